"""What the threads room says about one field, in the pixel frame (no scale applied yet)."""

from __future__ import annotations

import math
from dataclasses import dataclass

from imgcover.findings import Finding


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
    bow : float or None
        Arc height over chord of these threads, signed (+ bulges towards +row or +column), or None
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
    bow: float | None

    @property
    def pixels_a_thread(self) -> float:
        """Distance between neighbouring threads, at right angles to them."""
        return 1.0 / math.hypot(*self.frequency)


@dataclass(frozen=True, slots=True)
class ThreadReading:
    """Ends and picks of one field, or the reasons why not.

    Parameters
    ----------
    ends, picks : ThreadSet or None
        None where a set could not be counted; a finding says why.
    phase : tuple of float
        (ends, picks) in cycles: the phase of each lattice at pixel (0, 0); a thread's centre
        lies where frequency · (x, y) + phase is an integer, as far as phase can tell.
    tiles : tuple of Tile
        The field's pieces, used and left out.
    repeat : tuple of int or None
        (ends, picks) in the smallest repeat the spectrum shows.
    findings : tuple of Finding
        Refusals and warnings.
    """

    ends: ThreadSet | None
    picks: ThreadSet | None
    phase: tuple[float, float]
    tiles: tuple[Tile, ...]
    repeat: tuple[int, int] | None
    findings: tuple[Finding, ...]


__all__ = ["ThreadReading", "ThreadSet", "Tile"]
