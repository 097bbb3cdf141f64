"""What do the fitted openings add up to? Open area, light and yarn of whole cells."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.fitting import Fitted
from imgcover.cover.places import Places
from imgcover.cover.shadow import Yarn

Floats = NDArray[np.float64]

PARTS = 200
"""Parts of a half yarn when the light through it is summed."""


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """The cells around the pores, each from thread middle to thread middle; px and px².

    Parameters
    ----------
    width, height : ndarray, shape (n,)
        Of the cell.
    open_width, open_height : ndarray, shape (n,)
        Of the pore in it.
    light_width, light_height : ndarray, shape (n,)
        Of the opening that would let as much light through.
    """

    width: Floats
    height: Floats
    open_width: Floats
    open_height: Floats
    light_width: Floats
    light_height: Floats

    @property
    def open_share(self) -> float:
        """Open area over all area."""
        return float(np.sum(self.open_width * self.open_height) / self._area)

    @property
    def yarn_level(self) -> float:
        """Mean transmittance of what is covered."""
        passed = float(np.sum(self.light_width * self.light_height) / self._area)
        covered = 1 - self.open_share
        return (passed - self.open_share) / covered if covered > 0 else 0.0

    @property
    def end_widths(self) -> Floats:
        """Widths of the threads beside the pores."""
        return self.width - self.open_width

    @property
    def pick_widths(self) -> Floats:
        """Widths of the threads above and below the pores."""
        return self.height - self.open_height

    @property
    def unevenness(self) -> float:
        """Relative standard deviation of the widths of the threads, of the less even system."""
        return max(
            float(widths.std()) / max(float(widths.mean()), 1e-9)
            for widths in (self.end_widths, self.pick_widths)
        )

    @property
    def _area(self) -> float:
        return float(np.sum(self.width * self.height))


def cells_of(places: Places, fitted: Fitted) -> Cells:
    """Measure the cells whose four neighbours are known; all of them where too few are."""
    across = _sides(
        fitted.edges[:, :2], places.beside, places.beside_lacks, places.column, fitted.optics.ends
    )
    down = _sides(
        fitted.edges[:, 2:4], places.above, places.above_lacks, places.row, fitted.optics.picks
    )
    whole = places.whole
    return Cells(
        width=across[0][whole],
        height=down[0][whole],
        open_width=fitted.width[whole],
        open_height=fitted.height[whole],
        light_width=across[1][whole],
        light_height=down[1][whole],
    )


def _sides(
    edges: Floats, neighbours: NDArray[np.int64], lacks: Floats, middle: Floats, yarn: Yarn
) -> tuple[Floats, Floats]:
    """Width of each cell, and of the opening that would pass as much light, px."""
    before, after = neighbours[:, 1], neighbours[:, 3]
    far_before = edges[before, 1] + middle[before] - middle + lacks[:, 1]
    far_after = edges[after, 0] + middle[after] - middle + lacks[:, 3]
    left = np.maximum((edges[:, 0] - far_before) / 2, 0)
    right = np.maximum((far_after - edges[:, 1]) / 2, 0)
    gap = edges[:, 1] - edges[:, 0]
    half = np.linspace(0, 1.2 * max(float(left.max()), float(right.max()), yarn.half_px), 64)
    passed = half * _transmittance(yarn, half)
    light = gap + np.interp(left, half, passed) + np.interp(right, half, passed)
    return gap + left + right, light


def _transmittance(yarn: Yarn, half: Floats) -> Floats:
    """Mean transmittance across yarns of several half widths; a wider one is thicker."""
    across = (np.arange(PARTS) + 0.5) / PARTS
    thick = (1 - across ** (1 / yarn.roundness)) ** yarn.roundness
    depth = yarn.depth * half[:, None] / yarn.half_px
    return np.asarray(np.exp(-depth * thick).mean(axis=1), np.float64)


__all__ = ["Cells", "cells_of"]
