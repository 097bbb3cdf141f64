"""What a drawn picture really shows: counted from its fine drawing, not from the order given."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import cv2
import numpy as np
from numpy.typing import NDArray

LINES = 49
"""Rows or columns along which threads are counted."""
MOST_PORE_POINTS = 40_000_000
"""Fine points in which pores are told apart; beyond it the rest of the frame is left out."""


@dataclass(frozen=True, slots=True)
class Truth:
    """What was drawn; densities 1/mm at right angles to the threads, lengths mm, angles degrees.

    Parameters
    ----------
    ends, picks : float
        Threads per mm, from the first whole thread to the last; a missing end leaves its place.
    ends_counted, picks_counted : float
        Gaps from thread to thread on a counting line, mean.
    pixels_per_end, pixels_per_pick : float
        Pixels from thread to thread at right angles (for unequal pitch: as the picture shows it).
    angle, skew : float
        Turn of the ends from the vertical, and of the picks against the ends, both clockwise.
    bow : float
        How far the middle of a pick lies below its ends, over the width seen.
    cover, cover_with_hairs : float
        Covered share of the swatch inside the frame.
    warp_cover, weft_cover : float
        Share that each system covers alone.
    open_width, open_height : float
        Mean gap beside an end and beside a pick: (1 − cover) / density of each.
    pores_per_cm2, pore_area, largest_pore : float
        Number, mean and largest area (mm²) of the pores that lie wholly inside.
    corners : tuple of four (x, y)
        The counted cloth in pixels of the picture; it may reach beyond the frame.
    """

    ends: float
    picks: float
    ends_counted: float
    picks_counted: float
    pixels_per_end: float
    pixels_per_pick: float
    angle: float
    skew: float
    bow: float
    cover: float
    cover_with_hairs: float
    warp_cover: float
    weft_cover: float
    open_width: float
    open_height: float
    pores_per_cm2: float
    pore_area: float
    largest_pore: float
    corners: tuple[tuple[float, float], ...]

    @property
    def upright(self) -> tuple[float, float]:
        """Threads per mm of the set nearest to the vertical, and of the other.

        On a swatch laid a quarter turn round these are picks and ends.
        """
        turned = abs(self.angle) > 45
        return (self.picks, self.ends) if turned else (self.ends, self.picks)


@dataclass(frozen=True, slots=True)
class Lines:
    """Thread numbers met along parallel lines of the picture.

    Parameters
    ----------
    at : ndarray, shape (lines,)
        Where each line lies, px.
    along : ndarray, shape (places,)
        Places along a line, px.
    number : ndarray, shape (lines, places)
        Thread number counted from centre line to centre line; NaN outside the swatch.
    down : bool
        The lines run down the picture, not across it.
    """

    at: NDArray[np.float64]
    along: NDArray[np.float64]
    number: NDArray[np.float64]
    down: bool


@dataclass(frozen=True, slots=True)
class Count:
    """One system counted: 1/mm, direction in radians from +x towards +y, gaps, px, bow."""

    per_mm: float
    direction: float
    gaps: float
    pixels: float
    bow: float


def count(lines: Lines, *, along_per_mm: float, aside_per_mm: float, pattern: int) -> Count:
    """Count threads from whole thread to whole thread, at right angles to them.

    Parameters
    ----------
    along_per_mm, aside_per_mm : float
        Pixels per mm along the lines, and from line to line.
    pattern : int
        Threads after which the plan of gaps repeats: only whole patterns are counted, so that a
        wide gap at the end of the field weighs no more than elsewhere.
    """
    met = [_crossings(number, lines.along) for number in lines.number]
    gaps, length, counted = 0.0, 0.0, []
    for _, place in met:
        whole = (place.size - 1) // pattern * pattern
        for start in range(place.size - whole if whole > 0 else 0):
            gaps += whole
            length += place[start + whole] - place[start]
        counted.append(max(0, place.size - 1))
    per_px = gaps / length if length > 0 else math.nan
    slope, bend = _shape(met, lines.at)
    slope_mm = slope * aside_per_mm / along_per_mm
    per_mm_along = per_px * along_per_mm
    direction = math.atan(slope_mm) if lines.down else math.atan2(1.0, slope_mm)
    return Count(
        per_mm=float(per_mm_along * math.hypot(1.0, slope_mm)),
        direction=direction,
        gaps=float(np.mean(counted)),
        pixels=float(1 / (per_px * math.hypot(1.0, slope))),
        bow=float(bend / along_per_mm / (np.ptp(lines.at) / aside_per_mm)),
    )


def _crossings(
    number: NDArray[np.float64], along: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Find where a line crosses the centre of each thread: whole numbers, and places."""
    inside = np.isfinite(number)
    rising = number[inside]
    if rising.size < 2:
        return np.empty(0), np.empty(0)
    backwards = rising[-1] < rising[0]
    rising = np.maximum.accumulate(-rising if backwards else rising)
    whole = np.arange(math.ceil(rising[0]), math.floor(rising[-1]) + 1, dtype=np.float64)
    place = np.interp(whole, rising, along[inside])
    return (-whole if backwards else whole), place


