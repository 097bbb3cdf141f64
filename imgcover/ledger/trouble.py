"""What SQLite's errors mean to an inspector, and what to do about each."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from imgcover.errors import LedgerError

SAID = {
    sqlite3.SQLITE_FULL: ("the disk is full", "make room; what was written before is safe"),
    sqlite3.SQLITE_READONLY: (
        "it, or the folder it lies in, cannot be written to",
        "allow writing there, or name another file as ledger",
    ),
    sqlite3.SQLITE_BUSY: (
        "another program holds it locked",
        "wait until the other is done, then try again",
    ),
    sqlite3.SQLITE_LOCKED: (
        "another program holds it locked",
        "wait until the other is done, then try again",
    ),
    sqlite3.SQLITE_CANTOPEN: (
        "it cannot be opened",
        "check that the folder exists and may be written to",
    ),
    sqlite3.SQLITE_PERM: ("access to it is denied", "ask for the right to read and write it"),
    sqlite3.SQLITE_NOTADB: ("it is not a ledger", "name another file as ledger"),
    sqlite3.SQLITE_CORRUPT: ("its file is damaged", "take the last good copy; keep this one"),
    sqlite3.SQLITE_IOERR: (
        "the disk failed while it was read or written",
        "check the disk; what was written before is safe",
    ),
    sqlite3.SQLITE_CONSTRAINT: (
        "a row was refused by the ledger's own rules",
        "verify it with: imgcover ledger verify",
    ),
}
"""By primary result code, SQLite's documentation "Result and Error Codes"."""


@contextmanager
def told(path: Path) -> Iterator[None]:
    """Turn every SQLite error inside into a `LedgerError` in plain words."""
    try:
        yield
    except sqlite3.Error as fault:
        raise LedgerError(str(path), *_meaning(fault)) from fault
    except OSError as fault:
        reason = fault.strerror or type(fault).__name__
        raise LedgerError(
            str(path), f"it cannot be used ({reason})", "choose another place, or make room"
        ) from fault


def _meaning(fault: sqlite3.Error) -> tuple[str, str]:
    # codes are extended: the lowest byte is the primary one
    code = getattr(fault, "sqlite_errorcode", None)
    known = SAID.get(code & 0xFF) if code is not None else None
    if known is None:
        return f"the database says: {fault}", "check the file, or name another as ledger"
    return known


__all__ = ["told"]
