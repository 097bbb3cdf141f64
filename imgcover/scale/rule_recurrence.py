"""Do a pattern's longest lines come again where its period wants them, and as lines do?

Half or twice the period would be as good a scale: the line between must be shorter, the next one
no longer, and a worn or lengthened line must not decide.
"""

from __future__ import annotations

from enum import Enum

import numpy as np
from numpy.typing import NDArray

from imgcover.scale.rule_hierarchy import Graduation, Pattern, levels, misfit, usual_scatter
from imgcover.scale.rule_lines import Row

MOST_LONGER = 0.25
"""Of the lines that keep their level's length: how many may be longer."""
MOST_LONGEST = 0.12
"""The same of the longest: longer ones among them are a level more, seen under wear."""
LEAST_KEPT = 0.5
"""Of each level's lines that must keep its length; the rest may be worn or under dust."""
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


class Recurrence(Enum):
    """Whether a pattern's longest lines come again at its period."""

    SEEN = "seen"
    NOT_IN_FRAME = "not in frame"
    DISPROVED = "disproved"


def recurs(pattern: Pattern, row: Row) -> Recurrence:
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


__all__ = ["FINEST", "UNMISTAKABLE", "WIDE_TIP", "Recurrence", "recurs"]
