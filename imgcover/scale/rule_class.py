"""How far may an honest rule be wrong? Its accuracy class sets the limit."""

from __future__ import annotations

import math
from enum import IntEnum


class RuleClass(IntEnum):
    """Accuracy class of a material measure of length."""

    I = 1  # noqa: E741 - the class is called so
    II = 2
    III = 3


_FIXED_MM = {RuleClass.I: 0.1, RuleClass.II: 0.3, RuleClass.III: 0.6}
_A_METRE_MM = {RuleClass.I: 0.1, RuleClass.II: 0.2, RuleClass.III: 0.4}
_INTERVAL_MM = {RuleClass.I: 0.1, RuleClass.II: 0.2, RuleClass.III: 0.3}


def largest_error_mm(length_mm: float, rule_class: RuleClass) -> float:
    """Return the maximum permissible error of a length on a rule of the class, in mm.

    Parameters
    ----------
    length_mm : float
        Between two graduations, mm, > 0; rounded up to whole metres.
    rule_class : RuleClass
        I, II or III.

    Returns
    -------
    float
        a + b L; for a single interval of at most 1 mm the smaller limit that holds there.

    References
    ----------
    Directive 2014/32/EU, annex X (MI-008), chapter I; OIML R 35-1.
    """
    if not length_mm > 0:
        raise ValueError(f"length_mm must be positive, got {length_mm}")
    if length_mm <= 1.0:
        return _INTERVAL_MM[rule_class]
    return _FIXED_MM[rule_class] + _A_METRE_MM[rule_class] * math.ceil(length_mm / 1000)


def rule_u(length_mm: float, rule_class: RuleClass) -> float:
    """Return the relative standard uncertainty that the class leaves over a length.

    The limit is taken as the half-width of a rectangle (JCGM 100, 4.3.7).
    """
    return largest_error_mm(length_mm, rule_class) / length_mm / math.sqrt(3)


__all__ = ["RuleClass", "largest_error_mm", "rule_u"]
