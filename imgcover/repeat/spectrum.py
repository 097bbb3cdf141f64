"""Which plane waves stand out of a field: averaged power, its noise floor, significant peaks."""

from __future__ import annotations

from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

HIGHEST_FREQUENCY = 0.46
"""Cycles per pixel. Nearer to one half, a wave and its own mirror image melt into one peak."""

LOWEST_CYCLES = 3.0
"""Cycles per window. Slower waves are light and shade, and leak through the window's skirt."""

FOLDED_EXCESS = 5.0
"""ln(power over floor) of a line that is more than grain."""

FLOOR_SPAN = 17
"""Bins of the half-size spectrum over which the floor is a median: wider than any line."""


@dataclass(frozen=True, slots=True)
class Peak:
    """One plane wave that stands out.

    Parameters
    ----------
    fx, fy : float
        Cycles per pixel, in the half plane fy > 0, or fy = 0 and fx > 0.
    level : float
        ln(power), the window's total power being 1.
    excess : float
        ln(power over the noise floor around it).
    """

    fx: float
    fy: float
    level: float
    excess: float


@dataclass(frozen=True, slots=True, eq=False)
class Spectrum:
    """Averaged power of windows of one field.

    Parameters
    ----------
    log_power : ndarray, shape (size, size), float32
        ln(power), zero frequency at (size // 2, size // 2).
    log_floor : ndarray, shape (size, size), float32
        ln(power) of what is not a line.
    size : int
        Bins a side; one bin is 1 / size cycles per pixel.
    window : tuple of int
        (rows, columns) of the windows that were averaged.
    windows : int
        How many.
    """

    log_power: NDArray[np.float32]
    log_floor: NDArray[np.float32]
    size: int
    window: tuple[int, int]
    windows: int


def spectrum(tiles: list[NDArray[np.float32]]) -> Spectrum:
    """Average the power spectra of windows of equal shape.

    Parameters
    ----------
    tiles : list of ndarray, shape (rows, columns), float32
        Linear light. Each weighs alike, whatever its contrast: it is scaled to unit power.

    Returns
    -------
    Spectrum
        Of size next power of two, zero padded.

    Raises
    ------
    ValueError
        When there are no tiles or they differ in shape.

    Notes
    -----
    The square root of the light is transformed: it evens out highlights, which would otherwise
    outweigh the threads, and moves no line.
    """
    if not tiles or any(each.shape != tiles[0].shape for each in tiles):
        raise ValueError("tiles must be one or more arrays of one shape")
    rows, columns = tiles[0].shape
    size = 1 << (max(rows, columns) - 1).bit_length()
    taper = np.outer(_hann(rows), _hann(columns))
    power = np.zeros((size, size), np.float32)
    padded = np.zeros((size, size), np.float32)
    for tile in tiles:
        root = np.sqrt(np.maximum(tile, 0.0))
        flat = (root - float((root * taper).sum() / taper.sum())) * taper
        energy = float((flat * flat).sum())
        if energy > 0:
            padded[:rows, :columns] = flat
            parts = cv2.dft(padded, flags=cv2.DFT_COMPLEX_OUTPUT)
            power += (parts[..., 0] ** 2 + parts[..., 1] ** 2) / np.float32(energy)
    mean = np.asarray(np.fft.fftshift(power) / len(tiles), np.float32)
    log_power = np.log(mean + 1e-12).astype(np.float32)
    return Spectrum(log_power, _floor(log_power), size, (rows, columns), len(tiles))


def _hann(length: int) -> NDArray[np.float32]:
    return np.hanning(length + 2)[1:-1].astype(np.float32)


