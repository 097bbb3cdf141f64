"""Which unit do the long and short lines spell?

Decimal scales lengthen every fifth and tenth line, half-millimetre scales every second, tenth and
twentieth, inch scales every second, fourth, eighth and so on. The pattern is read from the lines'
reach alone. What the pattern leaves open, the lines' proportions may close: a rule's shortest
lines are 2 to 6 mm long whatever its unit, so ten lines to the unit standing closer together than
half their height are millimetres; standing wider, they may be tenths of an inch, and it is said.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from imgcover.scale.rule_lines import Row
from imgcover.scale.rule_reach import pitch_scatter

INCH_MM = 25.4


class Graduation(StrEnum):
    """The distance of a rule's neighbouring lines."""

    MM = "1 mm"
    HALF_MM = "1/2 mm"
    TENTH_INCH = "1/10 in"
    SIXTEENTH_INCH = "1/16 in"
    THIRTYSECOND_INCH = "1/32 in"
    SIXTYFOURTH_INCH = "1/64 in"

    @property
    def step_mm(self) -> float:
        """Its length in mm."""
        return STEP_MM[self]

    @property
    def metric(self) -> bool:
        """Whether it divides the millimetre."""
        return self in (Graduation.MM, Graduation.HALF_MM)


STEP_MM = {
    Graduation.MM: 1.0,
    Graduation.HALF_MM: 0.5,
    Graduation.TENTH_INCH: INCH_MM / 10,
    Graduation.SIXTEENTH_INCH: INCH_MM / 16,
    Graduation.THIRTYSECOND_INCH: INCH_MM / 32,
    Graduation.SIXTYFOURTH_INCH: INCH_MM / 64,
}

PATTERNS: tuple[tuple[tuple[int, ...], tuple[Graduation, ...]], ...] = (
    ((1, 5, 10), (Graduation.MM, Graduation.TENTH_INCH)),
    ((1, 5), (Graduation.MM, Graduation.TENTH_INCH)),
    ((1, 10), (Graduation.MM, Graduation.TENTH_INCH)),
    ((1, 2, 10, 20), (Graduation.HALF_MM,)),
    ((1, 2, 4, 8, 16), (Graduation.SIXTEENTH_INCH,)),
    ((1, 4, 8, 16), (Graduation.SIXTEENTH_INCH,)),
    ((1, 2, 4, 8, 16, 32), (Graduation.THIRTYSECOND_INCH,)),
    ((1, 4, 8, 16, 32), (Graduation.THIRTYSECOND_INCH,)),
    ((1, 2, 4, 8, 16, 32, 64), (Graduation.SIXTYFOURTH_INCH,)),
    ((1, 4, 8, 16, 32, 64), (Graduation.SIXTYFOURTH_INCH,)),
    ((1, 2, 8, 16, 32, 64), (Graduation.SIXTYFOURTH_INCH,)),
)
"""Every how many lines one grows longer, and what such a scale can be."""

LOST = 4.0
"""Cost, in units of a line's usual scatter, beyond which a line's reach is taken for an accident
(dust, a digit, a scratch): a straight line fit's usual bound."""
SHORTEST_SHARE = 0.4
"""Share of the lines that must be of one length: half of them, less a fifth for accidents."""
BEND_SEEN = 4.0
"""Standard uncertainties of a bend that stands out from how unevenly lines end."""
LEAST_SAG = 0.45
"""Pixels by which both outer thirds must lie off the middle one: ends are told to whole pixels."""
U_ENDS = 0.3
"""Pixels by which a row's middle may seem to sag since ends are told to whole pixels: a uniform
error of one pixel has this standard deviation, and neighbours share it."""
A_LEVEL = 4.0
"""Cost of one more length: near half the logarithm of the number of lines, twice (BIC)."""


@dataclass(frozen=True, slots=True)
class Pattern:
    """How well one pattern fits a row: the lengths (in pitches) of its levels, and its cost."""

    steps: tuple[int, ...]
    graduations: tuple[Graduation, ...]
    phase: int
    lengths: tuple[float, ...]
    cost: float
    explained: float


def match_patterns(row: Row) -> list[Pattern]:
    """Fit every pattern to a row's lines, the best first.

    Parameters
    ----------
    row : Row
        From `follow_row`.

    Returns
    -------
    list of Pattern
        One for each of `PATTERNS` that fits with its lengths in order; cost in scatters.
    """
    reach, scatter = row.reach / row.pitch, usual_scatter(row)
    if not _crowded(reach, scatter):
        return []
    fitted = []
    for steps, graduations in PATTERNS:
        if steps[-1] <= len(reach):
            best = _best_phase(row, steps, graduations)
            if best is not None:
                fitted.append(best)
    return sorted(fitted, key=lambda each: each.cost)


def usual_scatter(row: Row) -> float:
    """Return how far, in pitches, a line's measured end strays: never less than a pixel or so."""
    return pitch_scatter(row.pitch)


