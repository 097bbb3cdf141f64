"""Entries into the ledger in the list's order, whatever the order in which they are finished."""

from __future__ import annotations

from collections.abc import Iterator

from imgcover.ledger.chain import Entry
from imgcover.ledger.store import Ledger


class Sequence:
    """Puts entry after entry in its place; what comes too early waits on the disk.

    Parameters
    ----------
    ledger : Ledger
    again : bool
        Append also what the ledger already says, word for word.
    """

    def __init__(self, ledger: Ledger, *, again: bool) -> None:
        self._ledger = ledger
        self._again = again
        self._next = 0
        self._early: dict[int, tuple[str, str]] = {}

    def put(self, index: int, entry: Entry, *, kept: bool = False) -> None:
        """Keep an entry safe; when this returns it is on the disk, in place or waiting.

        Parameters
        ----------
        index : int
            Its place in the list; every index from 0 is put once.
        entry : Entry
        kept : bool
            It came from the ledger, and need not be written again to be safe.
        """
        if index != self._next:
            if not kept:
                self._ledger.keep_waiting([entry])
            self._early[index] = (entry.subject, entry.key)
            return
        self._ledger.append(self._due(entry), again=self._again)

    def _due(self, entry: Entry) -> Iterator[Entry]:
        """The entry, and everything that waited for it alone."""
        yield entry
        self._next += 1
        while (name := self._early.pop(self._next, None)) is not None:
            early = self._ledger.waiting(*name) or self._ledger.find(*name)
            assert early is not None, "what was kept is gone from the ledger"
            yield early
            self._next += 1


__all__ = ["Sequence"]
