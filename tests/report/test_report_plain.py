"""A name from outside stays text, wherever it is shown.

Truth is Unicode's own categories and the first characters on which spreadsheets compute.
"""

from __future__ import annotations

import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.report.plain import FORMULA, cell, columns, plain, shortened

ANYTHING = st.text(st.characters(exclude_categories=()), max_size=60)


@given(ANYTHING)
def test_plain_text_holds_nothing_that_steers(text: str) -> None:
    shown = plain(text)
    assert not [each for each in shown if unicodedata.category(each) in ("Cc", "Cf", "Cs", "Zl")]
    shown.encode("utf-8")  # no lone surrogate is left
    assert plain(shown) == shown


@given(ANYTHING)
def test_a_cell_is_never_computed(text: str) -> None:
    assert not cell(text).lstrip(" ").startswith(FORMULA)


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", "  =1", "＝1"])
def test_each_known_formula_start_is_neutralised(text: str) -> None:
    assert cell(text).startswith("'")


def test_ordinary_names_pass_unchanged() -> None:
    for name in ("harrow-02.png", "Gewebe Ä 4711", "布地.tif", "naïve [red].png"):
        assert plain(name) == name
        assert cell(name) == name


@given(ANYTHING.map(plain), st.integers(8, 40))
def test_a_shortened_text_fits_and_keeps_its_ends(text: str, width: int) -> None:
    cut = shortened(text, width)
    assert columns(cut) <= width
    if columns(text) > width and "…" not in text:
        head, tail = cut.split("…")
        assert text.startswith(head)
        assert text.endswith(tail)


def test_wide_letters_take_two_columns() -> None:
    assert columns("布地") == 4
    assert columns("e\u0301") == 1
