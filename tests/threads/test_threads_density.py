"""From counts over pixels to threads a centimetre.

Truth is theory: wave vectors, angles and arcs written down; the referee for u is `uncertainties`.
"""

from __future__ import annotations

import math
from typing import Literal

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from uncertainties import correlated_values
from uncertainties.umath import atan2, sqrt

from imgcover.findings import Flag
from imgcover.quantity import Measured
from imgcover.scale.scale import Scale, ScaleSource
from imgcover.threads.density import Density, density_of
from imgcover.threads.reading import Fork, ThreadReading, ThreadSet


def threads(
    frequency: tuple[float, float],
    *,
    u: float = 0.0,
    counted: float = 50.0,
    bow: float | None = None,
) -> ThreadSet:
    arc = None if bow is None else Measured(bow, 0.001, "1")
    length = counted / math.hypot(*frequency)
    return ThreadSet(frequency, counted, length, u, {"phase": u}, 0.01, 0.98, 1.02, 5, arc)


def scale(x: float, y: float, *, ux: float = 0.0, uy: float = 0.0, ratio_u: float = 0.0) -> Scale:
    return Scale(
        Measured(x, x * ux, "px/mm"), Measured(y, y * uy, "px/mm"), ratio_u, ScaleSource.RULE
    )


def put(
    ends: ThreadSet | None,
    picks: ThreadSet | None,
    by: Scale,
    *,
    warp: Literal["vertical", "horizontal"] = "vertical",
    forks: tuple[Fork, ...] = (),
) -> Density:
    return density_of(ThreadReading(ends, picks, None, (), None, forks, ()), by, warp=warp)


def test_units() -> None:
    """A thread each eight pixels at 20 px/mm is 2.5 a mm: 25 a cm, 63.5 an inch."""
    got = put(threads((1 / 8, 0.0)), threads((0.0, 1 / 10), counted=40), scale(20, 20))
    assert got.ends == Measured(25.0, 0.0, "1/cm")
    assert got.picks == Measured(20.0, 0.0, "1/cm")
    assert got.length_ends_mm == pytest.approx(50 * 8 / 20)
    assert got.length_picks_mm == pytest.approx(40 * 10 / 20)


def test_a_set_that_was_not_counted_has_no_density() -> None:
    got = put(None, threads((0.0, 0.1)), scale(20, 20))
    assert got.ends is None and got.angle is None and got.skew is None
    assert got.length_ends_mm is None and got.picks is not None


@pytest.mark.parametrize("turn", [-40.0, -10.0, 0.0, 25.0])
def test_unequal_pitch_is_taken_out_before_lengths_and_angles(turn: float) -> None:
    """A square cloth of 2 threads a mm, turned, seen with 24 px/mm across and 21 down.

    A wave vector of (a, b) cycles a mm is (a / 24, b / 21) cycles a pixel.
    """
    c, s = math.cos(math.radians(turn)), math.sin(math.radians(turn))
    got = put(threads((2 * c / 24, 2 * s / 21)), threads((-2 * s / 24, 2 * c / 21)), scale(24, 21))
    for each in (got.ends, got.picks):
        assert each is not None and each.value == pytest.approx(20.0, rel=1e-12)
    assert got.angle is not None and got.angle.value == pytest.approx(turn)
    assert got.skew is not None and got.skew.value == pytest.approx(0.0, abs=1e-9)


def test_signs_of_angle_and_skew() -> None:
    """Clockwise as shown, y down: ends that lean right at the top are turned by +.

    Such ends run along (sin t, −cos t), so their wave vector is (cos t, sin t); picks that fall to
    the right by p run along (cos p, sin p), and theirs is (−sin p, cos p).
    """
    t, p = math.radians(3.0), math.radians(5.0)
    ends = threads((0.1 * math.cos(t), 0.1 * math.sin(t)))
    picks = threads((-0.1 * math.sin(p), 0.1 * math.cos(p)))
    got = put(ends, picks, scale(20, 20))
    assert got.angle is not None and got.angle.value == pytest.approx(3.0)
    assert got.skew is not None and got.skew.value == pytest.approx(2.0)
    # the same picture with the warp across: what were picks are ends, and the skew turns over
    other = put(picks, ends, scale(20, 20), warp="horizontal")
    assert other.angle is not None and other.angle.value == pytest.approx(5.0)
    assert other.skew is not None and other.skew.value == pytest.approx(-2.0)