def _shape(
    met: list[tuple[NDArray[np.float64], NDArray[np.float64]]], at: NDArray[np.float64]
) -> tuple[float, float]:
    """Fit one slope and one bend to all threads, each with a place of its own.

    Returns
    -------
    tuple of float
        px along the lines per px aside; and how far the middle lies beyond the ends, px.
    """
    thread = np.concatenate([whole for whole, _ in met])
    place = np.concatenate([where for _, where in met])
    aside = np.repeat(at, [whole.size for whole, _ in met])
    if thread.size < 4:
        return math.nan, math.nan
    half = np.ptp(at) / 2
    t = (aside - at.mean()) / half
    _, which = np.unique(thread, return_inverse=True)
    columns = np.stack([t, t * t, place], axis=1)
    weight = np.bincount(which).astype(np.float64)
    for k in range(3):
        columns[:, k] -= (np.bincount(which, columns[:, k]) / weight)[which]
    (rise, bend), *_ = np.linalg.lstsq(columns[:, :2], columns[:, 2], rcond=None)
    return float(rise / half), float(-bend)


@dataclass(slots=True)
class Tally:
    """Adds up what is covered while the fine drawing passes by, band after band."""

    area: float = 0.0
    covered: float = 0.0
    with_hairs: float = 0.0
    warp: float = 0.0
    weft: float = 0.0
    masks: list[NDArray[np.uint8]] = field(default_factory=list)
    kept: int = 0

    def add(
        self,
        warp: NDArray[np.float32],
        weft: NDArray[np.float32],
        hidden: NDArray[np.float32] | float,
        inside: NDArray[np.float32],
    ) -> None:
        """Add a band: each system's covered shares, the hairs', and which points count."""
        bare = (1 - warp) * (1 - weft)
        self.area += float(inside.sum(dtype=np.float64))
        self.covered += float(((1 - bare) * inside).sum(dtype=np.float64))
        self.with_hairs += float(((1 - bare * (1 - hidden)) * inside).sum(dtype=np.float64))
        self.warp += float((warp * inside).sum(dtype=np.float64))
        self.weft += float((weft * inside).sum(dtype=np.float64))
        if self.kept < MOST_PORE_POINTS:
            self.masks.append(((bare > 0.5) & (inside > 0)).astype(np.uint8))
            self.kept += bare.size

    def pores(self, point_mm2: float) -> tuple[float, float, float]:
        """Give number per cm², mean and largest area, mm², of the pores wholly inside."""
        bare = np.concatenate(self.masks)
        found, _, stats, _ = cv2.connectedComponentsWithStats(bare, connectivity=4)
        left, top, wide, high, area = stats[1:found].T
        rows, columns = bare.shape
        whole = (left > 0) & (top > 0) & (left + wide < columns) & (top + high < rows)
        areas = area[whole] * point_mm2
        if areas.size == 0:
            return 0.0, 0.0, 0.0
        field_cm2 = rows * columns * point_mm2 / 100
        # pores cut by the frame count half, as on a counting chamber
        number = (areas.size + 0.5 * (area.size - areas.size)) / field_cm2
        return float(number), float(areas.mean()), float(areas.max())


__all__ = ["LINES", "Count", "Lines", "Tally", "Truth", "count"]
