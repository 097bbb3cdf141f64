"""300 deliveries with one known deviation each, and 60 with none.

Truth is drawn: drawn_deliveries, seeds 902, 2032 and 2033. Each cloth is changed in its
construction, its constants are drawn from their stated u, and every measurement carries noise of
its stated u. The names of the causes are the program's; what they do to a cloth is written anew
there. Four seeds gave the true cause first in 94 to 96 %, in the first two in 97 to 99 %; 902
lies in their middle.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest
from drawn_deliveries import DEVIATIONS, FINISHED, GREY, Delivery, draw_delivery

from imgcover.cloth.prediction import predict
from imgcover.verdict.decision import Decision
from imgcover.verdict.evidence import agrees, evidence_of
from imgcover.verdict.sheet import sheet_of
from imgcover.verdict.swatch import judge
from imgcover.verdict.verdict import Suspect

EACH = 12
"""Deliveries a cause: 25 causes make 300."""
NONE_WRONG = 60
SCALE = "both densities off by one factor (scale)"


@dataclass(frozen=True)
class Seen:
    delivery: Delivery
    diagnosis: tuple[Suspect, ...]
    decision: Decision


TIES: tuple[tuple[str, str, Callable[[Delivery], bool]], ...] = (
    # Both ways alike packs both systems closer by one factor, as a wrong scale reads them: only
    # cover and mass differ, by less than their u when the factor is small.
    (SCALE, f"{GREY}: shrinkage both ways", lambda d: True),
    (SCALE, f"{FINISHED}: missing shrinkage both ways", lambda d: True),
    # One way changes one sett, as too many or too few threads do; the other system's yarn gets
    # longer, which only a mass shows, and treatments move a mass by as much.
    ("more picks than declared", f"{GREY}: shrinkage in length", lambda d: True),
    ("more ends than declared", f"{GREY}: shrinkage in width", lambda d: True),
    ("picks short", f"{FINISHED}: missing shrinkage in length", lambda d: True),
    ("ends short", f"{FINISHED}: missing shrinkage in width", lambda d: True),
    # Coarser yarns and flatter ones cover alike: only a mass tells them apart.
    (
        "yarn flattened in finishing",
        "warp and weft yarns coarser than declared",
        lambda d: d.observed.gsm is None,
    ),
    (
        "yarn flattened in finishing",
        "folded warp and weft yarns declared by their single count",
        lambda d: d.observed.gsm is None,
    ),
    # Twofold yarn counted by its plies is read double, as pairs taken for threads are.
    ("plies counted as threads: ends", "threads in pairs: ends", lambda d: True),
    ("plies counted as threads: picks", "threads in pairs: picks", lambda d: True),
)
"""Pairs of causes that the evidence cannot tell apart, and when."""


def may_tie(delivery: Delivery, one: str, other: str) -> bool:
    return any({one, other} == {a, b} and when(delivery) for a, b, when in TIES)


def is_first(seen: Seen) -> bool:
    """The true cause is named first, or named as a listed tie with the first."""
    truth, diagnosis = seen.delivery.truth, seen.diagnosis
    if not diagnosis:
        return False
    if diagnosis[0].cause == truth:
        return True
    tied = truth in diagnosis[0].tied_with
    return tied and may_tie(seen.delivery, diagnosis[0].cause, str(truth))


def is_in_two(seen: Seen) -> bool:
    return is_first(seen) or seen.delivery.truth in [each.cause for each in seen.diagnosis[:2]]


def look(delivery: Delivery) -> Seen:
    declaration = delivery.declaration
    verdict = judge(declaration, predict(declaration), delivery.observed)
    return Seen(delivery, verdict.diagnosis, verdict.decision)


@pytest.fixture(scope="module")
def wrong() -> list[Seen]:
    rng = np.random.default_rng(902)
    return [look(draw_delivery(name, rng)) for name in DEVIATIONS for _ in range(EACH)]


@pytest.fixture(scope="module")
def right() -> list[Seen]:
    rng = np.random.default_rng(2032)
    return [look(draw_delivery(None, rng)) for _ in range(NONE_WRONG)]


def test_there_are_three_hundred(wrong: list[Seen]) -> None:
    assert len(wrong) == 300


def test_the_true_cause_is_named_first(wrong: list[Seen]) -> None:
    missed = Counter(str(seen.delivery.truth) for seen in wrong if not is_first(seen))
    assert sum(missed.values()) <= 0.10 * len(wrong), missed


def test_the_true_cause_is_among_the_first_two(wrong: list[Seen]) -> None:
    missed = Counter(str(seen.delivery.truth) for seen in wrong if not is_in_two(seen))
    assert sum(missed.values()) <= 0.03 * len(wrong), missed


def test_ties_do_not_do_the_work(wrong: list[Seen]) -> None:
    """Even where a listed tie counts as a miss, the true cause is first almost as often."""
    strict = [bool(s.diagnosis) and s.diagnosis[0].cause == s.delivery.truth for s in wrong]
    assert np.mean(strict) >= 0.88


def test_a_right_delivery_is_seldom_accused(right: list[Seen]) -> None:
    """The stated risk is 2.28 %: of 60, four or more would come once in 20 if it were used up."""
    assert sum(bool(seen.diagnosis) for seen in right) <= 3


@pytest.mark.parametrize("at_limits", [False, True])
def test_the_share_of_false_alarms_keeps_to_the_risk(at_limits: bool) -> None:
    """Right cloths, in the middle or at the corners of their tolerances, at a stated 5 %."""
    rng, alarms, drawn, risk = np.random.default_rng(2033), 0, 250, 0.05
    for _ in range(drawn):
        delivery = draw_delivery(None, rng, at_limits=at_limits)
        sheet, evidence = sheet_of(delivery.declaration), evidence_of(delivery.observed)
        alarms += not agrees(sheet, evidence, risk=risk)
    # three standard deviations of the drawn share
    assert alarms / drawn <= risk + 3 * np.sqrt(risk * (1 - risk) / drawn)
    assert alarms > 0  # a test that never fires would keep any risk


def test_a_right_delivery_is_never_refused(right: list[Seen]) -> None:
    """Drawn within half its tolerances, with u of half a percent at most: none lies beyond."""
    assert not [seen for seen in right if seen.decision is Decision.DOES_NOT_CONFORM]


def test_weights_are_a_share_and_fall(wrong: list[Seen]) -> None:
    for seen in wrong:
        weights = [each.weight for each in seen.diagnosis]
        assert weights == sorted(weights, reverse=True)
        assert sum(weights) <= 1 + 1e-9


def test_every_suspect_says_what_speaks_for_it_and_how_to_settle_it(wrong: list[Seen]) -> None:
    first = [seen.diagnosis[0] for seen in wrong if seen.diagnosis]
    assert all(each.settle for each in first)
    assert np.mean([bool(each.speaks_for) for each in first]) > 0.95
