"""Truth is arithmetic: a plane is read exactly, and a grid's own places give its values."""

import numpy as np
from scipy.ndimage import map_coordinates

from imgcover.repeat.between import between

ROWS, COLUMNS = np.mgrid[0:7, 0:5].astype(float)


def test_a_plane_is_read_exactly_between_its_places():
    rows, columns = np.array([0.0, 2.25, 5.5, 6.0]), np.array([4.0, 1.5, 0.125, 3.75])
    read = between(3 * ROWS - 2 * COLUMNS + 1, rows, columns)
    assert np.allclose(read, 3 * rows - 2 * columns + 1, rtol=0, atol=1e-12)


def test_beyond_the_grid_its_edge_counts():
    read = between(10 * ROWS + COLUMNS, np.array([-3.0, 9.0]), np.array([2.0, 40.0]))
    assert read.tolist() == [2.0, 64.0]


def test_scipy_reads_the_same():
    chance = np.random.default_rng(3)
    values = chance.normal(size=(11, 13)).astype(np.float32)
    places = chance.uniform(-2, 14, (2, 4, 50))
    ours = between(values, *places)
    theirs = map_coordinates(values.astype(np.float64), places, order=1, mode="nearest")
    assert ours.shape == (4, 50)
    # both work in double: only the order of the sums differs
    assert np.allclose(ours, theirs, rtol=0, atol=1e-12)
