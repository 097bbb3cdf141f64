"""A row of lines laid straight: from the picture to the row and back."""

from __future__ import annotations

from dataclasses import dataclass, replace

import cv2
import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Frame:
    """Where the straightened row lies in the picture: place of (0, 0) and both directions.

    `along` (rad) is the direction of the row, `upright` that of its lines, from foot to tip.
    """

    x: float
    y: float
    along: float
    upright: float

    def place(
        self, s: NDArray[np.float64], t: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return picture x and y of points s along the row and t along the lines, in pixels."""
        x = self.x + s * np.cos(self.along) + t * np.cos(self.upright)
        y = self.y + s * np.sin(self.along) + t * np.sin(self.upright)
        return x, y

    def sample(
        self, light: NDArray[np.float32], s: NDArray[np.float64], t: NDArray[np.float64]
    ) -> NDArray[np.float32]:
        """Return the picture at the grid of t (rows) and s (columns); 0 outside it."""
        x, y = self.place(s[None, :], t[:, None])
        return np.asarray(
            cv2.remap(light, x.astype(np.float32), y.astype(np.float32), cv2.INTER_LINEAR),
            dtype=np.float32,
        )

    def moved(self, s: float, t: float) -> Frame:
        """Return the frame with its origin at (s, t)."""
        x, y = self.place(np.array(s), np.array(t))
        return replace(self, x=float(x), y=float(y))


def run_around(strong: NDArray[np.bool_], start: int) -> tuple[int, int]:
    """Return the first and last index of the run of true values around `start`."""
    low = high = start
    while low > 0 and strong[low - 1]:
        low -= 1
    while high + 1 < len(strong) and strong[high + 1]:
        high += 1
    return low, high


__all__ = ["Frame", "run_around"]
