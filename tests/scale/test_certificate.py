"""Device certificates: written, read, used, checked, refused."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from imgcover.errors import CertificateError
from imgcover.findings import Flag, has
from imgcover.quantity import Measured
from imgcover.scale.certificate import (
    Certificate,
    find_certificate,
    read_certificate,
    write_certificate,
)
from imgcover.scale.certificate_use import (
    U_OTHER_RESOLUTION,
    Holding,
    check_certificate,
    scale_from_certificate,
)
from imgcover.scale.sheet import SHEET_NAME, Bars
from imgcover.scale.sheet_bed import BedMap
from imgcover.scale.sheet_device import DeviceReading

MADE, ENDS, TODAY = date(2026, 1, 10), date(2027, 1, 10), date(2026, 6, 1)
DPI = (600.0, 600.0)


def reading(x: float = 23.60, y: float = 23.72, u: float = 2e-4) -> DeviceReading:
    """A device's reading with these pitches, px/mm."""
    places = np.stack(np.meshgrid(np.arange(20.0, 180, 10), np.arange(20.0, 180, 10)), -1)
    return DeviceReading(
        Measured(x, x * u, "px/mm"),
        Measured(y, y * u, "px/mm"),
        1e-4,
        Measured(3e-4, 5e-5, "rad"),
        BedMap(places.reshape(-1, 2), np.full((256, 2), 0.01), 0.004),
        True,
        512,
        (1e-4, -2e-4, 5e-5),
        (u / 2, u / 2),
    )


def text(**other: object) -> str:
    """A certificate's text."""
    said = {
        "name": 'bench "2"',
        "resolution_dpi": DPI,
        "tone": "srgb",
        "made": MADE,
        "valid_until": ENDS,
        "sheet": SHEET_NAME,
        "bars": Bars(180.4, 260.2, 0.3),
        "scans_sha256": ("ab" * 32, "cd" * 32),
    }
    return write_certificate(reading(), **{**said, **other})  # type: ignore[arg-type]


def certificate(**other: object) -> Certificate:
    """The same, read."""
    return read_certificate(text(**other).encode(), name="bench.toml")


def test_what_is_written_is_read() -> None:
    """Truth is theory: a round trip keeps nine digits."""
    held = certificate()
    assert held.name == 'bench "2"'
    assert held.x.value == pytest.approx(23.60, rel=1e-8)
    assert held.y.u == pytest.approx(23.72 * 2e-4, rel=1e-8)
    assert (held.made, held.valid_until) == (MADE, ENDS)
    assert held.sheet_errors == pytest.approx((1e-4, -2e-4, 5e-5))
    assert held.bars == Bars(180.4, 260.2, 0.3)
    assert len(held.sha256) == 64


@pytest.mark.parametrize(
    ("old", "new", "where"),
    [
        ("[pitch]", "[pitches]", "pitch"),
        ("x = 23.6", "x = -23.6", "pitch.x"),
        ("x = 23.6", "x = 11.8", "pitch.x"),
        ("ratio_u", "ratio_v", "pitch.ratio_"),
        ("valid_until = 2027", "valid_until = 2025", "dates"),
        ("certificate/1", "certificate/9", "certificate"),
        ("bars_mm = [180.4", "bars_mm = [100.4", "evidence.bars_mm"),
        ("[dates]", "[dates", "bench.toml"),
        ("made = 2026-01-10", 'made = "soon"', "dates.made"),
    ],
)
def test_a_damaged_certificate_is_refused(old: str, new: str, where: str) -> None:
    """Truth is theory: what was altered is named."""
    altered = text().replace(old, new, 1)
    assert altered != text()
    with pytest.raises(CertificateError) as caught:
        read_certificate(altered.encode(), name="bench.toml")
    assert where in caught.value.where


def test_no_file_is_refused(tmp_path) -> None:  # type: ignore[no-untyped-def]
    """Truth is theory: a name without a file, and a file that is no TOML."""
    with pytest.raises(CertificateError):
        read_certificate(tmp_path / "none.toml", name="none.toml")
    with pytest.raises(CertificateError):
        read_certificate(b"\xff\xfe", name="x.toml")
    assert find_certificate("bench-2").name == "bench-2.toml"