def _floor(log_power: NDArray[np.float32]) -> NDArray[np.float32]:
    """Local median of the log power: lines are too few to move it.

    The median is taken of 256 levels, where it is fifty times as fast; one level is about 0.1.
    """
    half = (log_power.shape[1] // 2, log_power.shape[0] // 2)
    small = cv2.resize(log_power, half, interpolation=cv2.INTER_AREA)
    low, high = float(small.min()), float(small.max())
    step = max(high - low, 1e-6) / 255
    levels = np.round((small - low) / step).astype(np.uint8)
    margin = FLOOR_SPAN // 2
    wrapped = cv2.copyMakeBorder(levels, *(margin,) * 4, cv2.BORDER_WRAP)
    median = cv2.medianBlur(wrapped, FLOOR_SPAN)[margin:-margin, margin:-margin]
    floor = low + step * median.astype(np.float32)
    whole = cv2.resize(floor, log_power.shape[::-1], interpolation=cv2.INTER_LINEAR)
    return np.asarray(whole, np.float32)


def peaks(of: Spectrum, *, excess: float, most: int) -> list[Peak]:
    """Find the strongest plane waves that stand out of the floor.

    Parameters
    ----------
    of : Spectrum
        An averaged power spectrum.
    excess : float
        Least ln(power over floor).
    most : int
        How many at the most.

    Returns
    -------
    list of Peak
        Strongest first.
    """
    log_power = of.log_power
    middle = of.size // 2
    reach = 2 * of.size // max(of.window) + 1
    top = cv2.dilate(log_power, np.ones((2 * reach + 1, 2 * reach + 1), np.uint8))
    rows, columns = np.nonzero((log_power >= top) & (log_power - of.log_floor > excess))
    found = []
    for row, column in zip(rows.tolist(), columns.tolist(), strict=True):
        cycles_y, cycles_x = row - middle, column - middle
        inside = 0 < row < of.size - 1 and 0 < column < of.size - 1
        if not inside or cycles_y < 0 or (cycles_y == 0 and cycles_x <= 0):
            continue
        across = np.hypot(cycles_x * of.window[1], cycles_y * of.window[0]) / of.size
        if across < LOWEST_CYCLES or np.hypot(cycles_x, cycles_y) > HIGHEST_FREQUENCY * of.size:
            continue
        found.append(_refined(of, row, column))
    found.sort(key=lambda each: (-each.level, each.fx, each.fy))
    return found[:most]


def folded_over(of: Spectrum) -> bool:
    """Whether the strongest wave lies so near the limit of the pixels that it may be folded over.

    Notes
    -----
    Waves too fine for the pixels come back as coarser ones, mirrored at half a cycle per pixel.
    What is seen below the limit is then no guide to what is there.
    """
    middle = of.size // 2
    axis = np.arange(of.size) - middle
    cycles = np.hypot(axis[:, None], axis[None, :])
    lowest = LOWEST_CYCLES * of.size / max(of.window)
    line = of.log_power - of.log_floor > FOLDED_EXCESS
    strength = np.where(line & (cycles > lowest), of.log_power, -np.inf)
    outside = cycles > HIGHEST_FREQUENCY * of.size
    return bool(strength[outside].max() > strength[~outside].max())


def _refined(of: Spectrum, row: int, column: int) -> Peak:
    """Place a peak between bins by the vertex of a parabola through the log power.

    A Hann window's main lobe is close to Gaussian, so its logarithm is close to a parabola.
    """
    log_power, middle = of.log_power, of.size // 2
    dx = _vertex(*(float(v) for v in log_power[row, column - 1 : column + 2]))
    dy = _vertex(*(float(v) for v in log_power[row - 1 : row + 2, column]))
    level = float(log_power[row, column])
    return Peak(
        (column - middle + dx) / of.size,
        (row - middle + dy) / of.size,
        level,
        level - float(of.log_floor[row, column]),
    )


def _vertex(before: float, at: float, after: float) -> float:
    curvature = before - 2 * at + after
    return 0.0 if curvature >= 0 else float(np.clip(0.5 * (before - after) / curvature, -0.5, 0.5))


__all__ = ["Peak", "Spectrum", "folded_over", "peaks", "spectrum"]
