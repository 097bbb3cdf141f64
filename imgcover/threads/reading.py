"""What the threads room says about one field, in the pixel frame (no scale applied yet)."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding
from imgcover.quantity import Measured


@dataclass(frozen=True, slots=True)
class Tile:
    """One piece of the field: where it lies, whether it was counted, and why not."""

    x: int
    y: int
    width: int
    height: int
    used: bool
    reason: str


@dataclass(frozen=True, slots=True)
class ThreadSet:
    """One set of parallel threads, counted over the field.

    Parameters
    ----------
    frequency : tuple of float
        (fx, fy), cycles per pixel: the mean wave vector of the threads; it points across them.
    counted : float
        Threads between the first and the last place where they were followed.
    length_px : float
        The distance over which they were counted, at right angles to the threads.
    u_relative : float
        Relative standard uncertainty of this field's density, without the scale.
    components : dict of str to float
        The parts u_relative is made of, each relative.
    local_scatter : float
        Relative standard deviation of the density between places of the field.
    local_low, local_high : float
        Extremes of the local density over the mean.
    parts : int
        How many places side by side, each with threads of its own, the scatter was taken over.
    bow : Measured or None
        Arc height over chord of these threads, signed (+ where the
        middle lies beyond the ends along the wave vector), or None
        where fewer than three places along the chord could be read.
    """

    frequency: tuple[float, float]
    counted: float
    length_px: float
    u_relative: float
    components: dict[str, float]
    local_scatter: float
    local_low: float
    local_high: float
    parts: int
    bow: Measured | None

    @property
    def pixels_a_thread(self) -> float:
        """Distance between neighbouring threads, at right angles to them."""
        return 1.0 / math.hypot(*self.frequency)


@dataclass(frozen=True, slots=True, eq=False)
class Track:
    """Where the threads run: their phase at places of the field.

    Parameters
    ----------
    x, y : ndarray, shapes (columns of the grid,) and (rows of the grid,), float64
        Places in picture pixels.
    ends, picks : ndarray, shape (rows of the grid, columns of the grid), float64
        Phase in cycles. Whole numbers lie on the lightest line of each thread or, where the gaps
        are the lightest (cloth before light), between two threads.
    valid : ndarray, shape of the grid, bool
        Where the phase was followed.
    """

    x: NDArray[np.float64]
    y: NDArray[np.float64]
    ends: NDArray[np.float64]
    picks: NDArray[np.float64]
    valid: NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Fork:
    """Two readings of one set that the picture cannot tell apart.

    Parameters
    ----------
    set_name : str
        "ends" or "picks".
    frequencies : tuple of two (fx, fy)
        Wave vectors of both readings, cycles per pixel.
    """

    set_name: str
    frequencies: tuple[tuple[float, float], tuple[float, float]]


@dataclass(frozen=True, slots=True)
class ThreadReading:
    """Ends and picks of one field, or the reasons why not.

    Parameters
    ----------
    ends, picks : ThreadSet or None
        None where a set could not be counted; a finding says why.
    track : Track or None
        The followed phases, for drawing the threads and for folding them into one.
    tiles : tuple of Tile
        The field's pieces, used and left out.
    repeat : tuple of int or None
        (ends, picks) in the repeat of the regular weave whose lines the spectrum shows.
    forks : tuple of Fork
        Sets that were refused because two readings stay possible.
    findings : tuple of Finding
        Refusals and warnings.
    """

    ends: ThreadSet | None
    picks: ThreadSet | None
    track: Track | None
    tiles: tuple[Tile, ...]
    repeat: tuple[int, int] | None
    forks: tuple[Fork, ...]
    findings: tuple[Finding, ...]


__all__ = ["Fork", "ThreadReading", "ThreadSet", "Tile", "Track"]
