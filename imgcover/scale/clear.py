"""Which part of the picture is free of rules and sheets, and so may be cloth?"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

CELLS = 256
"""The shorter side is looked at in this many cells: a rule's edge is then told to half a percent
of the picture, and its area comes with a margin anyway."""

Rectangle = tuple[int, int, int, int]


def clear_part(
    areas: Sequence[NDArray[np.float64]], shape: tuple[int, int], *, within: Rectangle
) -> Rectangle:
    """Find the largest upright rectangle that meets none of the areas.

    Parameters
    ----------
    areas : sequence of ndarray, shape (n, 2)
        Corners in picture pixels, x and y.
    shape : tuple of int
        Rows and columns of the picture.
    within : tuple of int
        (x, y, width, height), px: the part that may be used at all.

    Returns
    -------
    tuple of int
        (x, y, width, height), px; empty (width and height 0) where everything is covered.
    """
    if not areas:
        return within
    # here, and not above: only where a rule or sheet lies in the picture
    from imgcover.scale.rule_area import area_mask

    factor = max(1, min(shape) // CELLS)
    cells = (-(-shape[0] // factor), -(-shape[1] // factor))
    taken = area_mask(areas, cells, factor=factor)
    x, y, width, height = within
    free = np.zeros(cells, np.bool_)
    inside = np.s_[
        -(-y // factor) : (y + height) // factor, -(-x // factor) : (x + width) // factor
    ]
    free[inside] = ~taken[inside]
    left, top, wide, high = _largest(free)
    return left * factor, top * factor, wide * factor, high * factor


def _largest(free: NDArray[np.bool_]) -> Rectangle:
    """The largest rectangle of true cells: under each row, the tallest bars that stand on it."""
    best = (0, 0, 0, 0)
    tall = np.zeros(free.shape[1], np.int64)
    for row, line in enumerate(free):
        tall = np.where(line, tall + 1, 0)
        open_bars: list[tuple[int, int]] = []
        for column, height in enumerate([*tall.tolist(), 0]):
            start = column
            while open_bars and open_bars[-1][1] >= height:
                start, standing = open_bars.pop()
                if standing * (column - start) > best[2] * best[3]:
                    best = (start, row - standing + 1, column - start, standing)
            open_bars.append((start, height))
    return best


__all__ = ["Rectangle", "clear_part"]
