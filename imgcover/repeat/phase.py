"""How a plane wave's phase wanders over a field: demodulation on a coarse grid."""

from __future__ import annotations

from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, eq=False)
class Transformed:
    """A field's Fourier transform, ready to be demodulated at any frequency.

    Parameters
    ----------
    values : ndarray, shape (padded rows, padded columns), complex64
        Transform of the field, zero frequency first.
    shape : tuple of int
        (rows, columns) of the field before padding.
    """

    values: NDArray[np.complex64]
    shape: tuple[int, int]


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Where demodulated values stand: every `step` pixels from (0, 0).

    Parameters
    ----------
    step : tuple of float
        (rows, columns) pixels between neighbours.
    shape : tuple of int
        (rows, columns) of the grid.
    """

    step: tuple[float, float]
    shape: tuple[int, int]

    def rows(self) -> NDArray[np.float64]:
        """Row positions in pixels."""
        return np.arange(self.shape[0], dtype=np.float64) * self.step[0]

    def columns(self) -> NDArray[np.float64]:
        """Column positions in pixels."""
        return np.arange(self.shape[1], dtype=np.float64) * self.step[1]


def transform(field: NDArray[np.float32], *, margin: int) -> Transformed:
    """Transform a field once, padded so that its edges do not meet.

    Parameters
    ----------
    field : ndarray, shape (rows, columns), float32
        Local mean removed; zero where it is not to count.
    margin : int
        Pixels of zeros added: more than the reach of the smoothing to come.
    """
    rows, columns = field.shape
    padded = np.zeros(
        (cv2.getOptimalDFTSize(rows + margin), cv2.getOptimalDFTSize(columns + margin)), np.float32
    )
    padded[:rows, :columns] = field
    parts = cv2.dft(padded, flags=cv2.DFT_COMPLEX_OUTPUT)
    return Transformed(np.asarray(parts).view(np.complex64)[..., 0], (rows, columns))


def demodulate(
    of: Transformed, frequency: tuple[float, float], *, sigma: float
) -> tuple[NDArray[np.complex64], Grid]:
    """Shift one plane wave to zero frequency and smooth it with a Gaussian.

    Parameters
    ----------
    of : Transformed
        The field.
    frequency : tuple of float
        (fx, fy), cycles per pixel.
    sigma : float
        Standard deviation of the smoothing, pixels.

    Returns
    -------
    values : ndarray, shape of the grid, complex64
        Amplitude (half of the wave's, times the kernel's share of the mask) and phase of the wave,
        relative to exp(2πi (fx·x + fy·y)) with x, y in pixels from the field's (0, 0).
    grid : Grid
        Where the values stand.

    Notes
    -----
    Only the band around the line is transformed back, so the cost is that of the coarse grid. The
    band is cut at 3.2 standard deviations of the Gaussian in frequency (0.6 % left).
    """
    rows, columns = of.values.shape
    band = 3.2 / (2 * np.pi * sigma)
    half_rows = max(2, min(rows // 2 - 1, int(np.ceil(band * rows))))
    half_columns = max(2, min(columns // 2 - 1, int(np.ceil(band * columns))))
    centre_row = round(frequency[1] * rows)
    centre_column = round(frequency[0] * columns)
    at_rows = np.arange(centre_row - half_rows, centre_row + half_rows)
    at_columns = np.arange(centre_column - half_columns, centre_column + half_columns)
    piece = of.values[np.ix_(at_rows % rows, at_columns % columns)]
    weight_rows = np.exp(-2 * (np.pi * sigma * (at_rows / rows - frequency[1])) ** 2)
    weight_columns = np.exp(-2 * (np.pi * sigma * (at_columns / columns - frequency[0])) ** 2)
    piece = piece * np.outer(weight_rows, weight_columns).astype(np.float32)
    small = np.fft.ifft2(np.fft.ifftshift(piece))
    scale = small.size / (rows * columns)
    step = (rows / small.shape[0], columns / small.shape[1])
    grid = Grid(
        step,
        (
            int(np.ceil(of.shape[0] / step[0] - 1e-9)),
            int(np.ceil(of.shape[1] / step[1] - 1e-9)),
        ),
    )
    # the band's middle bin became zero frequency; what is left of the wanted one is a slow ramp
    left_over_x = centre_column / columns - frequency[0]
    left_over_y = centre_row / rows - frequency[1]
    down = np.exp(2j * np.pi * left_over_y * grid.rows()) * scale
    across = np.exp(2j * np.pi * left_over_x * grid.columns())
    values = small[: grid.shape[0], : grid.shape[1]] * np.outer(down, across)
    return values.astype(np.complex64), grid


__all__ = ["Grid", "Transformed", "demodulate", "transform"]
