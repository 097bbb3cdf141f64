"""Setts and tolerances as they are written.

Truth is theory: an inch is 25.4 mm; the meanings of DESIGN's tolerance grammar worked by hand.
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.cloth.sett import read_sett
from imgcover.cloth.stated import StatementError
from imgcover.cloth.tolerance import (
    read_cover_tolerance,
    read_mass_tolerance,
    read_sett_tolerance,
)


@pytest.mark.parametrize(
    ("text", "per_cm"),
    [
        ("68 /in", 68 / 2.54),
        ("68/inch", 68 / 2.54),
        ("68 per inch", 68 / 2.54),
        ("26.8 /cm", 26.8),
        ("268 /10cm", 26.8),
        ("268 /10 cm", 26.8),
        ("268 /dm", 26.8),
        ("2680 /m", 26.8),
        ("2.68 /mm", 26.8),
    ],
)
def test_a_sett_is_read_in_its_own_unit(text: str, per_cm: float) -> None:
    assert read_sett(text).per_cm == pytest.approx(per_cm, rel=1e-12)


@pytest.mark.parametrize(
    "text", ["68", "68 threads", "6800 /in", "0 /cm", "-68 /in", "/in", "68 /in u 1 /in", "6e1 /in"]
)
def test_a_sett_without_unit_or_sense_is_refused(text: str) -> None:
    with pytest.raises(StatementError):
        read_sett(text)


@given(st.floats(0.5, 250))
def test_inch_and_centimetre_say_the_same_sett(per_cm: float) -> None:
    metric, inch = read_sett(f"{per_cm:.9f} /cm"), read_sett(f"{per_cm * 2.54:.9f} /in")
    assert inch.per_mm == pytest.approx(metric.per_mm, rel=1e-8)


@pytest.mark.parametrize(
    ("text", "limits"),
    [
        ("2 %", (2.45, 2.55)),
        ("± 2 %", (2.45, 2.55)),
        ("-2 %", (2.45, None)),
        ("+5 %", (None, 2.625)),
        ("-2 % +5 %", (2.45, 2.625)),
        ("+5 % -2 %", (2.45, 2.625)),
        ("+5%-2%", (2.45, 2.625)),
        ("-0 % +5 %", (2.5, 2.625)),
        ("4 /10cm", (2.46, 2.54)),
        ("-4 /10cm +2 /10cm", (2.46, 2.52)),
        ("1 /in", (2.5 - 1 / 25.4, 2.5 + 1 / 25.4)),
        ("0.5 /cm", (2.45, 2.55)),
    ],
)
def test_limits_of_a_declared_25_threads_a_cm(
    text: str, limits: tuple[float | None, float | None]
) -> None:
    lower, upper = read_sett_tolerance(text).limits(2.5)
    for got, expected in ((lower, limits[0]), (upper, limits[1])):
        assert (got is None) == (expected is None)
        assert got == (None if expected is None else pytest.approx(expected, rel=1e-12))


@pytest.mark.parametrize(
    "text",
    [
        "2",
        "2 % 3 %",
        "-2 % -3 %",
        "-2 % +1 /in",
        "2 % +5 %",
        "80 %",
        "2 points",
        "2 g/m2",
        "",
        "±",
        "2 % u 1 %",
        "1 % 2 % 3 %",
    ],
)
def test_a_tolerance_with_two_meanings_is_refused(text: str) -> None:
    with pytest.raises(StatementError):
        read_sett_tolerance(text)


def test_cover_takes_points_only() -> None:
    assert read_cover_tolerance("4 points").limits(0.80) == pytest.approx((0.76, 0.84))
    assert read_cover_tolerance("-4 points").limits(0.80) == (pytest.approx(0.76), None)
    for text in ("4 %", "4", "0.04", "4 /10cm"):
        with pytest.raises(StatementError, match="points"):
            read_cover_tolerance(text)


def test_mass_takes_shares_and_grams() -> None:
    assert read_mass_tolerance("5 %").limits(118.0) == pytest.approx((112.1, 123.9))
    assert read_mass_tolerance("6 g/m2").limits(118.0) == (112.0, 124.0)
    assert read_mass_tolerance("6 g/m²").limits(118.0) == (112.0, 124.0)
    with pytest.raises(StatementError):
        read_mass_tolerance("4 /10cm")
