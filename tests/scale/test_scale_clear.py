"""The largest part of a picture that no rule lies in.

Truth is theory: rectangles that can be told by eye, and a search of all rectangles.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from imgcover.scale.clear import _largest, clear_part

SHAPE = (600, 900)
WHOLE = (0, 0, 900, 600)


def box(x: float, y: float, width: float, height: float) -> NDArray[np.float64]:
    return np.array([[x, y], [x + width, y], [x + width, y + height], [x, y + height]])


def test_without_areas_all_of_it_is_clear() -> None:
    assert clear_part((), SHAPE, within=(10, 20, 300, 200)) == (10, 20, 300, 200)


def test_a_rule_along_an_edge_leaves_the_rest() -> None:
    x, y, width, height = clear_part([box(-50, 450, 1000, 120)], SHAPE, within=WHOLE)
    assert (x, y, width) == (0, 0, 900)
    # told to a cell of 2 px
    assert 440 <= height <= 450


def test_what_was_asked_for_is_never_left() -> None:
    x, y, width, height = clear_part([box(0, 0, 900, 50)], SHAPE, within=(100, 20, 400, 300))
    assert x >= 100
    assert y >= 50
    assert x + width <= 500
    assert y + height <= 320
    assert width * height > 0.95 * 400 * 270


def test_a_rule_across_the_middle_leaves_the_larger_side() -> None:
    x, _, width, _ = clear_part([box(300, -10, 100, 700)], SHAPE, within=WHOLE)
    assert 400 <= x <= 406
    assert width >= 490


def test_nothing_is_left_under_a_rule_that_covers_everything() -> None:
    *_, width, height = clear_part([box(-9, -9, 999, 999)], SHAPE, within=WHOLE)
    assert (width, height) == (0, 0)


def largest_area(free: NDArray[np.bool_]) -> int:
    """Try every rectangle."""
    rows, columns = free.shape
    return max(
        (
            (bottom - top) * (right - left)
            for top in range(rows)
            for bottom in range(top + 1, rows + 1)
            for left in range(columns)
            for right in range(left + 1, columns + 1)
            if free[top:bottom, left:right].all()
        ),
        default=0,
    )


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 2**30), st.integers(1, 7), st.integers(1, 7), st.floats(0.3, 0.95))
def test_no_rectangle_is_larger(seed: int, rows: int, columns: int, share: float) -> None:
    free = np.random.default_rng(seed).random((rows, columns)) < share
    x, y, width, height = _largest(free)
    assert free[y : y + height, x : x + width].all()
    assert width * height == largest_area(free)


@pytest.mark.parametrize("value", [True, False])
def test_all_or_nothing(value: bool) -> None:
    expected = (0, 0, 4, 3) if value else (0, 0, 0, 0)
    assert _largest(np.full((3, 4), value)) == expected