def misfit(row: Row, pattern_lengths: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return how far, in pitches, each line ends from the length that its level has."""
    ends = np.stack([row.reach, row.beyond, row.faint]) / row.pitch
    return np.asarray(np.abs(ends - pattern_lengths).min(axis=0))


@dataclass(frozen=True, slots=True)
class Bend:
    """How strongly a row's ends bend, 1 over the radius in pixels, with its u; signed as the pitch
    grows up the lines of such a row. `plain` where it stands out, cut lines set aside."""

    value: float
    u: float
    plain: bool

    def finer(self, ratio: float) -> Bend:
        """Return the same in pixels `ratio` times finer."""
        return Bend(self.value / ratio, self.u / ratio, self.plain)


def bend_of(row: Row, pattern: Pattern) -> Bend:
    """Fit how the ends of a row's shortest lines bend.

    No tilt bends a straight row; a bent tape or a lens does.
    """
    shortest = levels(row.numbers - pattern.phase, pattern.steps) == 0
    kept = shortest & (np.abs(row.reach / row.pitch - pattern.lengths[0]) < 1.0)
    if kept.sum() < 8:
        return Bend(0.0, math.inf, False)
    along = (row.numbers[kept] - row.numbers[kept].mean()) * row.pitch
    square = along**2
    design = np.stack([np.ones_like(along), along, square - square.mean()], axis=1)
    terms, *_ = np.linalg.lstsq(design, row.reach[kept], rcond=None)
    rest = row.reach[kept] - design @ terms
    u = math.sqrt((rest**2).sum() / (kept.sum() - 3) / (design[:, 2] ** 2).sum())
    first, middle, last = (float(np.median(p)) for p in np.array_split(row.reach[kept], 3))
    # lines cut short at one end of a row are no bend
    sag = min(abs(first - middle), abs(last - middle)) if (first > middle) == (last > middle) else 0
    plain = sag > LEAST_SAG and abs(terms[2]) > BEND_SEEN * u
    u_ends = U_ENDS / float(np.abs(along).max()) ** 2
    return Bend(2 * float(terms[2]), 2 * math.hypot(u, u_ends), plain)


def _crowded(reach: NDArray[np.float64], scatter: float) -> bool:
    """Whether enough lines are of one length: in every pattern half or more are the shortest."""
    ordered = np.sort(reach)
    need = max(2, int(SHORTEST_SHARE * len(ordered)))
    return bool((ordered[need - 1 :] - ordered[: len(ordered) - need + 1]).min() < 6 * scatter)


def _middle(values: NDArray[np.float64]) -> float:
    """Return the upper median; NaN of nothing (numpy's own takes ten times as long)."""
    return float(np.sort(values)[len(values) // 2]) if len(values) else math.nan


def _best_phase(
    row: Row, steps: tuple[int, ...], graduations: tuple[Graduation, ...]
) -> Pattern | None:
    """Fit one pattern at each of its likely phases; return the cheapest."""
    best = None
    reach, scatter = row.reach / row.pitch, usual_scatter(row)
    # worn lines have to be seen by what is left of them, others end sooner than their blur
    for ends, phase in (
        (each, phase)
        for each in (reach, row.faint / row.pitch)
        for phase in _likely_phases(row.numbers, each, steps)
    ):
        level = levels(row.numbers - phase, steps)
        lengths = [_middle(ends[level == i]) for i in range(len(steps))]
        rises = [after - before for before, after in pairwise(lengths)]
        if not min(rises) >= 1.5 * scatter:
            continue
        each = np.minimum(misfit(row, np.array(lengths)[level]) / scatter, LOST)
        cost = float(each.sum()) + A_LEVEL * len(steps)
        if best is None or cost < best.cost:
            explained = float((each < LOST).mean())
            best = Pattern(steps, graduations, phase, tuple(lengths), cost, explained)
    return best


def _likely_phases(
    numbers: NDArray[np.int_], reach: NDArray[np.float64], steps: tuple[int, ...]
) -> list[int]:
    """Fold the reaches on the pattern's period; return the phases whose levels part them best."""
    period = steps[-1]
    kept = np.clip(reach, *(np.median(reach) + np.array([-20.0, 20.0])))
    count = np.bincount(numbers % period, minlength=period).astype(float)
    fold = np.bincount(numbers % period, kept, period) / np.maximum(count, 1)
    turned = (np.arange(period)[:, None] + np.arange(period)) % period
    folded, weight = fold[turned], count[turned]
    level = levels(np.arange(period), steps)
    rest = np.zeros(period)
    for index in range(len(steps)):
        mine, mass = folded[:, level == index], weight[:, level == index]
        mean = (mine * mass).sum(axis=1) / np.maximum(mass.sum(axis=1), 1e-9)
        rest += (np.abs(mine - mean[:, None]) * mass).sum(axis=1)
    return [int(phase) for phase in np.argsort(rest, kind="stable")[:5]]


def levels(numbers: NDArray[np.int_], steps: tuple[int, ...]) -> NDArray[np.int_]:
    """Return the index of the largest step that divides each number.

    Examples
    --------
    >>> levels(np.arange(11), (1, 5, 10)).tolist()
    [2, 0, 0, 0, 0, 1, 0, 0, 0, 0, 2]
    """
    level = np.zeros(len(numbers), dtype=int)
    for index, step in enumerate(steps):
        level[numbers % step == 0] = index
    return level


__all__ = [
    "INCH_MM",
    "LOST",
    "Bend",
    "Graduation",
    "Pattern",
    "bend_of",
    "levels",
    "match_patterns",
    "misfit",
    "usual_scatter",
]
