"""A sheet to draw on: text, lines and pictures, in the overlay's few colours."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import cv2
import numpy as np
from numpy.typing import NDArray
from PIL import Image, ImageDraw, ImageFont

from imgcover.report.plain import plain

Colour = tuple[int, int, int]
Pixels = NDArray[np.uint8]

FACE = "mpl-data/fonts/ttf/DejaVuSans.ttf"
FACE_SCALE = 0.93
"""It is drawn larger in its square than other faces of the same size."""

PAPER: Colour = (250, 250, 247)
INK: Colour = (28, 32, 38)
FAINT: Colour = (128, 134, 142)
ENDS: Colour = (214, 40, 110)
"""Red-violet for ends and blue-green for picks: told apart by colour-blind eyes, and by neither
of them mistaken for cloth."""
PICKS: Colour = (0, 150, 160)
LEFT_OUT: Colour = (225, 120, 0)
PORE: Colour = (60, 130, 255)


@dataclass(frozen=True, slots=True, eq=False)
class Canvas:
    """One RGB sheet that pictures, lines and words are put on.

    Parameters
    ----------
    image : PIL.Image.Image
        Mode RGB.
    """

    image: Image.Image

    @classmethod
    def blank(cls, width: int, height: int) -> Canvas:
        """Make an empty sheet."""
        return cls(Image.new("RGB", (width, height), PAPER))

    @property
    def pixels(self) -> Pixels:
        """The sheet as an array, shape (rows, columns, 3), uint8."""
        return np.asarray(self.image, np.uint8)

    def put(self, pixels: Pixels, at: tuple[int, int]) -> None:
        """Lay a picture down with its upper left corner at (x, y)."""
        self.image.paste(Image.fromarray(pixels), at)

    def line(
        self, start: tuple[float, float], end: tuple[float, float], colour: Colour, width: int = 1
    ) -> None:
        """Draw a straight line between two points (x, y)."""
        ImageDraw.Draw(self.image).line([start, end], fill=colour, width=width)

    def box(self, corner: tuple[float, float], size: tuple[float, float], colour: Colour) -> None:
        """Outline a rectangle from its upper left corner and its (width, height)."""
        (x, y), (width, height) = corner, size
        ImageDraw.Draw(self.image).rectangle([x, y, x + width, y + height], outline=colour)

    def fill(self, corner: tuple[float, float], size: tuple[float, float], colour: Colour) -> None:
        """Fill a rectangle from its upper left corner and its (width, height)."""
        (x, y), (width, height) = corner, size
        ImageDraw.Draw(self.image).rectangle([x, y, x + width, y + height], fill=colour)

    def words(
        self,
        text: str,
        at: tuple[float, float],
        *,
        size: int = 15,
        colour: Colour = INK,
        anchor: str = "la",
    ) -> None:
        """Write one line; the anchor is Pillow's: l, m or r, then a, m or d."""
        drawing = ImageDraw.Draw(self.image)
        drawing.text(at, plain(text), fill=colour, font=_font(size), anchor=anchor)


def stacked(sheets: list[Canvas]) -> Canvas:
    """Put sheets of one width under one another."""
    whole = Canvas.blank(
        max(each.image.width for each in sheets), sum(each.image.height for each in sheets)
    )
    top = 0
    for each in sheets:
        whole.image.paste(each.image, (0, top))
        top += each.image.height
    return whole


def text_width(text: str, size: int) -> float:
    """How wide a line of text will be, px."""
    return float(_font(size).getlength(plain(text)))


def tinted(pixels: Pixels, share: NDArray[np.float32], colour: Colour) -> Pixels:
    """Mix a colour in, as much of it at each pixel as `share` (0…1) says."""
    mixed = pixels + np.clip(share[..., None], 0.0, 1.0) * (np.asarray(colour, np.float32) - pixels)
    return np.asarray(np.clip(mixed, 0, 255), np.uint8)


def resized(values: NDArray[Any], width: int, height: int) -> NDArray[Any]:
    """Resize by area where smaller and smoothly where larger, whatever the values are."""
    smaller = width < values.shape[1]
    how = cv2.INTER_AREA if smaller else cv2.INTER_CUBIC
    return np.asarray(cv2.resize(values, (width, height), interpolation=how))


def eight_bits(stored: NDArray[Any]) -> Pixels:
    """Bring stored values to RGB of 8 bits, shape (rows, columns, 3)."""
    eight = (stored // 257 if stored.dtype == np.uint16 else stored).astype(np.uint8)
    return eight if eight.ndim == 3 else np.repeat(eight[..., None], 3, axis=2)


@lru_cache(maxsize=8)
def _font(size: int) -> ImageFont.FreeTypeFont | ImageFont.ImageFont:
    """The face that comes with matplotlib: Pillow's own has no ×, √ or µ."""
    found = find_spec("matplotlib")
    if found is None or found.origin is None:
        return ImageFont.load_default(size)
    return ImageFont.truetype(str(Path(found.origin).parent / FACE), round(FACE_SCALE * size))


__all__ = [
    *("ENDS", "FAINT", "INK", "LEFT_OUT", "PAPER", "PICKS", "PORE"),
    *("Canvas", "Colour", "Pixels", "eight_bits", "resized", "stacked", "text_width", "tinted"),
]
