"""The first page of an audit: every lot with its decision, and where its page is."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from imgcover.report.layout import Units, figure
from imgcover.report.lot_page import About
from imgcover.report.pages import DECISIONS, decision_class, page, said_decision
from imgcover.report.plain import plain

GRAVEST = ("does not conform", "undecided", "conforms", None)
"""One lot that does not conform colours the whole; a lot with nothing declared colours nothing."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LotLine:
    """One lot on the first page.

    Parameters
    ----------
    lot : mapping
        Schema imgcover/lot/1.
    units : {"inch", "cm"}
        Of its densities.
    link : str
        Of its page, relative and already quoted for an address.
    """

    lot: Mapping[str, Any]
    units: Units
    link: str


def index_page(
    lots: Iterable[LotLine],
    *,
    title: str,
    pictures: int,
    unread: int,
    notes: Sequence[str],
    about: About,
) -> str:
    """Write the first page.

    Parameters
    ----------
    lots : iterable of LotLine
        In order; one at a time is in memory.
    title : str
        What was audited.
    pictures, unread : int
        How many pictures there are, and how many of them gave no number.
    notes : sequence of str
        Sentences about the whole: pictures that are not listed, lots without a declaration.
    about : About

    Returns
    -------
    str
        HTML.
    """
    counts: Counter[str | None] = Counter()
    lines = []
    for each in lots:
        counts[each.lot["decision"]] += 1
        lines.append(_line(each))
    gravest = next((each for each in GRAVEST if counts[each]), None)
    return page(
        "index.html.j2",
        title=plain(title),
        lots=lines,
        pictures=pictures,
        unread=unread,
        decision=said_decision(gravest),
        tone=decision_class(gravest),
        lead=lead(counts),
        notes=[plain(each) for each in notes],
        about=about,
    )


def lead(counts: Mapping[str | None, int]) -> str:
    """Say how many lots ended how, in one line.

    Examples
    --------
    >>> lead({"conforms": 3, "undecided": 1})
    '3 lots conform, 1 lot undecided.'
    >>> lead({None: 1})
    '1 lot not judged.'
    """
    words = {
        "does not conform": ("does not conform", "do not conform"),
        "undecided": ("undecided", "undecided"),
        "conforms": ("conforms", "conform"),
        None: ("not judged", "not judged"),
    }
    said = []
    for decision in ("conforms", "does not conform", "undecided", None):
        n = counts.get(decision, 0)
        if n:
            one, many = words[decision]
            said.append(f"{n} lot{'' if n == 1 else 's'} {one if n == 1 else many}")
    return ", ".join(said) + "." if said else "No lot."


def _line(each: LotLine) -> dict[str, str]:
    means = each.lot["means"]
    assert each.lot["decision"] in DECISIONS
    return {
        "name": plain(str(each.lot["lot"])),
        "article": plain(str(each.lot["article"] or "–")),
        "places": f"{each.lot['n_places']} of {each.lot['required']}",
        "decision": said_decision(each.lot["decision"]),
        "tone": decision_class(each.lot["decision"]),
        "link": each.link,
        **{key: figure(means.get(key), each.units) for key in ("ends", "picks", "cover")},
    }


__all__ = ["LotLine", "index_page", "lead"]
