"""Is this row a rule's, and of which unit: proven, open between two, or no rule at all?

Cloth is periodic too, so a row of equal distances proves nothing. A rule is believed only when
nearly all its lines end where one of the known patterns of long and short lines wants them, the
longest lines recur, and no other pattern of another unit does as well.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.special import gammaln

from imgcover.scale.rule_hierarchy import (
    LOST,
    Graduation,
    Pattern,
    levels,
    match_patterns,
    misfit,
    usual_scatter,
)
from imgcover.scale.rule_lines import Row
from imgcover.scale.rule_recurrence import (
    FINEST,
    UNMISTAKABLE,
    WIDE_TIP,
    Recurrence,
    recurs,
)

LEAST_EXPLAINED = 0.75
"""Share of a row's lines that must end where the pattern wants them."""
LARGEST_COST = 1.35
"""Mean distance of the lines from the pattern, in scatters (0.8 pixel or an eighth of a pitch)."""
RAGGED_COST = 2.0
"""The same where the evidence is `BEYOND_CHANCE` and the period could be no other's: print leaves
ends ragged by a quarter of a millimetre, which is half a pitch of a half-millimetre scale."""
BEYOND_CHANCE = 15.0
"""Powers of ten; of 10⁴ trials a picture, ten more than any number of pictures would need."""
LEAST_EVIDENCE = 5.0
"""Powers of ten by which the found order of lengths is rarer than chance would have it. All spots,
phases and patterns together are some 10⁴ trials."""
TWO_LENGTHS = 3.0
"""Powers more for a pattern of only two lengths: stripes and fringes come near it more easily."""
LEAST_RISE = 6.0
"""Scatters between the shortest and the longest lines: three pixels' difference, clearly seen."""
MARGIN = 10.0
"""What a pattern of another unit must cost more to be out of the question."""
FALSE_ENDS = 2
"""Lines at each end of a row that may be none: one beyond the rule's end, one beyond the frame."""
MM_SHORTEST = 1.75
"""Pitches. Tenths of an inch this tall would be 4.4 mm lines at 2.5 mm distance; no rule at hand
has them, and millimetre lines are hardly ever shorter."""
MM_RISE = 1.8
"""Pitches from the shortest lines to the longest, which no misplaced foot moves: tenths of an inch
would rise by 4.6 mm, more than any drawn or at hand; millimetre lines rise by 2 to 4."""
HALF_MM_SHORTEST = 3.2
"""Pitches. Twentieths of an inch this tall would be 4 mm tall; half-millimetre lines are 1.7
at least."""
HALF_MM_RISE = 4.5
"""Pitches, as `MM_RISE`: twentieths of an inch would rise by 5.7 mm, half-millimetres by 2.3."""
INCH_SHORTEST_MM = 0.7
"""Below, a reading as a fraction of an inch would have lines that no rule has."""
SHORTEST_MM = 9.0
"""No rule's shortest lines are taller; squared paper's are, whose longer lines pass its edge."""
FIVES_ONLY = (1, 5)
"""Two-millimetre and decimal inch scales have this pattern as well, in any proportions: it is left
to the user."""
TENTH_TALLEST = 2.8
"""Pitches: lines 7 mm tall for tenths of an inch are millimetre lines misnamed."""


OTHERWISE = {
    Graduation.HALF_MM: Graduation.MM,
    Graduation.SIXTEENTH_INCH: Graduation.THIRTYSECOND_INCH,
    Graduation.THIRTYSECOND_INCH: Graduation.SIXTYFOURTH_INCH,
    Graduation.SIXTYFOURTH_INCH: Graduation.THIRTYSECOND_INCH,
}
"""What a pattern may be as well when its longest lines are seen once: the next one up."""


