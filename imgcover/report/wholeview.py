"""The whole picture, small: what was measured, what was left out and why, and how large it is."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import LightField, Seen
from imgcover.report.canvas import (
    FAINT,
    LEFT_OUT,
    PAPER,
    PORE,
    Canvas,
    Colour,
    Pixels,
    eight_bits,
    resized,
    text_width,
    tinted,
)
from imgcover.report.strips import Path
from imgcover.threads.reading import Tile

CONTOUR = 0.05
"""Light-field contours lie this far apart, as a share of the brightest place."""
BAR_SHARE = 0.25
"""The scale bar is at most this share of the view's width."""


@dataclass(frozen=True, slots=True)
class View:
    """The picture laid into a box of the sheet.

    Parameters
    ----------
    x, y : int
        Upper left corner on the sheet.
    scale : float
        Sheet pixels a picture pixel.
    rows, columns : int
        Size of the picture, px.
    """

    x: int
    y: int
    scale: float
    rows: int
    columns: int

    @property
    def size(self) -> tuple[int, int]:
        """(width, height) on the sheet."""
        return (
            max(1, round(self.columns * self.scale)),
            max(1, round(self.rows * self.scale)),
        )

    def at(self, x: float, y: float) -> tuple[float, float]:
        """Where a point of the picture lies on the sheet."""
        return self.x + x * self.scale, self.y + y * self.scale


def fitted(shape: tuple[int, ...], at: tuple[int, int], box: tuple[int, int]) -> View:
    """Lay a picture of that shape into a box (width, height) at (x, y) of the sheet."""
    rows, columns = shape[:2]
    return View(at[0], at[1], min(box[0] / columns, box[1] / rows), rows, columns)


def draw_whole(
    sheet: Canvas,
    view: View,
    shown: NDArray[np.uint8 | np.uint16],
    *,
    tiles: Sequence[Tile],
    seen: Sequence[Seen],
    light_field: LightField | None,
) -> None:
    """Draw the picture with its open area tinted, its light in contours and its tiles outlined.

    Parameters
    ----------
    sheet : Canvas
    view : View
        Where it lies.
    shown : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        The picture as stored.
    tiles : sequence of Tile
        Pieces of the field.
    seen : sequence of Seen
        Where pores were classed.
    light_field : LightField or None
        The bare light behind the cloth.
    """
    pixels = eight_bits(resized(shown, *view.size))
    for window in seen:
        pixels = _tint_window(pixels, view, window)
    if light_field is not None:
        pixels = _contoured(pixels, light_field.values)
    sheet.put(pixels, (view.x, view.y))
    for tile in tiles:
        corner = view.at(tile.x, tile.y)
        size = (tile.width * view.scale, tile.height * view.scale)
        if tile.used:
            sheet.box(corner, size, FAINT)
    for tile in tiles:
        if not tile.used:
            _cross_out(sheet, view, tile)


def _cross_out(sheet: Canvas, view: View, tile: Tile) -> None:
    left, top = view.at(tile.x, tile.y)
    right, bottom = view.at(tile.x + tile.width, tile.y + tile.height)
    sheet.box((left + 1, top + 1), (right - left - 3, bottom - top - 3), LEFT_OUT)
    sheet.line((left + 1, top + 1), (right - 2, bottom - 2), LEFT_OUT)
    if text_width(tile.reason, 11) < right - left - 6:
        middle = ((left + right) / 2, (top + bottom) / 2)
        half = text_width(tile.reason, 11) / 2 + 3
        sheet.fill((middle[0] - half, middle[1] - 8), (2 * half, 16), PAPER)
        sheet.words(tile.reason, middle, size=11, colour=LEFT_OUT, anchor="mm")


def draw_path(sheet: Canvas, view: View, path: Path, colour: Colour) -> None:
    """Draw a way across the threads, with a bar at either end."""
    start, end = view.at(*path.at(0.0)), view.at(*path.at(path.length))
    sheet.line(start, end, PAPER, 4)
    sheet.line(start, end, colour, 2)
    aside = (-5 * path.across[1], 5 * path.across[0])
    for x, y in (start, end):
        sheet.line((x - aside[0], y - aside[1]), (x + aside[0], y + aside[1]), colour, 3)


def draw_scale_bar(sheet: Canvas, view: View, px_per_mm: float) -> None:
    """Draw a bar of a round number of millimetres under the view."""
    longest = BAR_SHARE * view.columns / px_per_mm
    power = 10.0 ** math.floor(math.log10(longest))
    length = max(step * power for step in (1, 2, 5) if step * power <= longest)
    width = length * px_per_mm * view.scale
    y = view.y + view.size[1] + 14
    sheet.line((view.x, y), (view.x + width, y), FAINT, 3)
    for x in (view.x, view.x + width):
        sheet.line((x, y - 5), (x, y + 5), FAINT, 2)
    sheet.words(f"{length:g} mm", (view.x + width + 8, y), size=14, colour=FAINT, anchor="lm")


def draw_region(
    sheet: Canvas, view: View, region: tuple[int, int, int, int], colour: Colour
) -> None:
    """Outline the part of the picture that was asked for (x, y, width, height), px."""
    x, y, width, height = region
    left, top = view.at(x, y)
    size = (width * view.scale, height * view.scale)
    sheet.box((left - 1, top - 1), (size[0] + 2, size[1] + 2), PAPER)
    sheet.box((left, top), size, colour)


def _tint_window(pixels: Pixels, view: View, window: Seen) -> Pixels:
    rows, columns = window.open_share.shape
    left, top = round(window.column * view.scale), round(window.row * view.scale)
    width, height = max(1, round(columns * view.scale)), max(1, round(rows * view.scale))
    part = pixels[top : top + height, left : left + width]
    open_share = resized(np.where(window.inside, window.open_share, 0.0), width, height)
    done = pixels.copy()
    done[top : top + height, left : left + width] = tinted(
        part, 0.7 * open_share[: part.shape[0], : part.shape[1]].astype(np.float32), PORE
    )
    return done


def _contoured(pixels: Pixels, field: NDArray[np.float32]) -> Pixels:
    """Draw where the light field passes each step of its height."""
    rows, columns = pixels.shape[:2]
    fine = cv2.resize(field / field.max(), (columns, rows), interpolation=cv2.INTER_CUBIC)
    step = np.floor(fine / CONTOUR)
    edge = np.zeros((rows, columns), bool)
    edge[1:] |= step[1:] != step[:-1]
    edge[:, 1:] |= step[:, 1:] != step[:, :-1]
    done = pixels.copy()
    done[edge] = (255, 235, 120)
    return done


__all__ = ["View", "draw_path", "draw_region", "draw_scale_bar", "draw_whole", "fitted"]
