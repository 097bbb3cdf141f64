"""Guard bands and decisions, drawn against known truth.

Truth is theory: a measured value is the true one plus normal noise of the stated u, so the shares
of wrong decisions are known.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.verdict.decision import (
    DEFAULT_RISK,
    Decision,
    Limits,
    decide,
    guard_band,
    overall,
    probability_inside,
)

DRAWS = 40_000
SLACK = 4.0
"""Standard deviations of a drawn share: one failure in 16 000 runs, and the seed is fixed."""


def share_of_errors(truth: float, limits: Limits, u: float, guard: float, *, seed: int) -> float:
    """Share of decisions that contradict the truth."""
    noise = np.random.default_rng(seed).normal(truth, u, DRAWS)
    wrong = (
        Decision.DOES_NOT_CONFORM
        if decide(truth, limits, 0.0) is Decision.CONFORMS
        else Decision.CONFORMS
    )
    return float(np.mean([decide(value, limits, guard) is wrong for value in noise]))


def most_errors(risk: float) -> float:
    return risk + SLACK * math.sqrt(risk * (1 - risk) / DRAWS)


@pytest.mark.parametrize("risk", [0.01, 0.05, 0.2])
@pytest.mark.parametrize("width", [2.0, 3.0, 3.6, 5.0, 12.0])
def test_no_truth_is_misjudged_more_often_than_the_stated_risk(risk: float, width: float) -> None:
    """Just outside and just inside each limit is where decisions go wrong most often."""
    limits = Limits(10.0, 10.0 + width)
    guard = guard_band(1.0, risk=risk, width=width)
    for truth in (10.0 - 1e-9, 10.0 + 1e-9, 10.0 + width - 1e-9, 10.0 + width + 1e-9):
        assert share_of_errors(truth, limits, 1.0, guard, seed=11) <= most_errors(risk)


def test_the_stated_risk_is_used_up_at_a_single_limit() -> None:
    """A guard band far wider than needed would keep the risk, and decide nothing."""
    limits = Limits(10.0, None)
    guard = guard_band(1.0, risk=0.05)
    share = share_of_errors(10.0 - 1e-9, limits, 1.0, guard, seed=12)
    assert abs(share - 0.05) <= SLACK * math.sqrt(0.05 * 0.95 / DRAWS)


def test_what_conforms_does_so_with_the_stated_probability() -> None:
    """Truth drawn flat: of the values just accepted, 1 − risk have a truth inside the limits."""
    generator = np.random.default_rng(13)
    limits, u, risk = Limits(-3.0, 3.0), 1.0, 0.05
    guard = guard_band(u, risk=risk, width=limits.width)
    truth = generator.uniform(-12, 12, 20 * DRAWS)
    seen = truth + generator.normal(0, u, truth.size)
    at_the_edge = np.abs(np.abs(seen) - (3.0 - guard)) < 0.05
    outside = np.mean(np.abs(truth[at_the_edge]) > 3.0)
    # 0.05 u of bin moves the share by at most 0.05 × density at the limit, 0.005
    assert abs(outside - risk) < 0.005 + SLACK * math.sqrt(risk / at_the_edge.sum())


def test_a_tolerance_too_narrow_for_the_measurement_accepts_nothing() -> None:
    """Truth is theory: limits 3 u apart hold at most 87 % of what a value at their middle means."""
    limits = Limits(0.0, 3.0)
    guard = guard_band(1.0, risk=0.05, width=3.0)
    assert limits.shrunk(guard) is None
    assert {decide(v, limits, guard) for v in np.linspace(0, 3, 50)} == {Decision.UNDECIDED}


def test_the_default_guard_band_is_twice_u() -> None:
    """Truth is published: ISO 14253-1 and JCGM 106 take w = U, U = 2 u."""
    assert guard_band(0.13) == 0.26
    assert math.isclose(DEFAULT_RISK, 0.02275, abs_tol=5e-6)


@given(
    value=st.floats(-20, 20),
    u=st.floats(0.01, 5),
    freedom=st.one_of(st.just(math.inf), st.floats(1, 200)),
)
def test_what_is_decided_is_probable_enough(value: float, u: float, freedom: float) -> None:
    """Truth is theory: the posterior of the true value given the measured one, flat prior."""
    limits = Limits(-5.0, 5.0)
    guard = guard_band(u, risk=0.05, freedom=freedom, width=limits.width)
    inside = probability_inside(value, u, limits, freedom)
    match decide(value, limits, guard):
        case Decision.CONFORMS:
            assert inside >= 0.95 - 1e-9
        case Decision.DOES_NOT_CONFORM:
            assert inside <= 0.05 + 1e-9
        case Decision.UNDECIDED:
            pass


@given(value=st.floats(-10, 10), guard=st.floats(0, 3))
def test_a_mirrored_value_gets_the_same_decision(value: float, guard: float) -> None:
    """Truth is symmetry."""
    limits = Limits(-4.0, 4.0)
    assert decide(value, limits, guard) is decide(-value, limits, guard)


def test_the_whole_follows_its_worst_line() -> None:
    """Truth is the rule as stated: one failing line decides, else one open line."""
    good, bad, unclear = Decision.CONFORMS, Decision.DOES_NOT_CONFORM, Decision.UNDECIDED
    assert overall((good, good)) is good
    assert overall((good, unclear)) is unclear
    assert overall((good, unclear, bad)) is bad
    assert overall(()) is unclear


@pytest.mark.parametrize(
    ("call", "named"),
    [
        (lambda: guard_band(-1.0), "u"),
        (lambda: guard_band(1.0, risk=0.5), "risk"),
        (lambda: guard_band(1.0, risk=0.0), "risk"),
        (lambda: guard_band(1.0, freedom=0.0), "freedom"),
        (lambda: guard_band(math.nan), "u"),
        (lambda: Limits(None, None), "limits"),
        (lambda: Limits(2.0, 1.0), "lower"),
    ],
)
def test_a_wrong_call_names_its_parameter(call: object, named: str) -> None:
    """Refusal."""
    with pytest.raises(ValueError, match=named):
        call()  # type: ignore[operator]
