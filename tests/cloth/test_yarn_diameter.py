"""Diameters, sections and cover factors of yarns.

Truth is theory: Peirce's 1/(28 √Ne) in, the area of a circle and of Kemp's race-track, worked here
anew with fractions of an inch.
"""

from __future__ import annotations

import math
from typing import Any, cast

import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.cloth.count import read_count
from imgcover.cloth.diameter import (
    PEIRCE_YARN_DENSITY,
    peirce_yarn_density,
    race_track,
    read_flattening,
    round_diameter,
)
from imgcover.cloth.factor import CoverFactor, cloth_factor
from imgcover.cloth.fibre import DENSITY, packing_of, read_fibre
from imgcover.cloth.sett import read_sett
from imgcover.cloth.stated import StatementError

NE = st.floats(1, 300)


@given(NE)
def test_peirce_is_exactly_one_over_28_root_ne_inches(ne: float) -> None:
    tex = 453592.37 / (840 * 0.9144) / ne
    inches = round_diameter(tex, PEIRCE_YARN_DENSITY) / 25.4
    assert inches == pytest.approx(1 / (28 * math.sqrt(ne)), rel=1e-12)


def test_peirce_stands_for_a_specific_volume_of_1_1_and_a_packing_of_0_60() -> None:
    # 28 is the round number of 27.93, so the diameter lies 0.25 % under that of 1.1 cm³/g
    assert round_diameter(20, 1 / 1.1) / round_diameter(20, PEIRCE_YARN_DENSITY) == pytest.approx(
        1.0025, abs=1e-4
    )
    assert PEIRCE_YARN_DENSITY / DENSITY["cotton"] == pytest.approx(0.60, abs=0.002)


def test_a_packing_off_by_five_points_moves_a_diameter_by_four_percent() -> None:
    yarn = peirce_yarn_density()
    for density, move in ((yarn.value + yarn.u, -0.04), (yarn.value - yarn.u, +0.044)):
        ratio = round_diameter(20, density) / round_diameter(20, yarn.value)
        assert ratio - 1 == pytest.approx(move, abs=0.002)


@given(st.floats(0.01, 2), st.floats(1, 5))
def test_flattening_keeps_the_area_and_the_ratio(diameter: float, ratio: float) -> None:
    section = race_track(diameter, ratio)
    straight = (section.width - section.height) * section.height
    area = math.pi * section.height**2 / 4 + straight
    assert area == pytest.approx(math.pi * diameter**2 / 4, rel=1e-12)
    assert section.width == pytest.approx(ratio * section.height, rel=1e-12)
    assert section.width >= diameter * (1 - 1e-12) >= section.height * (1 - 1e-9)


@pytest.mark.parametrize(
    ("written", "value", "u"),
    [
        ("round", 1.0, 0.0),
        ("Round", 1.0, 0.0),
        (1, 1.0, 0.0),
        (1.4, 1.4, 0.07),
        ("1.4 u 0.1", 1.4, 0.1),
        ("race-track 1.4 u 0.1", 1.4, 0.1),
        ({"value": 1.4, "u": 0.1}, 1.4, 0.1),
    ],
)
def test_flattening_is_an_input(written: object, value: float, u: float) -> None:
    constant = read_flattening(written)
    assert (constant.value, constant.u) == (value, pytest.approx(u))


def test_a_blend_has_the_density_of_its_volumes() -> None:
    blend = read_fibre("polyester 65 %, cotton 35 %").density.value
    assert blend == pytest.approx(100 / (65 / 1.39 + 35 / 1.52))
    assert 1.39 < blend < 1.52
    assert read_fibre("linen").density.value == read_fibre("flax").density.value


def test_each_packing_is_as_unsure_as_its_range_and_a_monofilament_is_solid() -> None:
    assert packing_of("monofilament").value == 1.0
    assert packing_of("monofilament").u == 0.0
    assert packing_of("textured").u == pytest.approx(0.2 / math.sqrt(12))
    assert packing_of("ring").u == 0.05


@given(NE, st.floats(0.5, 200))
def test_k_over_28_is_peirces_diameter_over_the_spacing(ne: float, per_cm: float) -> None:
    factor = CoverFactor(read_sett(f"{per_cm:.9f} /cm"), read_count(f"{ne:.9f} Ne"))
    diameter = round_diameter(factor.count.tex, PEIRCE_YARN_DENSITY)
    assert factor.fraction == pytest.approx(diameter * factor.sett.per_mm, rel=1e-12)


@given(NE, st.floats(0.5, 200))
def test_k_does_not_depend_on_the_units_it_was_declared_in(ne: float, per_cm: float) -> None:
    """The trap: n a cm × √tex / 10 is 0.957 K, and its full cover is 26.8."""
    inch = CoverFactor(read_sett(f"{per_cm * 2.54:.12f} /in"), read_count(f"{ne:.12f} Ne"))
    tex = 453592.37 / (840 * 0.9144) / ne
    metric = CoverFactor(read_sett(f"{per_cm:.12f} /cm"), read_count(f"{tex:.12f} tex"))
    assert metric.value == pytest.approx(inch.value, rel=1e-9)
    assert per_cm * math.sqrt(tex) / 10 / metric.value == pytest.approx(0.957, abs=5e-4)


def test_a_cover_factor_is_never_made_of_bare_numbers() -> None:
    for sett, count in ((26.8, 18.45), (read_sett("68 /in"), 32.0)):
        with pytest.raises(ValueError, match="sett and count"):
            CoverFactor(cast(Any, sett), cast(Any, count))


def test_the_cloth_factor_never_passes_28() -> None:
    full = CoverFactor(read_sett("200 /in"), read_count("40 Ne"))
    half = CoverFactor(read_sett("60 /in"), read_count("40 Ne"))
    assert full.value > 28
    assert cloth_factor(full, half) == 28.0
    assert cloth_factor(half, half) == pytest.approx(28 * (1 - (1 - half.fraction) ** 2), rel=1e-12)


@pytest.mark.parametrize("blend", ["50 % cotton", "cotton wool", "", "% cotton", "-10 % wool"])
def test_a_blend_that_does_not_add_up_is_refused(blend: str) -> None:
    with pytest.raises(StatementError):
        read_fibre(blend)
