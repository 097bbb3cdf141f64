"""One lattice under planted peaks, its thread candidates, and which multiple a profile shows.

Truth is theory: lattices and profiles written down.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from imgcover.repeat.phase import transform
from imgcover.repeat.spectrum import Peak
from imgcover.threads.candidates import candidates
from imgcover.threads.follow import Line, follow
from imgcover.threads.lattice import Lattice, fit_lattices
from imgcover.threads.profile import Multiple, which_multiple

BIN = 1 / 256
TOLERANCE = 0.8 * BIN


def planted(*vectors: tuple[float, float], excess: float = 6.0, stray: float = 0.0) -> list[Peak]:
    generator = np.random.default_rng(8)
    moved = np.array(vectors) + stray * generator.standard_normal((len(vectors), 2))
    return [Peak(fx, fy, -3.0 - 0.2 * k, excess) for k, (fx, fy) in enumerate(moved.tolist())]


QUINCUNX = ((0.05, 0.06), (-0.05, 0.06), (0.1, 0.0), (0.0, 0.12), (0.15, 0.06), (0.2, 0.0))
"""Two-colour plain cloth of 10 and 8⅓ pixels a thread: the diagonals are the strongest."""


def same_lattice(one: Lattice, first: tuple[float, float], second: tuple[float, float]) -> None:
    """Hold that each basis is made of whole numbers of the other."""
    change = np.linalg.solve(np.array([first, second]).T, one.basis)
    assert change == pytest.approx(np.round(change), abs=0.03)
    assert abs(np.linalg.det(change)) == pytest.approx(1, abs=0.03)


def test_the_lattice_of_planted_peaks() -> None:
    (best, *_) = fit_lattices(planted(*QUINCUNX, stray=0.1 * BIN), tolerance=TOLERANCE, most=4)
    same_lattice(best, QUINCUNX[0], QUINCUNX[1])
    assert best.explained > 0.9
    assert best.shortest == pytest.approx(math.hypot(0.05, 0.06), rel=0.02)
    assert best.cell == pytest.approx(2 * 0.05 * 0.06, rel=0.02)


def test_a_chance_peak_does_not_bend_the_lattice() -> None:
    """One peak in seven lies where none should: it is left over, the lattice stays."""
    peaks = planted(*QUINCUNX, (0.083, 0.091), stray=0.1 * BIN)
    (best, *_) = fit_lattices(peaks, tolerance=TOLERANCE, most=4)
    same_lattice(best, QUINCUNX[0], QUINCUNX[1])
    assert 0.6 < best.explained < 0.97


def test_peaks_on_one_line_have_no_lattice() -> None:
    assert fit_lattices(planted((0.1, 0.0), (0.2, 0.0)), tolerance=TOLERANCE, most=4) == []


@settings(max_examples=30, deadline=None)
@given(turn=st.floats(-0.5, 0.5), skew=st.floats(-0.12, 0.12))
def test_the_threads_are_among_the_candidates(turn: float, skew: float) -> None:
    """Of a turned, skewed quincunx: sum and difference of the diagonals, two crossings a cell."""
    c, s = math.cos(turn), math.sin(turn)
    ends = (0.1 * c, 0.1 * s)
    picks = (-0.12 * math.sin(turn + skew), 0.12 * math.cos(turn + skew))
    first = ((ends[0] + picks[0]) / 2, (ends[1] + picks[1]) / 2)
    second = ((ends[0] - picks[0]) / 2, (ends[1] - picks[1]) / 2)
    found = candidates([Lattice(first, second, 1.0)])
    fits = [
        one
        for one in found
        if np.allclose(one.ends, ends, atol=1e-9) and np.allclose(one.picks, picks, atol=1e-9)
    ]
    assert len(fits) == 1
    (one,) = fits
    assert one.index == 2 and one.parts == (1, 1)
    assert one.skew == pytest.approx(-math.degrees(skew))
    assert one.turn == pytest.approx(math.degrees(turn + skew / 2), abs=1e-6)
    assert one.pixels == pytest.approx((10, 1 / 0.12))


SIDE = 260
PERIOD = 13.0


def ridges(at: tuple[float, ...], period: float = PERIOD) -> NDArray[np.float32]:
    """Ends of Gaussian light at shares of a period, crossed by even picks every eleven pixels."""
    y, x = np.mgrid[:SIDE, :SIDE]
    across = sum(
        np.exp(-(((x / period - place + 0.5) % 1 - 0.5) ** 2) / (2 * 0.1**2)) for place in at
    )
    light = across + 0.5 * np.cos(2 * np.pi * y / 11)
    light = light + 0.05 * np.random.default_rng(9).standard_normal(light.shape)
    return np.asarray(light - light.mean(), np.float32)


def asked(light: NDArray[np.float32], vector: float, *, parts: int = 1) -> Multiple:
    """Follow both sets by lines that are certainly there, then ask the ends' profile."""
    sigma = 14.0
    field = transform(light, margin=60)
    steady = (1 / PERIOD, 0.0), (0.0, 1 / 11)
    lines = [Line(1, 0, 6.0, -2.0), Line(0, 1, 6.0, -2.0)]
    seen = follow(field, *steady, lines=lines, sigma=sigma)
    assert seen is not None and seen.valid.mean() > 0.9
    phase = seen.ends * vector * PERIOD
    return which_multiple(field, seen, phase, (vector, 0.0), sigma=sigma, parts=parts)


def test_one_ridge_a_period_is_a_thread() -> None:
    told = asked(ridges((0.0,)), 1 / PERIOD)
    assert told.factor == 1 and told.rival is None
    assert told.amplitude > 20 * told.noise


def test_a_pair_a_period_is_two_threads() -> None:
    """Two ridges 0.42 apart: the second multiple is the stronger, and two ridges are seen."""
    told = asked(ridges((0.0, 0.42)), 1 / PERIOD)
    assert told.factor == 2 and told.rival is None


@pytest.mark.parametrize(("times", "factor"), [(2, Fraction(1, 2)), (3, Fraction(1, 3))])
def test_a_multiple_taken_for_the_thread_is_put_right(times: int, factor: Fraction) -> None:
    told = asked(ridges((0.0,)), times / PERIOD)
    assert told.factor == factor and told.rival is None


def test_a_silent_axis_says_nothing_but_what_the_lattice_allows() -> None:
    """No ends at all: with the lattice dividing the vector there are two readings, else one."""
    y, _ = np.mgrid[:SIDE, :SIDE]
    light = np.asarray(0.5 * np.cos(2 * np.pi * y / 11), np.float32)
    light += 0.02 * np.random.default_rng(1).standard_normal(light.shape).astype(np.float32)
    field = transform(light, margin=60)
    flat = follow(
        field,
        (1 / PERIOD, 0.0),
        (0.0, 1 / 11),
        lines=[Line(0, 1, 6.0, -2.0), Line(1, 0, 3.0, -6.0)],
        sigma=14.0,
    )
    assert flat is not None
    for parts, rival in ((1, None), (2, Fraction(1, 2))):
        told = which_multiple(
            field, flat, np.zeros_like(flat.ends), (1 / PERIOD, 0.0), sigma=14.0, parts=parts
        )
        assert told.factor == 1 and told.rival == rival
