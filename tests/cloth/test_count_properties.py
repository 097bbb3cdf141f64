"""What must hold for every count, whatever its system.

Truth is symmetry: a count written, read and written again is itself; a finer yarn is finer in
every system.
"""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.cloth.count import read_count
from imgcover.cloth.count_system import CountSystem

SYSTEMS = st.sampled_from(list(CountSystem))
TEX = st.floats(0.2, 10_000)


@given(SYSTEMS, TEX)
def test_there_and_back_through_every_system(system: CountSystem, tex: float) -> None:
    assert system.to_tex(system.from_tex(tex)) == pytest.approx(tex, rel=1e-12)


@given(SYSTEMS, TEX)
def test_a_count_written_in_any_spelling_is_read_as_itself(system: CountSystem, tex: float) -> None:
    number = f"{system.from_tex(tex):.9f}"
    for spelling in system.spellings:
        for text in (f"{number} {spelling}", f"{spelling.upper()} {number}"):
            count = read_count(text)
            assert count.system is system
            assert count.tex == pytest.approx(system.to_tex(float(number)), rel=1e-9)


@given(SYSTEMS, TEX, st.floats(1.001, 3))
def test_direct_counts_rise_and_indirect_counts_fall_with_coarseness(
    system: CountSystem, tex: float, factor: float
) -> None:
    finer, coarser = system.from_tex(tex), system.from_tex(tex * factor)
    assert (coarser > finer) == system.is_direct


@given(
    st.sampled_from(["Ne", "Nm", "worsted", "lea", "run"]), st.integers(13, 300), st.integers(1, 12)
)
def test_folded_yarn_reads_the_same_both_ways_round(unit: str, single: int, plies: int) -> None:
    one, other = read_count(f"{plies}/{single} {unit}"), read_count(f"{single}/{plies} {unit}")
    assert one.tex == other.tex
    assert one.tex == pytest.approx(plies * read_count(f"{single} {unit}").tex, rel=1e-12)


@given(TEX)
def test_all_systems_together_are_one_yarn(tex: float) -> None:
    count = read_count(f"{tex:.6f} tex")
    for label, value in count.in_all_systems().items():
        again = read_count(f"{value:.12f} {label}")
        assert math.isclose(again.tex, count.tex, rel_tol=1e-6)
