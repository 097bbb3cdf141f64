"""Whether the pieces of one thread are alike, on cells whose likeness was put in by hand.

Truth is theory: each cell of a grid is as light as its column's own share and a share of its own,
so that cells of a column correlate by the ratio of the two variances. Differences to both
neighbours keep that ratio.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.threads.candidates import Candidate
from imgcover.threads.field import Field, Region
from imgcover.threads.follow import Followed
from imgcover.threads.individual import Individuality, individuality
from imgcover.threads.lattice import Lattice
from imgcover.threads.reader import Plain, read_threads

PITCH = 8.0


def field_of(light: NDArray[np.float64]) -> Field:
    rows, columns = light.shape
    return Field(light.astype(np.float32), Region(0, 0, columns, rows), 1)


def read(light: NDArray[np.float64], pitch: float = PITCH) -> Individuality:
    """Hold the field against the threads it was laid on, upright and evenly spaced."""
    ends, picks = (1 / pitch, 0.0), (0.0, 1 / pitch)
    one = Candidate(ends, picks, 1, (1, 1), Lattice(ends, picks, 1.0))
    rows, columns = light.shape
    x, y = np.arange(0, columns, pitch / 2), np.arange(0, rows, pitch / 2)
    flat = np.zeros((y.size, x.size))
    everywhere = np.ones(flat.shape, bool)
    followed = Followed(flat, flat, everywhere, x, y, flat + 1.0, 1.0)
    return individuality(field_of(light), one, followed)


def cells(likeness: float, rng: np.random.Generator, side: int = 48) -> NDArray[np.float64]:
    """Cells whose columns are as alike as said, rows not at all; dark lines between them."""
    own = rng.standard_normal((side, side)) * math.sqrt(1 - likeness)
    lightness = 0.4 + 0.02 * (own + rng.standard_normal(side) * math.sqrt(likeness))
    cell = np.ones((int(PITCH), int(PITCH)))
    cell[:2, :] = cell[:, :2] = 0.3
    return np.kron(lightness, cell)


@pytest.mark.parametrize("likeness", [0.0, 0.2, 0.6])
def test_likeness_along_a_thread_is_the_share_that_stays(likeness: float) -> None:
    got = read(cells(likeness, np.random.default_rng(7)))
    # 44 columns of 46 cells: the correlation's own standard error is about 0.02 + 0.1 of it
    assert got.ends == pytest.approx(likeness, abs=0.04 + 0.2 * likeness)
    assert got.picks == pytest.approx(0.0, abs=0.04)
    assert got.least == min(got.ends, got.picks)


def test_turned_over_the_sets_change_places() -> None:
    light = cells(0.6, np.random.default_rng(8))
    upright, over = read(light), read(np.ascontiguousarray(light.T))
    assert over.picks == pytest.approx(upright.ends, abs=1e-3)
    assert over.ends == pytest.approx(upright.picks, abs=1e-3)


def test_what_the_raster_does_to_a_column_is_no_individual() -> None:
    """Dots drawn hard on whole pixels, 6.8 apart: each column has its own rounding, all alike."""
    pitch = 6.8
    places = (np.arange(400) + 0.5) / pitch % 1
    row = np.abs(places - 0.5) < 0.3
    light = np.where(np.logical_and.outer(row, row), 0.8, 0.2)
    light += np.random.default_rng(9).normal(0, 0.01, light.shape)
    got = read(light, pitch)
    assert max(got.ends, got.picks) < 0.1


def test_roughness_tells_ragged_holes_from_punched_ones() -> None:
    rng = np.random.default_rng(10)
    punched = np.kron(np.ones((48, 48)), cells(0.0, rng, side=1) / 0.4)
    ragged = cells(0.0, rng) + rng.normal(0, 0.15, (384, 384))
    assert read(punched * 0.5).rough < 0.02 < 0.1 < read(ragged).rough


def test_few_threads_say_nothing() -> None:
    got = read(cells(0.6, np.random.default_rng(11), side=11))
    assert math.isnan(got.ends) and got.least == 0.0


@pytest.mark.parametrize("pitch", [6.0, 8.0, 9.3, 12.0])
def test_an_even_mesh_is_crossed_bars_and_counted(pitch: float) -> None:
    """Truth is drawn here: bars of one width, exactly evenly laid, as in a woven wire mesh."""
    fine = np.abs((np.arange(360 * 8) + 0.5) / 8 / pitch % 1 - 0.5) < 0.3
    bars = fine.reshape(-1, 8).mean(axis=1)
    light = 0.05 + 0.9 * np.outer(bars, bars)
    light += np.random.default_rng(12).normal(0, 0.01, light.shape)
    assert read(light, pitch).not_crossed < 0.005
    reading = read_threads(Plain(light.clip(0, 1).astype(np.float32)))
    assert reading.ends is not None and reading.picks is not None
    assert reading.ends.pixels_a_thread == pytest.approx(pitch, rel=1e-3)
    assert reading.picks.pixels_a_thread == pytest.approx(pitch, rel=1e-3)
