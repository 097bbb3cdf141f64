"""How far does each line of a row reach, and how does it end?

Each line's contrast is given at every height. Where it stops being half as strong as it was at its
foot, it ends; a worn line shows further, and a digit at a line's end seems to lengthen it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d, median_filter

from imgcover.scale.rule_frame import Frame

BESIDE = (0.22, 0.3)
"""Pitches from a line's middle where its own ink, blurred, hardly reaches and a digit's does."""
BEFORE_END = 0.5
"""Pitches before its end over which a line is looked at for ink beside it."""
FAINTEST = 0.15
"""Of a line's contrast at its foot: what is left where wear has taken nearly all of it."""
SEEN = 3.0
"""Times the distance of the twentieth from the quarter of the contrasts (about one standard
deviation where most lines have ended) above which a line is seen to go on."""


def pitch_scatter(pitch: float) -> float:
    """Return how far, in pitches, a line's measured end strays: never less than a pixel or so."""
    return max(0.12, 0.8 / pitch)


def reach_of(
    contrast: NDArray[np.float64],
    strength: NDArray[np.float64],
    t: NDArray[np.float64],
    *,
    foot: float,
    top: float,
    clear: float,
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return where each line ends: where the sum of contrast over half is largest.

    First with lines ended by their first clear gap, then with gaps bridged; last how strong each
    is just before its end: a line that ends is, one that fades away is not.
    """
    # its own contrast, for wear goes line by line; but noise must not become a line
    usual = np.maximum(strength, 0.3 * median_filter(strength, 9, mode="nearest"))[:, None]
    usual = np.maximum(usual, 0.2 * np.median(strength))
    start = int(np.searchsorted(t, (foot + top) / 2))
    relative = np.clip(contrast[:, start:] / usual, -0.5, 1.5)
    above = np.cumsum(relative - 0.5, axis=1)
    # a digit over a line's end must not lengthen it, dust on a line not shorten it: which of the
    # two a gap is, the pattern of all lines decides
    fallen = np.maximum.accumulate(above, axis=1) - above > clear
    ended = np.maximum.accumulate(fallen, axis=1)
    first = np.argmax(np.where(ended, -np.inf, above), axis=1)
    before = first[:, None] - np.arange(1, 4)
    tip = np.take_along_axis(relative, np.maximum(before, 0), axis=1).mean(axis=1)
    return t[start] + first + 0.5, t[start] + np.argmax(above, axis=1) + 0.5, tip


def faint_reach(
    contrast: NDArray[np.float64],
    strength: NDArray[np.float64],
    t: NDArray[np.float64],
    *,
    foot: float,
    top: float,
    clear: float,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return how far a worn line shows against what no line reaches, and how strong its end is.

    At each height the lines that do not come so far, a quarter of all and more, tell how far a
    contrast strays where there is none.
    """
    usual = np.maximum(strength, 0.2 * np.median(strength))[:, None]
    start = int(np.searchsorted(t, (foot + top) / 2))
    low, quarter = np.quantile(contrast[:, start:], (0.05, 0.25), axis=0)
    level = quarter + SEEN * gaussian_filter1d(quarter - low, clear, mode="nearest")
    level = np.clip(level, FAINTEST * usual, usual / 2)
    relative = np.clip(contrast[:, start:] / usual, -0.5, 1.5)
    above = np.cumsum(relative - level / usual, axis=1)
    fallen = np.maximum.accumulate(above, axis=1) - above > FAINTEST * clear
    ended = np.maximum.accumulate(fallen, axis=1)
    end = np.argmax(np.where(ended, -np.inf, above), axis=1)
    last, before = (
        np.take_along_axis(relative, np.maximum(end[:, None] - np.arange(*part), 0), axis=1)
        for part in ((1, 4), (4, 12))
    )
    return t[start] + end + 0.5, last.mean(axis=1) / np.maximum(before.mean(axis=1), FAINTEST)


def wide_ends(
    tone: NDArray[np.float32],
    frame: Frame,
    positions: NDArray[np.float64],
    t: NDArray[np.float64],
    pitch: float,
    strength: NDArray[np.float64],
    reach: NDArray[np.float64],
    zone: tuple[float, float],
) -> NDArray[np.float64]:
    """Return how much ink stands on both sides of each line's end: a digit's does, a line's not."""
    gap = [frame.sample(tone, positions + d * pitch, t) for d in (-0.5, 0.5)]
    ground = ((gap[0] + gap[1]) / 2).T
    before = (t > (reach - max(BEFORE_END * pitch, 4.0))[:, None]) & (t < reach[:, None])
    at_foot = np.broadcast_to((t >= zone[0]) & (t <= zone[1]), before.shape)
    sides = []
    for side in (-1, 1):
        beside = [frame.sample(tone, positions + side * d * pitch, t) for d in BESIDE]
        ink = np.abs((beside[0] + beside[1]).T / 2 - ground)
        end, foot = (
            (ink * where).sum(axis=1) / np.maximum(where.sum(axis=1), 1)
            for where in (before, at_foot)
        )
        sides.append(end - np.median(foot))
    usual = np.maximum(strength, 0.3 * np.median(strength))
    return np.asarray(np.minimum(*sides) / usual, dtype=np.float64)


def trend_of(
    reach: NDArray[np.float64], positions: NDArray[np.float64], pitch: float
) -> NDArray[np.float64]:
    """Return by how much the lines seem to grow along the row, when the foot was laid askew.

    A line through the ends of the shortest third in each third of the row; nothing where those do
    not lie on one: lines that are cut short at one end of a row have not all grown shorter.
    """
    parts = np.array_split(np.arange(len(reach)), 3)
    ends = [float(np.quantile(reach[part], 1 / 3)) for part in parts]
    places = [float(positions[part].mean()) for part in parts]
    growth = ends[2] - ends[0]
    if abs(ends[1] - (ends[0] + ends[2]) / 2) > 0.25 * abs(growth):
        return np.zeros(len(reach))
    slope = growth / (places[2] - places[0])
    return np.asarray(slope * (positions - positions.mean()))


__all__ = ["faint_reach", "pitch_scatter", "reach_of", "trend_of", "wide_ends"]
