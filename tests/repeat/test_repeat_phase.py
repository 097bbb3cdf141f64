"""Demodulation on a coarse grid: amplitude, phase, and where the values stand.

Truth is theory: waves written down by their formula, a Gaussian's transform.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from imgcover.repeat.phase import demodulate, transform

ROWS, COLUMNS = 180, 230
SIGMA = 14.0
INSIDE = 3.5
"""Standard deviations from an edge from which on the Gaussian's tail beyond it is below 0.05 %."""


def wave(fx: float, fy: float, turn: float) -> NDArray[np.float32]:
    y, x = np.mgrid[:ROWS, :COLUMNS]
    return np.asarray(np.cos(2 * np.pi * (fx * x + fy * y + turn)), np.float32)


@settings(max_examples=15, deadline=None)
@given(
    fx=st.floats(-0.35, 0.35),
    fy=st.floats(0.08, 0.35),
    turn=st.floats(0, 1),
    amplitude=st.floats(0.1, 10),
)
def test_amplitude_and_phase_come_back(fx: float, fy: float, turn: float, amplitude: float) -> None:
    """Half the amplitude and the whole phase, on and between the bins of the transform.

    The band is cut at 0.6 % of the Gaussian: so much may ripple.
    """
    field = np.asarray(amplitude * wave(fx, fy, turn), np.float32)
    values, grid = demodulate(transform(field, margin=60), (fx, fy), sigma=SIGMA)
    reach = INSIDE * SIGMA
    rows = (grid.rows() > reach) & (grid.rows() < ROWS - reach)
    columns = (grid.columns() > reach) & (grid.columns() < COLUMNS - reach)
    inner = values[np.ix_(rows, columns)] / (0.5 * amplitude)
    assert inner.size > 0
    assert np.abs(inner) == pytest.approx(np.ones(inner.shape), abs=0.01)
    lag = np.angle(inner * np.exp(-2j * np.pi * turn)) / (2 * np.pi)
    assert np.abs(lag).max() < 0.002


def test_a_frequency_nearby_gives_a_steady_ramp() -> None:
    """Demodulated a little beside its frequency, a wave's phase grows by the difference."""
    off = (0.0011, -0.0007)
    values, grid = demodulate(
        transform(wave(0.11, 0.07, 0.2), margin=60), (0.11 - off[0], 0.07 - off[1]), sigma=SIGMA
    )
    want = 0.2 + off[0] * grid.columns()[None, :] + off[1] * grid.rows()[:, None]
    lag = np.angle(values * np.exp(-2j * np.pi * want)) / (2 * np.pi)
    middle = lag[3:-3, 3:-3]
    assert np.abs(middle).max() < 0.002


@pytest.mark.parametrize("sigma", [8.0, 14.0, 25.0])
def test_another_wave_is_smoothed_away(sigma: float) -> None:
    """A wave f beside the asked one keeps exp(−2 (π σ f)²) of its amplitude."""
    apart = 0.3 / sigma
    values, _ = demodulate(
        transform(wave(0.2 + apart, 0.1, 0.0), margin=round(5 * sigma)), (0.2, 0.1), sigma=sigma
    )
    middle = abs(values[values.shape[0] // 2, values.shape[1] // 2])
    want = 0.5 * np.exp(-2 * (np.pi * sigma * apart) ** 2)
    # what the edges let through beside it comes on top, where the smoothing nearly fills the field
    assert middle == pytest.approx(want, abs=0.01)


def test_the_grid_covers_the_field() -> None:
    """Its places start at the first pixel and end inside, a smoothing apart at the most."""
    values, grid = demodulate(transform(wave(0.1, 0.1, 0), margin=60), (0.1, 0.1), sigma=SIGMA)
    assert values.shape == grid.shape
    for places, length in ((grid.rows(), ROWS), (grid.columns(), COLUMNS)):
        assert places[0] == 0 and length - SIGMA < places[-1] < length
        assert np.diff(places).max() < SIGMA
