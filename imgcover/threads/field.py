"""The piece of picture that is read: its windows for the spectrum, its flattened light."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import cv2
import numpy as np
from numpy.typing import NDArray

MOST_PIXELS = 2_400_000
"""Pixels followed at once: 65 mm square at 600 dpi, more than the 50 mm that counting by hand asks
for down to ten threads a cm (ISO 7211-2), in less time than an A4 scan takes to decode."""

DARKEST = 0.01
"""Linear light added before a logarithm: an 8-bit picture's darkest steps are noise below it."""

MOST_WINDOWS = 5
"""Windows a side for the spectrum: their average is steady from about nine on."""


class LightSource(Protocol):
    """Anything that gives linear light by window: a Picture, or an array wrapped for it."""

    @property
    def rows(self) -> int:
        """Height in pixels."""
        ...

    @property
    def columns(self) -> int:
        """Width in pixels."""
        ...

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Linear light 0…1 of a window, or of all."""
        ...


@dataclass(frozen=True, slots=True)
class Region:
    """A rectangle of the shown picture, pixels."""

    x: int
    y: int
    width: int
    height: int


@dataclass(frozen=True, slots=True, eq=False)
class Field:
    """Light of a region, made smaller by a whole factor.

    Parameters
    ----------
    light : ndarray, shape (rows, columns), float32
        Linear light.
    region : Region
        Where it lies in the picture.
    zoom : int
        Picture pixels a field pixel, in each direction.
    """

    light: NDArray[np.float32]
    region: Region
    zoom: int


def whole(source: LightSource) -> Region:
    """The region that is all of the picture."""
    return Region(0, 0, source.columns, source.rows)


def field_of(source: LightSource, region: Region, zoom: int) -> Field:
    """Cut the middle of a region that can be followed at once, and make it smaller.

    A region of at most MOST_PIXELS after zooming is taken whole.
    """
    height, width = region.height // zoom, region.width // zoom
    if height * width > MOST_PIXELS:
        side = int(MOST_PIXELS**0.5)
        short = min(height, width, side)
        width = min(width, MOST_PIXELS // short) if width >= height else short
        height = min(height, MOST_PIXELS // short) if height > width else short
    x = region.x + (region.width - width * zoom) // 2
    y = region.y + (region.height - height * zoom) // 2
    cut = Region(x, y, width * zoom, height * zoom)
    light = source.light(
        (slice(cut.y, cut.y + cut.height), slice(cut.x, cut.x + cut.width))
    ).astype(np.float32, copy=False)
    if zoom > 1:
        light = np.asarray(
            cv2.resize(light, (width, height), interpolation=cv2.INTER_AREA), np.float32
        )
    return Field(light, cut, zoom)


def windows_of(field: Field, side: int) -> list[NDArray[np.float32]]:
    """Windows spread evenly over a field, half overlapping where it is small."""
    rows, columns = field.light.shape
    high, wide = min(side, rows), min(side, columns)
    return [
        field.light[y : y + high, x : x + wide]
        for y in _starts(rows, high)
        for x in _starts(columns, wide)
    ]


def _starts(length: int, side: int) -> list[int]:
    count = 1 if length <= side else min(MOST_WINDOWS, -(-(length - side) * 2 // side) + 1)
    return [int(v) for v in np.linspace(0, length - side, count)]


def flattened(light: NDArray[np.float32], period: float) -> NDArray[np.float32]:
    """Take light and shade out: mean and contrast alike everywhere, at the scale of a few threads.

    Parameters
    ----------
    period : float
        The longer of the two thread periods, pixels.

    Notes
    -----
    The square root of light is used as in the spectrum. The contrast is not raised above a third
    of the field's median: bare bed has none, and its noise must not count like cloth.
    """
    root = np.sqrt(np.maximum(light, 0.0))
    flat = root - _smooth(root, 1.5 * period)
    # a running mean may leave a hair below zero where there is nothing
    spread = np.sqrt(np.maximum(_smooth(flat * flat, 3 * period), 0.0))
    return np.asarray(flat / np.maximum(spread, 0.3 * np.median(spread) + 1e-9), np.float32)


def outlines(field: Field, period: float) -> Field:
    """Where threads end, whatever their colours: how steeply the light changes, as a light.

    Parameters
    ----------
    period : float
        The longer of the two thread periods, pixels.

    Notes
    -----
    Between light and dark stripes a thread turns from lighter to darker than what lies beside it,
    and its line in the spectrum turns over with it. Its edges stay where they are. The logarithm
    makes a dark stripe's edges as steep as a light one's. Squared, since the root of a light is
    taken wherever it is read.
    """
    log = cv2.GaussianBlur(np.log(np.maximum(field.light, 0.0) + DARKEST), (0, 0), 0.7)
    across, down = (cv2.Scharr(log, cv2.CV_32F, *axis) for axis in ((1, 0), (0, 1)))
    steep = np.hypot(across, down)
    side = 2 * round(period) + 1
    steep /= cv2.blur(steep, (side, side)) + 1e-3 * float(steep.max()) + 1e-9
    return Field(np.asarray(steep * steep, np.float32), field.region, field.zoom)


def _smooth(array: NDArray[np.float32], sigma: float) -> NDArray[np.float32]:
    """Smooth by three box means: as good as a Gaussian here, at a cost without sigma in it."""
    side = 2 * round(sigma) + 1
    for _ in range(3):
        blurred = cv2.blur(array, (side, side), borderType=cv2.BORDER_REFLECT)
        array = np.asarray(blurred, np.float32)
    return array


__all__ = [
    "Field",
    "LightSource",
    "Region",
    "field_of",
    "flattened",
    "outlines",
    "whole",
    "windows_of",
]
