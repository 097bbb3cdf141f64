"""How far does each line of a row reach?

Each line is compared with the gaps beside it at every height; where it stops being half as strong
as it was at its foot, it ends.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d, median_filter

from imgcover.scale.rule_frame import Frame, run_around

LONGEST_LINE = 30
"""Pitches: an inch line on a 1/64 inch rule reaches 25."""
BEYOND_FOOT = 8.0
"""Pitches: longer than the shortest lines of any scale that stands foot to foot with another."""
BESIDE = (0.22, 0.3)
"""Pitches from a line's middle where its own ink, blurred, hardly reaches and a digit's does."""
BEFORE_END = 0.5
"""Pitches before its end over which a line is looked at for ink beside it."""
CLEAR_GAP = 0.14
"""Pitches of full gap, halved: a line's ink may be broken by less, digits stand off by more."""
LOOKED_AT = 48
"""Lines nearest the seed that are looked at before the whole row is: two inches of a 1/16 scale."""
LEAST_TOGETHER, TOGETHER = 0.3, 6.0
"""Of these the share that must end within so many scatters: half are of one length in every
pattern, wear takes some."""
FAINTEST = 0.15
"""Of a line's contrast at its foot: what is left where wear has taken nearly all of it."""
SEEN = 3.0
"""Times the distance of the twentieth from the quarter of the contrasts (about one standard
deviation where most lines have ended) above which a line is seen to go on."""


@dataclass(frozen=True, slots=True)
class Row:
    """A row of lines as it was followed.

    `numbers` and `positions` (px along the frame) of each line; `reach` how far each goes from
    the common foot at t = 0 up to its first clear gap, px, `beyond` how far if gaps may be dust,
    and `faint` how far something of it shows at all; `tip` its contrast just before its end over
    that at its foot, `faint_tip` the same of its faint end over what comes before; `wide` the same
    of what stands close beside it on both sides, less what does at its foot; `strength` its
    contrast over the usual; `pitch` in px; `light` whether the lines are lighter than their
    ground; `zone` the height up to which all lines go.
    """

    frame: Frame
    pitch: float
    numbers: NDArray[np.int_]
    positions: NDArray[np.float64]
    reach: NDArray[np.float64]
    beyond: NDArray[np.float64]
    faint: NDArray[np.float64]
    tip: NDArray[np.float64]
    faint_tip: NDArray[np.float64]
    wide: NDArray[np.float64]
    strength: NDArray[np.float64]
    light: bool
    zone: float

    def part(self, first: int, last: int) -> Row:
        """Return the lines from index `first` up to `last`, which is left out."""
        inside = slice(first, last)
        arrays = {
            name: getattr(self, name)[inside]
            for name in (each.name for each in fields(self))
            if isinstance(getattr(self, name), np.ndarray)
        }
        return replace(self, **arrays)


def lay_lines(
    tone: NDArray[np.float32],
    frame: Frame,
    positions: NDArray[np.float64],
    light: bool,
    *,
    zone: tuple[float, float],
) -> tuple[Frame, NDArray[np.float64], tuple[float, float]] | None:
    """Turn the frame along the lines' common foot; return it, the positions and the zone anew.

    None where lines do not stand against their gaps, or do not end as lines do.
    """
    pitch = float(np.median(np.diff(positions)))
    for first_time in (True, False):
        t = _heights(zone, pitch)
        if first_time:
            nearest = np.sort(np.argsort(np.abs(positions), kind="stable")[:LOOKED_AT])
            seen = _contrast(tone, frame, positions[nearest], t, pitch, light)
            if not _may_be_lines(seen, t, pitch, zone):
                return None
        contrast = _contrast(tone, frame, positions, t, pitch, light)
        usual = _usual(contrast, t, zone)
        if usual is None:
            return None
        strength, *zone_found = usual
        zone = (zone_found[0], zone_found[1])
        lean = _lean(positions, contrast, strength, t, *zone)
        turned = frame.along + np.arctan(lean) * np.sin(frame.upright - frame.along)
        positions = positions * (
            np.sin(frame.upright - frame.along) / np.sin(frame.upright - turned)
        )
        frame = replace(frame, along=turned)
    return frame, positions, zone


def measure_lines(
    tone: NDArray[np.float32],
    frame: Frame,
    numbers: NDArray[np.int_],
    positions: NDArray[np.float64],
    light: bool,
    *,
    zone: tuple[float, float],
) -> Row | None:
    """Measure how far each line goes from the common foot."""
    laid = lay_lines(tone, frame, positions, light, zone=zone)
    if laid is None:
        return None
    frame, positions, zone = laid
    pitch = float(np.median(np.diff(positions)))
    clear = max(1.2, CLEAR_GAP * pitch)
    t = _heights(zone, pitch)
    contrast = _contrast(tone, frame, positions, t, pitch, light)
    usual = _usual(contrast, t, zone)
    if usual is None:
        return None
    strength, foot, top = usual
    zone = (foot, top)
    reach, beyond, tip = _reach(contrast, strength, t, foot=foot, top=top, clear=clear)
    faint, faint_tip = _faint(contrast, strength, t, foot=foot, top=top, clear=clear)
    faint = np.maximum(faint, reach)
    wide = np.maximum(
        *(_wide(tone, frame, positions, t, pitch, strength, end, zone) for end in (reach, faint))
    )
    local = median_filter(strength, 15, mode="nearest")
    return Row(
        frame=frame.moved(0.0, foot),
        pitch=pitch,
        numbers=numbers,
        positions=positions,
        reach=reach - foot,
        beyond=beyond - foot,
        faint=faint - foot,
        tip=tip,
        faint_tip=faint_tip,
        wide=wide,
        strength=strength / np.maximum(local, 1e-6),
        light=light,
        zone=top - foot,
    )


