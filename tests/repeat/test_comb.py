"""Combs of marks: pitch, strays, tilt, and whether the stated u is the scatter of repeats."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from imgcover.repeat.comb import fit_comb, fit_line


def test_line_fit_of_the_guide() -> None:
    """Truth is published: JCGM 100:2008, H.3, the thermometer's calibration curve (table H.6).

    The table's temperatures and corrections are from memory; that they give the published
    intercept, slope, uncertainties and prediction, to every digit, confirms them.
    """
    degrees = [
        *(21.521, 22.012, 22.512, 23.003, 23.507, 23.999),
        *(24.513, 25.002, 25.503, 26.010, 26.511),
    ]
    corrections = [
        *(-0.171, -0.169, -0.166, -0.159, -0.164, -0.165),
        *(-0.156, -0.157, -0.159, -0.161, -0.160),
    ]
    line = fit_line(np.array(degrees) - 20.0, corrections)
    assert f"{line.intercept:.4f} {line.u_intercept:.4f}" == "-0.1712 0.0029"
    assert f"{line.slope:.5f} {line.u_slope:.5f}" == "0.00218 0.00067"
    value, u = line.at(10.0)
    assert f"{value:.4f} {u:.4f}" == "-0.1494 0.0041"


def test_strays_are_dropped() -> None:
    """Truth is theory: positions 4 + 11.3 k, five of sixty moved by a third of a pitch."""
    generator = np.random.default_rng(3)
    k = np.delete(np.arange(60), [7, 8, 9, 33])
    x = 4 + 11.3 * k + generator.normal(0, 0.05, len(k))
    moved = generator.choice(len(k), 5, replace=False)
    x[moved] += 11.3 / 3
    comb = fit_comb(k, x)
    assert comb is not None
    assert not comb.kept[moved].any() and comb.kept.sum() >= len(k) - 7
    assert abs(comb.pitch - 11.3) < 4 * comb.u_pitch < 0.01
    assert comb.tilt == 0.0


def test_tilt_is_told_and_corrected() -> None:
    """Truth is theory: marks of a rule seen aslant stand at p k / (1 + c k)."""
    generator = np.random.default_rng(4)
    k = np.arange(-40, 41)
    x = 12.0 * k / (1 + 1.5e-4 * k) + generator.normal(0, 0.03, len(k))
    comb = fit_comb(k, x)
    assert comb is not None
    assert comb.tilt == pytest.approx(1.5e-4, abs=4 * comb.u_tilt)
    for number in (-40, 0, 40):
        truth = 12.0 / (1 + 1.5e-4 * number) ** 2
        assert comb.pitch_at(number) == pytest.approx(truth, rel=3e-4)  # 3 u of tilt at the ends
    assert comb.position(k) == pytest.approx(12.0 * k / (1 + 1.5e-4 * k), abs=0.03)


def test_u_is_the_scatter_of_repeats() -> None:
    """Truth is theory: 300 rows with the same noise; two u hold about 95 of 100.

    Quarters that stray together by chance raise u now and then, so a little more is held.
    """
    generator = np.random.default_rng(5)
    k = np.arange(50)
    combs = [fit_comb(k, 9.0 * k + generator.normal(0, 0.1, 50)) for _ in range(300)]
    off = np.array([(each.pitch - 9.0) / each.u_pitch for each in combs if each is not None])
    assert len(off) == 300
    assert 0.93 < (np.abs(off) < 2).mean() <= 0.995


@pytest.mark.parametrize("marks", [3, 5])
def test_too_few_marks_give_nothing(marks: int) -> None:
    """Truth is theory: five marks cannot show that they are a comb."""
    assert fit_comb(np.arange(marks), np.arange(marks) * 3.0) is None


def test_marks_without_order_give_nothing() -> None:
    """Truth is theory: uniform places have no pitch that half of them keep."""
    generator = np.random.default_rng(6)
    assert fit_comb(np.arange(40), generator.uniform(0, 400, 40)) is None


@settings(deadline=None)  # how long an example takes says how busy the machine is
@given(scale=st.floats(0.01, 100), shift=st.floats(-1e3, 1e3))
def test_unit_and_origin_do_not_matter(scale: float, shift: float) -> None:
    """Truth is symmetry: pitch and u scale with the unit, and the origin does not touch them."""
    k = np.arange(30)
    x = 7.0 * k + 0.1 * np.sin(3.7 * k)
    plain, other = fit_comb(k, x), fit_comb(k, scale * x + shift)
    assert plain is not None and other is not None
    assert other.pitch == pytest.approx(scale * plain.pitch, rel=1e-6)
    assert other.u_pitch == pytest.approx(scale * plain.u_pitch, rel=1e-3)
    assert np.array_equal(plain.kept, other.kept)


@pytest.mark.parametrize("x", [[1.0, 2.0], [4.0, 4.0, 4.0]])
def test_a_line_needs_points(x: list[float]) -> None:
    """Truth is theory: two points leave no scatter, one x no slope."""
    with pytest.raises(ValueError, match="a line needs"):
        fit_line(x, x)
