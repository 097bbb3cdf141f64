"""How a ledger's tables came to be: every step once, in order, a copy kept before each."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Sequence
from contextlib import closing
from pathlib import Path

from imgcover.errors import LedgerError

APPLICATION = 0x696D6363
"""SQLite's application_id, "imcc": a database of another program is never written to."""

Step = tuple[str, ...]

STEPS: tuple[Step, ...] = (
    (
        """
        CREATE TABLE entry (
            n INTEGER PRIMARY KEY CHECK (n >= 1),
            schema TEXT NOT NULL,
            subject TEXT NOT NULL,
            key TEXT NOT NULL,
            supersedes INTEGER REFERENCES entry (n) CHECK (supersedes < n),
            body TEXT NOT NULL,
            made_at TEXT NOT NULL,
            evidence TEXT NOT NULL,
            previous TEXT NOT NULL,
            seal TEXT NOT NULL UNIQUE
        ) STRICT
        """,
        "CREATE INDEX entry_by_subject ON entry (subject, n)",
        """
        CREATE TRIGGER entry_is_never_changed BEFORE UPDATE ON entry
        BEGIN SELECT RAISE (ABORT, 'a ledger is only appended to'); END
        """,
        """
        CREATE TRIGGER entry_is_never_removed BEFORE DELETE ON entry
        BEGIN SELECT RAISE (ABORT, 'a ledger is only appended to'); END
        """,
        # finished out of turn: kept here until the rows before them are in
        """
        CREATE TABLE waiting (
            subject TEXT NOT NULL,
            key TEXT NOT NULL,
            schema TEXT NOT NULL,
            body TEXT NOT NULL,
            made_at TEXT NOT NULL,
            evidence TEXT NOT NULL,
            PRIMARY KEY (subject, key)
        ) STRICT
        """,
    ),
)
"""One step a version; a step that was released is never edited."""


def version_of(connection: sqlite3.Connection) -> int:
    """Read the version a file says it has; 0 for a new one."""
    return int(connection.execute("PRAGMA user_version").fetchone()[0])


def check_kind(connection: sqlite3.Connection, path: Path, *, newest: int) -> None:
    """Refuse a database of another program, and a ledger of a newer version.

    Raises
    ------
    LedgerError
        With what to do about it.
    """
    version = version_of(connection)
    application = connection.execute("PRAGMA application_id").fetchone()[0]
    tables = connection.execute("SELECT count(*) FROM sqlite_schema").fetchone()[0]
    if tables and application != APPLICATION:
        raise LedgerError(
            str(path), "it is a database of another program", "name another file as ledger"
        )
    if version > newest:
        raise LedgerError(
            str(path),
            f"it was written by a newer imgcover (ledger version {version}; this one knows "
            f"{newest})",
            "update imgcover, or name another file as ledger",
        )


def migrate(
    connection: sqlite3.Connection, path: Path, *, steps: Sequence[Step] = STEPS
) -> Path | None:
    """Bring a ledger to the newest version.

    Parameters
    ----------
    connection : sqlite3.Connection
        In autocommit mode.
    path : Path
        Of the ledger, for the copy's name.
    steps : sequence of tuple of str
        Statements of each version.

    Returns
    -------
    Path or None
        The copy that was kept, when an older ledger was moved.

    Raises
    ------
    LedgerError
        When it is newer, or no ledger.
    """
    check_kind(connection, path, newest=len(steps))
    version = version_of(connection)
    if version == len(steps):
        return None
    kept = _keep_copy(connection, path, version) if version else None
    connection.execute("BEGIN IMMEDIATE")
    try:
        # another process may have moved it while this one waited for its turn
        for step in steps[version_of(connection) :]:
            for statement in step:
                connection.execute(statement)
        connection.execute(f"PRAGMA application_id = {APPLICATION}")
        connection.execute(f"PRAGMA user_version = {len(steps)}")
        connection.execute("COMMIT")
    except BaseException:
        if connection.in_transaction:
            connection.execute("ROLLBACK")
        raise
    return kept


def _keep_copy(connection: sqlite3.Connection, path: Path, version: int) -> Path:
    """Write the whole ledger as it is beside itself, and wait until it is on the disk."""
    copy = path.with_name(f"{path.name}.version-{version}")
    again = 1
    while copy.exists():
        again += 1
        copy = path.with_name(f"{path.name}.version-{version}-{again}")
    with closing(sqlite3.connect(copy)) as target:
        connection.backup(target)
    with copy.open("rb") as file:
        os.fsync(file.fileno())
    return copy


__all__ = ["STEPS", "Step", "check_kind", "migrate", "version_of"]
