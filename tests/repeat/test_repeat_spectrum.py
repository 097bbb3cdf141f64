"""Plane waves found in averaged power: their place, what the floor does, what is folded over.

Truth is theory: the waves are written down by their formula.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.repeat.spectrum import HIGHEST_FREQUENCY, folded_over, peaks, spectrum

SIDE = 256
Wave = tuple[float, float, float]


def waves(*these: Wave, seed: int = 1, noise: float = 0.3) -> NDArray[np.float32]:
    """Light whose square root is one half with waves (fx, fy, amplitude) and grain on it."""
    y, x = np.mgrid[:SIDE, :SIDE]
    root = np.full((SIDE, SIDE), 0.5)
    for fx, fy, amplitude in these:
        root += amplitude * np.cos(2 * np.pi * (fx * x + fy * y) + 0.7)
    grain = np.random.default_rng(seed).standard_normal((SIDE, SIDE))
    return np.asarray(np.maximum(root + 0.05 * noise * grain, 0) ** 2, np.float32)


@pytest.mark.parametrize(
    ("fx", "fy"), [(0.1, 0.0), (0.1234, 0.0411), (-0.2377, 0.3049), (0.0, 0.44), (0.031, 0.0)]
)
def test_a_wave_is_placed_within_a_tenth_of_a_bin(fx: float, fy: float) -> None:
    """A parabola through a Hann lobe's logarithm errs by 0.02 bins at the most (theory)."""
    (strongest, *_) = peaks(spectrum([waves((fx, fy, 0.15))]), excess=3.0, most=5)
    assert strongest.fx == pytest.approx(fx, abs=0.05 / SIDE)
    assert strongest.fy == pytest.approx(fy, abs=0.05 / SIDE)
    assert strongest.excess > 8


def test_peaks_come_by_strength_and_no_more_than_asked() -> None:
    """Amplitudes 0.2, 0.1, 0.05: their powers differ by ln 4 each; whole bins, so none leaks."""
    places = np.array([(0, 54), (26, 0), (-44, 44)]) / SIDE
    first, second, third = places.tolist()
    seen = spectrum([waves((*second, 0.1), (*first, 0.2), (*third, 0.05))])
    found = peaks(seen, excess=4.0, most=3)
    assert np.array([(e.fx, e.fy) for e in found]) == pytest.approx(places, abs=2e-4)
    assert np.diff([e.level for e in found]) == pytest.approx(-np.log(4.0), abs=0.05)
    assert found[:2] == peaks(seen, excess=4.0, most=2)


def test_noise_has_no_lines() -> None:
    """White noise: of nine averaged windows no bin in 32 768 rises by 2.2 over its median.

    The mean of nine independent exponential variables exceeds e^2.2 = 9 with chance 1e-27.
    """
    generator = np.random.default_rng(2)
    tiles = [np.asarray(generator.uniform(0, 1, (SIDE, SIDE)), np.float32) for _ in range(9)]
    assert peaks(spectrum(tiles), excess=2.2, most=9) == []


def test_lines_do_not_move_the_floor() -> None:
    """The same grain with and without waves of forty times its spread: one floor, away from zero.

    One level of the median's table is a tenth of ln(power), wider where lines stretch the range.
    """
    plain = spectrum([waves(noise=1.0)])
    lined = spectrum([waves((0.1, 0.0, 0.1), (0.0, 0.15, 0.1), (0.2, 0.1, 0.1), noise=1.0)])
    # each window is scaled to unit power; the waves' power is taken out again
    energy = 3 * 0.1**2 / 2 / 0.05**2 + 1
    shift = plain.log_floor - lined.log_floor - np.log(energy)
    away = np.hypot(*np.meshgrid(*[np.arange(SIDE) - SIDE // 2] * 2)) > 20
    assert abs(float(np.median(shift[away]))) < 0.1
    assert float(np.quantile(np.abs(shift[away]), 0.99)) < 0.5


def test_what_is_too_slow_or_too_fine_is_no_peak() -> None:
    """Two cycles a window are light and shade; a wave beyond the limit meets its mirror image."""
    found = peaks(
        spectrum([waves((2 / SIDE, 0.0, 0.2), (HIGHEST_FREQUENCY + 0.02, 0.0, 0.2))]),
        excess=4.0,
        most=9,
    )
    assert all(0.02 < np.hypot(each.fx, each.fy) < HIGHEST_FREQUENCY for each in found)
    assert not any(each.excess > 8 for each in found)


@pytest.mark.parametrize(("fx", "folded"), [(0.48, True), (0.30, False)])
def test_a_strongest_wave_near_the_limit_is_said_to_be_folded(fx: float, folded: bool) -> None:
    assert folded_over(spectrum([waves((fx, 0.0, 0.2), (0.0, 0.2, 0.1))])) is folded


def test_a_tiles_contrast_does_not_weigh() -> None:
    """Truth is symmetry: each window is scaled to unit power."""
    strong, faint = waves((0.1, 0.0, 0.2), noise=0.1), waves((0.0, 0.2, 0.2), noise=0.1)
    dark = np.asarray(faint * np.float32(0.01))
    one, other = spectrum([strong, faint]), spectrum([strong, dark])
    away = np.hypot(*np.meshgrid(*[np.arange(SIDE) - SIDE // 2] * 2)) > 3
    # the mean is taken out; what rounding leaves of it is not compared
    assert np.abs(other.log_power - one.log_power)[away].max() < 0.01


@pytest.mark.parametrize("shapes", [(), ((64, 64), (64, 32))])
def test_tiles_must_be_alike(shapes: tuple[tuple[int, int], ...]) -> None:
    with pytest.raises(ValueError, match="one shape"):
        spectrum([np.ones(shape, np.float32) for shape in shapes])
