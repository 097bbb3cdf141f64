"""A printed sheet's scans: pitch, shear and distortion of the device; copies and crops refused.

Truth is drawn: `drawn_sheets.draw_scan`, each pixel the mean of exact samples.
"""

from __future__ import annotations

import math
from functools import cache

import numpy as np
import pytest
from drawn_sheets import Scan, Scanned, draw_scan
from numpy.typing import NDArray

from imgcover.findings import Flag, has
from imgcover.scale.sheet import BAR_A_MM, BAR_B_MM, Bars, draw_sheet
from imgcover.scale.sheet_device import SheetRefused, read_device
from imgcover.scale.sheet_scale import measure_sheet
from imgcover.scale.sheet_scan import SheetCorners, find_corners

X, Y, SHEAR = 5.93, 6.01, 0.002
STRETCH = (1.004, 0.997)
BARS = Bars(BAR_A_MM * STRETCH[0], BAR_B_MM * STRETCH[1], 0.1)


def bend(x: NDArray[np.float64], y: NDArray[np.float64]) -> tuple[NDArray, NDArray]:
    """A bed whose carriage wobbles and whose optics bow a little, mm."""
    return (
        0.12 * np.sin(2 * np.pi * y / 150) + 0.03 * np.cos(2 * np.pi * x / 80),
        0.15 * np.sin(2 * np.pi * y / 110 + 0.5),
    )


@cache
def scanned(turn: float, *, bent: bool = False) -> SheetCorners:
    """The corners of one drawn scan."""
    kind = {"distort": bend} if bent else {}
    skew = 0.0 if bent else 0.001
    scan = Scan(x=X, y=Y, shear=SHEAR, turn=turn, stretch=STRETCH, skew=skew, **kind)
    return find_corners(draw_scan(scan))


def test_pitch_and_shear_of_turned_scans() -> None:
    """Truth is drawn: unequal pitch, shear, a stretched and skewed print; 0.02 % is held to."""
    reading = read_device([scanned(0.01), scanned(math.pi / 2 + 0.02)], BARS)
    assert reading.apart
    assert reading.x.value == pytest.approx(X, rel=2e-4)
    assert reading.y.value == pytest.approx(Y, rel=2e-4)
    assert reading.shear.value == pytest.approx(SHEAR, abs=2e-4)
    assert reading.bed.largest < 0.05


def test_one_scan_leaves_the_sheet_in() -> None:
    """Truth is theory: one way only, each axis carries its bar's u, and the print's skew is shear.

    Two turned scans share both bars: each axis' u is their mean's.
    """
    one = read_device([scanned(0.01)], BARS)
    two = read_device([scanned(0.01), scanned(math.pi / 2 + 0.02)], BARS)
    assert not one.apart
    assert one.x.u / one.x.value == pytest.approx(0.1 / BARS.a, rel=0.1)
    both = math.hypot(0.1 / BARS.a, 0.1 / BARS.b) / 2
    assert two.x.u / two.x.value == pytest.approx(both, rel=0.1)
    assert two.ratio_u < one.ratio_u / 3
    assert one.shear.value == pytest.approx(SHEAR + 0.001, abs=2e-4)


def test_distortion_of_the_bed() -> None:
    """Truth is drawn: a bent bed, less its own straight-line part, within 0.05 mm everywhere."""
    # one scan of a true print; parting print and bed is seen on flat beds, which are cheaper
    reading = read_device([scanned(0.01, bent=True)], BARS)
    places = reading.bed.places
    truth = np.stack(bend(*places.T), axis=1)
    design = np.column_stack([places, np.ones(len(places))])
    truth = truth - design @ np.linalg.lstsq(design, truth, rcond=None)[0]
    assert np.abs(reading.bed.shifts - truth).max() < 0.05
    lattice, shifts = reading.bed.lattice()
    assert len(lattice) > 30 and np.abs(shifts).max() <= reading.bed.largest + 0.01


def test_a_known_sheet_checks_sharply() -> None:
    """Truth is drawn: with the sheet's own errors known, one scan gives shear and ratio again."""
    two = read_device([scanned(0.01), scanned(math.pi / 2 + 0.02)], BARS)
    one = read_device([scanned(0.01)], BARS, known=two.sheet_errors)
    assert one.shear.value == pytest.approx(SHEAR, abs=2e-4)
    assert one.x.value / two.x.value == pytest.approx(1, abs=3 * max(one.u_own))


