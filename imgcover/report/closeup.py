"""A few threads, large: each thread's line and each pore, where the eye can judge them."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import Seen
from imgcover.report.canvas import PORE, Canvas, eight_bits, resized, tinted
from imgcover.report.strips import Marked, Path, thread_places
from imgcover.threads.reading import Tile

THREADS_SHOWN = 14
"""Threads across the close-up: as many as are counted at a glance."""


def middle_of_interest(
    shape: tuple[int, ...], tiles: Sequence[Tile], seen: Sequence[Seen]
) -> tuple[float, float]:
    """The point (x, y) nearest to the picture's middle where something was measured."""
    centre = (shape[1] / 2, shape[0] / 2)
    middles = [
        (window.column + window.inside.shape[1] / 2, window.row + window.inside.shape[0] / 2)
        for window in seen
    ] or [(tile.x + tile.width / 2, tile.y + tile.height / 2) for tile in tiles if tile.used]
    return min(
        middles or [centre],
        key=lambda middle: (middle[0] - centre[0]) ** 2 + (middle[1] - centre[1]) ** 2,
    )


def close_up(
    shown: NDArray[np.uint8 | np.uint16],
    *,
    marked: Sequence[Marked],
    tiles: Sequence[Tile],
    seen: Sequence[Seen],
    side: int,
) -> Canvas:
    """Draw a square of the field with its threads and pores marked.

    Parameters
    ----------
    shown : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        The picture as stored.
    marked : sequence of Marked
        Its threads.
    tiles : sequence of Tile
        The pieces of the field.
    seen : sequence of Seen
        Its pores, where cover was measured.
    side : int
        Of the sheet, px.
    """
    middle = middle_of_interest(shown.shape, tiles, seen)
    pitches = [each.threads.pixels_a_thread for each in marked]
    reach = int(min(THREADS_SHOWN * max(pitches, default=10.0), *shown.shape[:2]))
    left = int(np.clip(middle[0] - reach / 2, 0, shown.shape[1] - reach))
    top = int(np.clip(middle[1] - reach / 2, 0, shown.shape[0] - reach))
    pixels = eight_bits(resized(shown[top : top + reach, left : left + reach], side, side))
    share = _open_share(seen, left, top, reach)
    if share is not None:
        pixels = tinted(pixels, 0.6 * resized(share, side, side).astype(np.float32), PORE)
    sheet = Canvas.blank(side, side)
    sheet.put(pixels, (0, 0))
    scale = side / reach
    for each in marked:
        _lines(sheet, each, corner=(left, top), reach=reach, scale=scale)
    return sheet


def _lines(
    sheet: Canvas,
    marked: Marked,
    *,
    corner: tuple[int, int],
    reach: int,
    scale: float,
) -> None:
    """Draw each thread's line right across the square."""
    fx, fy = marked.threads.frequency
    size = math.hypot(fx, fy)
    across = (fx / size, fy / size)
    middle = (corner[0] + reach / 2, corner[1] + reach / 2)
    half = 0.75 * reach
    path = Path((middle[0] - half * across[0], middle[1] - half * across[1]), across, 2 * half)
    along = (-across[1], across[0])
    for _, place in thread_places(marked, path):
        x, y = path.at(place)
        ends = [
            ((x + far * along[0] - corner[0]) * scale, (y + far * along[1] - corner[1]) * scale)
            for far in (-reach, reach)
        ]
        sheet.line(ends[0], ends[1], marked.colour)


def _open_share(
    seen: Sequence[Seen], left: int, top: int, reach: int
) -> NDArray[np.float32] | None:
    """Lay the classed windows over a square of the picture."""
    share = np.zeros((reach, reach), np.float32)
    met = False
    for window in seen:
        rows, columns = window.open_share.shape
        first_row, last_row = max(top, window.row), min(top + reach, window.row + rows)
        first, last = max(left, window.column), min(left + reach, window.column + columns)
        if first_row >= last_row or first >= last:
            continue
        met = True
        cut = (
            slice(first_row - window.row, last_row - window.row),
            slice(first - window.column, last - window.column),
        )
        share[first_row - top : last_row - top, first - left : last - left] = np.where(
            window.inside[cut], window.open_share[cut], 0.0
        )
    return share if met else None


__all__ = ["close_up", "middle_of_interest"]
