"""How stored values stand for light, and back: transfer curves, both ways.

Cover is an area, and area is a mean of linear light; an average of stored values is not.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

SRGB_TOE = 0.04045
"""Stored value below which sRGB is a straight line (IEC 61966-2-1:1999, 5.2)."""
SRGB_SLOPE = 12.92
"""Slope of that line (IEC 61966-2-1:1999, 5.2)."""
SRGB_OFFSET = 0.055
"""Offset of the power law above it (IEC 61966-2-1:1999, 5.2)."""
SRGB_POWER = 2.4
"""Exponent of that power law; the whole curve is near 2.2 (IEC 61966-2-1:1999, 5.2)."""
LOWEST_GAMMA, HIGHEST_GAMMA = 0.2, 5.0
"""Devices lie between 1.0 and 2.6; 1/2.2 is a curve stated backwards, worth reading as such only
when asked for. Outside these limits it is a slip of the pen."""


@dataclass(frozen=True, slots=True)
class Tone:
    """A transfer curve between stored values and linear light, both 0…1.

    Parameters
    ----------
    kind : {"srgb", "linear", "gamma"}
        The family of the curve.
    gamma : float
        light = stored ** gamma; used only by kind "gamma".

    Examples
    --------
    >>> Tone.parse("gamma:2.2")
    Tone(kind='gamma', gamma=2.2)
    >>> round(float(Tone("srgb").from_linear(0.18)), 7)
    0.4613561
    """

    kind: Literal["srgb", "linear", "gamma"]
    gamma: float = 1.0

    def __post_init__(self) -> None:
        if self.kind not in ("srgb", "linear", "gamma"):
            raise ValueError(f"kind must be srgb, linear or gamma, got {self.kind!r}")
        if not LOWEST_GAMMA <= self.gamma <= HIGHEST_GAMMA:
            raise ValueError(
                f"gamma must lie between {LOWEST_GAMMA} and {HIGHEST_GAMMA}, got {self.gamma}"
            )

    @staticmethod
    def parse(text: str) -> Tone:
        """Read `srgb`, `linear` or `gamma:G`, as the command line and the lot sheet write it.

        Raises
        ------
        ValueError
            When the text is none of these, or G is not a sensible number.
        """
        word = text.strip().lower()
        if word == "srgb":
            return SRGB
        if word == "linear":
            return LINEAR
        match = re.fullmatch(r"gamma:\s*(\d+(?:\.\d*)?|\.\d+)", word, re.ASCII)
        if match is None:
            raise ValueError(
                f"tone must be srgb, linear or gamma:G such as gamma:2.2, got {text!r}"
            )
        return Tone("gamma", float(match[1]))

    def to_linear(self, stored: NDArray[np.floating] | float) -> NDArray[np.floating]:
        """Turn stored values 0…1 into linear light 0…1.

        Parameters
        ----------
        stored : ndarray of any shape, float, 0…1
            Values as the file holds them, divided by the largest it can hold.

        Returns
        -------
        ndarray of the same shape and dtype
            Linear light.
        """
        value = np.asarray(stored)
        if self.kind == "linear":
            return value.copy()
        if self.kind == "gamma":
            return np.asarray(np.maximum(value, 0) ** self.gamma)
        curved = ((np.maximum(value, 0) + SRGB_OFFSET) / (1 + SRGB_OFFSET)) ** SRGB_POWER
        return np.where(value <= SRGB_TOE, value / SRGB_SLOPE, curved)

    def from_linear(self, light: NDArray[np.floating] | float) -> NDArray[np.floating]:
        """Turn linear light 0…1 into stored values 0…1: the inverse of `to_linear`.

        Parameters
        ----------
        light : ndarray of any shape, float, 0…1
            Linear light.

        Returns
        -------
        ndarray of the same shape and dtype
            Values as a file holds them, divided by the largest it can hold.
        """
        value = np.asarray(light)
        if self.kind == "linear":
            return value.copy()
        if self.kind == "gamma":
            return np.asarray(np.maximum(value, 0) ** (1 / self.gamma))
        curved = (1 + SRGB_OFFSET) * np.maximum(value, 0) ** (1 / SRGB_POWER) - SRGB_OFFSET
        return np.where(value <= SRGB_TOE / SRGB_SLOPE, value * SRGB_SLOPE, curved)

    def lut(self, bits: int) -> NDArray[np.float32]:
        """Tabulate linear light for every value a file of that depth can hold.

        Parameters
        ----------
        bits : int
            8 or 16.

        Returns
        -------
        ndarray, shape (2**bits,), float32, read-only
            Linear light 0…1 of each stored value.
        """
        return _lut(self, bits)

    def __str__(self) -> str:
        if self.kind != "gamma":
            return self.kind
        shown = int(self.gamma) if math.floor(self.gamma) == self.gamma else self.gamma
        return f"gamma:{shown}"


@lru_cache(maxsize=16)
def _lut(tone: Tone, bits: int) -> NDArray[np.float32]:
    if bits not in (8, 16):
        raise ValueError(f"bits must be 8 or 16, got {bits}")
    table: NDArray[np.float32] = tone.to_linear(np.linspace(0.0, 1.0, 1 << bits)).astype(np.float32)
    table.flags.writeable = False
    return table


SRGB = Tone("srgb")
"""What cameras and scanners write unless told otherwise."""
LINEAR = Tone("linear")
"""Stored values are light already: raw exports, and most 16-bit light-table cameras."""


__all__ = ["LINEAR", "SRGB", "Tone"]
