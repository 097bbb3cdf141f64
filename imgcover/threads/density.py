"""From counts over pixels to threads a centimetre: where the scale meets the threads."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.scale import Scale
from imgcover.threads.reading import Fork, ThreadReading, ThreadSet

CM_PER_INCH = 2.54


@dataclass(frozen=True, slots=True)
class Density:
    """Ends and picks in lengths, and how the two sets lie.

    Parameters
    ----------
    ends, picks : Measured or None
        Threads a centimetre at right angles to them; u is of this field's count and the scale.
    angle : Measured or None
        Degrees the ends are turned from where the warp was said to run, clockwise as shown.
    skew : Measured or None
        Degrees the picks are turned from the right angle to the ends, clockwise as shown.
    bow : Measured or None
        Height of the picks' arc over its chord in this field, + where the middle lies lower (or
        farther right, for a warp that runs across).
    length_ends_mm, length_picks_mm : float or None
        Distances over which the threads were counted.
    ends_forks, picks_forks : tuple of float
        Where two readings stayed possible: both, threads a centimetre.
    findings : tuple of Finding
        Refusals that need a length to be said.
    """

    ends: Measured | None
    picks: Measured | None
    angle: Measured | None
    skew: Measured | None
    bow: Measured | None
    length_ends_mm: float | None
    length_picks_mm: float | None
    ends_forks: tuple[float, ...]
    picks_forks: tuple[float, ...]
    findings: tuple[Finding, ...]


def density_of(
    reading: ThreadReading, scale: Scale, *, warp: Literal["vertical", "horizontal"]
) -> Density:
    """Put a scale to a reading of the threads.

    Parameters
    ----------
    reading : ThreadReading
        Counts in the pixel frame.
    scale : Scale
        Pixels a millimetre along x and y.
    warp : {"vertical", "horizontal"}
        How the warp was said to run.
    """
    ends = None if reading.ends is None else _per_cm(reading.ends, scale)
    picks = None if reading.picks is None else _per_cm(reading.picks, scale)
    across = warp == "vertical"
    end_turn = None if reading.ends is None else _turn(reading.ends, scale, across=across)
    pick_turn = None if reading.picks is None else _turn(reading.picks, scale, across=not across)
    skew = None
    if end_turn is not None and pick_turn is not None:
        stretch = math.degrees(scale.ratio_u) * abs(math.sin(2 * math.radians(end_turn.value)))
        u = math.hypot(end_turn.u, pick_turn.u, stretch)
        skew = Measured(pick_turn.value - end_turn.value, u, "deg")
    forks = {name: _fork_values(reading.forks, name, scale) for name in ("ends", "picks")}
    return Density(
        ends,
        picks,
        end_turn,
        skew,
        _bow(reading.picks, scale, across=across),
        _length_mm(reading.ends, ends),
        _length_mm(reading.picks, picks),
        forks["ends"],
        forks["picks"],
        tuple(_fork_said(name, values) for name, values in forks.items() if values),
    )


def _vector(frequency: tuple[float, float], scale: Scale) -> tuple[float, float]:
    """Cycles per mm."""
    return frequency[0] * scale.x.value, frequency[1] * scale.y.value


def _per_cm(threads: ThreadSet, scale: Scale) -> Measured:
    """Length of the wave vector, with the scale's part of u.

    Notes
    -----
    ln density changes by cos² of the direction for x and sin² for y. What the two axes have in
    common follows from the u of each and of their ratio (JCGM 100, 5.2.2).
    """
    fx, fy = _vector(threads.frequency, scale)
    per_mm = math.hypot(fx, fy)
    a, b = (fx / per_mm) ** 2, (fy / per_mm) ** 2
    ux, uy = scale.x.u / scale.x.value, scale.y.u / scale.y.value
    common = (ux**2 + uy**2 - scale.ratio_u**2) / 2
    variance = (a * ux) ** 2 + (b * uy) ** 2 + 2 * a * b * common
    relative = math.hypot(threads.u_relative, math.sqrt(max(0.0, variance)))
    return Measured(10 * per_mm, 10 * per_mm * relative, "1/cm")


def _turn(threads: ThreadSet, scale: Scale, *, across: bool) -> Measured:
    """Turn of threads from the vertical (across) or the horizontal, degrees clockwise."""
    fx, fy = _vector(threads.frequency, scale)
    turn = math.atan2(fy, fx) if across else math.atan2(-fx, fy)
    # a phase error of the edges turns the threads as much as it stretches them
    u = math.hypot(threads.u_relative, 0.5 * scale.ratio_u * math.sin(2 * turn))
    return Measured(math.degrees(turn), math.degrees(u), "deg")


def _bow(picks: ThreadSet | None, scale: Scale, *, across: bool) -> Measured | None:
    if picks is None or picks.bow is None:
        return None
    stretch = scale.x.value / scale.y.value if across else scale.y.value / scale.x.value
    return picks.bow.times(stretch, "1")


def _length_mm(threads: ThreadSet | None, density: Measured | None) -> float | None:
    if threads is None or density is None:
        return None
    return 10 * threads.counted / density.value


def _fork_values(forks: tuple[Fork, ...], name: str, scale: Scale) -> tuple[float, ...]:
    for fork in forks:
        if fork.set_name == name:
            return tuple(10 * float(np.hypot(*_vector(f, scale))) for f in fork.frequencies)
    return ()


def _fork_said(name: str, values: tuple[float, ...]) -> Finding:
    readings = " or ".join(f"{v:.1f} a cm ({v * CM_PER_INCH:.1f} an inch)" for v in values)
    return found(Flag.TWO_READINGS, f"two readings of the {name} stay possible: {readings}")


__all__ = ["Density", "density_of"]
