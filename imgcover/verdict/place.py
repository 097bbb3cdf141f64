"""Several pictures of one place of the cloth, made into one: backlit and reflected light."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import replace

from imgcover.findings import Flag
from imgcover.quantity import Measured
from imgcover.verdict.line import Quantity
from imgcover.verdict.observed import Observed, Spread
from imgcover.verdict.standing import COVER_MISSING, holds

APART = 2.0
"""Standard uncertainties of their difference beyond which two pictures of a place disagree."""


def merged(pictures: Iterable[Observed]) -> tuple[Observed, ...]:
    """Merge pictures of the same place, in the order in which places first come.

    Parameters
    ----------
    pictures : iterable of Observed
        A picture without a named place is a place of its own.
    """
    places: dict[str, list[Observed]] = {}
    for number, picture in enumerate(pictures):
        places.setdefault(picture.place or f"\0{number}", []).append(picture)
    return tuple(_merge(each) if len(each) > 1 else each[0] for each in places.values())


def _merge(pictures: Sequence[Observed]) -> Observed:
    """Average what several pictures tell of one place.

    A picture that keeps a sett undecided gives way to one that does not.
    """
    sound = [p for p in pictures if not holds(p.flags, Quantity.ENDS)] or list(pictures)
    scale_u = max(p.scale_u for p in sound)
    ends, ends_agree = _mean([p.ends for p in sound], scale_u)
    picks, picks_agree = _mean([p.picks for p in sound], scale_u)
    cover, cover_agrees = _mean([p.cover for p in pictures], 0.0)
    flags = frozenset().union(*(p.flags for p in sound))
    if cover is not None:
        flags -= COVER_MISSING
    if not (ends_agree and picks_agree and cover_agrees):
        flags |= {Flag.PICTURES_OF_A_PLACE_DISAGREE}
    return replace(
        pictures[0],
        ends=ends,
        picks=picks,
        cover=cover,
        warp_cover=_mean([p.warp_cover for p in pictures], 0.0)[0],
        weft_cover=_mean([p.weft_cover for p in pictures], 0.0)[0],
        gsm=_mean([p.gsm for p in pictures], 0.0)[0],
        conditioned=all(p.conditioned for p in pictures if p.gsm is not None),
        ends_spread=_widest([p.ends_spread for p in sound if p.ends is not None]),
        picks_spread=_widest([p.picks_spread for p in sound if p.picks is not None]),
        scale_u=scale_u,
        ends_length_mm=_longest([p.ends_length_mm for p in sound]),
        picks_length_mm=_longest([p.picks_length_mm for p in sound]),
        repeat=_one_repeat(sound),
        ends_forks=() if ends is not None else _first([p.ends_forks for p in sound]),
        picks_forks=() if picks is not None else _first([p.picks_forks for p in sound]),
        flags=flags,
    )


def _mean(values: Sequence[Measured | None], shared: float) -> tuple[Measured | None, bool]:
    """Average by 1/u², and say whether the values agree.

    The relative part `shared` of the u is the same in all and does not average out. Where they
    disagree, half their distance is added: which of them is right cannot be told.
    """
    given = [each for each in values if each is not None]
    if len(given) < 2:
        return (given[0] if given else None), True
    own = [_own_u(each, shared) for each in given]
    if min(own) == 0.0:
        own = [1.0] * len(given)
    weights = [1.0 / u**2 for u in own]
    total = math.fsum(weights)
    value = math.fsum(w * each.value for w, each in zip(weights, given, strict=True)) / total
    # the smallest u, not the u of a mean: two pictures of one field share its errors
    u = min(each.u for each in given)
    lowest = min(given, key=lambda each: each.value)
    highest = max(given, key=lambda each: each.value)
    gap = highest.value - lowest.value
    agree = gap <= APART * math.hypot(_own_u(lowest, shared), _own_u(highest, shared))
    return Measured(value, u if agree else math.hypot(u, gap / 2), given[0].unit), agree


def _own_u(value: Measured, shared: float) -> float:
    return math.sqrt(max(value.u**2 - (shared * value.value) ** 2, 0.0))


def _widest(spreads: Sequence[Spread]) -> Spread:
    return max(spreads, key=lambda each: each.u_relative, default=Spread())


def _longest(lengths: Sequence[float | None]) -> float | None:
    return max((each for each in lengths if each is not None), default=None)


def _first(forks: Sequence[tuple[float, ...]]) -> tuple[float, ...]:
    return next((each for each in forks if each), ())


def _one_repeat(pictures: Sequence[Observed]) -> tuple[int, int] | None:
    """The repeat that all pictures that show one agree upon."""
    seen = {p.repeat for p in pictures if p.repeat is not None}
    return seen.pop() if len(seen) == 1 else None


__all__ = ["merged"]
