"""The mean cell: every cell of the cloth laid over the others, finer than the pixel."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.fitting import Fitted
from imgcover.cover.places import Places
from imgcover.cover.reading import Lattice
from imgcover.cover.windows import cell_sides

SIDE = 48
"""Points of the mean cell each way: the finest detail that hundreds of cells can tell."""


def mean_cell(
    places: Places, fitted: Fitted, bare: NDArray[np.float64], lattice: Lattice
) -> NDArray[np.float32]:
    """Fold the light over the light field onto one cell, its pore in the middle.

    Parameters
    ----------
    places : Places
    fitted : Fitted
        Each pore's own middle is the middle of its cell.
    bare : ndarray, shape (n,)
        Bare light at each pore.
    lattice : Lattice

    Returns
    -------
    ndarray, shape (48, 48), float32
        Mean transmitted share; rows run down the picture, columns across it.
    """
    height, width = places.patch.shape[1:]
    across, down = cell_sides(lattice)
    x = np.arange(width) - (width - 1) / 2 - fitted.edges[:, :2].mean(axis=1)[:, None]
    y = np.arange(height) - (height - 1) / 2 - fitted.edges[:, 2:4].mean(axis=1)[:, None]
    column = np.floor((x / across + 0.5) * SIDE).astype(int)[:, None, :] % SIDE
    row = np.floor((y / down + 0.5) * SIDE).astype(int)[:, :, None] % SIDE
    at = (row * SIDE + column)[places.sound]
    share = ((places.patch - fitted.optics.glare) / bare[:, None, None])[places.sound]
    total = np.bincount(at, share, minlength=SIDE * SIDE)
    count = np.bincount(at, minlength=SIDE * SIDE)
    cell = np.where(count > 0, total / np.maximum(count, 1), np.nan).reshape(SIDE, SIDE)
    return _filled(cell).astype(np.float32)


def _filled(cell: NDArray[np.float64]) -> NDArray[np.float64]:
    """Give points that no pixel fell on the mean of their neighbours, round and round the cell."""
    while np.isnan(cell).any():
        near = np.stack([np.roll(cell, s, a) for s in (-1, 1) for a in (0, 1)])
        known = ~np.isnan(near)
        mean = np.where(known, near, 0).sum(axis=0) / np.maximum(known.sum(axis=0), 1)
        gaps = np.isnan(cell) & known.any(axis=0)
        if not gaps.any():
            return np.zeros_like(cell)
        cell = np.where(gaps, mean, cell)
    return cell


__all__ = ["SIDE", "mean_cell"]
