"""Counting from edge to edge, breaks, tiles and bow, on phases written down by their formula.

Truth is theory.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy import integrate, stats

from imgcover.repeat.phase import Grid
from imgcover.threads.counting import breaks, count
from imgcover.threads.follow import Followed, _centroids
from imgcover.threads.regions import (
    away_from_bare,
    bow_of,
    divide,
    local_density,
    without_strays,
)

STEP = 10.0
ROWS, COLUMNS = 30, 40
Y, X = np.mgrid[:ROWS, :COLUMNS] * STEP
NOWHERE = np.zeros((ROWS, COLUMNS))


def followed(
    ends: NDArray[np.float64] = NOWHERE, valid: NDArray[np.bool_] | None = None
) -> Followed:
    valid = np.ones((ROWS, COLUMNS), bool) if valid is None else valid
    strength = valid.astype(float)
    return Followed(ends, NOWHERE, valid, X[0], Y[:, 0], strength, 1.0)


@settings(max_examples=25, deadline=None)
@given(
    slope=st.tuples(st.floats(-0.004, 0.004), st.floats(-0.004, 0.004)),
    start=st.floats(-3, 3),
)
def test_a_steady_phase_is_counted_exactly(slope: tuple[float, float], start: float) -> None:
    """Phase grown over the field plus the wave vector's own: their sum is the count."""
    phase = start + slope[0] * X + slope[1] * Y
    got = count(phase, followed(phase), (0.12, 0.01))
    assert got is not None
    assert got.frequency == pytest.approx((0.12 + slope[0], 0.01 + slope[1]), rel=1e-9)
    assert got.counted == pytest.approx(np.hypot(*got.frequency) * got.length_px)
    assert got.noise < 1e-9 and got.irregular < 1e-9 and got.broken == 0


def test_uneven_spacing_on_the_way_does_not_move_the_count() -> None:
    """Threads crowd in the middle and are loose at the edges; between the edges lie as many."""
    reach = (COLUMNS - 1) * STEP
    crowd = 0.8 * np.sin(2 * np.pi * X / reach) + 0.002 * X
    got = count(crowd, followed(crowd), (0.12, 0.0))
    assert got is not None
    assert got.frequency[0] == pytest.approx(0.122, rel=1e-9)
    assert got.counted == pytest.approx(0.122 * reach, rel=1e-9)
    assert got.irregular > 1e-3


