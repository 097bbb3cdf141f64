"""The bare light behind the cloth, as a smooth surface over the picture."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.windows import Window

BRIGHT_SHARE = 0.99
"""A block's light is taken at this quantile: below the noise's own extremes, inside its pores."""


@dataclass(frozen=True, slots=True)
class Surface:
    """A smooth light over the picture: exp of a quadratic in the place.

    Parameters
    ----------
    rows, columns : int
        Size of the picture, px.
    coefficients : tuple of float
        Of 1, x, y, x², xy, y² with x and y in -1…1.
    """

    rows: int
    columns: int
    coefficients: tuple[float, ...]

    def at(self, row: NDArray[np.float64], column: NDArray[np.float64]) -> NDArray[np.float64]:
        """Light at the places, linear."""
        total = np.zeros(np.broadcast_shapes(row.shape, column.shape))
        for coefficient, term in zip(self.coefficients, self._terms(row, column), strict=True):
            total = total + coefficient * term
        return np.exp(total)

    def over(self, window: Window) -> NDArray[np.float32]:
        """Light over every pixel of the window."""
        rows, columns = window.light.shape
        row = window.row + np.arange(rows, dtype=float)[:, None]
        column = window.column + np.arange(columns, dtype=float)[None, :]
        # All terms but that of xy belong to a row or to a column: a quarter of the work.
        c = self.coefficients
        x, y = self._sides(row, column)
        along = (c[0] + c[1] * x + c[3] * x * x).astype(np.float32)
        down = (c[2] * y + c[5] * y * y).astype(np.float32)
        tilted = (c[4] * y).astype(np.float32) * x.astype(np.float32)
        return np.asarray(np.exp(tilted + (along + down)), np.float32)

    def _terms(
        self, row: NDArray[np.float64], column: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], ...]:
        x, y = self._sides(row, column)
        return np.ones_like(x * y), x, y, x * x, x * y, y * y

    def _sides(
        self, row: NDArray[np.float64], column: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Places as x and y from -1 to 1."""
        x = 2 * column / max(1, self.columns - 1) - 1
        y = 2 * row / max(1, self.rows - 1) - 1
        return x, y


def open_pore_light(
    windows: list[Window], *, rows: int, columns: int, block: int
) -> tuple[Surface, float]:
    """Fit the light field to the brightest pores of every block.

    Parameters
    ----------
    windows : list of Window
    rows, columns : int
        Size of the picture, px.
    block : int
        Side of a block, px: a few threads.

    Returns
    -------
    Surface, float
        The field and the relative scatter of the blocks about it.
    """
    places, lights = [], []
    for window in windows:
        height, width = window.light.shape
        for row in range(0, height - block // 2, block):
            for column in range(0, width - block // 2, block):
                cut = (slice(row, row + block), slice(column, column + block))
                part = window.light[cut][window.inside[cut]]
                if part.size > block * block / 4:
                    places.append(
                        (window.row + row + block / 2, window.column + column + block / 2)
                    )
                    lights.append(_bright(part))
    return _fit(np.array(places), np.array(lights), rows, columns)


def _bright(part: NDArray[np.float32]) -> float:
    """Quantile `BRIGHT_SHARE`, as NumPy's own, which takes five times as long for so few."""
    place = BRIGHT_SHARE * (part.size - 1)
    below = int(place)
    above = min(below + 1, part.size - 1)
    sorted_there = np.partition(part, (below, above))
    low, high = float(sorted_there[below]), float(sorted_there[above])
    return low + (high - low) * (place - below)


def _fit(
    places: NDArray[np.float64], lights: NDArray[np.float64], rows: int, columns: int
) -> tuple[Surface, float]:
    """Fit the surface with the blocks below it (no open pore there) left out in turn."""
    flat = Surface(rows, columns, (0.0,) * 6)
    terms = np.stack(flat._terms(places[:, 0], places[:, 1]), axis=1)
    if len(lights) < 12:
        terms = terms[:, :1]
    logs = np.log(np.maximum(lights, 1e-6))
    keep = np.ones(len(logs), bool)
    for _ in range(8):
        solved, *_ = np.linalg.lstsq(terms[keep], logs[keep], rcond=None)
        residual = logs - terms @ solved
        spread = 1.4826 * float(np.median(np.abs(residual[keep]))) + 1e-4
        keep = residual > -2.5 * spread
    coefficients = tuple(float(c) for c in solved) + (0.0,) * (6 - len(solved))
    return Surface(rows, columns, coefficients), spread


__all__ = ["Surface", "open_pore_light"]
