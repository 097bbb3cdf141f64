"""Smooth randomness: what real yarn, cloth and paper vary by."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.ndimage import gaussian_filter, gaussian_filter1d

Rng = np.random.Generator


def along_rows(rng: Rng, shape: tuple[int, int], *, length: float) -> NDArray[np.float32]:
    """Vary smoothly along each row, rows independent of each other.

    Parameters
    ----------
    shape : tuple of int
        (rows, samples).
    length : float
        Standard deviation of the smoothing Gaussian, in samples.

    Returns
    -------
    ndarray, shape (rows, samples), float32
        Mean 0 and variance 1 over the ensemble.
    """
    reach = int(4 * length) + 1
    white = rng.standard_normal((shape[0], shape[1] + 2 * reach), dtype=np.float32)
    smooth = gaussian_filter1d(white, length, axis=1, truncate=4)[:, reach : reach + shape[1]]
    return np.asarray(smooth * np.sqrt(2 * length * np.sqrt(np.pi)), dtype=np.float32)


def over_field(rng: Rng, shape: tuple[int, int], *, length: float) -> NDArray[np.float32]:
    """Vary smoothly over a field that wraps at its edges.

    Parameters
    ----------
    shape : tuple of int
        (rows, columns).
    length : float
        Standard deviation of the smoothing Gaussian, in samples.

    Returns
    -------
    ndarray, shape (rows, columns), float32
        Mean 0, sd 1 over this field.
    """
    white = rng.standard_normal(shape, dtype=np.float32)
    smooth = gaussian_filter(white, length, mode="wrap")
    return np.asarray((smooth - smooth.mean()) / smooth.std(), dtype=np.float32)


class SlowField:
    """A random displacement over the frame that changes over `length_mm`.

    It is a bicubic surface over a coarse grid of nodes, evaluated exactly on any regular grid by
    two small matrix products, so that a picture may be drawn band by band.
    """

    def __init__(
        self, rng: Rng, width_mm: float, height_mm: float, *, length_mm: float, rms: float
    ) -> None:
        self._x = _nodes(width_mm, length_mm)
        self._y = _nodes(height_mm, length_mm)
        self._value = rms * rng.standard_normal((self._y.size, self._x.size))
        self._still = rms == 0

    def on(self, x_mm: NDArray[np.float64], y_mm: NDArray[np.float64]) -> NDArray[np.float32] | int:
        """Give the displacement on the grid y × x, in the unit of `rms`; 0 where it is still.

        Parameters
        ----------
        x_mm, y_mm : ndarray, shape (columns,) and (rows,)
            Places from the middle of the frame.
        """
        if self._still:
            return 0
        rows = CubicSpline(self._y, np.eye(self._y.size))(y_mm)
        columns = CubicSpline(self._x, np.eye(self._x.size))(x_mm)
        return np.asarray(rows @ self._value @ columns.T, dtype=np.float32)


def _nodes(extent_mm: float, length_mm: float) -> NDArray[np.float64]:
    """Spread nodes a length apart over the extent, and two lengths beyond."""
    count = int(np.ceil(extent_mm / length_mm)) + 5
    return np.asarray((np.arange(count) - (count - 1) / 2) * length_mm)


__all__ = ["Rng", "SlowField", "along_rows", "over_field"]
