"""Two witnesses of the open share: where the edges lie, and how much light comes through."""

from __future__ import annotations

import math

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.fitting import Fitted
from imgcover.cover.places import Places

Floats = NDArray[np.float32]

FLAT = 1e-4
"""Change a pixel (of the light field) below which no edge passes."""


def open_share(share: Floats, level: float) -> Floats:
    """Give the part of each pixel that lies on the bright side of the level.

    Parameters
    ----------
    share : ndarray, shape (..., rows, columns), float32
        Light over the light field.
    level : float

    Notes
    -----
    The light is taken as a plane over each pixel; the plane's edge cuts it.
    """
    slope = np.abs(_change(share, -1)) + np.abs(_change(share, -2))
    inside = (share - np.float32(level)) / np.maximum(slope, np.float32(FLAT)) + np.float32(0.5)
    return np.asarray(np.clip(inside, 0, 1), np.float32)


def _change(share: Floats, axis: int) -> Floats:
    """Central difference along an axis, one-sided at the ends."""
    if share.ndim == 2:
        kernel = np.array([[-0.5, 0, 0.5]], np.float32)
        kernel = kernel if axis == -1 else kernel.T
        return np.asarray(
            cv2.filter2D(share, -1, kernel, borderType=cv2.BORDER_REFLECT_101), np.float32
        )
    return np.asarray(np.gradient(share, axis=axis), np.float32)


def edge_bias(places: Places, fitted: Fitted, bare: NDArray[np.float64], level: float) -> float:
    """Tell how much too large the half-level edge shows the pores that were fitted, relative.

    Parameters
    ----------
    places : Places
    fitted : Fitted
    bare : ndarray, shape (n,)
        Bare light at each pore.
    level : float
        Share of the light field at which the edge was drawn.

    Returns
    -------
    float
        Area inside the edge in the picture that the fit expects, over the area of its openings,
        less 1. Blur eats corners and small pores and widens what is thin and bright.
    """
    share = (fitted.light - np.float32(fitted.optics.glare)) / bare.astype(np.float32)[
        :, None, None
    ]
    inside = open_share(share, level)
    # Where an edge is not seen the fit and the picture may be of two minds about it.
    whole = places.whole
    own = (inside * own_pixels(places, fitted))[whole]
    seen = float(np.sum(own, dtype=np.float64))
    true = float(np.sum((fitted.width * fitted.height)[whole]))
    return seen / true - 1 if true > 0 else 0.0


def own_pixels(places: Places, fitted: Fitted) -> Floats:
    """Say which pixels of each patch belong to its own pore and not to the next: 0 or 1."""
    height, width = places.patch.shape[1:]
    x = np.arange(width) - (width - 1) / 2
    y = np.arange(height) - (height - 1) / 2
    across = (fitted.edges[:, 0] + fitted.edges[:, 1]) / 2
    down = (fitted.edges[:, 2] + fitted.edges[:, 3]) / 2
    near_x = np.abs(x - across[:, None]) <= (width - 1) / 2
    near_y = np.abs(y - down[:, None]) <= (height - 1) / 2
    return np.asarray(near_y[:, :, None] & near_x[:, None, :], np.float32)


def weighted(maps: list[Floats], weights: list[Floats]) -> float:
    """Mean of the maps under their weights."""
    total = sum(float(np.sum(m * w, dtype=np.float64)) for m, w in zip(maps, weights, strict=True))
    return total / sum(float(np.sum(w, dtype=np.float64)) for w in weights)


def between_windows(maps: list[Floats], weights: list[Floats]) -> float:
    """Standard uncertainty of the weighted mean from how much the windows differ; 0 for one."""
    if len(maps) < 2:
        return 0.0
    means = [weighted([m], [w]) for m, w in zip(maps, weights, strict=True)]
    return float(np.std(means, ddof=1)) / math.sqrt(len(means))


__all__ = ["between_windows", "edge_bias", "open_share", "own_pixels", "weighted"]
