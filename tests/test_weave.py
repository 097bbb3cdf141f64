"""Weave matrices are the weaves of those names.

Truth is theory: what defines each weave (floats, steps, bindings), checked on the matrix itself.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.weave import LONGEST_REPEAT, WRITTEN, weave


def floats(line: NDArray[np.bool_]) -> list[int]:
    """Lengths of the runs round a closed line, starting at a change."""
    changes = np.flatnonzero(line != np.roll(line, 1))
    return np.diff(np.append(changes, changes[0] + line.size)).tolist()


def test_plain_alternates_both_ways() -> None:
    matrix = weave("plain").matrix
    assert matrix.shape == (2, 2)
    assert (matrix[0] != matrix[1]).all()
    assert (matrix[:, 0] != matrix[:, 1]).all()


@pytest.mark.parametrize(("up", "down"), [(2, 1), (1, 2), (3, 1), (1, 3), (2, 2), (3, 3), (4, 2)])
@pytest.mark.parametrize("hand", ["", " s", " z"])
def test_a_twill_floats_over_and_under_and_steps_by_one(up: int, down: int, hand: str) -> None:
    matrix = weave(f"{up}/{down} twill{hand}").matrix
    for end in matrix.T:
        assert sorted(floats(end)) == sorted([up, down])
        assert end.sum() == up
    step = 1 if hand == " s" else -1
    # the next end to the right does the same one pick lower (S) or higher (Z) in the picture
    assert (np.roll(matrix[:, :-1], step, axis=0) == matrix[:, 1:]).all()


@pytest.mark.parametrize("ends", [5, 7, 8, 10, 12])
def test_a_satin_binds_once_and_never_beside_itself(ends: int) -> None:
    sateen = weave(f"{ends}-end sateen").matrix
    assert (sateen.sum(axis=0) == 1).all()
    assert (sateen.sum(axis=1) == 1).all()
    place = np.argmax(sateen, axis=0)
    step = (np.diff(place, append=place[0])) % ends
    assert np.unique(step).size == 1
    assert step[0] not in (1, ends - 1)
    assert (weave(f"{ends}-end satin").matrix == ~sateen).all()


def test_ribs_and_hopsacks_group_the_threads_they_say() -> None:
    warp_rib, weft_rib = weave("2/2 warp rib").matrix, weave("2/2 weft rib").matrix
    assert (warp_rib[0] == warp_rib[1]).all()
    assert (warp_rib[1] != warp_rib[2]).all()
    assert (weft_rib == warp_rib.T).all()
    hopsack = weave("2/2 hopsack").matrix
    assert (hopsack[::2, ::2] == weave("plain").matrix).all()
    assert (np.repeat(np.repeat(hopsack[::2, ::2], 2, 0), 2, 1) == hopsack).all()


def test_a_herringbone_turns_back_with_a_clean_cut() -> None:
    matrix = weave("2/2 herringbone").matrix
    assert matrix.shape == (4, 8)
    assert (matrix[:, :4] == weave("2/2 twill").matrix).all()
    assert (np.roll(matrix[:, 4:-1], 1, axis=0) == matrix[:, 5:]).all()
    # at each turn every end lies where its neighbour does not
    assert (matrix[:, 3] != matrix[:, 4]).all()
    assert (matrix[:, 7] != matrix[:, 0]).all()


@pytest.mark.parametrize("name", WRITTEN)
def test_every_written_weave_holds_together(name: str) -> None:
    one = weave(name)
    assert one.name == name
    assert one.matrix.shape == (one.picks_repeat, one.ends_repeat)
    for line in (*one.matrix, *one.matrix.T):
        assert 0 < line.sum() < line.size, "a thread that never interlaces falls out of the cloth"
    with pytest.raises(ValueError, match="read-only"):
        one.matrix[0, 0] = False


@pytest.mark.parametrize(
    ("name", "across"),
    [("plain", 2), ("2/1 twill", 2), ("8-end satin", 2), ("2/2 warp rib", 2), ("2/2 weft rib", 2)],
)
def test_intersections_count_the_changes_of_a_repeat(name: str, across: float) -> None:
    one = weave(name)
    assert one.intersections[0] == across
    counted = [len(floats(pick)) for pick in one.matrix]
    assert one.intersections[0] == pytest.approx(np.mean(counted))


def test_names_are_read_as_people_write_them() -> None:
    assert (weave("  Plain ").matrix == weave("tabby").matrix).all()
    assert (weave("5 END SATIN").matrix == weave("5-end satin").matrix).all()
    assert (weave("2/1_twill").matrix == weave("2/1 twill z").matrix).all()


@pytest.mark.parametrize(
    "name",
    ["2/2 twil", "", "6-end satin", "1/1 twill", "0/2 twill", "99/99 twill", "2/1 herringbone"],
)
def test_an_unknown_weave_is_refused_with_the_nearest(name: str) -> None:
    with pytest.raises(ValueError, match="no weave is written"):
        weave(name)


def test_the_nearest_weave_is_named() -> None:
    with pytest.raises(ValueError, match="2/2 twill"):
        weave("2/2 twil")
    assert LONGEST_REPEAT >= 16
