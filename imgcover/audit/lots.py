"""The pictures of a lot, summed: places, means, decision."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from imgcover.audit.evidence import observed_from
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import Prediction, predict
from imgcover.findings import Flag, found
from imgcover.ledger.chain import Row
from imgcover.ledger.sections import findings_section, tidied
from imgcover.verdict.lot import judge_lot, measured_lot
from imgcover.verdict.observed import Observed


@dataclass(frozen=True, slots=True)
class Member:
    """One picture of a lot, as much of it as a lot needs.

    Parameters
    ----------
    name : str
        Of the picture.
    pixels : str or None
        SHA-256 of its pixels; None where it could not be read.
    observed : Observed
    """

    name: str
    pixels: str | None
    observed: Observed


def member(row: Row, record: Mapping[str, Any]) -> Member:
    """Take from a ledger's row what its lot needs."""
    picture, sample = record["picture"], record["sample"]
    # places are numbered within a piece: place 1 of two pieces is two places
    parts = [sample["piece"], sample["place"]] if sample["place"] else []
    place = ", ".join(filter(None, parts))
    observed = replace(observed_from(row.entry.evidence), place=place)
    return Member(picture["name"], picture["pixels_sha256"], observed)


def sum_lot(
    members: Sequence[Member],
    *,
    lot: str,
    declaration: Declaration | None,
    prediction: Prediction | None = None,
    risk: float | None,
) -> dict[str, Any]:
    """Sum a lot's pictures by place.

    A picture that shows the same pixels as an earlier one counts once: a copy under another name
    is not another place.

    Parameters
    ----------
    members : sequence of Member
        In the list's order.
    lot : str
        Its name.
    declaration : Declaration or None
        Of its article.
    prediction : Prediction or None
        What the declaration implies, where that is known already.
    risk : float or None
        As in `imgcover.verdict.lot.judge_lot`.

    Returns
    -------
    dict
        Schema imgcover/lot/1.
    """
    copies = _copies(members)
    counted = [each for at, each in enumerate(members) if at not in copies]
    observed = [each.observed for each in counted]
    if declaration is None:
        record = measured_lot(observed, lot=lot)
    else:
        expected = predict(declaration) if prediction is None else prediction
        record = judge_lot(declaration, expected, observed, lot=lot, risk=risk).record()
    record["findings"] += findings_section(
        found(
            Flag.SAME_PICTURE_TWICE,
            f"{members[at].name} shows the same pixels as {members[first].name}; counted once",
        )
        for at, first in copies.items()
    )
    summed: dict[str, Any] = tidied(record)
    return summed


def place_numbers(members: Sequence[Member]) -> tuple[int | None, ...]:
    """Say as which place of its lot, from 1, each picture was counted; None for a copy."""
    return tuple(_numbers(members, _copies(members)))


def _copies(members: Sequence[Member]) -> dict[int, int]:
    """Later pictures with the same pixels: index, and index of the first."""
    first: dict[str, int] = {}
    copies = {}
    for at, each in enumerate(members):
        if each.pixels is not None and first.setdefault(each.pixels, at) != at:
            copies[at] = first[each.pixels]
    return copies


def _numbers(members: Sequence[Member], copies: Mapping[int, int]) -> Iterable[int | None]:
    """Number the places as `imgcover.verdict.place.merged` orders them."""
    numbers: dict[str, int] = {}
    for at, each in enumerate(members):
        if at in copies:
            yield None
        else:
            place = each.observed.place or f"\0{at}"
            yield numbers.setdefault(place, len(numbers) + 1)


__all__ = ["Member", "member", "place_numbers", "sum_lot"]
