"""Which pairs of lattice vectors could be the ends and the picks."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.repeat.spectrum import HIGHEST_FREQUENCY
from imgcover.threads.lattice import Lattice

LOWEST_FREQUENCY = 1 / 75
"""Cycles per pixel: the coarsest thread looked for in one analysis. A coarser one is seen after
the picture has been made smaller."""

FARTHEST_INDEX = 6
"""Multiples of the lattice basis combined: an 8-end satin's threads are (1, 3) and (−3, −1)…"""

LARGEST_REPEAT = 16
"""Cells of the pattern in one cell of the threads, as an area ratio: a 4-end dent over a weave
that repeats on 4 is the largest met."""

REGULAR_REPEATS = (2, 3, 4, 5, 8)
"""Threads on which the common regular weaves repeat: plain, twills, satins."""

STEEPEST_SKEW = 12.0
"""Degrees from the right angle; cloth is asked for to 8, and a wave vector has an error."""


@dataclass(frozen=True, slots=True)
class Candidate:
    """Two wave vectors that could be the threads'.

    Parameters
    ----------
    ends, picks : tuple of float
        Cycles per pixel.
    index : int
        How many times finer the pattern's lattice is than the threads': 1 where every crossing
        looks alike, 2 for plain cloth whose weave shows, n for a regular weave on n.
    parts : tuple of int
        (ends, picks): how many times the lattice divides each wave vector. 1 in an evenly woven
        cloth; dents, ribs, hopsacks and stripes divide it further.
    lattice : Lattice
        The lattice both belong to.
    """

    ends: tuple[float, float]
    picks: tuple[float, float]
    index: int
    parts: tuple[int, int]
    lattice: Lattice

    @property
    def basis(self) -> NDArray[np.float64]:
        """Columns are the wave vectors of ends and picks."""
        return np.array([self.ends, self.picks]).T

    @property
    def skew(self) -> float:
        """Degrees by which the crossing differs from a right angle."""
        cosine = (self.ends[0] * self.picks[0] + self.ends[1] * self.picks[1]) / (
            math.hypot(*self.ends) * math.hypot(*self.picks)
        )
        return math.degrees(math.asin(max(-1.0, min(1.0, cosine))))

    @property
    def turn(self) -> float:
        """Degrees by which the pair is turned from the picture's axes."""
        ends = math.atan2(self.ends[1], self.ends[0])
        picks = math.atan2(-self.picks[0], self.picks[1])
        return math.degrees((ends + picks) / 2)

    @property
    def repeat(self) -> tuple[int, int] | None:
        """Ends and picks after which a regular weave repeats; None where the lines show none.

        A regular weave on n threads steps through all n of both sets. Whatever else divides the
        lattice (dents, pairs, stripes) says nothing of the weave, and is passed over.
        """
        if self.parts != (1, 1) or self.index not in REGULAR_REPEATS:
            return None
        at = np.linalg.solve(self.basis, self.lattice.basis) * self.index
        nearest = np.round(at).astype(int)
        if np.abs(at - nearest).max() > 0.25:
            return None
        steps = [self.index // math.gcd(self.index, *(int(v) for v in row)) for row in nearest]
        return (steps[0], steps[1]) if steps == [self.index] * 2 else None

    @property
    def pixels(self) -> tuple[float, float]:
        """Pixels an end and a pick."""
        return 1 / math.hypot(*self.ends), 1 / math.hypot(*self.picks)


def candidates(lattices: list[Lattice]) -> list[Candidate]:
    """List every pair of lattice vectors that could be ends (across) and picks (down).

    Ends here are the set whose wave vector lies nearer to the x axis; which of the two sets is the
    warp is settled by the caller.
    """
    found: dict[tuple[int, ...], Candidate] = {}
    for lattice in lattices:
        across, down = _vectors(lattice)
        for (ends, at), (picks, to) in itertools.product(across, down):
            index = abs(at[0] * to[1] - at[1] * to[0])
            if not 0 < index <= LARGEST_REPEAT:
                continue
            parts = (math.gcd(*at), math.gcd(*to))
            one = Candidate(ends, picks, index, parts, lattice)
            if abs(one.skew) <= STEEPEST_SKEW:
                found.setdefault((*_place(one), *parts, index), one)
    return list(found.values())


Vector = tuple[tuple[float, float], tuple[int, int]]


def _vectors(lattice: Lattice) -> tuple[list[Vector], list[Vector]]:
    across: list[Vector] = []
    down: list[Vector] = []
    steps = range(-FARTHEST_INDEX, FARTHEST_INDEX + 1)
    (ax, ay), (bx, by) = lattice.first, lattice.second
    for at in itertools.product(steps, steps):
        fx, fy = at[0] * ax + at[1] * bx, at[0] * ay + at[1] * by
        if not LOWEST_FREQUENCY < math.hypot(fx, fy) < HIGHEST_FREQUENCY:
            continue
        # a little over 45° each way, so that a swatch turned by half a right angle is not lost
        if fx > 0 and abs(fy) <= 1.05 * fx:
            across.append(((fx, fy), at))
        if fy > 0 and abs(fx) <= 1.05 * fy:
            down.append(((fx, fy), at))
    return across, down


def _place(one: Candidate) -> tuple[int, ...]:
    """A key that candidates within about 1 % of each other share: near enough to count alike."""
    lengths = (math.hypot(*one.ends), math.hypot(*one.picks))
    turns = (math.atan2(one.ends[1], one.ends[0]), math.atan2(one.picks[1], one.picks[0]))
    return (*(round(math.log(v) * 80) for v in lengths), *(round(v * 60) for v in turns))


__all__ = ["Candidate", "candidates"]
