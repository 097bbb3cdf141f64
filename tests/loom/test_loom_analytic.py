"""Analytic pictures have the area their formula says.

Truth is theory: areas of bars, discs and meshes; and sums over points made here by brute force.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.ndimage import gaussian_filter

from imgcover.loom.analytic import bars, discs, grating, mesh


@pytest.mark.parametrize(
    ("pitch", "bar", "start"), [(8.0, 3.0, 0.0), (8.3, 3.1, 0.37), (5.77, 0.4, -2.2), (9, 9, 1.5)]
)
def test_bars_agree_with_brute_force(pitch: float, bar: float, start: float) -> None:
    fine = 2000
    place = (np.arange(50 * fine) + 0.5) / fine
    brute = (((place - start) % pitch) < bar).reshape(50, fine).mean(axis=1)
    # a two-thousandth of a pixel at each edge
    assert bars(50, pitch_px=pitch, bar_px=bar, start_px=start) == pytest.approx(brute, abs=1e-3)


def test_whole_periods_cover_bar_over_pitch() -> None:
    drawn = grating(4, 80, pitch_px=8.0, bar_px=3.0, start_px=0.3, dark=0.1, bright=0.9)
    assert drawn.covered == pytest.approx(3 / 8, abs=1e-12)
    assert drawn.light.mean() == pytest.approx(0.9 - 0.8 * 3 / 8, abs=1e-12)
    assert drawn.light.min() == pytest.approx(0.1)


@pytest.mark.parametrize(("wire", "opening"), [(40.0, 73.0), (48.0, 65.0), (54.0, 59.0)])
def test_a_mesh_is_open_by_the_wire_cloth_rule(wire: float, opening: float) -> None:
    # ISO 9044: open area (w / (w + d))²; ten pitches of 1.13 to 1.27 px a µm
    pitch = (wire + opening) / 10
    side = round(pitch * 40)
    drawn = mesh(
        side, side, pitch_px=(side / 40, side / 40), bar_px=(wire / 10, wire / 10), dark=0.0
    )
    # the pitch was rounded to put whole periods into whole pixels
    assert 1 - drawn.covered == pytest.approx((opening / (wire + opening)) ** 2, abs=2e-3)
    assert drawn.light.mean() == pytest.approx(1 - drawn.covered, abs=1e-9)


def test_blur_keeps_the_mean_and_the_share() -> None:
    sharp = mesh(96, 96, pitch_px=(12, 12), bar_px=(4, 5), dark=0.2)
    soft = mesh(96, 96, pitch_px=(12, 12), bar_px=(4, 5), dark=0.2, blur_px=1.3)
    assert soft.covered == sharp.covered
    assert soft.light.mean() == pytest.approx(sharp.light.mean(), abs=1e-9)
    assert soft.light.std() < 0.9 * sharp.light.std()
    fine = mesh(768, 768, pitch_px=(96, 96), bar_px=(32, 40), dark=0.2).light
    blurred = gaussian_filter(fine, 8 * 1.3, mode="wrap").reshape(96, 8, 96, 8).mean(axis=(1, 3))
    # what a Gaussian over an eighth of a pixel leaves of its integral
    assert soft.light == pytest.approx(blurred, abs=5e-4)


def test_a_crossing_is_as_dark_as_it_is_told() -> None:
    drawn = mesh(40, 40, pitch_px=(10, 10), bar_px=(4, 4), dark=0.3, crossing=0.05)
    assert drawn.light.min() == pytest.approx(0.05)
    product = mesh(40, 40, pitch_px=(10, 10), bar_px=(4, 4), dark=0.3)
    assert product.light.min() == pytest.approx(0.09)


@pytest.mark.parametrize("hole", [False, True])
def test_discs_cover_pi_r_squared(hole: bool) -> None:
    drawn = discs(120, 120, pitch_px=20, radius_px=8.3, hole=hole, dark=0.0)
    area = math.pi * 8.3**2 / 400
    assert drawn.covered == pytest.approx(1 - area if hole else area)
    # a circle counted by 16 × 16 points a pixel: 0.05 point
    assert 1 - drawn.light.mean() == pytest.approx(drawn.covered, abs=5e-4)


def test_impossible_figures_are_refused() -> None:
    with pytest.raises(ValueError, match="bar_px"):
        bars(10, pitch_px=4, bar_px=5)
    with pytest.raises(ValueError, match="overlap"):
        discs(10, 10, pitch_px=8, radius_px=5)
