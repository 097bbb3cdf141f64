"""The light across one thread, all threads folded into one, and what it says of its neighbours.

Demodulated at a multiple of the thread frequency and turned back by the followed phase, every
thread of the field adds up in step and noise does not. A true thread is one ridge a period and its
own line outweighs the next multiples; half a pair is two ridges and a strong second multiple.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from imgcover.repeat.phase import Transformed, demodulate
from imgcover.repeat.spectrum import HIGHEST_FREQUENCY
from imgcover.threads.follow import Followed

SUBMULTIPLES = tuple(Fraction(1, m) for m in (2, 3, 4))
"""Broken multiples tried: pairs and ribs, dents of two to four."""

THIRDS = (Fraction(2, 3), Fraction(3, 2))
"""Tried too: wide pairs are loudest at the third multiple of the pair, and are two thirds of it."""

MULTIPLES = (Fraction(2), Fraction(3), Fraction(4))
"""Whole multiples tried: a repeat taken for a thread."""

STEEPNESS = 0.6
"""A line's weight grows with its frequency to this power. On drawn cloth with counted threads the
second multiple reaches 0.62 of the thread's own amplitude (sharp open pores) and a two-colour
hopsack's half line 1.72 times; this power keeps both below or near the thread's."""

AMBIGUOUS = 1.6
"""Two readings whose weights differ by less than this are told apart by their ridges."""

LOUD_THIRD = 0.6
"""Share of the strongest line's amplitude from which on a line at a third of its frequency asks for
the ridges to be counted: pairs set wide apart are loudest at the third multiple of the pair."""

SILENT = 0.12
"""Share of the strongest line's amplitude below which an axis says nothing of its own."""

PLAIN_RIDGE = 0.3
"""A second ridge counts when it rises by this share of the profile's range. In 400 drawn sets the
second thread of a pair rises by 0.35 at the least; the shading of a single broad one by 0.23."""

FAINT_RIDGE = 0.15
"""Below this there is no second ridge; between the two the readings cannot be told apart. Single
threads rise again by up to 0.13 beside their crest, pairs taken for one thread by 0.44 or more."""


@dataclass(frozen=True, slots=True)
class Multiple:
    """Which multiple of a wave vector is the thread's.

    Parameters
    ----------
    factor : Fraction
        1 where the wave vector was right.
    rival : Fraction or None
        Another multiple that cannot be ruled out.
    amplitude : float
        Coherent amplitude of the thread's own line, in standard deviations of the field.
    noise : float
        What that amplitude would be if no thread were there.
    halved, doubled : float
        Amplitudes of the lines at half and at twice the frequency over the thread's own: of pairs.
    """

    factor: Fraction
    rival: Fraction | None
    amplitude: float
    noise: float
    halved: float
    doubled: float


def amplitudes(
    field: Transformed,
    followed: Followed,
    phase: NDArray[np.float64],
    vector: tuple[float, float],
    *,
    sigma: float,
    multiples: tuple[Fraction, ...],
) -> tuple[NDArray[np.complex128], float]:
    """Coherent amplitudes at multiples of a thread set's wave vector.

    Returns
    -------
    values : ndarray, shape (multiples,), complex128
        0 beyond the highest frequency that can be told.
    noise : float
        Typical size of such a value where there is nothing.
    """
    out = np.zeros(len(multiples), np.complex128)
    scatter = []
    for k, multiple in enumerate(multiples):
        h = float(multiple)
        if h * math.hypot(*vector) > HIGHEST_FREQUENCY:
            continue
        values, _ = demodulate(field, (h * vector[0], h * vector[1]), sigma=sigma)
        rows, columns = phase.shape
        values = values[:rows, :columns]
        valid = followed.valid[: values.shape[0], : values.shape[1]]
        turns = h * phase[: values.shape[0], : values.shape[1]][valid]
        chosen = values[valid] * np.exp(-2j * np.pi * turns)
        out[k] = chosen.mean()
        # neighbouring places share about half their smoothing
        scatter.append(float(np.abs(chosen - out[k]).std()) / math.sqrt(max(1.0, chosen.size / 3)))
    return out, float(np.median(scatter)) if scatter else math.inf


