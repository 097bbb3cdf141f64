"""Is this row a rule's, and of which unit: proven, open between two, or no rule at all?

Cloth is periodic too, so a row of equal distances proves nothing. A rule is believed only when
nearly all its lines end where one of the known patterns of long and short lines wants them, the
longest lines recur, and no other pattern of another unit does as well.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.scale.rule_band import Row
from imgcover.scale.rule_hierarchy import (
    Graduation,
    Pattern,
    flat_cost,
    levels,
    match_patterns,
)

LEAST_EXPLAINED = 0.8
"""Share of a row's lines that must end where the pattern wants them."""
LARGEST_COST = 1.6
"""Mean distance of the lines from the pattern, in scatters (0.8 pixel or an eighth of a pitch)."""
LEAST_GAIN = 24.0
"""What the pattern must save against equally long lines: six lines' worth of accidents."""
MARGIN = 10.0
"""What a pattern of another unit must cost more to be out of the question."""
MM_SHORTEST = 1.75
"""Pitches. Tenths of an inch this tall would be 4.4 mm lines at 2.5 mm distance; no rule at hand
has them, and millimetre lines are hardly ever shorter."""
MM_LONGEST = 2.6
HALF_MM_SHORTEST = 2.4
"""Pitches. Twentieths of an inch this tall would be 3 mm; half-millimetre lines are 1.2 at least."""
INCH_SHORTEST_MM = (0.7, 9.0)
"""Outside, a reading as a fraction of an inch would have lines that no rule has."""
TENTH_TALLEST = 2.8
"""Pitches: lines 7 mm tall for tenths of an inch are millimetre lines misnamed."""


@dataclass(frozen=True, slots=True)
class Proof:
    """What a row can be: one graduation when proven, several when open."""

    graduations: tuple[Graduation, ...]
    pattern: Pattern

    @property
    def proven(self) -> bool:
        """Whether only one reading is left."""
        return len(self.graduations) == 1


def prove(row: Row, unit: str) -> Proof | None:
    """Judge one row.

    Parameters
    ----------
    row : Row
        From `follow_row`.
    unit : {"auto", "mm", "inch"}
        What the user says the rule shows.

    Returns
    -------
    Proof or None
        None where the row is no rule's, or not of the stated unit.
    """
    patterns = match_patterns(row)
    if not patterns or not _fits(patterns[0], row):
        return None
    cheapest = patterns[0].cost
    rivals = [each for each in patterns if each.cost < cheapest + MARGIN]
    standing = [each for each in rivals if _stands(each, row)]
    if not standing:
        return None
    readings: list[Graduation] = []
    for pattern in standing:
        readings += [each for each in _readings(pattern, unit) if each not in readings]
    if standing[0] is not patterns[0] and not _same_unit(standing[0], patterns[0]):
        readings += [each for each in patterns[0].graduations if each not in readings]
    return Proof(tuple(readings), standing[0]) if readings else None


def _fits(pattern: Pattern, row: Row) -> bool:
    count = len(row.numbers)
    return (
        pattern.explained >= LEAST_EXPLAINED
        and pattern.cost / count <= LARGEST_COST
        and flat_cost(row) - pattern.cost >= LEAST_GAIN
    )


def _stands(pattern: Pattern, row: Row) -> bool:
    """Whether the longest lines recur, alike, and so does every level that tells the unit."""
    level = levels(row.numbers - pattern.phase, pattern.steps)
    reach = row.reach / row.pitch
    scatter = max(0.12, 0.8 / row.pitch)
    fewest = 3 if pattern.steps[-1] == 5 or len(pattern.steps) == 2 else 2
    top = reach[level == len(pattern.steps) - 1]
    if len(top) < fewest:
        return False
    for index, length in enumerate(pattern.lengths):
        mine = reach[level == index]
        if not _alike(mine, length, 3 * scatter):
            return False
    return True


def _alike(mine: NDArray[np.float64], length: float, bound: float) -> bool:
    """Whether the lines of one level are equally long, up to accidents.

    Of three lines none may differ: long and short in turn would be a level more.
    """
    strays = int((np.abs(mine - length) > bound).sum())
    return strays == 0 if len(mine) <= 3 else strays <= 0.25 * len(mine)


def _same_unit(one: Pattern, other: Pattern) -> bool:
    return set(one.graduations) == set(other.graduations)


def _readings(pattern: Pattern, unit: str) -> list[Graduation]:
    """List what a standing pattern can be, by its lines' proportions and the stated unit."""
    shortest, longest = pattern.lengths[0], pattern.lengths[-1]
    possible = []
    for graduation in pattern.graduations:
        if unit == ("inch" if graduation.metric else "mm"):
            continue
        if graduation is Graduation.TENTH_INCH:
            tall = shortest >= MM_SHORTEST and longest >= MM_LONGEST
            if shortest > TENTH_TALLEST or (unit == "auto" and tall):
                continue
        elif not graduation.metric:
            height = shortest * graduation.step_mm
            if not INCH_SHORTEST_MM[0] <= height <= INCH_SHORTEST_MM[1]:
                continue
        elif graduation is Graduation.HALF_MM and unit == "auto" and shortest < HALF_MM_SHORTEST:
            continue
        possible.append(graduation)
    return possible


__all__ = ["Proof", "prove"]
