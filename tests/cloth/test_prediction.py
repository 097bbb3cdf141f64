"""What a declared construction implies.

Truth is theory: Peirce's formulas worked by hand; symmetries of units, of warp and weft, of order.
"""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from declared_sheets import sheet
from hypothesis import given, settings
from hypothesis import strategies as st

from imgcover.cloth.prediction import Prediction, predict
from imgcover.findings import Flag, has
from imgcover.quantity import Measured

NE_TEX = 453592.37 / (840 * 0.9144)


def figures(seen: Prediction) -> dict[str, Measured | None]:
    """Every number of a prediction."""
    limit = seen.limit
    assert limit is not None
    return {
        "warp_factor": seen.warp_factor,
        "weft_factor": seen.weft_factor,
        "cloth_factor": seen.cloth_factor,
        "warp": seen.warp,
        "weft": seen.weft,
        "cover": seen.cover,
        "mass": seen.mass,
        "warp k": seen.ends.k,
        "diameter": seen.picks.diameter,
        "tightness": limit.tightness,
        "ashenhurst": limit.ashenhurst_ends,
        "brierley": limit.brierley_picks,
    }


def test_a_cotton_cloth_by_hand() -> None:
    seen = predict(
        sheet("68 /in", "64 /in", "32 Ne", "32 Ne", of_warp='crimp = "6 %"',
              of_weft='crimp = "8 %"', of_article='state = "finished"',
              rest='[mass]\nfinish_change = "-4 %"')
    )  # fmt: skip
    k1, k2 = 68 / math.sqrt(32), 64 / math.sqrt(32)
    assert seen.model == "peirce"
    assert seen.warp_factor.value == pytest.approx(k1)
    assert seen.weft_factor.value == pytest.approx(k2)
    assert seen.cloth_factor.value == pytest.approx(k1 + k2 - k1 * k2 / 28)
    assert seen.warp.value == pytest.approx(k1 / 28)
    assert seen.cover.value == pytest.approx(1 - (1 - k1 / 28) * (1 - k2 / 28))
    assert seen.ends.diameter.value == pytest.approx(25.4 / (28 * math.sqrt(32)))
    grey = 23.2497 * (68 * 1.06 / 32 + 64 * 1.08 / 32)  # 23.25 with two more of its digits
    assert seen.mass.value == pytest.approx(0.96 * grey, rel=1e-5)
    assert not seen.findings
    assert any("read as single 32s = 18.5 tex" in line for line in seen.read_as)


@settings(max_examples=60, deadline=None)
@given(st.floats(4, 120), st.floats(4, 120), st.floats(0.2, 1.1), st.floats(0.2, 1.1))
def test_ne_and_tex_give_the_same_prediction_to_six_digits(
    ne1: float, ne2: float, k1: float, k2: float
) -> None:
    ends, picks = 28 * k1 * math.sqrt(ne1), 28 * k2 * math.sqrt(ne2)
    inch = predict(sheet(f"{ends:.9f} /in", f"{picks:.9f} /in", f"{ne1:.9f} Ne", f"{ne2:.9f} Ne"))
    metric = predict(
        sheet(
            f"{ends / 2.54:.9f} /cm",
            f"{10 * picks / 2.54:.9f} /10cm",
            f"{NE_TEX / ne1:.9f} tex",
            f"{NE_TEX / ne2:.9f} tex",
        )
    )
    for name, value in figures(inch).items():
        other = figures(metric)[name]
        assert value is not None and other is not None
        assert (other.value, other.u) == pytest.approx((value.value, value.u), rel=5e-7), name


@settings(max_examples=40, deadline=None)
@given(st.floats(4, 100), st.floats(4, 100))
def test_a_quarter_turn_swaps_warp_and_weft_and_leaves_the_cloth(ne1: float, ne2: float) -> None:
    one = predict(sheet("60 /in", "40 /in", f"{ne1} Ne", f"{ne2} Ne", weave="2/2 twill"))
    other = predict(sheet("40 /in", "60 /in", f"{ne2} Ne", f"{ne1} Ne", weave="2/2 twill"))
    assert one.warp == other.weft
    assert one.cover.value == pytest.approx(other.cover.value, rel=1e-12)
    assert one.cover.u == pytest.approx(other.cover.u, rel=1e-9)
    assert one.limit and other.limit
    assert one.limit.tightness.value == pytest.approx(other.limit.tightness.value, rel=1e-9)


