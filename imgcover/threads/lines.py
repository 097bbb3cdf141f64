"""Which spectral lines carry the phase of a candidate's threads."""

from __future__ import annotations

import itertools
import math

import numpy as np

from imgcover.repeat.spectrum import HIGHEST_FREQUENCY, Peak, Spectrum
from imgcover.threads.candidates import Candidate
from imgcover.threads.follow import Line
from imgcover.threads.witness import excess_at

MOST_LINES = 8
"""More add cost and little weight."""

FARTHEST = 2.01
"""Thread units: beyond the second multiple a phase wraps too early to be followed safely."""

LEAST_EXCESS = 2.0
"""ln(power over floor) a line needs to be followed."""


def lines_of(one: Candidate, of: Spectrum) -> list[Line]:
    """List the lattice's lines that stand out, strongest first.

    Parameters
    ----------
    one : Candidate
        Wave vectors of ends and picks, and the lattice they lie on.
    of : Spectrum
        The field's averaged power.

    Returns
    -------
    list of Line
        At most MOST_LINES; the threads' own two lines are among them where they stand out.
    """
    found = []
    for at in itertools.product(range(-8, 9), repeat=2):
        frequency = one.lattice.basis @ np.array(at)
        fx, fy = float(frequency[0]), float(frequency[1])
        if not 0.01 < math.hypot(fx, fy) < HIGHEST_FREQUENCY or (fy, fx) <= (0.0, 0.0):
            continue
        h, v = np.linalg.solve(one.basis, frequency) * one.index
        h, v = round(float(h)) / one.index, round(float(v)) / one.index
        if max(abs(h), abs(v)) > FARTHEST or min(abs(h) + abs(v), 9) < 0.3:
            continue
        excess, level = excess_at(of, one.basis @ np.array([h, v]))
        if excess > LEAST_EXCESS:
            found.append(Line(h, v, excess, level))
    found.sort(key=lambda each: (-each.level, each.h, each.v))
    own = [each for each in found if (abs(each.h), abs(each.v)) in ((1.0, 0.0), (0.0, 1.0))]
    rest = [each for each in found if each not in own]
    return sorted((own + rest)[:MOST_LINES], key=lambda each: -each.level)


def refined(one: Candidate, peaks: list[Peak], *, tolerance: float) -> Candidate:
    """Fit the two wave vectors to all peaks that lie on the candidate's lattice."""
    positions = np.array([(each.fx, each.fy) for each in peaks])
    at = np.linalg.solve(one.basis, positions.T).T
    nearest = np.round(at * one.index) / one.index
    misses = np.hypot(*(nearest @ one.basis.T - positions).T)
    use = (misses < tolerance + 0.004 * np.hypot(*positions.T)) & (
        np.abs(nearest).max(axis=1) <= FARTHEST
    )
    root = np.sqrt(np.exp([0.5 * each.level for each in peaks]))[use, None]
    if np.linalg.matrix_rank(nearest[use]) < 2:
        return one
    (ends, picks), *_ = np.linalg.lstsq(nearest[use] * root, positions[use] * root, rcond=None)
    return Candidate(
        (float(ends[0]), float(ends[1])),
        (float(picks[0]), float(picks[1])),
        one.index,
        one.parts,
        one.lattice,
    )


__all__ = ["lines_of", "refined"]
