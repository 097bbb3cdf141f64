"""One reciprocal lattice under all that repeats in a field."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.repeat.spectrum import Peak

BASIS_PEAKS = 10
"""Pairs are drawn from this many of the strongest peaks; a cloth shows two of its own in these."""

LARGEST_INDEX = 6
"""Highest multiple of a basis vector a peak is looked for at; beyond it lines drown in noise."""


NARROWEST = 0.05
"""Sine of the angle between two peaks (3 degrees) below which they are multiples of one wave."""


@dataclass(frozen=True, slots=True)
class Lattice:
    """A reciprocal lattice and how much of the spectrum it accounts for.

    Parameters
    ----------
    first, second : tuple of float
        A reduced basis, cycles per pixel.
    explained : float
        Share of the peaks' weight that lies on it, less what would by chance, 0…1.
    """

    first: tuple[float, float]
    second: tuple[float, float]
    explained: float

    @property
    def basis(self) -> NDArray[np.float64]:
        """Columns are the basis vectors."""
        return np.array([self.first, self.second]).T

    @property
    def cell(self) -> float:
        """Area of the primitive cell, (cycles per pixel)²."""
        return abs(self.first[0] * self.second[1] - self.first[1] * self.second[0])

    @property
    def shortest(self) -> float:
        """Length of the shortest lattice vector: how near two lines can lie."""
        return min(math.hypot(*self.first), math.hypot(*self.second))


def weights_of(peaks: list[Peak]) -> NDArray[np.float64]:
    """How much each peak says.

    Its excess over the floor, capped so that none drowns the rest, and less the weaker it is beside
    the strongest: a picture's grain has many weak peaks of its own. Strength is that of the slope
    of the light, not of the light, since broad shades and stripes are strong and are no threads.
    """
    strength = np.array([each.level + 2 * np.log(np.hypot(each.fx, each.fy)) for each in peaks])
    excess = np.array([min(each.excess, 7.0) for each in peaks])
    return np.asarray(excess * np.exp(0.35 * (strength - strength.max())))


def fit_lattices(peaks: list[Peak], *, tolerance: float, most: int) -> list[Lattice]:
    """Find the lattices that account for the peaks best.

    Parameters
    ----------
    peaks : list of Peak
        Strongest first.
    tolerance : float
        How far a peak may lie from its lattice point, cycles per pixel.
    most : int
        How many lattices to keep.

    Returns
    -------
    list of Lattice
        Best first; empty when fewer than two peaks point in different directions.

    Notes
    -----
    A fine enough lattice passes near anything. So each peak's weight counts less the chance
    π·tolerance² / cell that a random peak would hit: the coarsest lattice that holds them wins.
    """
    positions = np.array([(each.fx, each.fy) for each in peaks]).reshape(-1, 2)
    weights = weights_of(peaks)
    found: list[Lattice] = []
    for one, two in itertools.combinations(range(min(len(peaks), BASIS_PEAKS)), 2):
        reduced = _reduced(positions[one], positions[two])
        if reduced is None or math.sqrt(_area(reduced)) < 4 * tolerance:
            continue
        lattice = _refined(reduced, positions, weights, tolerance)
        if lattice is not None and not any(_same(lattice, each, tolerance) for each in found):
            found.append(lattice)
    found.sort(key=lambda each: -each.explained)
    return found[:most]


def _reduced(first: NDArray[np.float64], second: NDArray[np.float64]) -> NDArray[np.float64] | None:
    """Lagrange's reduction: the two shortest vectors, as columns; None where they are parallel."""
    # thousands of these a picture: plain numbers are ten times as fast as arrays of two
    (ax, ay), (bx, by) = first.tolist(), second.tolist()
    if abs(ax * by - ay * bx) < NARROWEST * math.hypot(ax, ay) * math.hypot(bx, by):
        return None
    while True:
        if ax * ax + ay * ay > bx * bx + by * by:
            ax, ay, bx, by = bx, by, ax, ay
        times = round((ax * bx + ay * by) / (ax * ax + ay * ay))
        if times == 0:
            return np.array([[ax, bx], [ay, by]])
        bx, by = bx - times * ax, by - times * ay


def _area(basis: NDArray[np.float64]) -> float:
    (ax, bx), (ay, by) = basis.tolist()
    area: float = abs(ax * by - ay * bx)
    return area


def _refined(
    basis: NDArray[np.float64],
    positions: NDArray[np.float64],
    weights: NDArray[np.float64],
    tolerance: float,
) -> Lattice | None:
    """Fit the basis to all peaks it indexes, then weigh what it explains."""
    for _ in range(3):
        indices, on = index(basis, positions, tolerance)
        solved = _least_squares(indices[on], positions[on], weights[on])
        again = None if solved is None else _reduced(solved[0], solved[1])
        if again is None:
            return None
        basis = again
    _, on = index(basis, positions, tolerance)
    chance = min(1.0, math.pi * tolerance**2 / _area(basis))
    explained = float((weights * (on - chance)).sum() / weights.sum())
    first, second = basis.T.tolist()
    return Lattice((first[0], first[1]), (second[0], second[1]), explained)


def _least_squares(
    indices: NDArray[np.float64], positions: NDArray[np.float64], weights: NDArray[np.float64]
) -> NDArray[np.float64] | None:
    """Fit two vectors, as rows, to peaks of known indices; None where these lie on one line."""
    (ii, ij), (_, jj) = (indices.T @ indices).tolist()
    if ii * jj == ij * ij:  # whole numbers: exact
        return None
    weighed = indices * weights[:, None]
    (ii, ij), (_, jj) = (weighed.T @ indices).tolist()
    inverse = np.array([[jj, -ij], [-ij, ii]]) / (ii * jj - ij * ij)
    return np.asarray(inverse @ (weighed.T @ positions), np.float64)


def index(
    basis: NDArray[np.float64], positions: NDArray[np.float64], tolerance: float
) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Give each peak its nearest lattice point.

    Returns
    -------
    indices : ndarray, shape (peaks, 2), float64
        Whole numbers.
    on : ndarray, shape (peaks,), bool
        Whether the peak lies within the tolerance, which grows 0.6 % of the peak's own frequency:
        skew and bow spread the far lines more.
    """
    (ax, bx), (ay, by) = basis.tolist()
    x, y = positions.T
    cell = ax * by - ay * bx
    indices = np.round(np.stack([by * x - bx * y, ax * y - ay * x], axis=1) / cell)
    misses = np.hypot(*(indices @ basis.T - positions).T)
    lengths = np.hypot(x, y)
    small = np.abs(indices).max(axis=1) <= LARGEST_INDEX
    return indices, small & (misses <= tolerance + 0.006 * lengths)


def _same(one: Lattice, other: Lattice, tolerance: float) -> bool:
    if abs(one.cell / other.cell - 1) > 0.05:
        return False
    _, on = index(one.basis, np.array([other.first, other.second]), 2 * tolerance)
    return bool(on.all())


__all__ = ["Lattice", "fit_lattices", "index", "weights_of"]
