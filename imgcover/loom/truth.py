"""What a drawn picture really shows: counted from its fine drawing, not from the order given."""

from __future__ import annotations

from dataclasses import dataclass, field

import cv2
import numpy as np
from numpy.typing import NDArray

MOST_PORE_POINTS = 40_000_000
"""Fine points in which pores are told apart; beyond it the rest of the frame is left out."""


@dataclass(frozen=True, slots=True)
class Truth:
    """What was drawn; densities 1/mm at right angles to the threads, lengths mm, angles degrees.

    Parameters
    ----------
    ends, picks : float
        Threads per mm, from the first whole thread to the last; a missing end leaves its place.
    ends_counted, picks_counted : float
        Gaps from thread to thread on a counting line, mean.
    pixels_per_end, pixels_per_pick : float
        Pixels from thread to thread at right angles (for unequal pitch: as the picture shows it).
    angle, skew : float
        Turn of the ends from the vertical, and of the picks against the ends, both clockwise.
    bow : float
        How far the middle of a pick lies below its ends, over the width seen.
    cover, cover_with_hairs : float
        Covered share of the swatch inside the frame.
    warp_cover, weft_cover : float
        Share that each system covers alone.
    open_width, open_height : float
        Mean gap beside an end and beside a pick: (1 − cover) / density of each.
    pores_per_cm2, pore_area, largest_pore : float
        Number, mean and largest area (mm²) of the pores that lie wholly inside.
    corners : tuple of four (x, y)
        The counted cloth in pixels of the picture; it may reach beyond the frame.
    """

    ends: float
    picks: float
    ends_counted: float
    picks_counted: float
    pixels_per_end: float
    pixels_per_pick: float
    angle: float
    skew: float
    bow: float
    cover: float
    cover_with_hairs: float
    warp_cover: float
    weft_cover: float
    open_width: float
    open_height: float
    pores_per_cm2: float
    pore_area: float
    largest_pore: float
    corners: tuple[tuple[float, float], ...]

    @property
    def upright(self) -> tuple[float, float]:
        """Threads per mm of the set nearest to the vertical, and of the other.

        On a swatch laid a quarter turn round these are picks and ends.
        """
        turned = abs(self.angle) > 45
        return (self.picks, self.ends) if turned else (self.ends, self.picks)


@dataclass(slots=True)
class Tally:
    """Adds up what is covered while the fine drawing passes by, band after band."""

    area: float = 0.0
    covered: float = 0.0
    with_hairs: float = 0.0
    warp: float = 0.0
    weft: float = 0.0
    masks: list[NDArray[np.uint8]] = field(default_factory=list)
    kept: int = 0

    def add(
        self,
        warp: NDArray[np.float32],
        weft: NDArray[np.float32],
        hidden: NDArray[np.float32] | float,
        inside: NDArray[np.float32],
    ) -> None:
        """Add a band: each system's covered shares, the hairs', and which points count."""
        bare = (1 - warp) * (1 - weft)
        self.area += float(inside.sum(dtype=np.float64))
        self.covered += float(((1 - bare) * inside).sum(dtype=np.float64))
        self.with_hairs += float(((1 - bare * (1 - hidden)) * inside).sum(dtype=np.float64))
        self.warp += float((warp * inside).sum(dtype=np.float64))
        self.weft += float((weft * inside).sum(dtype=np.float64))
        if self.kept < MOST_PORE_POINTS:
            self.masks.append(((bare > 0.5) & (inside > 0)).astype(np.uint8))
            self.kept += bare.size

    def pores(self, point_mm2: float) -> tuple[float, float, float]:
        """Give number per cm², mean and largest area, mm², of the pores wholly inside."""
        bare = np.concatenate(self.masks)
        found, _, stats, _ = cv2.connectedComponentsWithStats(bare, connectivity=4)
        left, top, wide, high, area = stats[1:found].T
        rows, columns = bare.shape
        whole = (left > 0) & (top > 0) & (left + wide < columns) & (top + high < rows)
        areas = area[whole] * point_mm2
        if areas.size == 0:
            return 0.0, 0.0, 0.0
        field_cm2 = rows * columns * point_mm2 / 100
        # pores cut by the frame count half, as on a counting chamber
        number = (areas.size + 0.5 * (area.size - areas.size)) / field_cm2
        return float(number), float(areas.mean()), float(areas.max())


__all__ = ["Tally", "Truth"]
