"""Where are the sheet's numbered corners in a picture?"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.scale.sheet import SQUARE_MM, SQUARES, board, corners_mm

LARGEST = 5_000_000
"""Pixels of the copy on which markers are looked for: an A4 scan at 150 dpi has 2 million."""
SMALLEST_MODULE = 3.0
"""Pixels a millimetre below which markers cannot be read."""
CLOSE = 0.11
"""Squares: the half-window about a corner, clear of the markers that begin at 0.15."""


class Lit(Protocol):
    """What a picture must be able to do here (`imgcover.picture.picture.Picture`)."""

    @property
    def rows(self) -> int:
        """Shown height in pixels."""
        ...

    @property
    def columns(self) -> int:
        """Shown width in pixels."""
        ...

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Give the linear light of a window."""
        ...

    def coarse(self, factor: int) -> NDArray[np.float32]:
        """Give means of linear light over square blocks of `factor` pixels a side."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class SheetCorners:
    """Corners found: as drawn, mm from the page's corner, and in picture pixels; both (n, 2)."""

    drawn: NDArray[np.float64]
    seen: NDArray[np.float64]

    @property
    def span(self) -> float:
        """How much of the field they span in its narrower direction, 0…1."""
        reach = np.ptp(self.drawn, axis=0) if len(self.drawn) else np.zeros(2)
        return float(reach.min() / ((SQUARES - 2) * SQUARE_MM))


def find_corners(picture: Lit) -> SheetCorners:
    """Find the sheet's corners, to a few hundredths of a pixel.

    Parameters
    ----------
    picture : Lit
        A scan or a picture that shows the sheet, whole or in part, at any turn.

    Returns
    -------
    SheetCorners
        Empty where no sheet shows, or only a mirrored one.
    """
    first = 1
    while picture.rows * picture.columns > LARGEST * first**2:
        first += 1
    best = _detect(picture, first)
    if len(best.seen) < 30 and first > 1:
        finer = _detect(picture, max(1, first // 2))
        best = finer if len(finer.seen) > len(best.seen) else best
    return _refined(picture, best) if len(best.seen) >= 4 else best


def _detect(picture: Lit, factor: int) -> SheetCorners:
    """Find markers and corners on a coarser copy."""
    tone = np.sqrt(np.maximum(picture.coarse(factor), 0.0))
    low, high = (float(each) for each in np.quantile(tone[::4, ::4], (0.01, 0.99)))
    grey = np.clip((tone - low) / max(high - low, 1e-3) * 255, 0, 255).astype(np.uint8)
    seen, numbers, _, _ = cv2.aruco.CharucoDetector(board()).detectBoard(grey)
    if numbers is None or not len(numbers):
        return SheetCorners(np.zeros((0, 2)), np.zeros((0, 2)))
    places = np.asarray(seen, dtype=np.float64).reshape(-1, 2) * factor + (factor - 1) / 2
    return SheetCorners(corners_mm()[np.asarray(numbers).ravel()], places)


def _refined(picture: Lit, rough: SheetCorners) -> SheetCorners:
    """Place the corners on the full picture, each where its surroundings turn into themselves.

    A corner between two black and two white squares looks the same after half a turn about it,
    whatever the blur and the tone; the place is solved for by least squares on the difference.
    """
    half = max(2, int(CLOSE * _square_px(rough)))
    low = np.maximum(np.floor(rough.seen.min(axis=0)).astype(int) - 4 * half, 0)
    high = np.ceil(rough.seen.max(axis=0)).astype(int) + 4 * half
    light = picture.light((slice(low[1], int(high[1])), slice(low[0], int(high[0]))))
    tone = cv2.GaussianBlur(light, (0, 0), 0.7)
    slopes = [cv2.Sobel(tone, cv2.CV_32F, dx, 1 - dx, scale=1 / 8) for dx in (1, 0)]
    step = np.arange(-half, half + 1)
    offsets = np.stack(np.meshgrid(step, step), axis=-1).reshape(-1, 2).astype(np.float64)
    window = np.exp(-0.5 * (offsets**2).sum(axis=1) / (0.6 * half) ** 2)
    seen = rough.seen - low
    for _ in range(12):
        there, back = (_around(seen, way * offsets) for way in (1.0, -1.0))
        apart = _at(tone, there) - _at(tone, back)
        by_x, by_y = (_at(slope, there) - _at(slope, back) for slope in slopes)
        xx, xy, yy = ((p * q) @ window for p, q in ((by_x, by_x), (by_x, by_y), (by_y, by_y)))
        x, y = (by_x * apart) @ window, (by_y * apart) @ window
        determinant = xx * yy - xy * xy + 1e-12
        move = -np.stack([yy * x - xy * y, xx * y - xy * x], axis=1) / determinant[:, None]
        move = np.clip(move, -0.5, 0.5)
        seen = seen + move
        if np.abs(move).max() < 1e-3:
            break
    kept = np.hypot(*(seen + low - rough.seen).T) < 0.8 * half
    return SheetCorners(rough.drawn[kept], (seen + low)[kept])


def _around(places: NDArray[np.float64], offsets: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(places[:, None, :] + offsets[None, :, :])


def _at(picture: cv2.typing.MatLike, places: NDArray[np.float64]) -> NDArray[np.float64]:
    x, y = places[..., 0].astype(np.float32), places[..., 1].astype(np.float32)
    return np.asarray(
        cv2.remap(picture, x, y, cv2.INTER_LINEAR, borderMode=cv2.BORDER_REPLICATE),
        dtype=np.float64,
    )


def _square_px(corners: SheetCorners) -> float:
    """Return how many pixels a side of a square measures, roughly."""
    design = np.column_stack([corners.drawn, np.ones(len(corners.drawn))])
    terms, *_ = np.linalg.lstsq(design, corners.seen, rcond=None)
    return float(np.sqrt(abs(np.linalg.det(terms[:2])))) * SQUARE_MM


__all__ = ["Lit", "SheetCorners", "find_corners"]