def test_an_uneven_edge_counts_by_its_length() -> None:
    """Half of the rows are followed over half of the way: each weighs by its distance."""
    valid = np.ones((ROWS, COLUMNS), bool)
    valid[ROWS // 2 :, COLUMNS // 2 :] = False
    phase = np.where(Y < STEP * ROWS / 2, 0.001, 0.003) * X
    got = count(phase, followed(phase, valid), (0.1, 0.0))
    assert got is not None
    long, short = (COLUMNS - 1), (COLUMNS // 2 - 1)
    want = 0.1 + (0.001 * long + 0.003 * short) / (long + short)
    assert got.frequency[0] == pytest.approx(want, rel=1e-9)


@pytest.mark.parametrize("turn", [1, -1])
def test_a_thread_that_ends_in_the_field_is_one_break(turn: int) -> None:
    """Round the end of a thread the phase gains a whole cycle: arctan of the place."""
    there = turn * np.arctan2(Y - 95.0, X - 155.0) / (2 * np.pi)
    everywhere = np.ones((ROWS, COLUMNS), bool)
    assert breaks(there + 0.003 * X, everywhere) == 1
    assert breaks(0.003 * X + 0.01 * Y, everywhere) == 0
    hidden = np.hypot(X - 155, Y - 95) > 3 * STEP
    assert breaks(there, hidden) == 0
    got = count(there, followed(there), (0.1, 0.0))
    assert got is not None and got.broken == pytest.approx(0.15 / got.counted)
    assert got.doubted < 0.01  # the one place where the thread ends
    leap = np.where((Y > 95) & (X > 155), 1.0, 0.0)
    got = count(leap, followed(leap), (0.1, 0.0))
    assert got is not None and got.doubted == pytest.approx(2 / 3, rel=1e-3)


def test_too_little_followed_is_no_count() -> None:
    valid = np.zeros((ROWS, COLUMNS), bool)
    valid[:, :2] = True
    assert count(X * 0.0, followed(NOWHERE, valid), (0.1, 0.0)) is None


def test_noise_of_the_phase_is_told_by_its_scatter() -> None:
    """Truth is theory: 200 fields with the same noise; u of the slope is that of the repeats.

    Each row's slope has σ √2 over its reach, the mean of 30 rows √30 less; what the code says is
    √2 more, for real rows share half their smoothing and these share none.
    """
    generator = np.random.default_rng(7)
    slopes, stated = [], []
    for _ in range(200):
        phase = 0.05 * generator.standard_normal((ROWS, COLUMNS))
        got = count(phase, followed(phase), (0.1, 0.0))
        assert got is not None
        slopes.append(got.frequency[0])
        stated.append(got.noise * 0.1)
    assert np.median(stated) == pytest.approx(np.sqrt(2) * np.std(slopes), rel=0.15)


@pytest.mark.parametrize("place", [0.0, 5.0, 14.0, 100.0, 199.0])
def test_the_smoothing_reaches_inwards_at_an_edge(place: float) -> None:
    """Truth is another library: the mean of a normal distribution cut off at the field's edges."""
    x, _, share = _centroids(Grid((50.0, place or 1.0), (2, 2)), (80, 200), (2, 2), 14.0)
    at = 0 if place == 0 else 1
    where = 0.0 if place == 0 else place
    low, high = (-0.5 - where) / 14, (199.5 - where) / 14
    assert x[at] == pytest.approx(stats.truncnorm(low, high, loc=where, scale=14).mean(), abs=1e-6)
    inside, _ = integrate.quad(stats.norm(where, 14).pdf, -0.5, 199.5, points=[where])
    down, _ = integrate.quad(stats.norm(0, 14).pdf, -0.5, 79.5)
    assert share[0, at] == pytest.approx(inside * down, rel=1e-6)


def test_tiles_not_followed_and_tiles_unlike_the_rest_are_left_out() -> None:
    """One corner is not followed; in another a fifth more threads lie."""
    valid = np.ones((ROWS, COLUMNS), bool)
    valid[:10, :10] = False
    more = np.where((Y > 200) & (X > 300), 0.02 * X, 0.0)
    seen = followed(more, valid)
    pieces = divide(seen, 12.0, (300, 400))
    assert len(pieces.tiles) == 12 and sum(each.used for each in pieces.tiles) == 11
    (left,) = [each for each in pieces.tiles if not each.used]
    assert (left.x, left.y, left.reason) == (0, 0, "no threads here")
    kept = without_strays(seen, pieces, (0.1, 0.0), (0.0, 0.1))
    unlike = [each for each in kept.tiles if each.reason == "unlike the rest"]
    assert [(each.x + each.width, each.y + each.height) for each in unlike] == [(400, 300)]
    local = local_density(more, seen, kept, (0.1, 0.0))
    assert local.scatter == pytest.approx(0, abs=1e-9) and local.parts == 4
    assert local.low == pytest.approx(1) and local.high == pytest.approx(1)


def test_the_local_density_is_that_of_each_place() -> None:
    """Density grows by 4 % from left to right: tiles' middles lie at 1/8, 3/8 … of the way."""
    reach = COLUMNS * STEP
    phase = 0.1 * 0.04 * (X**2 / (2 * reach) - X / 2)
    seen = followed(phase)
    local = local_density(phase, seen, divide(seen, 12.0, (300, 400)), (0.1, 0.0))
    # a tile's last place is not its last pixel: its middle lies half a step farther left
    assert local.low == pytest.approx(1 - 0.04 * 3 / 8, abs=1e-3)
    assert local.high == pytest.approx(1 + 0.04 * 3 / 8, abs=1e-3)


@pytest.mark.parametrize("height", [0.02, -0.02])
def test_bow_is_the_arc_over_the_chord(height: float) -> None:
    """Picks along y = 4 h w (t − t²): lower in the middle for h > 0, phase lags where y is more."""
    width = (COLUMNS - 1) * STEP
    t = X / width
    phase = -0.1 * 4 * height * width * (t - t**2)
    got = bow_of(phase, followed(), np.ones((ROWS, COLUMNS), bool), (0.0, 0.1))
    assert got is not None and got.value == pytest.approx(height, rel=1e-6)
    narrow = np.zeros((ROWS, COLUMNS), bool)
    narrow[:, :7] = True
    assert bow_of(phase, followed(), narrow, (0.0, 0.1)) is None


def test_bare_bed_is_traced_from_where_nothing_is_followed_up_to_the_cloth() -> None:
    """Left half textured, right half smooth; the phase seems to run on for three places more."""
    light = np.full((ROWS * 10, COLUMNS * 10), 0.8, np.float32)
    light[:, :200] += 0.1 * np.sin(2 * np.pi * np.arange(200) / 10).astype(np.float32)
    seems = X < 230
    strength = np.where(X < 260, np.where(seems, 1.0, 0.4), 0.0)
    seen = Followed(NOWHERE, NOWHERE, seems, X[0], Y[:, 0], strength, 1.0)
    kept = away_from_bare(seen, light, 10.0).valid
    assert kept[:, X[0] < 190].all()
    assert not kept[:, X[0] >= 210].any()


def test_a_smooth_patch_inside_the_cloth_is_not_bare_bed() -> None:
    """A dark stripe has little contrast, but its threads are followed: nothing is left out."""
    light = np.full((ROWS * 10, COLUMNS * 10), 0.8, np.float32)
    light[:, :200] += 0.1 * np.sin(2 * np.pi * np.arange(200) / 10).astype(np.float32)
    assert away_from_bare(followed(), light, 10.0).valid.all()
