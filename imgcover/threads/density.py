"""From threads in pixels to threads a centimetre: the one place where counting meets the scale."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from imgcover.quantity import Measured
from imgcover.scale.scale import Scale
from imgcover.threads.reading import ThreadReading, ThreadSet

PER_CM = 10.0
"""Wave vectors are 1/mm here; densities are told by the centimetre."""

Warp = Literal["vertical", "horizontal"]
Vector = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Density:
    """Densities and directions of one field.

    Parameters
    ----------
    ends, picks : Measured or None
        Threads at right angles to themselves, 1/cm; u of this field's count and of the scale.
    angle : Measured or None
        Turn of the ends from the way the warp was said to run, clockwise as shown, deg.
    skew : Measured or None
        Further clockwise turn of the picks, away from the right angle to the ends, deg.
    bow : Measured or None
        Arc height of the picks over their chord in this field, signed as `ThreadSet.bow`.
    length_ends_mm, length_picks_mm : float or None
        The length over which each set was counted, at right angles to it.
    scale_u : float
        The part of the densities' relative u that the scale brings: common to all pictures that
        share it. The larger of the two sets'.
    """

    ends: Measured | None
    picks: Measured | None
    angle: Measured | None
    skew: Measured | None
    bow: Measured | None
    length_ends_mm: float | None
    length_picks_mm: float | None
    scale_u: float


def density_of(reading: ThreadReading, scale: Scale, *, warp: Warp) -> Density:
    """Apply a scale to what was counted.

    Parameters
    ----------
    reading : ThreadReading
        In the pixel frame.
    scale : Scale
        Along the shown axes; x and y may differ, so every vector is scaled by component.
    warp : {"vertical", "horizontal"}
        How the warp was said to run.
    """
    ends, picks = reading.ends, reading.picks
    turn_ends = None if ends is None else _turn(ends, scale, upright=warp == "vertical")
    turn_picks = None if picks is None else _turn(picks, scale, upright=warp == "horizontal")
    skew = None
    if turn_ends is not None and turn_picks is not None:
        difference = _half_turn(turn_picks.value - turn_ends.value)
        skew = Measured(difference, math.hypot(turn_ends.u, turn_picks.u), "deg")
    return Density(
        ends=None if ends is None else _density(ends, scale),
        picks=None if picks is None else _density(picks, scale),
        angle=turn_ends,
        skew=skew,
        bow=_bow(ends, picks, scale),
        length_ends_mm=None if ends is None else _length_mm(ends, scale),
        length_picks_mm=None if picks is None else _length_mm(picks, scale),
        scale_u=max(
            (scale_u(each, scale) for each in (ends, picks) if each is not None), default=0.0
        ),
    )


def scale_u(threads: ThreadSet, scale: Scale) -> float:
    """Relative u that the scale brings to the density of a set.

    Notes
    -----
    ρ² = X² + Y² with X = fx·sx and Y = fy·sy, so dρ/ρ = (X/ρ)² dsx/sx + (Y/ρ)² dsy/sy. The
    covariance of both axes follows from their own u and that of their ratio (JCGM 100, 5.2.2).
    """
    x, y = _in_mm(threads, scale)
    share_x = x * x / (x * x + y * y)
    share_y = 1.0 - share_x
    u_x, u_y = scale.x.u / scale.x.value, scale.y.u / scale.y.value
    covariance = (u_x**2 + u_y**2 - scale.ratio_u**2) / 2
    variance = (share_x * u_x) ** 2 + (share_y * u_y) ** 2 + 2 * share_x * share_y * covariance
    return math.sqrt(max(variance, 0.0))


def _in_mm(threads: ThreadSet, scale: Scale) -> Vector:
    """The wave vector in cycles per mm."""
    return threads.frequency[0] * scale.x.value, threads.frequency[1] * scale.y.value


def _density(threads: ThreadSet, scale: Scale) -> Measured:
    value = PER_CM * math.hypot(*_in_mm(threads, scale))
    return Measured(value, value * math.hypot(threads.u_relative, scale_u(threads, scale)), "1/cm")


def _length_mm(threads: ThreadSet, scale: Scale) -> float:
    """Threads over density: the length that the count and the density have in common."""
    return threads.counted / math.hypot(*_in_mm(threads, scale))


def _turn(threads: ThreadSet, scale: Scale, *, upright: bool) -> Measured:
    """How far a set is turned, clockwise as shown, from upright or from level.

    Notes
    -----
    A phase followed over a field gives the wave vector's two components alike well, so its
    direction is as sure, in rad, as its length is relatively.
    """
    x, y = _in_mm(threads, scale)
    turn = math.atan2(y, x) if upright else math.atan2(-x, y)
    from_ratio = abs(math.sin(turn) * math.cos(turn)) * scale.ratio_u
    u = math.hypot(threads.u_relative, from_ratio)
    return Measured(_half_turn(math.degrees(turn)), math.degrees(u), "deg")


def _half_turn(degrees: float) -> float:
    """Bring the direction of a line into −90 … 90 degrees, 90 included."""
    return 90.0 - (90.0 - degrees) % 180.0


def _bow(ends: ThreadSet | None, picks: ThreadSet | None, scale: Scale) -> Measured | None:
    """Bow of the picks over the width of the field, with what the phase leaves open of it.

    Notes
    -----
    The count's u, in threads, is the u of a place; an arc height is read from such places, and is
    told over the chord.
    """
    if ends is None or picks is None or picks.bow is None:
        return None
    height, width = _length_mm(picks, scale), _length_mm(ends, scale)
    return Measured(picks.bow, picks.u_relative * height / width, "1")


__all__ = ["Density", "Warp", "density_of", "scale_u"]
