"""Decisions of whole verdicts agree with the stated risk.

Truth is drawn: setts of the cloth drawn over and beyond their tolerance, measured with the stated
u; a verdict is wrong when it contradicts the drawn truth.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from verdict_sheets import sheet

from imgcover.cloth.prediction import predict
from imgcover.quantity import Measured
from imgcover.verdict.aims import aims
from imgcover.verdict.decision import Decision, Limits, overall
from imgcover.verdict.line import Line, Quantity, Sample, judge_line
from imgcover.verdict.pooled import pooled
from imgcover.verdict.verdict import overall_risk

DECLARED = sheet('[tolerance]\nends = "2 %"\npicks = "-3 % +5 %"')
AIMS = aims(DECLARED, predict(DECLARED))
U = 0.15
DRAWS = 4000
SLACK = 4.0
"""Standard deviations of a drawn share; the seeds are fixed."""


def conforms(quantity: Quantity, truth: float) -> bool:
    limits = AIMS[quantity].limits
    assert isinstance(limits, Limits)
    assert limits.lower is not None
    assert limits.upper is not None
    return limits.lower <= truth <= limits.upper


def lines_of(rng: np.random.Generator, truths: dict[Quantity, float], risk: float) -> list[Line]:
    return [
        judge_line(AIMS[q], Sample(Measured(rng.normal(truth, U), U, "1/cm")), risk=risk)
        for q, truth in truths.items()
    ]


@pytest.mark.parametrize("risk", [0.05, 0.15])
def test_decided_lines_are_wrong_no_more_often_than_stated(risk: float) -> None:
    """Truths drawn flat over three times the tolerance: the share of wrong decisions among those
    made at any truth stays below the risk, and among all decisions far below."""
    rng = np.random.default_rng(41)
    wrong = decided = 0
    worst: dict[int, list[bool]] = {}
    for _ in range(DRAWS):
        truth = rng.uniform(28.2, 31.8)
        (line,) = lines_of(rng, {Quantity.ENDS: truth}, risk)
        if line.decision is Decision.UNDECIDED:
            continue
        is_wrong = (line.decision is Decision.CONFORMS) != conforms(Quantity.ENDS, truth)
        decided += 1
        wrong += is_wrong
        worst.setdefault(round(20 * (line.measured or 0.0)), []).append(is_wrong)
    assert decided > DRAWS / 2
    assert wrong / decided < risk / 2
    for seen in worst.values():
        # given what was measured, in steps of 0.05 a cm; small groups get their own slack
        share = sum(seen) / len(seen)
        assert share <= risk + SLACK * math.sqrt(risk * (1 - risk) / len(seen))


def test_the_probability_a_line_states_is_the_share_of_errors() -> None:
    """Calibration: the mean of the stated probabilities is the share that were wrong."""
    rng = np.random.default_rng(42)
    stated, wrong = [], []
    for _ in range(DRAWS):
        truth = rng.uniform(28.2, 31.8)
        (line,) = lines_of(rng, {Quantity.ENDS: truth}, 0.2)
        if line.wrong is not None:
            stated.append(line.wrong)
            wrong.append((line.decision is Decision.CONFORMS) != conforms(Quantity.ENDS, truth))
    deviation = math.sqrt(np.mean(stated) / len(stated))
    assert abs(np.mean(wrong) - np.mean(stated)) < SLACK * deviation


def test_the_overall_risk_bounds_the_share_of_wrong_verdicts() -> None:
    rng = np.random.default_rng(43)
    stated, wrong = [], []
    for _ in range(DRAWS):
        truths = {
            Quantity.ENDS: rng.uniform(29.0, 31.0),
            Quantity.PICKS: rng.uniform(23.8, 26.6),
        }
        lines = tuple(lines_of(rng, truths, 0.2))
        decision = overall(tuple(line.decision for line in lines))
        risk = overall_risk(lines, decision)
        if risk is None:
            continue
        truth = all(conforms(q, value) for q, value in truths.items())
        stated.append(risk)
        wrong.append((decision is Decision.CONFORMS) != truth)
    deviation = math.sqrt(np.mean(stated) / len(stated))
    assert np.mean(wrong) <= np.mean(stated) + SLACK * deviation


@pytest.mark.parametrize("n", [2, 3, 5, 10])
def test_few_places_keep_the_stated_risk_by_students_factor(n: int) -> None:
    """Scatter between places is only known from the places themselves: the normal factor would
    refuse good lots too often, Student's does not."""
    rng = np.random.default_rng(44 + n)
    risk, truth, scatter = 0.05, 29.4, 0.2  # exactly at the lower limit
    refused, lots = 0, 1500
    for _ in range(lots):
        places = [Measured(v, 0.0, "1/cm") for v in rng.normal(truth, scatter, n)]
        mean = pooled(places, common_u=0.0)
        sample = Sample(mean.mean, n, mean.freedom)
        line = judge_line(AIMS[Quantity.ENDS], sample, risk=risk)
        refused += line.decision is Decision.DOES_NOT_CONFORM
    share, slack = refused / lots, SLACK * math.sqrt(risk * (1 - risk) / lots)
    # limits within reach of one another share the risk, so very few places are refused more rarely
    assert risk - slack <= share <= risk + slack or (n <= 3 and share < risk)


def test_an_open_line_leaves_no_risk_to_state() -> None:
    line = judge_line(AIMS[Quantity.ENDS], Sample(Measured(29.4, U, "1/cm")))
    assert line.wrong is None
    assert overall_risk((line,), Decision.UNDECIDED) is None
    assert overall_risk((replace(line, wrong=None),), Decision.CONFORMS) is None
