"""What lies between the places of a grid."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray


def between(
    values: NDArray[np.floating], rows: NDArray[np.float64], columns: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Read a grid at broken places, by straight lines from place to place.

    Parameters
    ----------
    values : ndarray, shape (grid rows, grid columns), float
    rows, columns : ndarray, of one shape, float64
        Places, in steps of the grid; beyond the grid its nearest edge counts.

    Returns
    -------
    ndarray, shape of the places, float64

    Notes
    -----
    SciPy has this too, but to load it takes as long as to measure a small picture.
    """
    row = np.clip(rows, 0, values.shape[0] - 1)
    column = np.clip(columns, 0, values.shape[1] - 1)
    top, left = row.astype(np.intp), column.astype(np.intp)
    bottom = np.minimum(top + 1, values.shape[0] - 1)
    right = np.minimum(left + 1, values.shape[1] - 1)
    down, across = row - top, column - left
    upper = values[top, left] * (1 - across) + values[top, right] * across
    lower = values[bottom, left] * (1 - across) + values[bottom, right] * across
    return np.asarray(upper * (1 - down) + lower * down, np.float64)


__all__ = ["between"]