@settings(max_examples=40, deadline=None)
@given(st.floats(1.01, 1.5))
def test_closer_or_coarser_covers_more_weighs_more_and_weaves_tighter(factor: float) -> None:
    cloth = predict(sheet("60 /in", "50 /in", "30 Ne", "40 Ne")).construction
    closer = replace(cloth, warp=replace(cloth.warp, sett=cloth.warp.sett.times(factor)))
    coarser = replace(cloth, weft=replace(cloth.weft, count=cloth.weft.count.times(factor)))
    first = predict(cloth)
    for changed in (closer, coarser):
        second = predict(changed)
        assert second.cover.value > first.cover.value
        assert second.mass.value > first.mass.value
        assert second.cloth_factor.value > first.cloth_factor.value
        assert first.limit and second.limit
        assert second.limit.tightness.value > first.limit.tightness.value


def test_other_fibres_go_by_density_and_packing() -> None:
    seen = predict(
        sheet("40 /cm", "30 /cm", "167 dtex f 48", "20 tex",
              of_warp='fibre = "polyester"', of_weft='fibre = "wool"\nspinning = "worsted"')
    )  # fmt: skip
    by_hand = math.sqrt(4 * 16.7 / (math.pi * 1000 * 1.39 * 0.725))
    assert seen.model == "general"
    assert seen.ends.diameter.value == pytest.approx(by_hand)
    assert seen.picks.diameter.value == pytest.approx(
        math.sqrt(4 * 20 / (math.pi * 1000 * 1.31 * 0.575))
    )
    assert seen.ends.k is None and seen.picks.k is None
    assert has(seen.findings, Flag.PACKING_ASSUMED)


@pytest.mark.parametrize(
    ("declared", "model", "k"),
    [
        ("", "peirce", True),
        ('fibre = "cotton"', "peirce", True),
        ('fibre = "cotton 100 %"', "peirce", True),
        ('flattening = "round"', "peirce", True),
        ("flattening = 1.3", "peirce", False),
        ("packing = 0.55", "general", False),
        ('fibre = "cotton"\nspinning = "rotor"', "general", False),
        ('fibre = "viscose"', "general", False),
        ('yarn_density = "0.9 g/cm3"', "general", False),
    ],
)
def test_k_is_only_called_k_over_28_where_it_is_d_over_p(
    declared: str, model: str, k: bool
) -> None:
    seen = predict(sheet("60 /in", "50 /in", "30 Ne", "40 Ne", of_warp=declared))
    assert seen.model == model
    assert seen.ends.model == model
    assert (seen.ends.k is not None) == k
    assert seen.picks.k is not None
    if k:
        assert seen.warp_factor.value / 28 == pytest.approx(seen.warp.value, rel=1e-12)


def test_a_declared_yarn_is_no_surer_than_its_packing_unless_it_says_so() -> None:
    """Truth is theory: 0.05 of 0.60 is 8.3 %, half of it in the diameter."""
    for declared, u in [
        ('yarn_density = "0.9 g/cm3"', 0.05 / 0.60 / 2),
        ('yarn_density = "0.9 g/cm3 u 0.02"', 0.02 / 0.9 / 2),
        ('packing = "0.50"', math.hypot(0.05 / 0.50, 0.01) / 2),
        ('packing = "0.50 u 0.01"', math.hypot(0.01 / 0.50, 0.01) / 2),
    ]:
        seen = predict(sheet("60 /in", "50 /in", "30 Ne", "40 Ne", of_warp=declared))
        diameter = seen.ends.diameter
        assert diameter.u / diameter.value == pytest.approx(u, rel=0.01), declared


