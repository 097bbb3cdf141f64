"""What speaks for and against a pair of wave vectors being the threads.

In evenly woven cloth all ends weave alike. Averaged along the ends the weave is gone, so on the
ends' own axis of the spectrum only multiples of the thread frequency are left; the weave's own
lines lie off the axes. And each thread is an individual: a little thicker, brighter or farther from
its neighbour all along its length, which lays a faint unbroken streak along the axis of each set.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.repeat.between import between
from imgcover.repeat.spectrum import Peak, Spectrum
from imgcover.threads.candidates import Candidate
from imgcover.threads.lattice import Lattice, weights_of
from imgcover.threads.lattice import index as index_on

WHOLE = 99.0
"""Stands for "nothing to look for": higher than any line rises over its floor."""


SKEWED = 5.5
"""Degrees of skew that cost one point of score: cloth is asked for to 8, and a twill skewed by 7.5
must not lose to a satin that is not."""


@dataclass(frozen=True, slots=True)
class Evidence:
    """The witnesses for one candidate.

    Parameters
    ----------
    ends_line, picks_line : float
        ln(power over floor) at the thread frequencies themselves, 0 where nothing stands out.
    ends_second, picks_second : float
        The same at twice the thread frequencies.
    ends_part, picks_part : float
        Highest line at a broken multiple of the wave vector that the lattice allows; WHOLE where it
        allows none.
    ends_above, picks_above : float
        By how much the highest of the lines at two to five times the thread frequency exceeds it.
    against : float
        Share of the peaks' weight on the axes at broken multiples of the thread frequency.
    beyond : float
        Share of the peaks' weight farther out than the threads' own lines.
    apart : float
        Share of the peaks' weight on no point of the lattice.
    ends_streak, picks_streak : float
        ln(power) along the axis over the power beside it, between the lines.
    score : float
        All of these as one figure; higher is better.
    """

    ends_line: float
    picks_line: float
    ends_second: float
    picks_second: float
    ends_part: float
    picks_part: float
    ends_above: float
    picks_above: float
    against: float
    beyond: float
    apart: float
    ends_streak: float
    picks_streak: float
    score: float


def weigh(
    these: list[Candidate], of: Spectrum, peaks: list[Peak], *, tolerance: float
) -> list[tuple[Candidate, Evidence]]:
    """Hear the witnesses for each candidate.

    Parameters
    ----------
    these : list of Candidate
        Pairs of wave vectors.
    of : Spectrum
        The field's averaged power.
    peaks : list of Peak
        Its significant peaks, strongest first.
    tolerance : float
        How far a peak may lie from its place, cycles per pixel.

    Returns
    -------
    list of tuple
        (candidate, evidence), the best first.
    """
    positions = np.array([(each.fx, each.fy) for each in peaks])
    levels = np.array([each.level for each in peaks])
    weights = weights_of(peaks)
    seen = _Seen(of, positions, tolerance)
    heard = [(one, _hear(one, seen, levels, weights, tolerance)) for one in these]
    heard.sort(key=lambda pair: -pair[1].score)
    return heard


def excess_at(of: Spectrum, frequency: NDArray[np.float64]) -> tuple[float, float]:
    """ln(power over floor), and ln(power), of the strongest bin at a frequency's place."""
    reach = max(1, round(of.size / max(of.window)))
    column, row = (round(float(f) * of.size) + of.size // 2 for f in frequency)
    if not (reach <= row < of.size - reach and reach <= column < of.size - reach):
        return 0.0, -30.0
    around = of.log_power[row - reach : row + reach + 1, column - reach : column + reach + 1]
    level = float(around.max())
    return max(0.0, level - float(of.log_floor[row, column])), level


Vector = tuple[float, float]


@dataclass(frozen=True, slots=True)
class _Axis:
    """What the spectrum shows at the multiples of one wave vector."""

    line: float
    level: float
    second: float
    highest: float
    streak: float


class _Seen:
    """What was looked up in the spectrum: candidates share their vectors and lattices."""

    def __init__(self, of: Spectrum, positions: NDArray[np.float64], tolerance: float) -> None:
        self._of = of
        self.positions = positions
        self._tolerance = tolerance
        self._axes: dict[Vector, _Axis] = {}
        self._parts: dict[tuple[Vector, int], float] = {}
        self._streaks: dict[int, float] = {}
        self._on: dict[Lattice, NDArray[np.bool_]] = {}

    def axis(self, vector: Vector) -> _Axis:
        """Look along the multiples of a wave vector."""
        if vector not in self._axes:
            frequency = np.array(vector)
            line, level = excess_at(self._of, frequency)
            above = [excess_at(self._of, times * frequency)[0] for times in (2, 3, 4, 5)]
            self._axes[vector] = _Axis(line, level, above[0], max(above), self._streak(vector))
        return self._axes[vector]

    def part(self, vector: Vector, parts: int) -> float:
        """The highest line at a broken multiple of a wave vector."""
        if parts == 1:
            return WHOLE
        if (vector, parts) not in self._parts:
            frequency = np.array(vector)
            lines = (excess_at(self._of, k / parts * frequency)[0] for k in range(1, parts))
            self._parts[vector, parts] = max(lines)
        return self._parts[vector, parts]

    def on(self, lattice: Lattice) -> NDArray[np.bool_]:
        """Which peaks lie on a lattice."""
        if lattice not in self._on:
            _, self._on[lattice] = index_on(lattice.basis, self.positions, self._tolerance)
        return self._on[lattice]

    def _streak(self, vector: Vector) -> float:
        key = round(math.atan2(vector[1], vector[0]) * 500)
        if key not in self._streaks:
            self._streaks[key] = streak(self._of, vector)
        return self._streaks[key]


def _hear(
    one: Candidate,
    seen: _Seen,
    levels: NDArray[np.float64],
    weights: NDArray[np.float64],
    tolerance: float,
) -> Evidence:
    ends, picks = seen.axis(one.ends), seen.axis(one.picks)
    at = np.linalg.solve(one.basis, seen.positions.T).T
    slack = np.array([tolerance / math.hypot(*one.ends), tolerance / math.hypot(*one.picks)]) + 0.02
    # waves much longer than two threads are stripes and checks: they say nothing of the threads
    weights = weights * np.minimum(1.0, 2 * np.hypot(*at.T)) ** 2
    whole = np.abs(at - np.round(at)) < slack
    on_axis = np.abs(at) < slack
    broken_ends = on_axis[:, 1] & ~on_axis[:, 0] & ~whole[:, 0]
    broken_picks = on_axis[:, 0] & ~on_axis[:, 1] & ~whole[:, 1]
    # a broken multiple counts by how it compares with the thread's own line
    against = weights[broken_ends] @ np.exp(
        np.clip(0.5 * (levels[broken_ends] - ends.level), -4, 0.4)
    ) + weights[broken_picks] @ np.exp(np.clip(0.5 * (levels[broken_picks] - picks.level), -4, 0.4))
    apart = weights @ ~(seen.on(one.lattice) | whole.all(axis=1))
    total = max(float(weights.sum()), 1e-9)
    evidence = {
        "ends_line": ends.line,
        "picks_line": picks.line,
        "ends_second": ends.second,
        "picks_second": picks.second,
        "ends_part": seen.part(one.ends, one.parts[0]),
        "picks_part": seen.part(one.picks, one.parts[1]),
        "ends_above": ends.highest - ends.line,
        "picks_above": picks.highest - picks.line,
        "against": float(against / total),
        "beyond": float(weights @ (np.abs(at).max(axis=1) > 1.25) / total),
        "apart": float(apart / total),
        "ends_streak": ends.streak,
        "picks_streak": picks.streak,
    }
    return Evidence(**evidence, score=_score(one, evidence))


def streak(of: Spectrum, vector: tuple[float, float]) -> float:
    """How far power along a direction exceeds the power beside it, between the lines.

    Parameters
    ----------
    of : Spectrum
        Averaged power.
    vector : tuple of float
        A wave vector; only its direction counts.

    Returns
    -------
    float
        Median over the ray of ln(power) on it less the mean ln(power) on rays beside it.
    """
    bin_ = of.size / max(of.window)
    unit = np.array(vector) / math.hypot(*vector)
    along = np.arange(4 * bin_, 0.42 * of.size, 0.5 * bin_)
    offsets = np.array([-7, -6, -5, -4, -3, -0.5, 0, 0.5, 3, 4, 5, 6, 7]) * bin_
    middle = of.size // 2
    columns = middle - offsets[:, None] * unit[1] + along * unit[0]
    rows = middle + offsets[:, None] * unit[0] + along * unit[1]
    power = between(of.log_power, rows, columns)
    beside = np.delete(power, [5, 6, 7], axis=0).mean(axis=0)
    return float(max(np.median(power[k] - beside) for k in (5, 6, 7)))


_WEAVE_COST = {1: 0.0, 2: 0.0, 3: 0.1, 4: 0.2, 5: 0.3, 8: 0.6}
"""Common repeats are cheap; the rest cost 1.3, and more than 8 cost 1.8."""


def _score(one: Candidate, e: dict[str, float]) -> float:
    lines = 0.5 * (min(e["ends_line"], 6) + min(e["picks_line"], 6))
    seconds = 0.2 * (min(e["ends_second"], 4) + min(e["picks_second"], 4))
    # a thread's own line stands higher over the floor than its multiples do
    seconds -= 0.6 * (max(0, e["ends_above"]) + max(0, e["picks_above"]))
    streaks = 5 * (min(0.6, max(0, e["ends_streak"])) + min(0.6, max(0, e["picks_streak"])))
    shape = 1.5 * (one.turn / 30) ** 2 + (one.skew / SKEWED) ** 2
    weave = _WEAVE_COST.get(one.index, 1.3 if one.index < 9 else 1.8)
    weave += sum(
        0.5 if e[part] > 2.5 else 2.5 for part in ("ends_part", "picks_part") if e[part] < WHOLE
    )
    # in drawn cloth with counted threads up to 0.71 of the weight lies beyond the threads' lines
    weave += 15 * max(0.0, e["beyond"] - 0.68)
    return (
        lines
        + seconds
        + streaks
        - 8 * e["against"]
        - 5 * e["beyond"]
        - 4 * e["apart"]
        - shape
        - weave
    )


__all__ = ["Evidence", "excess_at", "streak", "weigh"]
