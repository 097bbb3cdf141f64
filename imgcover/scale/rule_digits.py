"""Which of a row's longest lines are numbered?

Inches are numbered, halves and quarters are not. Where every second of the longest lines has digits
and the others have none, the scale's unit is twice what the lines' lengths say: some rules draw
inch and half inch alike.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from imgcover.scale.rule_hierarchy import Pattern
from imgcover.scale.rule_lines import Row

BEYOND_TIP_MM = 10.0
"""Digits begin at the longest lines' ends or a few mm beyond; were the scale one of twice the
period, its millimetres would be half as long."""
CLEAR_MM = 0.4
"""From the ends of the level below: their blur is no digit."""
BESIDE = 0.2
"""Of the period to each side: digits are 2 to 5 mm wide, a fifth of an inch at most."""
NUMBERED = 2.0
"""Times the unrest where no digit can be, half-way between the longest lines."""
OUTERMOST = 0.25
"""Of the period: a longest line with fewer lines beyond it may be the scale's zero, which often
has no digit, or its digit may be cut off."""


def numbered_otherwise(tone: NDArray[np.float32], row: Row, pattern: Pattern) -> bool:
    """Tell whether digits stand at every second longest line only.

    Parameters
    ----------
    tone : ndarray, shape (rows, columns), float32
        Square root of linear light, on the row's level.
    row : Row
    pattern : Pattern
        As proven; its shortest distance is taken as its first graduation's.

    Returns
    -------
    bool
    """
    period = pattern.steps[-1]
    first, last = int(row.numbers[0]), int(row.numbers[-1])
    edge = OUTERMOST * period
    longest = [n for n in range(first, last + 1) if (n - pattern.phase) % period == 0]
    inner = [n for n in longest if first + edge <= n <= last - edge]
    between = [n + period // 2 for n in longest if n + period // 2 <= last - edge]
    between += [longest[0] - period // 2] if longest and longest[0] - period // 2 >= first else []
    if len(inner) < 2 or not between:
        return False
    quiet = max(_unrest(tone, row, pattern, each) for each in between)
    numbered = [_unrest(tone, row, pattern, each) > NUMBERED * quiet for each in inner]
    return set(numbered[::2]) | set(numbered[1::2]) == {True, False} and (
        len(set(numbered[::2])) == len(set(numbered[1::2])) == 1
    )


def _unrest(tone: NDArray[np.float32], row: Row, pattern: Pattern, number: int) -> float:
    """Return how uneven the light is about a line's end, the line itself left out."""
    px_per_mm = row.pitch / pattern.graduations[0].step_mm
    low = pattern.lengths[-2] * row.pitch + CLEAR_MM * px_per_mm
    high = pattern.lengths[-1] * row.pitch + BEYOND_TIP_MM * px_per_mm
    at = float(np.interp(number, row.numbers, row.positions))
    reach = BESIDE * pattern.steps[-1] * row.pitch
    s = np.arange(-reach, reach + 1)
    t = np.arange(low, max(high, low + 2))
    x, y = row.frame.place(at + s[None, :], t[:, None])
    inside = (x >= 0) & (y >= 0) & (x < tone.shape[1] - 1) & (y < tone.shape[0] - 1)
    if inside.mean() < 0.9:
        return 0.0
    band = row.frame.sample(tone, at + s, t)[:, np.abs(s) > 0.3 * row.pitch]
    # what runs along the rule, grain or brushing, is the same at every line
    return float(np.abs(band - np.median(band, axis=1, keepdims=True)).mean())


__all__ = ["numbered_otherwise"]