@dataclass(frozen=True, slots=True)
class Proof:
    """What a row can be: one graduation when proven, several when open, none when disproved."""

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
        None where the row is no rule's; without graduations where it looks like a rule's but its
        own lines speak against it, or it is not of the stated unit.
    """
    patterns = match_patterns(row)
    if patterns and (within := _without_false_ends(row, patterns[0])) is not row:
        row, patterns = within, match_patterns(within)
    if not patterns or not _fits(patterns[0], row):
        return None
    rivals = [
        (each, recurs(each, row))
        for each in patterns
        if each.cost < patterns[0].cost + MARGIN and _fits(each, row)
    ]
    possible = [(each, seen) for each, seen in rivals if seen is not Recurrence.DISPROVED]
    if not possible:
        return Proof((), patterns[0])
    readings: list[Graduation] = []
    for pattern, seen in possible:
        if seen is Recurrence.SEEN:
            readings += [each for each in _readings(pattern, unit) if each not in readings]
    first, seen = possible[0]
    if seen is Recurrence.NOT_IN_FRAME:
        readings += [each for each in _unseen(first, unit) if each not in readings]
    return Proof(tuple(readings), first)


def _without_false_ends(row: Row, pattern: Pattern) -> Row:
    """Leave out the outermost lines that end a pitch and more from their level's length.

    A row is followed a line too far where the rule ends or the frame cuts it; such a line tells
    nothing of the scale. Longest lines still have to recur among the others.
    """
    level = levels(row.numbers - pattern.phase, pattern.steps)
    off = misfit(row, np.array(pattern.lengths)[level]) >= max(1.0, LOST * usual_scatter(row))
    # a line with clear gaps beside it is one, and may be longer for a reason
    off &= row.wide > WIDE_TIP
    first = int(np.argmin(off[: FALSE_ENDS + 1])) if off[0] else 0
    last = int(np.argmin(off[::-1][: FALSE_ENDS + 1])) if off[-1] else 0
    return row.part(first, len(off) - last) if first or last else row


def _unseen(pattern: Pattern, unit: str) -> tuple[Graduation, ...]:
    """List what a pattern can be whose longest lines are not seen to recur: always two or more."""
    same = pattern.graduations
    if unit != "auto" and len(same) == 2:
        return same
    return same if len(same) > 1 else (*same, OTHERWISE[same[0]])


def _fits(pattern: Pattern, row: Row) -> bool:
    scatter = usual_scatter(row)
    powers = evidence(pattern, row)
    sure = powers >= BEYOND_CHANCE and pattern.steps in (*UNMISTAKABLE, FINEST)
    return (
        pattern.explained >= LEAST_EXPLAINED
        and pattern.cost / len(row.numbers) <= (RAGGED_COST if sure else LARGEST_COST)
        and pattern.lengths[-1] - pattern.lengths[0] >= LEAST_RISE * scatter
        and powers >= LEAST_EVIDENCE + (len(pattern.steps) == 2) * TWO_LENGTHS
    )


def evidence(pattern: Pattern, row: Row) -> float:
    """Return how rare the row's order of lengths is, in powers of ten.

    As many lines of each length can be put in order in n!/(n₁! n₂! …) ways, and only one is the
    pattern's; a line out of place is charged as half a power. That the lines of a longer level
    end at one height, when they might anywhere between the shortest and the longest, comes on top.
    """
    level = levels(row.numbers - pattern.phase, pattern.steps)
    counts = np.bincount(level)
    ways = gammaln(len(level) + 1) - gammaln(counts + 1).sum()
    order = float(ways / math.log(10) - 0.5 * (1 - pattern.explained) * len(level))
    kept = misfit(row, np.array(pattern.lengths)[level]) < LOST * usual_scatter(row)
    rise = (pattern.lengths[-1] - pattern.lengths[0]) / usual_scatter(row)
    a_line = max(0.0, math.log10(rise / (2 * LOST))) if rise > 0 else 0.0
    for index in range(1, len(pattern.steps)):
        n, k = int((level == index).sum()), int((level == index)[kept].sum())
        if k > 1:
            order += max(0.0, (k - 1) * a_line - math.log10(math.comb(n, k)))
    return order


def _readings(pattern: Pattern, unit: str) -> list[Graduation]:
    """List what a standing pattern can be, by its lines' proportions and the stated unit."""
    return [each for each in pattern.graduations if _can_be(each, pattern, unit)]


def _can_be(graduation: Graduation, pattern: Pattern, unit: str) -> bool:
    shortest, longest = pattern.lengths[0], pattern.lengths[-1]
    height = shortest * graduation.step_mm
    if unit == "auto" and pattern.steps == FIVES_ONLY:
        return True
    if unit == ("inch" if graduation.metric else "mm") or height > SHORTEST_MM:
        return False
    if graduation is Graduation.HALF_MM:
        return unit != "auto" or (
            shortest >= HALF_MM_SHORTEST and longest - shortest >= HALF_MM_RISE
        )
    if graduation is Graduation.TENTH_INCH:
        tall = shortest >= MM_SHORTEST and longest - shortest >= MM_RISE
        return shortest <= TENTH_TALLEST and not (unit == "auto" and tall)
    return graduation.metric or height >= INCH_SHORTEST_MM


__all__ = ["BEYOND_CHANCE", "Proof", "evidence", "prove"]