def _may_be_lines(
    contrast: NDArray[np.float64],
    t: NDArray[np.float64],
    pitch: float,
    zone: tuple[float, float],
) -> bool:
    """Whether some lines end at one height and others well beyond: in most cloth they do not."""
    usual = _usual(contrast, t, zone)
    if usual is None:
        return False
    strength, foot, top = usual
    clear = max(1.2, CLEAR_GAP * pitch)
    reach = np.sort(_reach(contrast, strength, t, foot=foot, top=top, clear=clear)[0]) / pitch
    together = max(2, int(LEAST_TOGETHER * len(reach)))
    least = (reach[together - 1 :] - reach[: len(reach) - together + 1]).min()
    return bool(least < TOGETHER * pitch_scatter(pitch) < reach[-2] - reach[0])


def pitch_scatter(pitch: float) -> float:
    """Return how far, in pitches, a line's measured end strays: never less than a pixel or so."""
    return max(0.12, 0.8 / pitch)


def goes_on(tone: NDArray[np.float32], row: Row) -> bool:
    """Whether the lines go on beyond their foot: squared paper's do, whatever reaches over it.

    A second scale may stand foot to foot with the first, but its shortest lines end.
    """
    heights = np.arange(-BEYOND_FOOT * row.pitch, -0.25 * row.pitch)
    contrast = _contrast(tone, row.frame, row.positions, heights, row.pitch, row.light)
    middle = np.median(contrast, axis=0)
    at_foot = np.arange(0.0, row.zone + 0.5)
    usual = np.median(_contrast(tone, row.frame, row.positions, at_foot, row.pitch, row.light))
    return bool((middle > abs(usual) / 3).mean() > 0.5)


def _contrast(
    tone: NDArray[np.float32],
    frame: Frame,
    positions: NDArray[np.float64],
    t: NDArray[np.float64],
    pitch: float,
    light: bool,
) -> NDArray[np.float64]:
    """Return how much a line stands out from the gaps beside it, shape (lines, heights)."""
    line = [frame.sample(tone, positions + d * pitch, t) for d in (-0.08, 0.0, 0.08)]
    gap = [frame.sample(tone, positions + d * pitch, t) for d in (-0.55, -0.45, 0.45, 0.55)]
    darker = (sum(gap) / 4 - sum(line) / 3).T  # type: ignore[union-attr]
    return np.asarray(-darker if light else darker, dtype=np.float64)


def _heights(zone: tuple[float, float], pitch: float) -> NDArray[np.float64]:
    return np.arange(np.floor(zone[0] - 3 * pitch), zone[0] + LONGEST_LINE * pitch)


def _usual(
    contrast: NDArray[np.float64], t: NDArray[np.float64], zone: tuple[float, float]
) -> tuple[NDArray[np.float64], float, float] | None:
    """Return each line's contrast where all lines stand, and the foot and top of that zone."""
    middle = np.median(contrast, axis=0)
    inside = (t >= zone[0]) & (t <= zone[1])
    if not inside.any():
        return None
    peak = np.quantile(middle[inside], 0.75)
    start = int(np.flatnonzero(inside)[np.argmax(middle[inside])])
    if peak <= 0 or middle[start] <= 0:
        return None
    low, high = run_around(middle > peak / 2, start)
    foot = float(t[low]) - _part(middle, low, low - 1, peak / 2)
    top = float(t[high]) + _part(middle, high, high + 1, peak / 2)
    strength = np.median(contrast[:, low : high + 1], axis=1)
    return strength, foot, top


def _part(values: NDArray[np.float64], inner: int, outer: int, level: float) -> float:
    """Return how far from `inner` towards `outer`, 0…1, the values cross the level."""
    if not 0 <= outer < len(values) or values[inner] <= values[outer]:
        return 0.5
    return float((values[inner] - level) / (values[inner] - values[outer]))


def _reach(
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


def _faint(
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


def _wide(
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


def _lean(
    positions: NDArray[np.float64],
    contrast: NDArray[np.float64],
    strength: NDArray[np.float64],
    t: NDArray[np.float64],
    foot: float,
    top: float,
) -> float:
    """Return the slope of the line that joins the feet, against the frame, px per px."""
    local = np.maximum(strength, 0.3 * np.median(strength))
    start = int(np.searchsorted(t, (foot + top) / 2))
    below = np.clip(contrast[:, start::-1] / local[:, None], -0.5, 1.5) - 0.5
    feet = t[start] - np.argmax(np.cumsum(below, axis=1), axis=1)
    slope = np.subtract.outer(feet, feet)[np.triu_indices(len(feet), len(feet) // 2)]
    length = np.subtract.outer(positions, positions)[np.triu_indices(len(feet), len(feet) // 2)]
    return float(np.median(slope / length)) if len(slope) else 0.0


__all__ = ["LONGEST_LINE", "Row", "goes_on", "lay_lines", "measure_lines", "pitch_scatter"]
