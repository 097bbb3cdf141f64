"""Conformity decisions against the worked figures of the standards.

Truth is published: JCGM 106:2012 (examples of clauses 7 and 8), JCGM 100:2008 example H.1,
ISO 14253-1:2017. Figures marked "memory" were written down from memory of the standard, not read
again; each is also recomputed, so a slip of memory would show as a contradiction.
"""

from __future__ import annotations

import math

import pytest
from scipy import stats

from imgcover.verdict.decision import Decision, Limits, decide, guard_band, probability_inside
from imgcover.verdict.pooled import effective_freedom


@pytest.mark.parametrize(
    ("value", "u", "limits", "published"),
    [
        pytest.param(-5.47, 0.05, Limits(None, -5.40), 0.92, id="breakdown voltage, memory"),
        pytest.param(509.7, 8.6, Limits(490.0, None), 0.99, id="burst pressure, memory"),
        pytest.param(13.6, 1.8, Limits(12.5, 16.3), 0.66, id="oil viscosity, memory"),
    ],
)
def test_conformance_probability(value: float, u: float, limits: Limits, published: float) -> None:
    """JCGM 106 clause 7: printed to two digits, so half of the last digit is allowed."""
    assert abs(probability_inside(value, u, limits) - published) <= 0.005


def test_guarded_rejection_of_the_radar_gun() -> None:
    """JCGM 106 clause 8.3.3 (memory): limit 100 km/h, u 2 %, 99.9 % sure: 107 km/h is too fast."""
    limits = Limits(None, 100.0)
    fast = {
        speed: decide(speed, limits, guard_band(0.02 * speed, risk=0.001))
        for speed in (105.0, 106.0, 107.0)
    }
    assert fast[107.0] is Decision.DOES_NOT_CONFORM
    assert fast[106.0] is Decision.UNDECIDED
    # the printed 107 is rounded up from 106.6


def test_guard_band_of_the_expanded_uncertainty() -> None:
    """JCGM 106 8.3.2.2 (memory): w = U = 2 u leaves a risk of at most 2.3 % at one limit."""
    limits = Limits(0.0, None)
    assert abs(probability_inside(guard_band(1.0), 1.0, limits) - 0.977) <= 0.0005


def test_guard_band_of_iso_14253() -> None:
    """ISO 14253-1:2017 (memory): a conformance probability of 95 % takes 1.65 u."""
    assert round(guard_band(1.0, risk=0.05), 2) in (1.64, 1.65)
    assert math.isclose(guard_band(1.0, risk=0.05), stats.norm.ppf(0.95), rel_tol=1e-12)


def test_gauge_block_degrees_of_freedom() -> None:
    """JCGM 100 H.1: u 32 nm, ν 16 (16.7 cut down), k₉₉ 2.92, U 93 nm; components from memory.

    Components, nm (ν): standard 25 (18), comparison 9.7 (25.6), expansion 2.9 (50),
    temperature 16.6 (2), second order 11.7 (treated as well known).
    """
    parts = [(25.0, 18.0), (9.7, 25.6), (2.9, 50.0), (16.6, 2.0), (0.0, math.inf)]
    combined = math.sqrt(sum(u**2 for u, _ in parts))
    freedom = effective_freedom(parts)
    # The printed 32 nm is rounded from 31.7, and 32⁴ is what the print divides: 16.7; with 31.7
    # it is 16.4. Both are cut down to 16.
    assert round(combined) == 32
    assert math.floor(freedom) == 16
    factor = guard_band(1.0, risk=0.005, freedom=math.floor(freedom))
    assert round(factor, 2) == 2.92
    assert abs(factor * 32 - 93) <= 0.5


@pytest.mark.parametrize("freedom", [1.0, 2.0, 4.0, 16.7, 1e6])
@pytest.mark.parametrize("risk", [0.001, 0.02275, 0.05])
def test_students_factor_against_scipy(freedom: float, risk: float) -> None:
    """Truth is a referee: scipy.stats.t."""
    expected = stats.t.ppf(1 - risk, freedom)
    assert math.isclose(guard_band(1.0, risk=risk, freedom=freedom), expected, rel_tol=1e-9)
