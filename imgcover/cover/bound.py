"""How much can be open at most? A bound that needs no pore to be resolved."""

from __future__ import annotations

import math

import numpy as np

from imgcover.cover.windows import Window
from imgcover.quantity import Measured

BLOCK = 48
"""Side of the blocks in which light is taken as even, px."""
BRIGHT = 0.999
"""Bare light is at least what this share of a block's pixels stay below."""


def most_open(windows: list[Window], *, light_known: bool) -> Measured:
    """Bound the open share from above: all the light that comes through, over bare light.

    Parameters
    ----------
    windows : list of Window
    light_known : bool
        Whether light is given as a share of a blank exposure; otherwise bare light is at least
        the brightest light of its neighbourhood.

    Returns
    -------
    Measured
        The bound, and the scatter of its mean between blocks.
    """
    bounds = []
    for window in windows:
        rows, columns = window.light.shape
        for row in range(0, rows - BLOCK // 2, BLOCK):
            for column in range(0, columns - BLOCK // 2, BLOCK):
                place = (slice(row, row + BLOCK), slice(column, column + BLOCK))
                light = window.light[place][window.inside[place]]
                if light.size > BLOCK:
                    bare = 1.0 if light_known else float(np.quantile(light, BRIGHT))
                    bounds.append(float(light.mean()) / max(bare, 1e-6))
    mean = min(1.0, float(np.mean(bounds)))
    return Measured(mean, float(np.std(bounds)) / math.sqrt(len(bounds)), "1")


__all__ = ["most_open"]
