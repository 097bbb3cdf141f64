"""Pictures whose covered area is known exactly: discs, bars, gratings and meshes."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

Floats = NDArray[np.float64]

TAPS = 16
"""Points across a pixel over which an edge that is not straight is averaged."""


@dataclass(frozen=True, slots=True, eq=False)
class Exact:
    """A picture of linear light and the share of it that is covered.

    Parameters
    ----------
    light : ndarray, shape (rows, columns), float64
        Linear light 0…1, each pixel the mean over its own area.
    covered : float
        Covered share of the frame, from the figure's formula.
    """

    light: Floats
    covered: float


def bars(count: int, *, pitch_px: float, bar_px: float, start_px: float = 0.0) -> Floats:
    """Cover a row of pixels by upright bars, exactly.

    Parameters
    ----------
    count : int
        Pixels in the row; pixel k reaches from k − ½ to k + ½.
    pitch_px, bar_px : float
        From bar to bar, and width of a bar; bars may not overlap.
    start_px : float
        Left edge of one bar, from the left edge of the row.

    Returns
    -------
    ndarray, shape (count,), float64
        Covered share of each pixel: the difference of an exact running total.
    """
    if not 0 < bar_px <= pitch_px:
        raise ValueError(f"bar_px must lie above 0 and up to pitch_px, got {bar_px} of {pitch_px}")
    edge = (np.arange(count + 1) - start_px) / pitch_px
    whole = np.floor(edge)
    total = whole * bar_px + np.minimum((edge - whole) * pitch_px, bar_px)
    return np.asarray(np.diff(total))


def grating(
    rows: int,
    columns: int,
    *,
    pitch_px: float,
    bar_px: float,
    start_px: float = 0.0,
    dark: float = 0.0,
    bright: float = 1.0,
) -> Exact:
    """Draw upright bars."""
    across = bars(columns, pitch_px=pitch_px, bar_px=bar_px, start_px=start_px)
    covered = np.broadcast_to(across, (rows, columns))
    return Exact(bright + (dark - bright) * covered, float(across.mean()))


def mesh(
    rows: int,
    columns: int,
    *,
    pitch_px: tuple[float, float],
    bar_px: tuple[float, float],
    start_px: tuple[float, float] = (0.0, 0.0),
    dark: float = 0.0,
    crossing: float | None = None,
    bright: float = 1.0,
    blur_px: float = 0.0,
) -> Exact:
    """Draw upright bars over level ones: a woven screen in the light.

    Parameters
    ----------
    pitch_px, bar_px, start_px : tuple of float
        Across (of the upright bars) and down (of the level ones).
    dark, crossing : float
        Light through one bar, and through two; None takes their product.
    blur_px : float
        Sd of a Gaussian that blurs the bars, exactly; the covered share stays the figure's own.
    """
    blurred = [
        _blurred_bars(n, pitch, bar, start, blur_px)
        for n, pitch, bar, start in zip((columns, rows), pitch_px, bar_px, start_px, strict=True)
    ]
    sharp = [
        bars(n, pitch_px=pitch, bar_px=bar, start_px=start)
        for n, pitch, bar, start in zip((columns, rows), pitch_px, bar_px, start_px, strict=True)
    ]
    both = dark * dark / bright if crossing is None else crossing
    upright, level = blurred[0][None, :], blurred[1][:, None]
    # light is bilinear in what the two sets cover, so blur and pixel act on each set alone
    light = (
        bright
        + (dark - bright) * (upright + level)
        + (both - 2 * dark + bright) * (upright * level)
    )
    open_share = (1 - sharp[0].mean()) * (1 - sharp[1].mean())
    return Exact(light, float(1 - open_share))


def _blurred_bars(count: int, pitch: float, bar: float, start: float, sigma: float) -> Floats:
    """Blur a row of bars by a Gaussian, by the closed integral of the normal distribution."""
    if sigma == 0:
        return bars(count, pitch_px=pitch, bar_px=bar, start_px=start)
    edge = np.arange(count + 1, dtype=np.float64)
    reach = math.ceil(8 * sigma / pitch) + 1
    first = math.floor(-start / pitch) - reach
    last = math.ceil((count - start) / pitch) + reach
    left = start + pitch * np.arange(first, last + 1)
    total = _ramp((edge[:, None] - left) / sigma) - _ramp((edge[:, None] - left - bar) / sigma)
    return np.asarray(np.diff(total.sum(axis=1) * sigma))


def _ramp(z: Floats) -> Floats:
    """Integrate the normal distribution's own integral from −∞ to z."""
    return np.asarray(z * ndtr(z) + np.exp(-0.5 * z * z) / math.sqrt(2 * math.pi))


def discs(
    rows: int,
    columns: int,
    *,
    pitch_px: float,
    radius_px: float,
    hole: bool = False,
    dark: float = 0.0,
    bright: float = 1.0,
) -> Exact:
    """Draw discs, or a plate with round holes, on a square lattice.

    The frame should be whole pitches wide and high: then the covered share is exactly
    π r² / p², or one less that.
    """
    if radius_px > pitch_px / 2:
        raise ValueError(f"discs of radius {radius_px} px overlap at a pitch of {pitch_px} px")
    inside = np.zeros((rows, columns))
    tap = (np.arange(TAPS) + 0.5) / TAPS
    y_all = _from_middle(np.arange(rows)[:, None] + tap, pitch_px)
    x_all = _from_middle(np.arange(columns)[:, None] + tap, pitch_px)
    for k in range(TAPS):
        for m in range(TAPS):
            near = x_all[None, :, m] ** 2 + y_all[:, k, None] ** 2 < radius_px**2
            inside += near
    share = inside / TAPS**2
    covered = share if not hole else 1 - share
    area = math.pi * radius_px**2 / pitch_px**2
    return Exact(bright + (dark - bright) * covered, 1 - area if hole else area)


def _from_middle(place: Floats, pitch: float) -> Floats:
    """Give the distance from the middle of the cell a place lies in."""
    return np.asarray((place % pitch) - pitch / 2)


__all__ = ["Exact", "bars", "discs", "grating", "mesh"]
