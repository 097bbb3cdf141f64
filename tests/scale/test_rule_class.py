"""Accuracy classes of rules."""

from __future__ import annotations

import math

import pytest

from imgcover.scale.rule_class import RuleClass, largest_error_mm, rule_u


@pytest.mark.parametrize(
    ("length_mm", "one", "two", "three"),
    [(1, 0.1, 0.2, 0.3), (100, 0.2, 0.5, 1.0), (1000, 0.2, 0.5, 1.0), (1500, 0.3, 0.7, 1.4)],
)
def test_limits_of_error(length_mm: float, one: float, two: float, three: float) -> None:
    """Truth is published: Directive 2014/32/EU, annex X: a + b L, L in whole metres rounded up;
    a: 0.1, 0.3, 0.6 mm, b: 0.1, 0.2, 0.4 mm; intervals up to 1 mm: 0.1, 0.2, 0.3 mm."""
    limits = [largest_error_mm(length_mm, each) for each in RuleClass]
    assert limits == pytest.approx([one, two, three])


def test_short_rules_prove_little() -> None:
    """Truth is theory: class II over 25 mm is 2 %, a rectangle of it 1.15 %."""
    assert rule_u(25, RuleClass.II) == pytest.approx(0.02 / math.sqrt(3))
    assert rule_u(100, RuleClass.II) == pytest.approx(0.005 / math.sqrt(3))


def test_a_length_must_be_positive() -> None:
    """Truth is theory: nothing has a limit of error over no length."""
    with pytest.raises(ValueError, match="length_mm"):
        largest_error_mm(0, RuleClass.I)
