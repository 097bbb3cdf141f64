"""Where to look: windows spread evenly over the field, and weights that hold whole periods only."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import Lattice, Lit

CLIPPED = 0.995
"""Linear light from which a pixel counts as clipped: 254.4 of 255 in sRGB."""
PIXELS_READ = 1_500_000
"""About this many pixels are measured: 0.1 s a step, and far more pores than the u needs."""
PIXELS_FITTED, PORES_FITTED = 60_000, 900
"""So many pixels, and pores, are fitted at most: enough to tell light, blur and yarn apart."""
PART_SIDE, PART_CELLS, FEWEST_PARTS = 48, 6, 6
"""Sides of a fitted part, px and threads, and how many at least: the light is fitted as well."""
SMOOTH_PX = 6.0
"""Standard deviation of the smoothing of a blank exposure: well below any lamp's shadow."""
WINDOW_SIDE = 512
"""Side of one window of a large picture, px: tens of threads at any resolution that counts."""


@dataclass(frozen=True, slots=True, eq=False)
class Window:
    """One rectangle of the picture.

    Parameters
    ----------
    row, column : int
        Where its first pixel lies in the picture.
    light : ndarray, shape (rows, columns), float32, linear light
    inside : ndarray, shape (rows, columns), bool
        What belongs to the field.
    clipped : ndarray, shape (rows, columns), bool
        Where the file could hold no more light.
    """

    row: int
    column: int
    light: NDArray[np.float32]
    inside: NDArray[np.bool_]
    clipped: NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Sheet:
    """A plain array of linear light, read as a picture."""

    values: NDArray[np.float32]

    @property
    def rows(self) -> int:
        """Height, px."""
        return int(self.values.shape[0])

    @property
    def columns(self) -> int:
        """Width, px."""
        return int(self.values.shape[1])

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Linear light 0…1 of the window."""
        return self.values if window is None else self.values[window]


def spread(
    source: Lit,
    *,
    field: NDArray[np.bool_] | None,
    pixels: int = PIXELS_READ,
    around: int = 0,
) -> list[Window]:
    """Take the whole field where it is small, else windows on an even grid over it.

    Parameters
    ----------
    source : Lit
    field : ndarray, shape (rows, columns), bool, or None
        True where the cloth is; None means everywhere.
    pixels : int
        About how many pixels may be read.
    around : int
        So many px around the field are read too, and are not inside: they show what lies there.

    Returns
    -------
    list of Window
        In reading order; windows less than half in the field are left out.
    """
    top, left, bottom, right = _bounds(source, field, around)
    if (bottom - top) * (right - left) <= pixels:
        return _read(source, field, [(top, left, bottom - top, right - left)])
    height, width = min(WINDOW_SIDE, bottom - top), min(WINDOW_SIDE, right - left)
    wanted = max(4, pixels // (height * width))
    down = max(1, round(math.sqrt(wanted * (bottom - top) / (right - left))))
    across = max(1, round(wanted / down))
    rows = np.linspace(top, bottom - height, down).astype(int)
    columns = np.linspace(left, right - width, across).astype(int)
    places = [(int(r), int(c), height, width) for r in rows for c in columns]
    return _read(source, field, places)


def exposed(windows: list[Window], *, blank: Lit | None, dark: Lit | None) -> list[Window]:
    """Take the dark exposure off, and give light as a share of the blank one.

    Parameters
    ----------
    windows : list of Window
    blank, dark : Lit or None
        The same light without cloth, and the same exposure without light.
    """
    if blank is None and dark is None:
        return windows
    shares = []
    for window in windows:
        rows, columns = window.light.shape
        cut = (slice(window.row, window.row + rows), slice(window.column, window.column + columns))
        without = np.float32(0) if dark is None else dark.light(cut)
        light = window.light - without
        if blank is not None:
            # Bare light is smooth: smoothing takes its noise, and leaves the cloth's own.
            bare = cv2.GaussianBlur(blank.light(cut) - without, (0, 0), SMOOTH_PX)
            light = light / np.maximum(bare, np.float32(1e-4))
        shares.append(replace(window, light=np.asarray(light, np.float32)))
    return shares


def parts(windows: list[Window], lattice: Lattice) -> list[Window]:
    """Cut small windows, evenly spread, that hold enough pores to fit and no more.

    Parameters
    ----------
    windows : list of Window
    lattice : Lattice

    Returns
    -------
    list of Window
        Each at least `PART_CELLS` threads wide and high, where the windows are.
    """
    across, down = cell_sides(lattice)
    height, width = (max(PART_SIDE, math.ceil(PART_CELLS * side)) for side in (down, across))
    most = PORES_FITTED * across * down
    wanted = max(FEWEST_PARTS, round(min(PIXELS_FITTED, most) / (height * width)))
    cut = []
    for window in windows:
        for row, column in _places(window.light.shape, height, width, wanted / len(windows)):
            place = (slice(row, row + height), slice(column, column + width))
            cut.append(
                Window(
                    window.row + row,
                    window.column + column,
                    window.light[place],
                    window.inside[place],
                    window.clipped[place],
                )
            )
    return cut


def _places(
    shape: tuple[int, ...], height: int, width: int, wanted: float
) -> list[tuple[int, int]]:
    """Spread parts so that no two of them look at the same threads where that can be helped."""
    count = max(1, round(wanted))
    step = next(
        k for k in range(max(1, round(0.618 * count)), count + 2) if math.gcd(k, count) == 1
    )
    places = []
    for k in range(count):
        shares = ((k * step % count + 0.5) / count, (k + 0.5) / count)
        row, column = (
            min(max(0, round(share * length - side / 2)), max(0, length - side))
            for share, length, side in zip(shares, shape, (height, width), strict=True)
        )
        places.append((row, column))
    return sorted(set(places))


def _bounds(source: Lit, field: NDArray[np.bool_] | None, around: int) -> tuple[int, int, int, int]:
    """First and past-last row and column of the field and what is around it."""
    if field is None:
        return 0, 0, source.rows, source.columns
    rows, columns = np.flatnonzero(field.any(axis=1)), np.flatnonzero(field.any(axis=0))
    if rows.size == 0:
        return 0, 0, 0, 0
    return (
        max(0, int(rows[0]) - around),
        max(0, int(columns[0]) - around),
        min(source.rows, int(rows[-1]) + 1 + around),
        min(source.columns, int(columns[-1]) + 1 + around),
    )


def _read(
    source: Lit, field: NDArray[np.bool_] | None, places: list[tuple[int, int, int, int]]
) -> list[Window]:
    windows = []
    for row, column, height, width in places:
        cut = (slice(row, row + height), slice(column, column + width))
        inside = np.ones((height, width), bool) if field is None else field[cut].copy()
        if inside.mean() > 0.5:
            light = source.light(cut)
            windows.append(Window(row, column, light, inside, light >= CLIPPED))
    return windows


def whole_periods(inside: NDArray[np.bool_], lattice: Lattice | None) -> NDArray[np.float32]:
    """Weigh the pixels of a field so that every phase of the thread lattice weighs alike.

    Parameters
    ----------
    inside : ndarray, shape (rows, columns), bool
    lattice : Lattice or None
        None: every pixel inside weighs 1.

    Returns
    -------
    ndarray, shape (rows, columns), float32, 0…1

    Notes
    -----
    The indicator of a region convolved with one cell of the lattice sums to the same over every
    phase, whatever the region's shape, so a weighted mean is a mean over whole periods. The cell
    is laid along the rows and columns, which for threads turned by a few degrees is right to the
    square of the turn.
    """
    if lattice is None:
        return inside.astype(np.float32)
    across, down = cell_sides(lattice)
    # Shrunk by half a cell first: the weight then never reaches outside the field.
    reach = np.ones((2 * math.ceil(down / 2) + 1, 2 * math.ceil(across / 2) + 1), np.uint8)
    shrunk = cv2.erode(
        inside.astype(np.uint8), reach, borderType=cv2.BORDER_CONSTANT, borderValue=0
    )
    weight = cv2.sepFilter2D(
        shrunk.astype(np.float32),
        -1,
        _box(across),
        _box(down),
        borderType=cv2.BORDER_CONSTANT,
    )
    return np.asarray(weight, np.float32)


def cell_sides(lattice: Lattice) -> tuple[float, float]:
    """Sides of one thread cell along the row and down the column, px."""
    return 1.0 / math.hypot(*lattice.ends), 1.0 / math.hypot(*lattice.picks)


def _box(side: float) -> NDArray[np.float32]:
    """Weights of a box of a broken number of pixels, summing to 1."""
    half = math.ceil((side - 1) / 2)
    box = np.ones(2 * half + 1)
    box[0] = box[-1] = (side - (2 * half - 1)) / 2
    return (box / side).astype(np.float32)


__all__ = [
    "PART_CELLS",
    "PIXELS_READ",
    "Sheet",
    "Window",
    "cell_sides",
    "exposed",
    "parts",
    "spread",
    "whole_periods",
]
