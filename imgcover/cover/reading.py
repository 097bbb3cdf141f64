"""What a reading of the cover holds."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding
from imgcover.quantity import Measured


class Lit(Protocol):
    """A picture that gives its linear light window by window (`imgcover.picture` or an array)."""

    @property
    def rows(self) -> int:
        """Height, px."""

    @property
    def columns(self) -> int:
        """Width, px."""

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Linear light 0…1 of the window, of the whole picture when None."""


@dataclass(frozen=True, slots=True)
class Lattice:
    """The thread lattice in the pixel frame.

    Parameters
    ----------
    ends, picks : tuple of float
        (fx, fy), cycles per pixel, of the repeat of one end and of one pick.
    """

    ends: tuple[float, float]
    picks: tuple[float, float]


@dataclass(frozen=True, slots=True)
class Pitch:
    """How many pixels make a millimetre, across (x) and down (y) the shown picture."""

    x: Measured
    y: Measured


@dataclass(frozen=True, slots=True)
class Pores:
    """The openings between the threads.

    Parameters
    ----------
    counted : int
        Pores wholly inside the measured windows.
    per_cm2 : Measured or None
        Number a square centimetre; None without a scale.
    width, height : Measured or None
        Mean open width (across, between ends) and height (between picks), mm; None without scale.
    width_px, height_px : float or None
        The same in pixels.
    areas : tuple of float
        The 5th, 25th, 50th, 75th and 95th percentile of the pore area, px² or mm² as `unit` says.
    largest : float
        The largest pore, in the same unit.
    unit : str
        "mm2", or "px2" without a scale.
    blocked, merged : float or None
        Share of the lattice's pores that are shut, and share of the counted pores that span more
        than one place of the lattice; None without a lattice.
    """

    counted: int
    per_cm2: Measured | None
    width: Measured | None
    height: Measured | None
    width_px: float | None
    height_px: float | None
    areas: tuple[float, float, float, float, float]
    largest: float
    unit: str
    blocked: float | None
    merged: float | None


@dataclass(frozen=True, slots=True, eq=False)
class LightField:
    """The bare light behind the cloth, as a surface over the picture.

    Parameters
    ----------
    source : str
        "blank", "bare light" or "open pores".
    values : ndarray, shape (rows, columns), float32, linear light
        The light at the nodes of a coarse, even grid whose corners are the picture's corners.
    u_relative : float
        Standard uncertainty of the level, relative.
    """

    source: str
    values: NDArray[np.float32]
    u_relative: float


@dataclass(frozen=True, slots=True, eq=False)
class Seen:
    """One window as it was classed, for the overlay.

    Parameters
    ----------
    row, column : int
        Where its first pixel lies in the picture.
    open_share : ndarray, shape (rows, columns), float32, 0…1
        How much of each pixel is open.
    inside : ndarray, shape (rows, columns), bool
        What was measured; the rest was masked.
    """

    row: int
    column: int
    open_share: NDArray[np.float32]
    inside: NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Histogram:
    """Transmitted light over the light field, with the levels found in it.

    Parameters
    ----------
    edges : ndarray, shape (n + 1,), float64
        Limits of the bins, fraction of the light field.
    counts : ndarray, shape (n,), int64
        Pixels in each.
    """

    edges: NDArray[np.float64]
    counts: NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class CoverReading:
    """The cover of the field, or the reason why there is none.

    Covers are fractions 0…1 of the area; what could not be measured is None and a finding says
    why. Levels are fractions of the light field.

    Parameters
    ----------
    optical : Measured or None
        The reported cover.
    threshold, two_level : Measured or None
        The two witnesses: the area outside the half-level edge, and the cover by intensities.
    upper_bound_open : Measured or None
        Nearly shut cloth: the open area is below `value + 2 u`; otherwise None.
    warp, weft : Measured or None
        Each system's own share of the width, d/p as seen.
    yarn_transmittance : Measured or None
        Mean light through the covered area, over the light field.
    pores : Pores or None
    light_field : LightField or None
    open_level, yarn_level, threshold_level : float or None
        Fractions of the light field.
    blur_px : float or None
        Standard deviation of the blur, px.
    mean_cell : ndarray or None, shape (n, n), float32
        Open share over one thread cell: rows run along the ends, columns along the picks.
    seen : tuple of Seen
    histogram : Histogram or None
    findings : tuple of Finding
    """

    optical: Measured | None = None
    threshold: Measured | None = None
    two_level: Measured | None = None
    upper_bound_open: Measured | None = None
    warp: Measured | None = None
    weft: Measured | None = None
    yarn_transmittance: Measured | None = None
    pores: Pores | None = None
    light_field: LightField | None = None
    open_level: float | None = None
    yarn_level: float | None = None
    threshold_level: float | None = None
    blur_px: float | None = None
    mean_cell: NDArray[np.float32] | None = None
    seen: tuple[Seen, ...] = ()
    histogram: Histogram | None = None
    findings: tuple[Finding, ...] = ()


__all__ = [
    "CoverReading",
    "Histogram",
    "Lattice",
    "LightField",
    "Lit",
    "Pitch",
    "Pores",
    "Seen",
]
