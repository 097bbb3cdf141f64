"""Over what field, and at how many places, must threads be counted to prove a tolerance?

The guard band is U of the count: the field's share falls with the threads counted, the scale's does
not. Where the scale alone takes too much of the tolerance, no field and no number of places help.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from imgcover.plan.trial import FieldError
from imgcover.verdict.decision import Limits, guard_band
from imgcover.verdict.pooled import effective_freedom
from imgcover.verdict.standard import PLACES, shortest_length_mm

MOST_SPENT = 0.5
"""Share of the tolerance that the guard band may take. What is left is then U itself, 2 u: a cloth
exactly as declared strays past it in one measurement of twenty, and is proved right in the rest."""
BETWEEN_PLACES = 0.005
"""Assumed relative standard deviation of a density from place to place of a lot: a quarter of the
2 % that trade allows, so that a lot in order stays within it everywhere."""
MOST_PLACES = 50
"""Beyond it nobody cuts swatches: a better scale is cheaper."""
LONGEST_MM = 1000.0
"""No bed is longer; a field that must be is none."""
LEFT_BY_PLACES = 0.8
"""Share of what may be spent that places alone may take, so that a scale anyone can make does."""
BISECTIONS = 40


@dataclass(frozen=True, slots=True)
class Room:
    """What a tolerance leaves on the side where it leaves least.

    Parameters
    ----------
    nearest : float
        Distance from the declared figure to the nearest limit, in the figure's unit or relative.
    width : float
        Distance between the limits; infinite where one is missing.
    """

    nearest: float
    width: float


@dataclass(frozen=True, slots=True)
class BetterScale:
    """A scale that would do.

    Parameters
    ----------
    u : float
        Its largest relative standard uncertainty.
    places : int
        At how many places of a lot it then does.
    """

    u: float
    places: int


@dataclass(frozen=True, slots=True)
class Proof:
    """What counting one system takes; every u relative.

    Parameters
    ----------
    standard_mm : float
        Shortest distance of ISO 7211-2 at this density.
    needed_mm : float or None
        Shortest distance over which the guard band of one swatch leaves half of the tolerance;
        None where no distance will do, or no tolerance is declared.
    field_mm : float
        What to count over: the longer of both.
    u : float
        Of one swatch's count over that field, with the scale.
    guard : float
        Its guard band.
    possible : bool or None
        Whether any swatch could be proved to conform; None without a tolerance.
    places : int or None
        Places of a lot at which its mean leaves half of the tolerance, five at least; None where
        no number will do. Five without a tolerance.
    better : BetterScale or None
        Where the scale stands in the way: one that would not.
    """

    standard_mm: float
    needed_mm: float | None
    field_mm: float
    u: float
    guard: float
    possible: bool | None
    places: int | None
    better: BetterScale | None


def room_of(limits: Limits | None, figure: float, *, relative: bool) -> Room | None:
    """Say what a tolerance leaves; None where there is none.

    Examples
    --------
    >>> room_of(Limits(9.7, 10.5), 10.0, relative=False).nearest
    0.3000000000000007
    """
    if limits is None:
        return None
    unit = figure if relative else 1.0
    sides = [
        abs(limit - figure) / unit for limit in (limits.lower, limits.upper) if limit is not None
    ]
    return Room(min(sides), limits.width / unit)


def proof(
    per_mm: float,
    *,
    error: FieldError,
    scale_u: float,
    room: Room | None,
    between: float = BETWEEN_PLACES,
    risk: float | None = None,
) -> Proof:
    """Work out field and places for one system.

    Parameters
    ----------
    per_mm : float
        Declared threads a millimetre.
    error : FieldError
        How the count's u falls with the threads counted.
    scale_u : float
        Relative standard uncertainty of the scale.
    room : Room or None
        What the tolerance leaves, relative.
    between : float
        Relative standard deviation between places of a lot.
    risk : float or None
        As in `imgcover.verdict.decision.guard_band`.
    """
    width = math.inf if room is None else room.width
    most = None if room is None else MOST_SPENT * room.nearest

    def guard_over(length_mm: float) -> float:
        u = math.hypot(scale_u, error.u(per_mm * length_mm))
        return guard_band(u, risk=risk, width=width)

    standard_mm = shortest_length_mm(10 * per_mm)
    needed_mm = None if most is None else _shortest(guard_over, most)
    field_mm = max(standard_mm, needed_mm or 0.0)
    own = math.hypot(error.u(per_mm * field_mm), between)

    def lot_guard(places: int, scale: float) -> float:
        of_mean = own / math.sqrt(places)
        freedom = effective_freedom([(of_mean, places - 1), (scale, math.inf)])
        u = math.hypot(of_mean, scale)
        return guard_band(u, risk=risk, freedom=freedom, width=width)

    return Proof(
        standard_mm,
        needed_mm,
        field_mm,
        math.hypot(scale_u, error.u(per_mm * field_mm)),
        guard_over(field_mm),
        None if room is None else guard_over(field_mm) < room.nearest,
        PLACES if most is None else _fewest(lambda n: lot_guard(n, scale_u), most),
        None if most is None else _better_scale(lot_guard, scale_u, most),
    )


def _shortest(guard_over: Callable[[float], float], most: float) -> float | None:
    """Shortest length, mm, whose guard band stays within what may be spent."""
    if guard_over(LONGEST_MM) > most:
        return None
    low, high = 0.1, LONGEST_MM
    for _ in range(BISECTIONS):
        middle = math.sqrt(low * high)
        low, high = (low, middle) if guard_over(middle) <= most else (middle, high)
    return high


def _fewest(guard_at: Callable[[int], float], most: float) -> int | None:
    return next((n for n in range(PLACES, MOST_PLACES + 1) if guard_at(n) <= most), None)


def _better_scale(
    lot_guard: Callable[[int, float], float], scale_u: float, most: float
) -> BetterScale | None:
    """Find the scale that would do, where this one does not with the standard's places."""
    if lot_guard(PLACES, scale_u) <= most:
        return None
    places = _fewest(lambda n: lot_guard(n, 0.0), LEFT_BY_PLACES * most)
    if places is None or lot_guard(places, scale_u) <= most:
        return None
    low, high = 0.0, scale_u
    for _ in range(BISECTIONS):
        middle = (low + high) / 2
        low, high = (middle, high) if lot_guard(places, middle) <= most else (low, middle)
    return BetterScale(low, places)


__all__ = ["BETWEEN_PLACES", "MOST_SPENT", "BetterScale", "Proof", "Room", "proof", "room_of"]