@settings(max_examples=60, deadline=None)
@given(
    fx=st.floats(0.02, 0.3),
    fy=st.floats(-0.3, 0.3),
    u=st.floats(0, 0.005),
    ux=st.floats(0.001, 0.01),
    uy=st.floats(0.001, 0.01),
    correlation=st.floats(-0.9, 0.95),
)
def test_u_of_density_against_a_referee(
    fx: float, fy: float, u: float, ux: float, uy: float, correlation: float
) -> None:
    """Truth is a referee: `uncertainties` carries two correlated axes through the same formula."""
    common = correlation * ux * uy
    ratio_u = math.sqrt(ux**2 + uy**2 - 2 * common)
    got = put(threads((fx, fy), u=u), None, scale(20, 23, ux=ux, uy=uy, ratio_u=ratio_u)).ends
    covariance = [[(20 * ux) ** 2, 20 * 23 * common], [20 * 23 * common, (23 * uy) ** 2]]
    x, y = correlated_values([20.0, 23.0], covariance)
    want = 10 * sqrt((fx * x) ** 2 + (fy * y) ** 2)
    assert got is not None and got.value == pytest.approx(want.n, rel=1e-12)
    assert got.u == pytest.approx(math.hypot(want.s, want.n * u), rel=1e-6)


@pytest.mark.parametrize("turn", [0.0, 10.0, -30.0])
def test_u_of_angle_against_a_referee(turn: float) -> None:
    """Truth is a referee: `uncertainties`; an error common to both axes turns nothing."""
    vector = (0.1 * math.cos(math.radians(turn)), 0.1 * math.sin(math.radians(turn)))
    got = put(threads(vector), None, scale(20, 20, ux=0.01, uy=0.01, ratio_u=0.004)).angle
    common = (2 * 0.01**2 - 0.004**2) / 2
    covariance = [[0.2**2, 400 * common], [400 * common, 0.2**2]]
    x, y = correlated_values([20.0, 20.0], covariance)
    want = atan2(vector[1] * y, vector[0] * x)
    assert got is not None and got.value == pytest.approx(math.degrees(want.n))
    assert got.u == pytest.approx(math.degrees(want.s), rel=1e-6, abs=1e-12)


@pytest.mark.parametrize(("warp", "want"), [("vertical", 0.024), ("horizontal", 0.01 * 10 / 24)])
def test_bow_is_height_over_chord_in_lengths(
    warp: Literal["vertical", "horizontal"], want: float
) -> None:
    """At 24 px/mm across and 10 down, height over chord stretches by the ratio."""
    across = warp == "vertical"
    picks = threads((0.0, 0.1) if across else (0.1, 0.0), bow=0.01)
    got = put(None, picks, scale(24, 10), warp=warp).bow
    assert got is not None and got.value == pytest.approx(want)
    assert got.u == pytest.approx(0.1 * want) and got.unit == "1"


def test_a_fork_is_told_in_both_units() -> None:
    """Twenty and forty a cm are 50.8 and 101.6 an inch."""
    fork = Fork("ends", ((0.1, 0.0), (0.2, 0.0)))
    got = put(None, threads((0.0, 0.1)), scale(20, 20), forks=(fork,))
    assert got.ends_forks == pytest.approx((20.0, 40.0)) and got.picks_forks == ()
    (told,) = got.findings
    assert told.flag is Flag.TWO_READINGS and told.remedy
    for words in ("ends", "20.0 a cm (50.8 an inch)", "40.0 a cm (101.6 an inch)"):
        assert words in told.message
