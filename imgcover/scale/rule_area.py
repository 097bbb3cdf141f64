"""Which part of the picture is the rule, and so not cloth?"""

from __future__ import annotations

from collections.abc import Iterable

import cv2
import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import minimum_filter1d

from imgcover.scale.rule_frame import Frame

BEYOND_ENDS_MM = 15.0
"""A rule's body goes on past its first and last graduation by up to this."""
WIDEST_MM = 60.0
DEFAULT_WIDTH_MM = 42.0
"""Taken when the far edge does not show: wider than most rules."""
SEEN_EDGE = 0.03
"""Step in the square root of linear light that counts as an edge."""


def rule_corners(
    tone: NDArray[np.float32],
    frame: Frame,
    *,
    px_per_mm: float,
    first: float,
    last: float,
    longest_mm: float,
) -> NDArray[np.float64]:
    """Return the corners of the rule's body on this level, shape (4, 2), x and y.

    Parameters
    ----------
    tone : ndarray, shape (rows, columns), float32
        Square root of linear light.
    frame : Frame
        Of the row of lines; t runs from the lines' foot to their tips.
    px_per_mm : float
        On this level.
    first, last : float
        Positions along the row of its first and last line, px.
    longest_mm : float
        Height of the longest lines.
    """
    step = max(1.0, px_per_mm / 8)
    t = np.arange(-5 * px_per_mm, WIDEST_MM * px_per_mm, step)
    s = np.arange(first, last, max(1.0, px_per_mm / 4))
    width = round(px_per_mm / step)
    edge = _edge_strength(frame.sample(tone, s, t), width)
    # outside the picture lies nothing, and the step to nothing is the strongest of all
    edge[~_in_picture(frame, s, t, tone.shape, width)] = 0.0
    near = _strongest(edge, t, (-4.5 * px_per_mm, 0.4 * px_per_mm))
    far = _strongest(edge, t, ((longest_mm + 1.0) * px_per_mm, t[-1]))
    low = (near if near is not None else 0.0) - 1.0 * px_per_mm
    high = (far if far is not None else DEFAULT_WIDTH_MM * px_per_mm) + 1.0 * px_per_mm
    ends = np.array([first, last]) + np.array([-1, 1]) * BEYOND_ENDS_MM * px_per_mm
    x, y = frame.place(ends[[0, 1, 1, 0]], np.array([low, low, high, high]))
    return np.stack([x, y], axis=1)


def area_mask(
    areas: Iterable[NDArray[np.float64]], shape: tuple[int, int], *, factor: int = 1
) -> NDArray[np.bool_]:
    """Return where the areas lie.

    Parameters
    ----------
    areas : iterable of ndarray, shape (n, 2)
        Corners in picture pixels, x and y.
    shape : (int, int)
        Rows and columns of the mask.
    factor : int
        Picture pixels to one of the mask's, as in `Picture.coarse`.

    Returns
    -------
    ndarray, shape `shape`, bool
    """
    mask = np.zeros(shape, dtype=np.uint8)
    for corners in areas:
        seen = np.round((corners - (factor - 1) / 2) / factor).astype(np.int32)
        cv2.fillPoly(mask, [seen], (1,))
    return mask.astype(bool)


def _edge_strength(band: NDArray[np.float32], width: int) -> NDArray[np.float64]:
    """Return how strong a step along the whole row each height shows: the median over stretches."""
    stretches = np.array_split(band, 12, axis=1)
    means = np.stack([each.mean(axis=1) for each in stretches if each.shape[1]], axis=1)
    smooth = cv2.blur(means, (1, max(1, width // 2)))
    step = np.zeros_like(smooth)
    half = max(1, width // 2)
    step[half:-half] = smooth[2 * half :] - smooth[: -2 * half]
    return np.asarray(np.abs(np.median(step, axis=1)), dtype=np.float64)


def _in_picture(
    frame: Frame,
    s: NDArray[np.float64],
    t: NDArray[np.float64],
    shape: tuple[int, ...],
    width: int,
) -> NDArray[np.bool_]:
    """Which heights lie in the picture with all that an edge there is told from."""
    x, y = frame.place(s[None, :], t[:, None])
    inside = (x >= 0) & (x <= shape[1] - 1) & (y >= 0) & (y <= shape[0] - 1)
    # an edge strength is a median over the row: half of it may leave the picture
    return np.asarray(minimum_filter1d(inside.mean(axis=1) > 0.5, 2 * max(1, width) + 1))


def _strongest(
    edge: NDArray[np.float64], t: NDArray[np.float64], between: tuple[float, float]
) -> float | None:
    inside = (t >= between[0]) & (t <= between[1])
    if not inside.any():
        return None
    index = int(np.flatnonzero(inside)[np.argmax(edge[inside])])
    return float(t[index]) if edge[index] > SEEN_EDGE else None


__all__ = ["area_mask", "rule_corners"]
