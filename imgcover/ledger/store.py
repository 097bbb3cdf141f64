"""The ledger's file: SQLite, appended to only, every acknowledged row on the disk."""

from __future__ import annotations

import sqlite3
import time
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import astuple
from pathlib import Path
from types import TracebackType
from typing import Self

from imgcover.errors import LedgerError
from imgcover.ledger.chain import EMPTY, Entry, Head, Row, sealed
from imgcover.ledger.migrations import STEPS, Step, check_kind, migrate
from imgcover.ledger.place import network_kind
from imgcover.ledger.trouble import told

PATIENCE_S = 30.0
"""How long to wait for another writer: an audit's turn takes milliseconds, a copy seconds."""
ENTRY = "schema, subject, key, body, made_at, evidence"
COLUMNS = f"n, {ENTRY}, supersedes, previous, seal"


class Ledger:
    """An open ledger.

    Opened by `Ledger.open` (to write) or `Ledger.read`; a context manager that closes it. Several
    processes may have the same ledger open and append to it; every method that returns has its
    rows on the disk. Every method raises `LedgerError` when the file or its disk fails.
    """

    def __init__(self, path: Path, connection: sqlite3.Connection, *, moved_from: Path | None):
        self.path = path
        self.moved_from = moved_from
        """The copy that was kept, when opening moved an older ledger to this version."""
        self._connection = connection

    @classmethod
    def open(
        cls, path: Path, *, patience_s: float = PATIENCE_S, steps: Sequence[Step] = STEPS
    ) -> Self:
        """Open a ledger to append to it; a new one is made where there is none.

        Parameters
        ----------
        path : Path
            Of the file; its folder must exist and lie on a disk of this machine.
        patience_s : float
            Seconds to wait for another writer.
        steps : sequence of tuple of str
            The versions of the tables.

        Raises
        ------
        LedgerError
            When it is no ledger, newer, on a network share, locked, or cannot be written.
        """
        place = path.resolve()
        share = network_kind(place)
        if share is not None:
            raise LedgerError(
                str(path),
                f"it would lie on a network share ({share}), where SQLite cannot keep it whole",
                "keep the ledger on this machine's own disk (--ledger FILE)",
            )
        with told(path):
            connection = sqlite3.connect(place, timeout=patience_s, isolation_level=None)
            try:
                check_kind(connection, path, newest=len(steps))
                _use_wal(connection, path, patience_s=patience_s)
                connection.execute("PRAGMA synchronous = FULL")
                connection.execute("PRAGMA foreign_keys = ON")
                # nothing of a ledger is written beside it, not even for a moment
                connection.execute("PRAGMA temp_store = MEMORY")
                moved_from = migrate(connection, place, steps=steps)
            except BaseException:
                connection.close()
                raise
        return cls(path, connection, moved_from=moved_from)

    @classmethod
    def read(cls, path: Path, *, steps: Sequence[Step] = STEPS) -> Self:
        """Open a ledger to look into it; also in a folder that may only be read.

        Raises
        ------
        LedgerError
            When there is none, it is no ledger, newer, or older: only opening to write moves it.
        """
        place = path.resolve()
        if place.is_dir():
            raise LedgerError(str(path), "is a folder", "name the ledger in it, ledger.sqlite")
        if not place.is_file():
            raise LedgerError(str(path), "there is no such ledger", "check the name")
        with told(path):
            connection = _read_only(place)
            try:
                check_kind(connection, path, newest=len(steps))
                version = connection.execute("PRAGMA user_version").fetchone()[0]
                if version < len(steps):
                    raise LedgerError(
                        str(path),
                        f"it is of an older version ({version})",
                        "open it once with an audit or with measure --ledger: that moves it",
                    )
            except BaseException:
                connection.close()
                raise
        return cls(path, connection, moved_from=None)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        fault: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the file."""
        with told(self.path):
            self._connection.close()

    def head(self) -> Head:
        """Say where the ledger stands."""
        with told(self.path):
            return self._head()

    def append(self, entries: Iterable[Entry], *, again: bool = False) -> int:
        """Append entries in their order, all of them or none.

        Parameters
        ----------
        entries : iterable of Entry
            What is waiting of them is taken out of the waiting room.
        again : bool
            Also append what the ledger already says last about its subject, word for word.

        Returns
        -------
        int
            How many rows were added. When this returns they are on the disk.
        """
        with told(self.path), self._turn():
            rows = [row for entry in entries for row in self._append(entry, again=again)]
        return len(rows)

    def keep_waiting(self, entries: Iterable[Entry]) -> None:
        """Keep entries that finished out of turn; `append` puts each in its place later."""
        with told(self.path), self._turn():
            self._connection.executemany(
                f"INSERT OR REPLACE INTO waiting ({ENTRY}) VALUES (?, ?, ?, ?, ?, ?)",
                [astuple(entry) for entry in entries],
            )

    def find(self, subject: str, key: str) -> Entry | None:
        """Look up what was said about a subject under a key, be it in place or waiting."""
        row = self._one(
            f"SELECT {ENTRY} FROM entry WHERE subject = ? AND key = ? ORDER BY n DESC LIMIT 1",
            (subject, key),
        )
        return self.waiting(subject, key) if row is None else Entry(*row)

    def waiting(self, subject: str, key: str) -> Entry | None:
        """Look up what waits for its place."""
        row = self._one(
            f"SELECT {ENTRY} FROM waiting WHERE subject = ? AND key = ?", (subject, key)
        )
        return None if row is None else Entry(*row)

    def last(self, subject: str) -> Row | None:
        """Look up what the ledger says now about a subject."""
        row = self._one(
            f"SELECT {COLUMNS} FROM entry WHERE subject = ? ORDER BY n DESC LIMIT 1", (subject,)
        )
        return None if row is None else _row(row)

    def knows(self, subject: str) -> bool:
        """Whether anything about a subject is in place or waiting."""
        row = self._one(
            "SELECT 1 FROM entry WHERE subject = ? UNION SELECT 1 FROM waiting WHERE subject = ?",
            (subject, subject),
        )
        return row is not None

    def row(self, n: int) -> Row | None:
        """Look up one row by its number."""
        found = self._one(f"SELECT {COLUMNS} FROM entry WHERE n = ?", (n,))
        return None if found is None else _row(found)

    def rows(self) -> Iterator[Row]:
        """Go through all rows in order, one in memory at a time."""
        with told(self.path):
            for row in self._connection.execute(f"SELECT {COLUMNS} FROM entry ORDER BY n"):
                yield _row(row)

    def superseded(self) -> dict[int, int]:
        """Say which rows no longer hold: the row, and the row that superseded it."""
        with told(self.path):
            pairs = self._connection.execute(
                "SELECT supersedes, n FROM entry WHERE supersedes IS NOT NULL"
            )
            return dict(pairs.fetchall())

    def _one(self, query: str, values: tuple[object, ...]) -> tuple[str, ...] | None:
        with told(self.path):
            row: tuple[str, ...] | None = self._connection.execute(query, values).fetchone()
            return row

    def _head(self) -> Head:
        query = "SELECT n, seal FROM entry ORDER BY n DESC LIMIT 1"
        row = self._connection.execute(query).fetchone()
        return EMPTY if row is None else Head(*row)

    def _append(self, entry: Entry, *, again: bool) -> Iterator[Row]:
        said = self.last(entry.subject)
        self._connection.execute(
            "DELETE FROM waiting WHERE subject = ? AND key = ?", (entry.subject, entry.key)
        )
        if said and not again and (said.entry.key, said.entry.body) == (entry.key, entry.body):
            return
        row = sealed(entry, after=self._head(), supersedes=said.n if said else None)
        self._connection.execute(
            f"INSERT INTO entry ({COLUMNS}) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
            (row.n, *astuple(entry), row.supersedes, row.previous, row.seal),
        )
        yield row

    @contextmanager
    def _turn(self) -> Iterator[None]:
        """Hold the only pen: the head is read and the rows are written in one transaction."""
        self._connection.execute("BEGIN IMMEDIATE")
        try:
            yield
            self._connection.execute("COMMIT")
        except BaseException:
            if self._connection.in_transaction:
                self._connection.execute("ROLLBACK")
            raise


def _row(found: Sequence[object]) -> Row:
    n, *said, supersedes, previous, seal = found
    entry = Entry(*map(str, said))
    earlier = supersedes if isinstance(supersedes, int) else None
    return Row(int(str(n)), entry, earlier, str(previous), str(seal))


def _use_wal(connection: sqlite3.Connection, path: Path, *, patience_s: float) -> None:
    """Turn the write-ahead log on; SQLite does not wait for its turn here, so this does."""
    until = time.monotonic() + patience_s
    while True:
        try:
            mode = connection.execute("PRAGMA journal_mode = WAL").fetchone()[0]
            break
        except sqlite3.OperationalError as fault:
            busy = fault.sqlite_errorcode & 0xFF == sqlite3.SQLITE_BUSY
            if not busy or time.monotonic() > until:
                raise
            time.sleep(0.02)
    if mode != "wal":
        raise LedgerError(
            str(path),
            f"its disk does not carry a write-ahead log (mode {mode})",
            "keep the ledger on this machine's own disk (--ledger FILE)",
        )


def _read_only(place: Path) -> sqlite3.Connection:
    address = place.as_uri()
    log = place.with_name(f"{place.name}-wal")
    connection = sqlite3.connect(f"{address}?mode=ro", uri=True, isolation_level=None)
    try:
        connection.execute("SELECT count(*) FROM sqlite_schema").fetchone()
        return connection
    except sqlite3.OperationalError:
        connection.close()
        if log.exists() and log.stat().st_size:
            raise
    # a folder that cannot be written to has no room for the log's index; with no log there is
    # nothing to index and nobody writing
    return sqlite3.connect(f"{address}?immutable=1", uri=True, isolation_level=None)


__all__ = ["Ledger"]
