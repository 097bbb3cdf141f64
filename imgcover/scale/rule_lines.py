"""How far does each line of a row reach?

Each line is compared with the gaps beside it at every height; where it stops being half as strong
as it was at its foot, it ends.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import median_filter

from imgcover.scale.rule_frame import Frame, run_around
from imgcover.scale.rule_reach import (
    faint_reach,
    pitch_scatter,
    reach_of,
    trend_of,
    wide_ends,
)

LONGEST_LINE = 30
"""Pitches: an inch line on a 1/64 inch rule reaches 25."""
BEYOND_FOOT = 8.0
"""Pitches: longer than the shortest lines of any scale that stands foot to foot with another."""
CLEAR_GAP = 0.14
"""Pitches of full gap, halved: a line's ink may be broken by less, digits stand off by more."""
LOOKED_AT = 48
"""Lines nearest the seed that are looked at before the whole row is: two inches of a 1/16 scale."""
LEAST_TOGETHER, TOGETHER = 0.3, 6.0
"""Of these the share that must end within so many scatters: half are of one length in every
pattern, wear takes some."""


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
    nearest = np.sort(np.argsort(np.abs(positions), kind="stable")[:LOOKED_AT])
    t = _heights(zone, pitch)
    seen = _contrast(tone, frame, positions[nearest], t, pitch, light)
    if not _may_be_lines(seen, t, pitch, zone):
        return None
    for _ in range(2):
        t = np.arange(np.floor(zone[0] - 3 * pitch), zone[1] + 3 * pitch)
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
    reach, beyond, tip = reach_of(contrast, strength, t, foot=foot, top=top, clear=clear)
    if not _crowded(reach / pitch, pitch):
        return None
    faint, faint_tip = faint_reach(contrast, strength, t, foot=foot, top=top, clear=clear)
    faint = np.maximum(faint, reach)
    wide = np.maximum(
        *(wide_ends(tone, frame, positions, t, pitch, strength, e, zone) for e in (reach, faint))
    )
    local = median_filter(strength, 15, mode="nearest")
    feet = foot + trend_of(reach, positions, pitch)
    return Row(
        frame=frame.moved(0.0, zone[0]),
        pitch=pitch,
        numbers=numbers,
        positions=positions,
        reach=reach - feet,
        beyond=beyond - feet,
        faint=faint - feet,
        tip=tip,
        faint_tip=faint_tip,
        wide=wide,
        strength=strength / np.maximum(local, 1e-6),
        light=light,
        zone=zone[1] - zone[0],
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
    reach = reach_of(contrast, strength, t, foot=foot, top=top, clear=clear)[0]
    return _crowded(reach / pitch, pitch)


def _crowded(reach: NDArray[np.float64], pitch: float) -> bool:
    """Whether lines, their reach in pitches, crowd at one length and some are longer."""
    ordered = np.sort(reach)
    together = max(2, int(LEAST_TOGETHER * len(ordered)))
    least = (ordered[together - 1 :] - ordered[: len(ordered) - together + 1]).min()
    return bool(least < TOGETHER * pitch_scatter(pitch) < ordered[-2] - ordered[0])


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


__all__ = ["LONGEST_LINE", "Row", "goes_on", "lay_lines", "measure_lines"]
