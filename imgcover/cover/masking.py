"""Which parts of the field show no cloth? Bare light beside it, and what lies on it."""

from __future__ import annotations

import math
from dataclasses import replace

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import Lattice
from imgcover.cover.surface import open_pore_light
from imgcover.cover.windows import Window, cell_sides

Bools = NDArray[np.bool_]

SAMPLES = 4
"""Samples taken across a cell: enough to see its pore, or that there is none."""
BLOCK, FEWEST_IN_BLOCK = 48, 16
"""Side of the blocks whose brightest light is taken for the light behind them, px, and the least
number of samples along it."""
DARK = 0.05
"""Quantile of the light, as a share of what is behind it, that is taken for yarn."""
BARE = 2.0
"""No cloth is without a thread over so many cells each way: even where one is missing, threads of
the other system cross the gap."""
FRAYED = 4.0
"""So many cells from bare light the cloth is frayed or cut, and not counted."""
HIDDEN = 8.0
"""So many cells each way without one open pore are a label, a finger or a clip on the cloth."""
LEAST = 1e-6
"""Less than one pixel's share of any rectangle, more than rounding."""
MOST_HIDDEN = 0.3
"""Where more than this share of the field shows no pore, it is the cloth itself that is shut."""


def cloth_only(windows: list[Window], lattice: Lattice, *, size: tuple[int, int]) -> list[Window]:
    """Take bare light, with the frayed rim beside it, and what hides the cloth out of the windows.

    Parameters
    ----------
    windows : list of Window
    lattice : Lattice
    size : tuple of int
        Rows and columns of the picture.

    Returns
    -------
    list of Window
        Those that still hold cloth.
    """
    step = max(1, int(min(cell_sides(lattice)) / SAMPLES))
    thin = [_thinned(window, step) for window in windows]
    coarse = Lattice(
        (lattice.ends[0] * step, lattice.ends[1] * step),
        (lattice.picks[0] * step, lattice.picks[1] * step),
    )
    rows, columns = (math.ceil(side / step) for side in size)
    block = max(FEWEST_IN_BLOCK, BLOCK // step)
    surface, _ = open_pore_light(thin, rows=rows, columns=columns, block=block)
    shares = [window.light / surface.over(window) for window in thin]
    low = float(np.mean([np.quantile(share, DARK) for share in shares]))
    seen = [share > (1 + low) / 2 for share in shares]
    bare = [_widened(_solid(each, coarse, BARE), coarse, FRAYED) for each in seen]
    hidden = [_widened(_solid(~each, coarse, HIDDEN), coarse, 1.0) for each in seen]
    if sum(int(each.sum()) for each in hidden) > MOST_HIDDEN * sum(each.size for each in hidden):
        hidden = [np.zeros_like(each) for each in hidden]
    left = [
        replace(window, inside=window.inside & ~_thickened(light | thing, step, window))
        for window, light, thing in zip(windows, bare, hidden, strict=True)
    ]
    return [window for window in left if window.inside.any()]


def _thinned(window: Window, step: int) -> Window:
    """Take every so many pixels each way: masks need no more."""
    every = (slice(None, None, step), slice(None, None, step))
    return replace(
        window,
        row=window.row // step,
        column=window.column // step,
        light=np.ascontiguousarray(window.light[every]),
        inside=window.inside[every],
        clipped=window.clipped[every],
    )


def _thickened(mask: Bools, step: int, window: Window) -> Bools:
    """Bring a mask of every so many pixels back to the window's size."""
    rows, columns = window.inside.shape
    return np.repeat(np.repeat(mask, step, axis=0), step, axis=1)[:rows, :columns]


def _solid(mask: Bools, lattice: Lattice, cells: float) -> Bools:
    """Keep the parts of the mask that hold a whole rectangle of so many cells."""
    filled = _mean(mask, lattice, cells) > 1 - LEAST
    return _mean(filled, lattice, cells) > LEAST if filled.any() else filled


def _widened(mask: Bools, lattice: Lattice, cells: float) -> Bools:
    """Widen the mask by so many cells on every side."""
    return _mean(mask, lattice, 2 * cells) > LEAST if mask.any() else mask


def _mean(mask: Bools, lattice: Lattice, cells: float) -> NDArray[np.float32]:
    """Share of the mask in a rectangle of so many cells about each pixel; beyond the rim 0."""
    across, down = (2 * math.ceil(cells * side / 2) + 1 for side in cell_sides(lattice))
    ones = mask.astype(np.float32)
    mean = cv2.boxFilter(ones, -1, (across, down), borderType=cv2.BORDER_CONSTANT)
    return np.asarray(mean, np.float32)


__all__ = ["cloth_only"]