def test_the_axes_turn_with_the_picture() -> None:
    """Truth is symmetry: shown turned, x and y change places; not known, their mean with half
    their difference in u."""
    held = certificate()
    straight = scale_from_certificate(held, dpi=DPI, swapped=False, on=TODAY)
    turned = scale_from_certificate(held, dpi=DPI, swapped=True, on=TODAY)
    assert (straight.x, straight.y) == (turned.y, turned.x) == (held.x, held.y)
    assert straight.findings == ()
    unknown = scale_from_certificate(held, dpi=DPI, swapped=None, on=TODAY)
    assert unknown.x.value == pytest.approx(23.66) == unknown.y.value
    assert unknown.x.u == pytest.approx(0.06, rel=0.01)
    assert has(unknown.findings, Flag.CERTIFICATE_AXES_UNKNOWN)


@pytest.mark.parametrize("day", [date(2026, 1, 9), date(2027, 1, 11)])
def test_out_of_its_dates_it_is_said(day: date) -> None:
    """Truth is theory: valid on its first and last day, not beside them."""
    held = certificate()
    scale = scale_from_certificate(held, dpi=DPI, swapped=False, on=day)
    assert has(scale.findings, Flag.CERTIFICATE_EXPIRED)
    for inside in (MADE, ENDS):
        assert not scale_from_certificate(held, dpi=DPI, swapped=False, on=inside).findings


def test_an_expired_certificates_word_does_not_age() -> None:
    """Truth is theory: equal input gives equal records, so no finding may hold today's date."""
    days = (date(2025, 6, 1), date(2028, 2, 3), date(2028, 2, 4))
    told = {
        each.message
        for day in days
        for each in scale_from_certificate(certificate(), dpi=DPI, swapped=False, on=day).findings
    }
    assert len(told) == 1
    assert str(ENDS) in told.pop()


def test_another_resolution_is_carried_over_and_said() -> None:
    """Truth is theory: half the dots, half the pitch, with the u of another carriage step."""
    scale = scale_from_certificate(certificate(), dpi=(300.0, 300.0), swapped=False, on=TODAY)
    assert scale.x.value == pytest.approx(11.80)
    assert scale.x.u / scale.x.value == pytest.approx(U_OTHER_RESOLUTION, rel=0.01)
    assert has(scale.findings, Flag.CERTIFICATE_OTHER_RESOLUTION)
    silent = scale_from_certificate(certificate(), dpi=None, swapped=False, on=TODAY)
    assert has(silent.findings, Flag.CERTIFICATE_RESOLUTION_UNCHECKED)


@pytest.mark.parametrize(
    ("x", "u", "decision"),
    [
        (23.60, 2e-4, Holding.HOLDS),
        (23.60 * 1.0005, 2e-4, Holding.HOLDS),
        (23.60 * 1.0007, 2e-4, Holding.OPEN),
        (23.60 * 1.0010, 2e-4, Holding.FAILS),
        (23.60 * 1.0010, 8e-3, Holding.OPEN),
    ],
)
def test_a_check_decides(x: float, u: float, decision: Holding) -> None:
    """Truth is theory: u of the difference is √2 × 0.02 %; two of it hold, three of it fail, and
    a check of 0.8 % says nothing."""
    held = certificate()
    checked = check_certificate(held, reading(x, u=u), same_sheet=False, on=TODAY)
    assert checked.decision is decision
    assert len(checked.reasons) == 2


def test_an_expired_certificate_is_open_at_best() -> None:
    """Truth is theory: agreement does not make it young; disagreement still fails it."""
    held = certificate()
    late = date(2028, 1, 1)
    assert check_certificate(held, reading(), same_sheet=True, on=late).decision is Holding.OPEN
    off = check_certificate(held, reading(23.9), same_sheet=True, on=late)
    assert off.decision is Holding.FAILS


def test_numbers_must_be_finite() -> None:
    """Truth is theory: NaN is no pitch, so it is never written."""
    broken = replace(reading(), ratio_u=float("nan"))
    with pytest.raises(ValueError, match="finite"):
        write_certificate(
            broken,
            name="x",
            resolution_dpi=DPI,
            tone="srgb",
            made=MADE,
            valid_until=ENDS,
            sheet=SHEET_NAME,
            bars=Bars(180, 260, 0.1),
            scans_sha256=("ab",),
        )
