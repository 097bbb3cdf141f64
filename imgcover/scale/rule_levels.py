"""The picture at the resolutions where a rule is looked for and measured."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Protocol

import cv2
import numpy as np
from numpy.typing import NDArray

LARGEST = 9_500_000
"""Pixels of the finest level: an A4 scan at 600 dpi halved. Its millimetre is 12 px, and a row of
lines is placed to a hundredth of a pixel by their number, not by the pixels of one."""
SMALLEST_SIDE = 150
"""Pixels: a row of lines shorter than this proves nothing."""
HALVINGS = 4


class Pictured(Protocol):
    """What a picture must be able to do to be searched (`imgcover.picture.picture.Picture`)."""

    @property
    def rows(self) -> int:
        """Shown height in pixels."""
        ...

    @property
    def columns(self) -> int:
        """Shown width in pixels."""
        ...

    def coarse(self, factor: int) -> NDArray[np.float32]:
        """Give means of linear light over square blocks of `factor` pixels a side."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class Level:
    """A copy of the picture, `factor` times coarser; the square root of its linear light."""

    factor: int
    tone: NDArray[np.float32]

    def to_picture(self, place: NDArray[np.float64]) -> NDArray[np.float64]:
        """Turn places on this level into picture pixels."""
        return place * self.factor + (self.factor - 1) / 2

    def from_picture(self, place: NDArray[np.float64]) -> NDArray[np.float64]:
        """Turn picture pixels into places on this level."""
        return (place - (self.factor - 1) / 2) / self.factor


def levels_of(picture: Pictured) -> tuple[Level, ...]:
    """Make the levels of a picture, the finest first."""
    factor = 1
    while picture.rows * picture.columns > LARGEST * factor**2:
        factor *= 2
    return tuple(_halved(factor, picture.coarse(factor)))


def _halved(factor: int, light: NDArray[np.float32]) -> Iterator[Level]:
    for _ in range(HALVINGS):
        yield Level(factor, np.sqrt(np.maximum(light, 0.0)))
        rows, columns = light.shape[0] // 2, light.shape[1] // 2
        if min(rows, columns) < SMALLEST_SIDE:
            return
        even = np.ascontiguousarray(light[: 2 * rows, : 2 * columns])
        light = np.asarray(
            cv2.resize(even, (columns, rows), interpolation=cv2.INTER_AREA), dtype=np.float32
        )
        factor *= 2


__all__ = ["Level", "Pictured", "levels_of"]
