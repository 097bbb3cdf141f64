"""Whether a ledger is still what was written: changed, removed and cut-off rows."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from imgcover.ledger.chain import EMPTY, Head, Row, sealed

MOST_FAULTS = 20
"""Told in full; after one change every later seal may fail, and nobody reads a thousand lines."""


@dataclass(frozen=True, slots=True)
class Verification:
    """What following the chain from row 1 showed.

    Parameters
    ----------
    head : Head
        Of the last row that was read.
    faults : tuple of str
        Each a sentence; at most 20, then a last one that says how many more.
    completeness : str
        What the given head shows about cut-off rows, or that without one nothing is shown.
    """

    head: Head
    faults: tuple[str, ...]
    completeness: str

    @property
    def holds(self) -> bool:
        """Whether nothing speaks against the ledger."""
        return not self.faults


def verify(rows: Iterable[Row], *, head: Head | None) -> Verification:
    """Follow the chain.

    Parameters
    ----------
    rows : iterable of Row
        In order.
    head : Head or None
        From the foot of a report: the ledger must still hold that row, unchanged.

    Returns
    -------
    Verification
    """
    faults: list[str] = []
    before = EMPTY
    subjects: dict[str, int] = {}
    met: str | None = EMPTY.seal if head is not None and head.n == 0 else None
    for row in rows:
        faults += _faults(row, before, subjects.get(row.entry.subject))
        subjects[row.entry.subject] = row.n
        if head is not None and row.n == head.n:
            met = row.seal
        before = row.head
    told = _against(head, before, met)
    if head is not None and (met is None or not met.startswith(head.seal)):
        faults.append(told)
    if len(faults) > MOST_FAULTS:
        faults = [*faults[:MOST_FAULTS], f"and {len(faults) - MOST_FAULTS} more"]
    return Verification(before, tuple(faults), told)


def _faults(row: Row, before: Head, said: int | None) -> list[str]:
    if row.n != before.n + 1:
        missing = f"{before.n + 1}" if row.n == before.n + 2 else f"{before.n + 1} to {row.n - 1}"
        return [f"row {missing} was removed"]
    if row.previous != before.seal:
        return [f"row {row.n} does not follow from row {before.n}"]
    made = sealed(row.entry, after=before, supersedes=row.supersedes)
    if made.seal != row.seal:
        return [f"row {row.n} was changed"]
    if row.supersedes != said:
        return [f"row {row.n} supersedes row {row.supersedes}, but row {said} spoke last"]
    return []


def _against(head: Head | None, now: Head, met: str | None) -> str:
    if head is None:
        return (
            "no head was given, so completeness is not shown: rows may have been cut off at the "
            "end, or all of it written anew"
        )
    if met is None:
        return f"rows after {now.n} were cut off: the head names row {head.n}"
    if not met.startswith(head.seal):
        return f"row {head.n} is not the one the head names: the ledger was written anew"
    grown = now.n - head.n
    since = f"; {grown} added since" if grown else ""
    return f"complete up to row {head.n}, as the head says{since}"


__all__ = ["Verification", "verify"]