def test_flattening_widens_the_yarn_and_nothing_else() -> None:
    as_spun = predict(sheet("60 /in", "50 /in", "30 Ne", "40 Ne"))
    pressed = predict(sheet("60 /in", "50 /in", "30 Ne", "40 Ne", of_warp="flattening = 1.5"))
    assert pressed.ends.width.value > as_spun.ends.width.value > pressed.ends.height.value
    assert pressed.warp.value / as_spun.warp.value == pytest.approx(
        pressed.ends.width.value / as_spun.ends.width.value
    )
    assert pressed.warp_factor == as_spun.warp_factor
    assert pressed.mass == as_spun.mass
    assert pressed.weft == as_spun.weft


def test_a_cloth_past_full_cover_is_capped_and_says_so() -> None:
    seen = predict(sheet("200 /in", "60 /in", "40 Ne", "40 Ne"))
    assert seen.warp.value == 1.0
    assert seen.cover.value == 1.0
    assert seen.warp_factor.value > 28
    assert seen.cloth_factor.value == 28.0
    assert seen.ends.k is not None and seen.ends.k.value > 1
    assert has(seen.findings, Flag.FRACTION_CAPPED)


def test_at_the_cap_the_uncertainty_does_not_vanish() -> None:
    """Truth is theory: one u less of the diameter and the cover is below 1."""
    seen = predict(sheet("178 /in", "60 /in", "40 Ne", "40 Ne"))  # K = 28.1
    assert seen.cover.value == 1.0
    assert seen.cover.u > 0.005


def test_what_is_not_declared_is_taken_and_said() -> None:
    bare = predict(sheet("60 /in", "50 /in", "30 Ne", "40 Ne"))
    told = predict(
        sheet("60 /in", "50 /in", "30 Ne", "40 Ne", of_article='state = "grey"',
              of_warp='crimp = "7.5 %"\nsize = "0 %"', of_weft='crimp = "7.5 %"')
    )  # fmt: skip
    assert {each.code for each in bare.findings} == {"crimp-assumed", "mass-only-indicates"}
    assert not told.findings
    assert bare.mass.value == pytest.approx(told.mass.value)
    assert bare.mass.u / bare.mass.value > 0.05 > 0.01 > told.mass.u / told.mass.value
    assert bare.cover == told.cover
    assert bare.budget["mass"][0].name == "size or finish not declared"
    assert any("taken as round" in line for line in bare.read_as)


def test_size_weighs_on_a_grey_warp_only() -> None:
    def mass(state: str, size: str) -> float:
        return predict(
            sheet("60 /in", "50 /in", "30 Ne", "40 Ne", of_article=f'state = "{state}"',
                  of_warp=f'crimp = "5 %"\nsize = "{size}"', of_weft='crimp = "5 %"',
                  rest='[mass]\nfinish_change = "0 %"')
        ).mass.value  # fmt: skip

    warp = 23.2497 * 60 / 30 * 1.05
    assert mass("grey", "10 %") - mass("grey", "0 %") == pytest.approx(0.1 * warp, rel=1e-4)
    assert mass("finished", "10 %") == mass("finished", "0 %")


@pytest.mark.parametrize(
    ("rest", "flag", "raised"),
    [
        ("[cover]\ndeclared = 0.84", Flag.DECLARED_COVER_UNLIKELY, True),
        ("[cover]\ndeclared = 0.64", Flag.DECLARED_COVER_UNLIKELY, False),
        ('[mass]\ndeclared = "118 g/m2"', Flag.DECLARED_MASS_UNLIKELY, True),
        ('[mass]\ndeclared = "100 g/m2"', Flag.DECLARED_MASS_UNLIKELY, False),
    ],
)
def test_a_sheet_that_contradicts_itself_is_told_before_anyone_scans(
    rest: str, flag: Flag, raised: bool
) -> None:
    seen = predict(sheet("68 /in", "64 /in", "32 Ne", "32 Ne", rest=rest))
    assert has(seen.findings, flag) == raised
