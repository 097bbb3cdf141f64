"""Drawn scans of the printed scale sheet, with known pitch, shear, distortion and print errors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.scale.sheet import FIELD_AT_MM, FIELD_MM, board

Distort = Callable[[NDArray[np.float64], NDArray[np.float64]], tuple[NDArray, NDArray]]


class Scanned:
    """An array of linear light that answers like a picture."""

    def __init__(self, light: NDArray[np.float32]) -> None:
        self.held = light
        self.rows, self.columns = light.shape

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Give a window."""
        return self.held if window is None else self.held[window]

    def coarse(self, factor: int) -> NDArray[np.float32]:
        """Give means over blocks."""
        size = (self.columns // factor, self.rows // factor)
        cut = self.held[: size[1] * factor, : size[0] * factor]
        return np.asarray(cv2.resize(cut, size, interpolation=cv2.INTER_AREA))


def nowhere(x: NDArray, y: NDArray) -> tuple[NDArray, NDArray]:
    """Distort nothing."""
    return np.zeros_like(x), np.zeros_like(y)


@dataclass(frozen=True)
class Scan:
    """How a sheet was printed and scanned; the pitch is px/mm, lengths are mm."""

    x: float = 8.0
    y: float = 8.0
    shear: float = 0.0
    turn: float = 0.0
    at: tuple[float, float] = (10.0, 10.0)
    size: tuple[float, float] = (195.0, 195.0)
    stretch: tuple[float, float] = (1.0, 1.0)
    skew: float = 0.0
    distort: Distort = field(default=nowhere)
    noise: float = 0.01
    blur: float = 0.6
    seed: int = 1


def draw_scan(scan: Scan, *, fine: int = 3) -> Scanned:
    """Draw it: each pixel is the mean of `fine` × `fine` exact samples of the field."""
    cells = round(2 * FIELD_MM)
    black = np.asarray(board().generateImage((cells, cells), None, 0, 1)) < 128
    rows, columns = round(scan.size[1] * scan.y), round(scan.size[0] * scan.x)
    total = np.zeros((rows, columns), dtype=np.float32)
    steps = (np.arange(fine) + 0.5) / fine - 0.5
    for dy in steps:
        for dx in steps:
            px, py = np.arange(columns) + dx, np.arange(rows) + dy
            bed_y = np.broadcast_to((py / scan.y)[:, None], (rows, columns))
            bed_x = px[None, :] / scan.x - scan.shear * bed_y
            true_x, true_y = bed_x, bed_y
            for _ in range(3):
                shift_x, shift_y = scan.distort(true_x, true_y)
                true_x, true_y = bed_x - shift_x, bed_y - shift_y
            total += _sample(black, scan, true_x, true_y)
    light = 0.03 + 0.85 * (1 - total / fine**2)
    generator = np.random.default_rng(scan.seed)
    light = cv2.GaussianBlur(light, (0, 0), scan.blur)
    light = light + generator.normal(0, scan.noise, light.shape)
    return Scanned(np.clip(light, 0, 1).astype(np.float32))


def _sample(black: NDArray[np.bool_], scan: Scan, x: NDArray, y: NDArray) -> NDArray:
    """Tell where the sheet is black, at bed places; the sheet turns about its field's middle."""
    middle = FIELD_MM / 2
    c, s = np.cos(scan.turn), np.sin(scan.turn)
    rx, ry = x - scan.at[0] - middle, y - scan.at[1] - middle
    u, v = c * rx + s * ry, -s * rx + c * ry
    v = (v / scan.stretch[1]) + middle
    u = (u - scan.skew * (v - middle)) / scan.stretch[0] + middle
    column, row = np.floor(2 * u).astype(int), np.floor(2 * v).astype(int)
    inside = (column >= 0) & (row >= 0) & (column < len(black)) & (row < len(black))
    return inside & black[np.where(inside, row, 0), np.where(inside, column, 0)]


__all__ = ["FIELD_AT_MM", "Scan", "Scanned", "draw_scan", "nowhere"]
