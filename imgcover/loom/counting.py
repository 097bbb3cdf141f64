"""Counts the threads that lines across a fine drawing meet."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from imgcover.loom.crossing import Nearest
from imgcover.loom.dressing import Loom

Floats = NDArray[np.float32]

LINES = 49
"""Rows or columns along which threads are counted."""


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
    along_per_mm, aside_per_mm : float
        Pixels per mm along the lines, and from line to line.
    pattern : int
        Threads after which the plan of gaps repeats.
    """

    at: NDArray[np.float64]
    along: NDArray[np.float64]
    number: NDArray[np.float64]
    down: bool
    along_per_mm: float
    aside_per_mm: float
    pattern: int

    def within(self, mask: NDArray[np.bool_]) -> Lines:
        """Keep the places that a mask of the whole picture keeps: shape (rows, columns)."""
        at = np.clip(np.rint(self.at).astype(int), 0, None)
        along = np.clip(np.rint(self.along).astype(int), 0, None)
        kept = mask.T[np.ix_(at, along)] if self.down else mask[np.ix_(at, along)]
        return replace(self, number=np.where(kept, self.number, np.nan))


@dataclass(frozen=True, slots=True)
class Count:
    """One system counted: 1/mm, direction in radians from +x towards +y, gaps, px, bow."""

    per_mm: float
    direction: float
    gaps: float
    pixels: float
    bow: float


def count(lines: Lines) -> Count:
    """Count threads from whole thread to whole thread, at right angles to them.

    Only whole patterns of gaps are counted, so that a wide gap at the end of the field weighs no
    more than elsewhere.
    """
    met = [_crossings(number, lines.along) for number in lines.number]
    gaps, length, counted = 0.0, 0.0, []
    for _, place in met:
        whole = (place.size - 1) // lines.pattern * lines.pattern
        for start in range(place.size - whole if whole > 0 else 0):
            gaps += whole
            length += place[start + whole] - place[start]
        counted.append(max(0, place.size - 1))
    per_px = gaps / length if length > 0 else math.nan
    slope, bend = _shape(met, lines.at)
    slope_mm = slope * lines.aside_per_mm / lines.along_per_mm
    per_mm_along = per_px * lines.along_per_mm
    direction = math.atan(slope_mm) if lines.down else math.atan2(1.0, slope_mm)
    return Count(
        per_mm=float(per_mm_along * math.hypot(1.0, slope_mm)),
        direction=direction,
        gaps=float(np.mean(counted)),
        pixels=float(1 / (per_px * math.hypot(1.0, slope))),
        bow=float(bend / lines.along_per_mm / (np.ptp(lines.at) / lines.aside_per_mm)),
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


class Met:
    """Collects the thread numbers met along the counting lines of the picture."""

    def __init__(self, loom: Loom, s: int) -> None:
        frame = loom.frame
        turn = math.radians(frame.camera.rotation_deg)
        self._upright = abs(math.cos(turn)) >= abs(math.sin(turn))
        self._rows = np.unique(np.linspace(0, frame.height * s - 1, LINES).astype(int))
        self._columns = np.unique(np.linspace(0, frame.width * s - 1, LINES).astype(int))
        self._across: list[NDArray[np.float64]] = []
        self._down: list[NDArray[np.float64]] = []
        self._row = 0
        self._s = s

    def add(
        self,
        end: tuple[Nearest, Floats],
        pick: tuple[Nearest, Floats],
        own: NDArray[np.bool_],
        edge: int,
    ) -> None:
        """Take the lines that fall into these fine rows: threads, and where they lie whole."""
        (over, over_in), (below, below_in) = (end, pick) if self._upright else (pick, end)
        keep = np.flatnonzero(own)
        rows = self._rows[(self._rows >= self._row) & (self._rows < self._row + keep.size)]
        self._row += keep.size
        local = rows - (self._row - keep.size)
        wide = np.s_[edge : over.left.shape[1] - edge]
        self._across.append(
            _number(
                over, np.ix_(keep[local], range(*wide.indices(over.left.shape[1]))), over_in[local]
            )
        )
        self._down.append(
            _number(below, np.ix_(keep, self._columns + edge), below_in[:, self._columns])
        )

    def lines(self, loom: Loom) -> tuple[Lines, Lines]:
        """Give the lines that count the ends, and those that count the picks."""
        across, down = self._on(self._rows), self._on(self._columns)
        camera = loom.frame.camera
        over, below = loom.warp, loom.weft
        if not self._upright:
            over, below = below, over
        level = Lines(
            across,
            self._on(np.arange(loom.frame.width * self._s)),
            np.concatenate(self._across),
            False,
            camera.px_per_mm,
            camera.y_per_mm,
            over.pattern,
        )
        plumb = Lines(
            down,
            self._on(np.arange(loom.frame.height * self._s)),
            np.concatenate(self._down).T,
            True,
            camera.y_per_mm,
            camera.px_per_mm,
            below.pattern,
        )
        return (level, plumb) if self._upright else (plumb, level)

    def _on(self, fine: NDArray[np.int_]) -> NDArray[np.float64]:
        """Give the picture's pixels that fine rows or columns lie on."""
        return np.asarray((fine + 0.5) / self._s - 0.5)


def _number(
    thread: Nearest, where: tuple[NDArray[np.int_], ...], inside: Floats
) -> NDArray[np.float64]:
    """Give thread numbers as they run from centre line to centre line; NaN outside."""
    number = thread.left[where] + thread.share[where].astype(np.float64)
    return np.where(inside > 0, number, np.nan)


__all__ = ["LINES", "Count", "Lines", "Met", "count"]