def which_multiple(
    field: Transformed,
    followed: Followed,
    phase: NDArray[np.float64],
    vector: tuple[float, float],
    *,
    sigma: float,
    parts: int,
) -> Multiple:
    """Ask the folded profile whether the wave vector is the thread's, or a part or multiple.

    Parameters
    ----------
    parts : int
        How many times the pattern's lattice divides the wave vector (`Candidate.parts`).

    Notes
    -----
    In two-colour plain cloth both lines of an axis are all but silent beside the diagonals; there
    the lattice alone speaks, and only where it does not divide the vector.
    """
    tried = tuple(
        sorted(
            {*SUBMULTIPLES, *THIRDS, Fraction(1), *MULTIPLES}
            | {Fraction(k, parts) for k in range(1, 2 * parts)}
        )
    )
    values, noise = amplitudes(field, followed, phase, vector, sigma=sigma, multiples=tried)
    size = np.abs(values)
    weight = size * np.array([float(h) for h in tried]) ** STEEPNESS
    own = tried.index(Fraction(1))
    if size.max() < max(5 * noise, SILENT * followed.loudest):
        rival = None if parts == 1 else Fraction(1, parts)
        return Multiple(Fraction(1), rival, float(size[own]), noise, 0.0, 0.0)
    best = int(weight.argmax())
    factor = tried[best]
    halved, doubled = (
        float(size[tried.index(each)] / size[best]) if each in tried else 0.0
        for each in (factor / 2, 2 * factor)
    )
    near = [k for k in range(len(tried)) if k != best and weight[k] * AMBIGUOUS > weight[best]]
    third = tried.index(factor / 3) if factor / 3 in tried else best
    if third != best and size[third] > LOUD_THIRD * size[best] and third not in near:
        near.append(third)
    for k in sorted(near, key=lambda k: -weight[k]):
        if size[k] < 5 * noise:
            continue
        base = _common(tried[k], factor)
        said = _ridges(field, followed, phase, vector, sigma, base)
        if said == factor / base:
            continue
        if said == tried[k] / base and tried[k] < factor:
            # fewer threads than the louder line has waves, each with a crest and a shoulder
            return Multiple(tried[k], None, float(size[k]), noise, 0.0, 0.0)
        # the stronger line must be borne out by the threads seen, or neither reading is given
        rival = tried[k] if said is None or said * base == factor else said * base
        return Multiple(factor, rival, float(size[best]), noise, halved, doubled)
    return Multiple(factor, None, float(size[best]), noise, halved, doubled)


def _common(one: Fraction, other: Fraction) -> Fraction:
    """The largest fraction that both are whole multiples of."""
    below = math.lcm(one.denominator, other.denominator)
    return Fraction(math.gcd(int(one * below), int(other * below)), below)


def _ridges(
    field: Transformed,
    followed: Followed,
    phase: NDArray[np.float64],
    vector: tuple[float, float],
    sigma: float,
    base: Fraction,
) -> int | None:
    """Count the ridges in one period of a multiple; None where that is unsure."""
    harmonics = tuple(base * k for k in range(1, 9))
    values, _ = amplitudes(field, followed, phase, vector, sigma=sigma, multiples=harmonics)
    turns = np.outer(np.arange(1, 9), np.arange(96) / 96)
    profile = (values[:, None] * np.exp(2j * np.pi * turns)).real.sum(axis=0)
    counts = [ridges_in(side, share=PLAIN_RIDGE) for side in (profile, -profile)]
    faint = [ridges_in(side, share=FAINT_RIDGE) for side in (profile, -profile)]
    if max(faint) == 1:
        return 1
    return max(counts) if max(counts) > 1 else None


def ridges_in(profile: NDArray[np.float64], *, share: float) -> int:
    """Count the ridges of one closed period.

    Parameters
    ----------
    profile : ndarray, shape (places,), float64
        Light along one period; its end meets its beginning.
    share : float
        A ridge counts when the light rises to it, and falls from it again, by this share of the
        profile's range.
    """
    least = share * float(np.ptp(profile))
    if least <= 0:
        return 0
    lowest = int(profile.argmin())
    ridges, rising = 0, True
    turn = float(profile[lowest])
    for light in (*np.roll(profile, -lowest).tolist(), turn):
        turn = max(turn, light) if rising else min(turn, light)
        if abs(light - turn) >= least:
            ridges += rising
            rising, turn = not rising, light
    return ridges


__all__ = ["Multiple", "amplitudes", "ridges_in", "which_multiple"]
