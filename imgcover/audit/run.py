"""The audit itself: every picture of a list measured or known, every lot summed, all remembered.

It knows neither terminal nor format: it tells what happened, and the ledger holds the rest.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

from imgcover.audit.digests import Digests
from imgcover.audit.folder import Listing
from imgcover.audit.grounds import OffGroundsError
from imgcover.audit.orders import Order, OrderBook
from imgcover.audit.out_folder import OutFolder
from imgcover.audit.outcome import Crew, Done, Loss, Lost
from imgcover.audit.packing import packed
from imgcover.audit.sequence import Sequence
from imgcover.audit.work import Answer, lost_answer
from imgcover.ledger.chain import Entry
from imgcover.ledger.store import Ledger

RECORD_SCHEMA = "imgcover/record/1"


class How(StrEnum):
    """How a picture came to its record."""

    MEASURED = "measured"
    KNOWN = "known"
    """Nothing had changed since it was measured; the ledger had it."""
    UNREAD = "unread"
    """The picture could not be read; the record says why."""
    REFUSED = "refused"
    """A file that its options name cannot be used; the record says so."""
    LOST = "lost"
    """Measuring it died, hung or failed; the record says so."""


@dataclass(frozen=True, slots=True)
class Told:
    """One picture that has its record.

    Parameters
    ----------
    index : int
        Its place in the list.
    how : How
    entry : Entry or None
        On the disk; None where it was known.
    said : str
        How it was lost, for the developer, or why it was refused or could not be read; else empty.
    is_bug : bool
        Whether the program itself failed on it.
    """

    index: int
    how: How
    entry: Entry | None = None
    said: str = ""
    is_bug: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Round:
    """One going through a list.

    Parameters
    ----------
    listing : Listing
    book : OrderBook
    folder : str
        The audited folder's name, without its path.
    ledger : Ledger
    out : OutFolder
    digests : Digests
        Of the pictures.
    fresh : bool
        Measure also what is known.
    send : bool
        Read files here and send what they hold: the workers do not see this disk.
    """

    listing: Listing
    book: OrderBook
    folder: str
    ledger: Ledger
    out: OutFolder
    digests: Digests
    fresh: bool = False
    send: bool = False

    def subject(self, index: int) -> str:
        """What the ledger calls a picture of the list.

        Its lot belongs to it: scanners number each day from 1, into folders of the same name.
        """
        listed = self.listing.pictures[index]
        return f"picture:{self.folder}/{listed.lot}/{listed.name}"


def measure_all(round_: Round, crew: Crew, *, work: Callable[[Order], Answer]) -> Iterator[Told]:
    """Give every picture of the list its record.

    Parameters
    ----------
    round_ : Round
    crew : Crew
        Who measures.
    work : callable
        Measures one picture: `imgcover.audit.work.measure_one`.

    Yields
    ------
    Told
        As each is safe on the disk, in any order; the ledger's rows are in the list's order.
    """
    sequence = Sequence(round_.ledger, again=round_.fresh)
    unknown: list[int] = []
    for index, listed in enumerate(round_.listing.pictures):
        # every row of the sheet is read before the first picture is measured
        entry = _known(round_, index, round_.book.order(listed))
        if entry is None:
            unknown.append(index)
        else:
            sequence.put(index, entry, kept=True)
            yield Told(index, How.KNOWN)
    orders: dict[int, Order] = {}

    def loads() -> Iterator[tuple[int, Order]]:
        for index in unknown:
            orders[index] = round_.book.order(round_.listing.pictures[index])
            yield index, packed(orders[index]) if round_.send else orders[index]

    for outcome in crew.run(work, loads()):
        entry, how, said = _kept(round_, orders.pop(outcome.index), outcome)
        sequence.put(outcome.index, entry)
        is_bug = isinstance(outcome, Lost) and outcome.loss is Loss.FAULT
        yield Told(outcome.index, how, entry, said, is_bug)


def _kept(round_: Round, order: Order, outcome: Done[Answer] | Lost) -> tuple[Entry, How, str]:
    if isinstance(outcome, Lost):
        answer, how, said = lost_answer(order, outcome), How.LOST, outcome.said
    elif outcome.answer.refused:
        answer, how, said = outcome.answer, How.REFUSED, outcome.answer.refused
    elif outcome.answer.unread:
        answer, how, said = outcome.answer, How.UNREAD, outcome.answer.unread
    else:
        answer, how, said = outcome.answer, How.MEASURED, ""
    # what was lost or refused is tried again next time, though nothing changed
    is_final = how in (How.MEASURED, How.UNREAD)
    key = round_.book.key(order, answer.picture_sha256) if is_final else ""
    if answer.small is not None:
        round_.out.keep_small(key, answer.small)
    subject = round_.subject(outcome.index)
    entry = Entry(RECORD_SCHEMA, subject, key, answer.body, answer.made_at, answer.evidence)
    return entry, how, said


def _known(round_: Round, index: int, order: Order) -> Entry | None:
    """Look up a picture that has not changed; only one that was met before is read for that."""
    subject = round_.subject(index)
    if round_.fresh or order.path is None or not round_.ledger.knows(subject):
        return None
    try:
        digest = round_.digests.of(order.path)
    except OffGroundsError:
        return None
    return round_.ledger.find(subject, round_.book.key(order, digest))


def record_in(entry: Entry) -> dict[str, Any]:
    """Read an entry's record, its envelope put back."""
    record: dict[str, Any] = json.loads(entry.body)
    return {**record, "envelope": {"made_at": entry.made_at}}


__all__ = ["How", "Round", "Told", "measure_all", "record_in"]
