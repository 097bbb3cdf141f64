"""What scale do the rules in a picture give, along x and along y?

One rule says how many pixels make a millimetre along itself. Across it a scanner may differ, and
nothing in the picture tells by how much, unless a second rule lies across the first.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.clear import Rectangle, clear_part
from imgcover.scale.rule import RuleReading, Unit, find_rules
from imgcover.scale.rule_class import RuleClass
from imgcover.scale.rule_levels import Pictured
from imgcover.scale.scale import Scale, ScaleSource

UNEQUAL_AXES = 0.01 / math.sqrt(3)
"""Relative standard uncertainty of y over x: consumer flatbeds differ by up to 1 %, taken as the
half-width of a rectangle."""
ACROSS = math.sin(math.radians(30))
"""Two rules at less than 30° to each other say the same thing twice."""
TILT_WORTH_SAYING = 0.001


@dataclass(frozen=True, slots=True, eq=False)
class RuleScale:
    """The scale by rule, or None, with the parts of the picture that are rule and no cloth.

    `areas` holds corners, shape (4, 2), x and y in picture pixels (`rule_area.area_mask`).
    """

    scale: Scale | None
    areas: tuple[NDArray[np.float64], ...]
    findings: tuple[Finding, ...]


def measure_rules(
    picture: Pictured,
    *,
    unit: Unit = "auto",
    rule_class: RuleClass = RuleClass.II,
    within: Rectangle | None = None,
) -> RuleScale:
    """Find the rules in a picture and make a scale of them.

    Parameters
    ----------
    picture : Pictured
        The picture.
    unit : {"auto", "mm", "inch"}
        What the user says of the rule (`--rule`).
    rule_class : RuleClass
        What the user says of its accuracy (`--rule-class`).
    within : tuple of int, optional
        (x, y, width, height), px: the part that may be cloth; the whole picture by default.

    Returns
    -------
    RuleScale
        `scale` is None where no rule was found or none can be trusted; a finding says why. It is
        the scale at the middle of what the rules leave of the cloth: a picture taken aslant has
        another one elsewhere.
    """
    search = find_rules(picture, unit=unit, rule_class=rule_class)
    if not search.readings:
        return RuleScale(None, search.areas, search.findings)
    whole = (0, 0, picture.columns, picture.rows)
    left, top, width, height = clear_part(
        search.areas, (picture.rows, picture.columns), within=within or whole
    )
    middle = np.array([left + (width - 1) / 2, top + (height - 1) / 2])
    readings = search.readings
    if width and height:
        readings = tuple(each.at(middle) for each in readings)
    scale = scale_of(readings)
    return RuleScale(scale, search.areas, search.findings + scale.findings)


def scale_of(readings: tuple[RuleReading, ...]) -> Scale:
    """Make a scale of agreeing readings, the surest first.

    Notes
    -----
    Along a direction at angle a to x, ln p = cos²a ln X + sin²a ln Y to first order in Y/X − 1.
    These equations, one a rule, and ln Y − ln X = 0 ± `UNEQUAL_AXES` are solved by weighted least
    squares. Of parallel rows, which share one rule's error, only the surest is used.
    """
    used = [readings[0]]
    used += [
        each for each in readings[1:] if abs(math.sin(each.angle - readings[0].angle)) > ACROSS
    ][:1]
    rows = [[math.cos(each.angle) ** 2, math.sin(each.angle) ** 2] for each in used] + [[-1, 1]]
    values = [math.log(each.px_per_mm.value) for each in used] + [0.0]
    us = [each.px_per_mm.u / each.px_per_mm.value for each in used] + [UNEQUAL_AXES]
    weighted = np.array(rows) / np.array(us)[:, None]
    covariance = np.linalg.inv(weighted.T @ weighted)
    x, y = np.exp(covariance @ weighted.T @ (np.array(values) / np.array(us)))
    u_x, u_y = np.sqrt(np.diag(covariance))
    ratio_u = math.sqrt(max(0.0, covariance[0, 0] + covariance[1, 1] - 2 * covariance[0, 1]))
    return Scale(
        Measured(float(x), float(x * u_x), "px/mm"),
        Measured(float(y), float(y * u_y), "px/mm"),
        ratio_u,
        ScaleSource.RULE,
        findings=_noticed(used),
    )


def _noticed(used: list[RuleReading]) -> tuple[Finding, ...]:
    findings = [found(Flag.RULE_READ, "; ".join(_said(each) for each in used))]
    if len(used) == 1:
        findings.append(found(Flag.RULE_ONE_WAY))
    if max(each.tilt for each in used) > TILT_WORTH_SAYING:
        findings.append(found(Flag.RULE_TILT_CORRECTED))
    return tuple(findings)


def _said(reading: RuleReading) -> str:
    turn = math.degrees(reading.angle) % 180
    return (
        f"rule read: {reading.lines} lines every {reading.graduations[0]} over "
        f"{reading.length_mm:.4g} mm at {turn:.1f}° to x, {reading.dropped} left out, "
        f"{reading.px_per_mm.value:.5g} px/mm"
    )


__all__ = ["RuleScale", "measure_rules", "scale_of"]