def test_a_copy_reads_by_its_own_bars() -> None:
    """Truth is drawn: a copy at 97 %, its own bars measured, gives the device's pitch all the
    same; read by the original's bars it is 3 % off, which `calibrate read` refuses."""
    copy = find_corners(draw_scan(Scan(x=6.0, y=6.0, stretch=(0.97, 0.97))))
    right = read_device([copy], Bars(BAR_A_MM * 0.97, BAR_B_MM * 0.97, 0.1))
    assert right.x.value == pytest.approx(6.0, rel=2e-4)
    wrong = read_device([copy], Bars(BAR_A_MM, BAR_B_MM, 0.1))
    assert wrong.x.value == pytest.approx(6.0 * 0.97, rel=2e-4)


@pytest.mark.parametrize("span", [0.2, 0.45])
def test_a_crop_is_refused(span: float) -> None:
    """Truth is theory: a strip of the field says too little of the bed."""
    full = scanned(0.01)
    kept = full.drawn[:, 0] < full.drawn[:, 0].min() + span * 150
    with pytest.raises(SheetRefused, match="cropped"):
        read_device([SheetCorners(full.drawn[kept], full.seen[kept])], BARS)


def test_half_a_sheet_is_read_right() -> None:
    """Truth is drawn: the upper two thirds of the field are enough, and the pitch is the same."""
    full = scanned(0.01)
    kept = full.drawn[:, 1] < full.drawn[:, 1].min() + 100
    reading = read_device([SheetCorners(full.drawn[kept], full.seen[kept])], BARS)
    assert reading.x.value == pytest.approx(X, rel=2e-4)


def test_a_crumpled_sheet_is_refused() -> None:
    """Truth is theory: corners that scatter by 0.2 mm are no print on glass."""
    full = scanned(0.01)
    crumpled = full.seen + np.random.default_rng(1).normal(0, 1.2, full.seen.shape)
    with pytest.raises(SheetRefused, match=r"scatter|off"):
        read_device([SheetCorners(full.drawn, crumpled)], BARS)


def test_nothing_and_a_mirrored_sheet_show_no_corners() -> None:
    """Truth is theory: blank paper has no markers; a mirrored marker is none of the dictionary."""
    blank = Scanned(np.full((600, 600), 0.8, np.float32))
    assert not len(find_corners(blank).seen)
    mirrored = Scanned(np.ascontiguousarray(draw_scan(Scan(x=4, y=4), fine=2).held[:, ::-1]))
    assert len(find_corners(mirrored).seen) < 16


def test_the_sheet_in_a_picture() -> None:
    """Truth is drawn: x 5.93, y 6.01 px/mm; without measured bars there is no scale."""
    picture = draw_scan(Scan(x=X, y=Y, turn=0.3, at=(20, 25), stretch=STRETCH), fine=2)
    found = measure_sheet(picture, BARS)
    assert found.scale is not None
    assert found.scale.x.value == pytest.approx(X, rel=3e-4)
    assert found.scale.y.value == pytest.approx(Y, rel=3e-4)
    assert len(found.areas) == 1
    unmeasured = measure_sheet(picture, None)
    assert unmeasured.scale is None and has(unmeasured.findings, Flag.SHEET_NOT_MEASURED)
    nothing = measure_sheet(Scanned(np.full((500, 500), 0.5, np.float32)), BARS)
    assert nothing.scale is None and has(nothing.findings, Flag.NO_SHEET_FOUND)


def test_the_drawn_page_is_the_sheet() -> None:
    """Truth is theory: the page as drawn, at 120 dpi, is 120/25.4 px/mm, bars and field alike."""
    import cv2

    stored = cv2.imdecode(np.frombuffer(draw_sheet("png", dpi=120), np.uint8), 0)
    corners = find_corners(Scanned((stored / np.float32(255)) ** 2.2))
    reading = read_device([corners], Bars(BAR_A_MM, BAR_B_MM, 0.05))
    assert len(corners.seen) == 256
    assert reading.x.value == pytest.approx(120 / 25.4, rel=2e-4)
    assert reading.y.value == pytest.approx(120 / 25.4, rel=2e-4)
    # bar A: its end lines stand at 15 and 195 mm
    line = stored[round(198 * 120 / 25.4)].astype(float)
    line[: round(14 * 120 / 25.4)] = 255  # bar B
    ends = [np.argmin(line[: len(line) // 2]), len(line) // 2 + np.argmin(line[len(line) // 2 :])]
    assert (ends[1] - ends[0]) * 25.4 / 120 == pytest.approx(BAR_A_MM, abs=0.25)


@pytest.mark.parametrize(("a", "b", "u"), [(150, 260, 0.1), (180, 300, 0.1), (180, 260, 0)])
def test_bars_must_be_bars(a: float, b: float, u: float) -> None:
    """Truth is theory: no printer is 8 % off, no reading is without uncertainty."""
    with pytest.raises(ValueError, match=r"bar|u must"):
        Bars(a, b, u)
