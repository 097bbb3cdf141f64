"""Is a stated pitch read as it is meant, and refused where it means nothing?"""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pint import UnitRegistry

from imgcover.errors import ScaleError
from imgcover.findings import Flag, has
from imgcover.scale.pitch import parse_pitch, parse_pitch_u, scale_from

INCH = 25.4
UNITS = UnitRegistry()


@pytest.mark.parametrize(
    ("text", "px_per_mm", "u"),
    [
        ("600dpi", 600 / INCH, 0.005),
        ("600 dpi", 600 / INCH, 0.005),
        ("1200DPI", 1200 / INCH, 0.005),
        (" 599.5 dpi ", 599.5 / INCH, 0.005),
        ("23.62px/mm", 23.62, 0.0),
        ("23.62 px/mm", 23.62, 0.0),
        ("42.3um", 1000 / 42.3, 0.0),
        ("42.3µm", 1000 / 42.3, 0.0),
        ("42.3 μm", 1000 / 42.3, 0.0),
        ("4.23e1um", 1000 / 42.3, 0.0),
        (".5um", 2000.0, 0.0),
    ],
)
def test_a_pitch_is_read_in_each_of_its_ways(text: str, px_per_mm: float, u: float) -> None:
    """Truth is theory: an inch is 25.4 mm; a pitch in µm is the inverse of px/mm."""
    pitch = parse_pitch(text)
    assert pitch.px_per_mm == pytest.approx(px_per_mm, rel=1e-12)
    assert pitch.u_relative == u


@settings(deadline=None)  # a busy machine is no fault
@given(dpi=st.floats(26, 50_000))
def test_dpi_against_a_referee(dpi: float) -> None:
    """Truth is a referee: pint's inch and millimetre."""
    per_mm = (dpi / UNITS.inch).to(1 / UNITS.mm).magnitude
    assert parse_pitch(f"{dpi!r} dpi").px_per_mm == pytest.approx(per_mm, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("", "not a pitch"),
        ("dpi", "not a pitch"),
        ("dpi600", "not a pitch"),
        ("42,3um", "decimal point"),
        ("600", "no unit"),
        ("600ppi", "unknown unit 'ppi'"),
        ("600 px/cm", "unknown unit"),
        ("600 dpi x", "not a pitch"),
        ("0dpi", "more than zero"),
        ("-600dpi", "more than zero"),
        ("0um", "more than zero"),
        ("3dpi", "under 1 or over 2000"),
        ("100000dpi", "under 1 or over 2000"),
        ("1e999px/mm", "under 1 or over 2000"),
        ("1e-320um", "under 1 or over 2000"),
        ("0.1um", "under 1 or over 2000"),
        ("42.3mm", "unknown unit 'mm'"),
        ("nandpi", "not a pitch"),
        ("infdpi", "not a pitch"),
        ("6oo dpi", "unknown unit|not a pitch"),
    ],
)
def test_what_is_no_pitch_is_refused_with_a_remedy(text: str, fault: str) -> None:
    """Truth is the contract: a number and one of three units, within reason."""
    with pytest.raises(ScaleError, match=fault) as refused:
        parse_pitch(text, option="--pitch-y")
    assert refused.value.where == "--pitch-y"
    assert refused.value.remedy


@settings(deadline=None)  # a busy machine is no fault
@given(text=st.text(max_size=12))
def test_any_text_is_read_or_refused(text: str) -> None:
    """Truth is the contract: nothing but ScaleError comes out."""
    for parse in (parse_pitch, parse_pitch_u):
        try:
            parse(text)
        except ScaleError:
            continue


@pytest.mark.parametrize(
    ("text", "share"), [("0.2%", 0.002), ("0.2 %", 0.002), ("1%", 0.01), ("0%", 0), (".5 %", 0.005)]
)
def test_an_uncertainty_is_a_percentage(text: str, share: float) -> None:
    """Truth is theory: one per cent is a hundredth."""
    assert parse_pitch_u(text) == pytest.approx(share)


@pytest.mark.parametrize("text", ["", "0.2", "%", "-1%", "10%", "200 %", "0.2%%", "nan%", "1e1%"])
def test_what_is_no_uncertainty_is_refused(text: str) -> None:
    """Truth is the contract: a share from nothing to under a tenth."""
    with pytest.raises(ScaleError, match="--pitch-u"):
        parse_pitch_u(text)


def test_a_stated_dpi_carries_half_a_per_cent_each_way() -> None:
    """Truth is the contract; two independent half per cents make 0.707 % of their ratio."""
    scale = scale_from(parse_pitch("600dpi"))
    for axis in (scale.x, scale.y):
        assert axis.value == pytest.approx(600 / INCH)
        assert axis.u == pytest.approx(0.005 * 600 / INCH)
        assert axis.unit == "px/mm"
    assert scale.ratio_u == pytest.approx(math.sqrt(0.5) / 100)
    assert scale.source == "stated pitch"
    assert scale.findings == ()


@pytest.mark.parametrize("text", ["23.62px/mm", "42.3um"])
def test_an_exact_pitch_is_said_to_be_taken_so(text: str) -> None:
    """Truth is the contract."""
    scale = scale_from(parse_pitch(text))
    assert scale.x.u == scale.y.u == scale.ratio_u == 0
    assert has(scale.findings, Flag.PITCH_TAKEN_AS_EXACT)
    assert text in scale.findings[0].message


def test_a_stated_uncertainty_replaces_both() -> None:
    """Truth is the contract: --pitch-u says better."""
    for text in ("600dpi", "42.3um"):
        scale = scale_from(parse_pitch(text), pitch_u=0.002)
        assert scale.x.u / scale.x.value == pytest.approx(0.002)
        assert scale.ratio_u == pytest.approx(0.002 * math.sqrt(2))
        assert scale.findings == ()


def test_the_axes_are_the_stored_files_and_turn_with_it() -> None:
    """Truth is symmetry: a quarter turn exchanges x and y, a half turn does nothing."""
    x, y = parse_pitch("600dpi"), parse_pitch("20px/mm")
    lying, standing = scale_from(x, y), scale_from(x, y, swapped=True)
    assert (lying.x.value, lying.y.value) == pytest.approx((600 / INCH, 20))
    assert (standing.x, standing.y) == (lying.y, lying.x)
    assert lying.ratio_u == standing.ratio_u == pytest.approx(0.005)
    assert has(lying.findings, Flag.PITCH_TAKEN_AS_EXACT)
