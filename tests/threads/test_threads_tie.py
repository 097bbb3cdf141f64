"""The declared weave breaks a tie only where its own cell is the one in the picture.

Truth is theory: cells counted by hand in the weave's matrix.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import pytest

from imgcover.threads.candidates import Candidate
from imgcover.threads.lattice import Lattice
from imgcover.threads.profile import Multiple
from imgcover.threads.tie import cell, settled
from imgcover.weave import weave

LATTICE = Lattice((0.05, 0.0), (0.0, 0.05), 1.0)


def seen(index: int, parts: tuple[int, int]) -> Candidate:
    return Candidate((0.1, 0.0), (0.0, 0.1), index, parts, LATTICE)


def told(factor: Fraction | int, rival: Fraction | int | None = None) -> Multiple:
    return Multiple(
        Fraction(factor), None if rival is None else Fraction(rival), 1.0, 0.01, 0.0, 0.0
    )


@pytest.mark.parametrize(
    ("name", "want"),
    [
        ("plain", (2, 1, 1)),
        ("2/1 twill", (3, 1, 1)),
        ("2/2 twill s", (4, 1, 1)),
        ("5-end satin", (5, 1, 1)),
        ("8-end sateen", (8, 1, 1)),
        ("2/2 hopsack", (8, 2, 2)),
        ("3/3 hopsack", (18, 3, 3)),
        ("2/2 warp rib", (4, 1, 2)),
        ("2/2 weft rib", (4, 2, 1)),
    ],
)
def test_the_cell_of_a_weave(name: str, want: tuple[int, int, int]) -> None:
    """A regular weave on n has n crossings a cell; m threads weaving as one divide their axis."""
    assert cell(weave(name)) == want


def test_the_finer_reading_of_a_hopsack() -> None:
    """Ridges of two ends: read as threads the cell would be a rib's; read twice it is hopsack's."""
    both = settled(seen(4, (1, 2)), told(1, 2), told(1), weave("2/2 hopsack"))
    assert both == (told(2), told(1))


def test_the_coarser_reading_of_a_hopsack() -> None:
    """The cell is the hopsack's already: taking half a thread for one would make it too large."""
    both = settled(seen(8, (2, 2)), told(1, 2), told(1), weave("2/2 hopsack"))
    assert both == (told(1), told(1))


def test_the_coarser_reading_of_a_twill() -> None:
    both = settled(seen(4, (1, 1)), told(1), told(1, 2), weave("3/1 twill"))
    assert both == (told(1), told(1))


def test_both_sets_at_once() -> None:
    """Ribs of two by two taken for threads of plain weave."""
    both = settled(seen(2, (1, 1)), told(1, 2), told(1, 2), weave("2/2 hopsack"))
    assert both == (told(2), told(2))


@pytest.mark.parametrize(
    ("index", "parts", "name"),
    [
        (1, (1, 1), "plain"),  # the weave does not show: pairs look like threads
        (4, (2, 2), "plain"),  # pairs of ends and picks divide the axes, plain weave does not
        (6, (1, 1), "3/3 hopsack"),
        (3, (1, 1), "2/2 twill"),
    ],
)
def test_a_cell_that_is_not_the_weaves_settles_nothing(
    index: int, parts: tuple[int, int], name: str
) -> None:
    assert settled(seen(index, parts), told(1, 2), told(1), weave(name)) is None


def test_turned_cloth_takes_the_turned_weave() -> None:
    """Truth is symmetry: ends and picks exchanged, weave transposed."""
    rib = weave("2/2 warp rib")
    upright = settled(seen(2, (1, 1)), told(1), told(1, 2), rib)
    turned = settled(seen(2, (1, 1)), told(1, 2), told(1), replace(rib, matrix=rib.matrix.T))
    assert upright == (told(1), told(2)) and turned == (told(2), told(1))
