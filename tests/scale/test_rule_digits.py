"""Digits at every second longest line; rows that have only one scale in common.

Truth is drawn: a band of paper with the digits' ink where the test puts it.
"""

from __future__ import annotations

import math
from typing import Any, cast

import numpy as np
import pytest

from imgcover.quantity import Measured
from imgcover.scale.rule import RuleReading, in_common
from imgcover.scale.rule_digits import numbered_otherwise
from imgcover.scale.rule_frame import Frame
from imgcover.scale.rule_hierarchy import Graduation, Pattern, levels
from imgcover.scale.rule_lines import Row

PITCH = 8.0
STEPS = (1, 2, 4, 8, 16)
LENGTHS = (2.0, 3.0, 4.0, 5.5, 7.0)


@pytest.mark.parametrize(
    ("numbered", "otherwise"),
    [((16, 48, 80), True), ((32, 64), True), ((16, 32, 48, 64, 80), False), ((), False)],
)
def test_digits_at_every_second_longest_line(numbered: tuple[int, ...], otherwise: bool) -> None:
    """Truth is theory: where only every second of the longest lines is numbered, the unit is two
    of them; where all or none are, the lines' lengths stand. Line 0 need not be numbered."""
    numbers = np.arange(97)
    reach = np.array(LENGTHS)[levels(numbers, STEPS)] * PITCH
    ones = np.ones(97)
    frame = Frame(20.0, 10.0, 0.0, math.pi / 2)
    places = numbers * PITCH
    row = Row(
        frame, PITCH, numbers, places, reach, reach, reach, ones, ones, 0 * ones, ones, False, 16.0
    )
    pattern = Pattern(STEPS, (Graduation.SIXTEENTH_INCH,), 0, LENGTHS, 0.0, 1.0)
    tone = np.random.default_rng(5).normal(0.8, 0.01, (150, 820)).astype(np.float32)
    for number in numbered:
        left, top = int(20 + number * PITCH) - 6, int(10 + 7.5 * PITCH)
        tone[top : top + 16, left : left + 12] = 0.2
    assert numbered_otherwise(tone, row, pattern) is otherwise


def opened(px_per_mm: float) -> RuleReading:
    """A row whose lines are millimetres at so many px/mm, or tenths of an inch."""
    nothing = cast(Any, None)
    return RuleReading(
        px_per_mm=Measured(px_per_mm, 0.001, "px/mm"),
        angle=0.0,
        graduations=(Graduation.MM, Graduation.TENTH_INCH),
        u_fit=1e-4,
        u_class=2e-3,
        lines=80,
        dropped=0,
        length_mm=80.0,
        tilt=0.0,
        corners=np.zeros((4, 2)),
        view=nothing,
        factor=1,
    )


def test_millimetres_beside_tenths_tell_each_other() -> None:
    """Truth is theory: lines 10 and 25.4 px apart are 1 mm and 1/10 inch at 10 px/mm, and no other
    scale makes both what they can be; two rows of one distance, or one alone, tell nothing."""
    read = in_common([opened(10.0), opened(25.4)])
    assert [each.graduations for each in read] == [
        (Graduation.MM,),
        (Graduation.TENTH_INCH,),
    ]
    assert [each.px_per_mm.value for each in read] == pytest.approx([10.0, 10.0])
    assert not in_common([opened(10.0), opened(10.0)])
    assert not in_common([opened(10.0)])
    assert not in_common([opened(10.0), opened(17.0)])
