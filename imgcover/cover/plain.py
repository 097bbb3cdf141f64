"""Cover without a thread lattice: two levels, and the edge half way between them."""

from __future__ import annotations

import math
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.windows import Window
from imgcover.cover.witnesses import weighted

Floats = NDArray[np.float32]

FINER = 4
"""Sub-pixels a pixel for the half-level edge: the edge is then placed to a few hundredths px."""
ROUNDS = 4
"""Levels and edge depend on each other; after three rounds neither moves by 0.0001."""
CLEAR = 2.0
"""Standard deviations of the blur from the edge at which a level is free of the other."""
FEWEST_CLEAR = 200
"""Pixels clear of any edge that a level must rest on: fewer are all rim."""


@dataclass(frozen=True, slots=True, eq=False)
class Levels:
    """Two levels in a picture, and the covered area by both witnesses.

    Parameters
    ----------
    open_level, yarn_level : float
        Shares of the light field.
    blur_px : float
        Standard deviation of blur and pixel together.
    threshold, two_level : float
        Covered share by the half-level edge, and by the light.
    scatter : float
        Relative standard deviation of the open level between its pixels.
    maps : list of ndarray
        Open share of each pixel, window by window.
    """

    open_level: float
    yarn_level: float
    blur_px: float
    threshold: float
    two_level: float
    scatter: float
    maps: list[Floats]


def two_levels(windows: list[Window], shares: list[Floats], weights: list[Floats]) -> Levels | None:
    """Find the two levels and what they say of the cover.

    Parameters
    ----------
    windows : list of Window
    shares : list of ndarray
        Light over the light field in each window.
    weights : list of ndarray
        What counts.

    Returns
    -------
    Levels or None
        None where too few pixels are clear of every edge: nothing shows the levels themselves.
    """
    values = np.concatenate([s[w > 0] for s, w in zip(shares, weights, strict=True)])
    low, high = (float(q) for q in np.quantile(values, (0.02, 0.995)))
    blur, scatter = 0.4, 0.0
    for _ in range(ROUNDS):
        middle = (low + high) / 2
        found = _clear_levels(windows, shares, middle, CLEAR * blur)
        if found is None or found[0] <= found[1]:
            return None
        high, low, scatter = found
        blur = _blur(shares, high, low)
    middle = (low + high) / 2
    fine = [_finer(share) > middle for share in shares]
    maps = [_coarser(each) for each in fine]
    seen = weighted(maps, weights)
    # What blur does to the shapes that were seen, it did to the true ones.
    again = [_coarser(_blurred(each, blur) > 0.5) for each in fine]
    return Levels(
        open_level=high,
        yarn_level=low,
        blur_px=blur,
        threshold=1 - (2 * seen - weighted(again, weights)),
        two_level=(high - weighted(shares, weights)) / (high - low),
        scatter=scatter,
        maps=maps,
    )


def _clear_levels(
    windows: list[Window], shares: list[Floats], middle: float, reach: float
) -> tuple[float, float, float] | None:
    """Levels of what lies further than `reach` px from every edge, and the open one's scatter."""
    bright, dark = [], []
    for window, share in zip(windows, shares, strict=True):
        above = share > middle
        inner, outer = (_clearance(each) > reach + 1 for each in (above, ~above))
        bright.append(share[inner & window.inside])
        dark.append(share[outer & window.inside])
    above_all, below_all = np.concatenate(bright), np.concatenate(dark)
    if min(above_all.size, below_all.size) < FEWEST_CLEAR:
        return None
    high = float(np.median(above_all))
    return high, float(np.mean(below_all)), float(np.std(above_all)) / high


def _clearance(mask: NDArray[np.bool_]) -> Floats:
    """Distance to the nearest edge, px; beyond the rim of the window there may be one."""
    ringed = np.pad(mask.astype(np.uint8), 1)
    return np.asarray(cv2.distanceTransform(ringed, cv2.DIST_L2, 5)[1:-1, 1:-1], np.float32)


def _blur(shares: list[Floats], high: float, low: float) -> float:
    """Width of the edges: across one, the integral of Φ(1 − Φ) is σ / √π."""
    between, length = 0.0, 0.0
    for share in shares:
        place = np.clip((share - low) / (high - low), 0, 1)
        between += float(np.sum(place * (1 - place), dtype=np.float64))
        length += _perimeter(place > 0.5)
    return math.sqrt(math.pi) * between / max(length, 1.0)


def _perimeter(above: NDArray[np.bool_]) -> float:
    """Length of all edges, px: by how often lines in four directions cross them (Crofton)."""
    straight = float(np.sum(above[1:] != above[:-1]) + np.sum(above[:, 1:] != above[:, :-1]))
    slanted = float(
        np.sum(above[1:, 1:] != above[:-1, :-1]) + np.sum(above[1:, :-1] != above[:-1, 1:])
    )
    # Lines lie 1 px apart along rows and columns, 1 / √2 px apart along the diagonals.
    return math.pi / 8 * (straight + slanted / math.sqrt(2))


def _finer(share: Floats) -> Floats:
    rows, columns = share.shape
    size = (columns * FINER, rows * FINER)
    return np.asarray(cv2.resize(share, size, interpolation=cv2.INTER_CUBIC), np.float32)


def _coarser(fine: NDArray[np.bool_]) -> Floats:
    rows, columns = fine.shape
    size = (columns // FINER, rows // FINER)
    return np.asarray(
        cv2.resize(fine.astype(np.float32), size, interpolation=cv2.INTER_AREA), np.float32
    )


def _blurred(fine: NDArray[np.bool_], blur_px: float) -> Floats:
    return np.asarray(
        cv2.GaussianBlur(fine.astype(np.float32), (0, 0), max(0.1, blur_px * FINER)), np.float32
    )


__all__ = ["Levels", "two_levels"]
