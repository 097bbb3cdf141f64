"""Is this row a rule's, and of which unit: proven, open between two, or no rule at all?

Cloth is periodic too, so a row of equal distances proves nothing. A rule is believed only when
nearly all its lines end where one of the known patterns of long and short lines wants them, the
longest lines recur, and no other pattern of another unit does as well.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import Enum

import numpy as np
from numpy.typing import NDArray
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
MOST_LONGER = 0.25
"""Of the lines that keep their level's length: how many may be longer."""
UNMISTAKABLE = ((1, 5, 10), (1, 2, 10, 20))
"""Patterns whose period could be neither halved nor doubled into another scale's."""
FINEST = (1, 2, 4, 8, 16, 32, 64)
"""The finest binary scale there is: what has all its levels has no more."""
SHARP_TIP = 0.72
"""Contrast just before a longest line's end, over that at its foot: a line that fades away is
half as strong there by definition, one that ends nearly as strong as at its foot."""
WIDE_TIP = 0.3
"""Ink on both sides of a longest line's end, over its own: it runs into a digit there, and every
second digit (1, 3, 5) may have ink where its line ends, so that a scale seems to have half as many
longest lines."""
MOST_LONGEST = 0.12
"""The same of the longest lines: longer ones among them are a level more, seen under wear."""
LEAST_KEPT = 0.5
"""Of each level's lines that must keep its length; the rest may be worn or under dust."""
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
        (each, _recurs(each, row))
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
    sure = powers >= BEYOND_CHANCE and pattern.steps in UNMISTAKABLE
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


class Recurrence(Enum):
    """Whether a pattern's longest lines come again at its period."""

    SEEN = "seen"
    NOT_IN_FRAME = "not in frame"
    DISPROVED = "disproved"


def _recurs(pattern: Pattern, row: Row) -> Recurrence:
    """Look for the longest lines one period apart and equally long, shorter ones half-way.

    Were the period twice as long, one of the two would be longer than the other; were it half as
    long, the line between them would be as long as they. Lines cut short by wear or dust are
    passed over.
    """
    scatter = usual_scatter(row)
    period = pattern.steps[-1]
    halved = period // 2 in pattern.steps
    need = 2 if halved else 3
    top, between = pattern.lengths[-1], pattern.lengths[-2]
    # a faded tip is allowed for, but not half the way down to the next level
    bound = max(2 * scatter, 0.3 * (top - between))
    reach = row.reach / row.pitch
    ends = misfit(row, np.full(len(reach), top)) <= bound
    if not _orderly(pattern, row, bound):
        return Recurrence.DISPROVED
    if Graduation.MM in pattern.graduations and _fifths_longer(pattern, row, bound):
        return Recurrence.DISPROVED
    if pattern.steps in UNMISTAKABLE:
        # that they are longer than the level below is enough, however far each still reaches
        ends |= row.faint / row.pitch > between + bound
    else:
        # half or twice the period would be as good a scale: a worn line must not decide
        if not _in_both_turns(pattern, row, ends):
            return Recurrence.DISPROVED
        ends = _sharp_ends(row, top, bound)
    longest = dict(zip(row.numbers.tolist(), ends.tolist(), strict=True))
    length = dict(zip(row.numbers.tolist(), (row.faint / row.pitch).tolist(), strict=True))
    tried = 0
    for first in range(int(row.numbers[0]), int(row.numbers[-1]) - (need - 1) * period + 1):
        chain = [longest.get(first + i * period) for i in range(need)]
        if (first - pattern.phase) % period or None in chain:
            continue
        tried += 1
        middle = length.get(first + period // 2, between) if halved else between
        if all(chain) and middle < top - 2 * scatter:
            return Recurrence.SEEN
    if not tried and pattern.steps == FINEST and _alone(pattern, ends, row):
        return Recurrence.SEEN
    return Recurrence.DISPROVED if tried else Recurrence.NOT_IN_FRAME


def _alone(pattern: Pattern, ends: NDArray[np.bool_], row: Row) -> bool:
    """Whether one longest line stands between two of the level below that end as lines end.

    The two exclude half the period; twice the period no scale has.
    """
    half, period = pattern.steps[-2:]
    halves = _sharp_ends(row, pattern.lengths[-2], 2 * usual_scatter(row))
    sharp = set(row.numbers[halves].tolist())
    longest = row.numbers[ends & ((row.numbers - pattern.phase) % period == 0)].tolist()
    return any({each - half, each + half} <= sharp for each in longest)


def _sharp_ends(row: Row, top: float, bound: float) -> NDArray[np.bool_]:
    """Return which lines end at a length as lines end, with nothing faint or wide beyond."""
    at_reach = (np.abs(row.reach / row.pitch - top) <= bound) & (row.tip >= SHARP_TIP)
    faint = row.faint / row.pitch
    at_faint = (np.abs(faint - top) <= bound) & (row.faint_tip >= SHARP_TIP)
    return (at_reach | at_faint) & (faint <= top + bound) & (row.wide <= WIDE_TIP)


def _fifths_longer(pattern: Pattern, row: Row, bound: float) -> bool:
    """Whether every fifth of the longest lines is longer still: 1/50 inch looks like this.

    Lines that run into digits seem longer too; then only they may have digits.
    """
    steps = (row.numbers - pattern.phase) / pattern.steps[-1]
    longest, digit = steps % 1 == 0, row.wide > WIDE_TIP
    for reach, turn in ((end / row.pitch, n) for end in (row.reach, row.faint) for n in range(5)):
        fifth = longest & (steps % 5 == turn)
        rest = reach[longest & ~fifth]
        if fifth.sum() < 2 or len(rest) < 4:
            continue
        if digit[fifth].any() and digit[longest & ~fifth].any():
            continue
        # worn lines among the rest must not make whole ones seem longer
        if (reach[fifth] > np.quantile(rest, 0.9) + bound).mean() > 0.6:
            return True
    return False


def _in_both_turns(pattern: Pattern, row: Row, ends: NDArray[np.bool_]) -> bool:
    """Whether half of the longest lines keep their length in each turn of twice the period.

    In a scale of twice the period every second of them would be longer; wear may shorten one of
    those to the same length, but hardly half.
    """
    period = pattern.steps[-1]
    for turn in (0, period):
        mine = (row.numbers - pattern.phase - turn) % (2 * period) == 0
        if (mine & ends).sum() < LEAST_KEPT * mine.sum():
            return False
    return True


def _orderly(pattern: Pattern, row: Row, bound: float) -> bool:
    """Whether every level keeps its length.

    Wear and dust shorten lines; what is longer belongs to a longer period, or is a digit's doing.
    """
    level = levels(row.numbers - pattern.phase, pattern.steps)
    off = misfit(row, np.array(pattern.lengths)[level])
    longer = (row.reach / row.pitch) > np.array(pattern.lengths)[level]
    for index in range(len(pattern.steps)):
        mine = level == index
        if pattern.steps in UNMISTAKABLE and index + 1 == len(pattern.steps):
            continue
        kept = int((mine & (off <= bound)).sum())
        most = MOST_LONGER if index + 1 < len(pattern.steps) else MOST_LONGEST
        if (mine & longer & (off > bound)).sum() > most * kept:
            return False
        # two at least: one line cut short must not be a level of its own
        if kept < max(LEAST_KEPT * mine.sum(), min(2, mine.sum())):
            return False
    return True


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


__all__ = ["UNMISTAKABLE", "Proof", "prove"]
