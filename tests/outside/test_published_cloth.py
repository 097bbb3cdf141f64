"""Mass, cover, diameter and sett against worked problems, standards and tables.

Truth is published: cloth_mass.toml, cloth_cover.toml, setts.toml and fibre_density.toml, each row
with its source. The recomputed value is held to its digits; the print within the difference that
its `reason` explains. No constant is bent to meet a rounded print.
"""

from __future__ import annotations

import math
import tomllib
from pathlib import Path
from typing import Any

import pytest

from imgcover.cloth.count import read_count
from imgcover.cloth.count_system import CountSystem
from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.cloth.diameter import PEIRCE_YARN_DENSITY, Section, round_diameter
from imgcover.cloth.fibre import DENSITY, PACKING
from imgcover.cloth.mass import mass_of
from imgcover.cloth.prediction import Prediction, predict
from imgcover.cloth.sett import MM_PER_INCH, read_sett
from imgcover.cloth.weaving_limit import (
    ashenhurst_diameters,
    ashenhurst_sett,
    brierley_sett,
    jam,
)
from imgcover.findings import Flag, has
from imgcover.weave import weave

HERE = Path(__file__).parent
MASS, COVER, SETTS, FIBRES = (
    tomllib.loads((HERE / f"{name}.toml").read_text("utf-8"))
    for name in ("cloth_mass", "cloth_cover", "setts", "fibre_density")
)


def declared(
    warp: dict[str, str], weft: dict[str, str], *, weave_name: str = "plain", rest: str = ""
) -> Declaration:
    def table(name: str, figures: dict[str, str]) -> str:
        return f"[{name}]\n" + "".join(f'{key} = "{value}"\n' for key, value in figures.items())

    text = f'[article]\ncode = "P"\nweave = "{weave_name}"\n'
    return read_declaration((text + table("warp", warp) + table("weft", weft) + rest).encode())


def seen(row: dict[str, Any], **crimp: str) -> Prediction:
    """A prediction from a row's figures."""
    return predict(
        declared(row["warp"] | crimp, row["weft"] | crimp, weave_name=row.get("weave", "plain"))
    )


@pytest.mark.parametrize("row", MASS["problem"], ids=lambda row: row["name"])
def test_mass_of_worked_problems(row: dict[str, Any]) -> None:
    mass = seen(row).mass.value
    assert mass == pytest.approx(row["recomputed"], abs=row["half_digit"])
    assert mass == pytest.approx(row["printed"], abs=row["within"])


def test_the_sett_and_cover_that_a_mass_allows() -> None:
    row = MASS["square"]
    count = read_count(row["count"])
    per_cm = 10 * row["mass"] / 2 / mass_of(1.0, count.tex, crimp=0.10)
    assert per_cm == pytest.approx(row["recomputed_per_cm"], abs=0.005)
    assert per_cm == pytest.approx(row["printed_per_cm"], abs=0.05)
    square = {"threads": f"{row['printed_per_cm']} /cm", "count": row["count"]}
    cover = predict(declared(square, square)).cover.value
    assert cover == pytest.approx(row["recomputed_cover"], abs=5e-5)
    assert cover == pytest.approx(row["worked_cover"], abs=0.004)
    assert cover == pytest.approx(row["printed_cover"], abs=0.018)


@pytest.mark.parametrize("row", MASS["standard"], ids=lambda row: row["name"])
def test_standard_cloths_weigh_what_they_must_with_a_plausible_crimp(row: dict[str, Any]) -> None:
    bare = seen(row, crimp="0 %").mass.value
    assert bare == pytest.approx(row["zero_crimp"], abs=0.05)
    assert row["printed"] / bare == pytest.approx(row["ratio"], abs=0.0005)
    lightest, heaviest = (row["printed"] + side * row["tolerance"] for side in (-1, 1))
    crimps = [crimp / 1000 for crimp in range(10, 141) if lightest
              <= bare * (1 + crimp / 1000) <= heaviest]  # fmt: skip
    # of the crimps of 1 to 14 % that are met, a band of more than four points does
    assert max(crimps) - min(crimps) > 0.04
    middle = (min(crimps) + max(crimps)) / 2
    assert lightest <= seen(row, crimp=f"{100 * middle:.2f} %").mass.value <= heaviest


@pytest.mark.parametrize("row", MASS["standard"], ids=lambda row: row["name"])
def test_a_standard_cloth_is_neither_unweavable_nor_unlikely(row: dict[str, Any]) -> None:
    rest = f'[mass]\ndeclared = "{row["printed"]} g/m2"\n'
    sheet = declared(row["warp"], row["weft"], weave_name=row["weave"], rest=rest)
    found = predict(sheet)
    assert not has(found.findings, Flag.CANNOT_BE_WOVEN)
    assert not has(found.findings, Flag.DECLARED_MASS_UNLIKELY)
    assert abs(found.mass.value - row["printed"]) < 2 * found.mass.u
    if "cover" in row:
        assert found.cover.value == pytest.approx(row["cover"], abs=5e-4)


def test_the_pound_inch_formula_of_mass() -> None:
    row = MASS["formula"]
    factor = mass_of(1 / MM_PER_INCH, CountSystem.NE.to_tex(1.0), crimp=0.0)
    assert float(f"{factor:.{row['digits']}g}") == row["factor"]


def test_crimp_is_by_the_cloth_and_take_up_by_the_yarn() -> None:
    row = MASS["crimp"]
    crimp = row["yarn_cm"] / row["cloth_cm"] - 1
    assert crimp == pytest.approx(row["crimp"], abs=5e-4)
    assert 1 - row["cloth_cm"] / row["yarn_cm"] == pytest.approx(row["take_up"], abs=5e-5)
    by_take_up = mass_of(2.0, 20.0, crimp=0.0) / (1 - row["take_up"])
    assert mass_of(2.0, 20.0, crimp=crimp) == pytest.approx(by_take_up, rel=5e-5)


@pytest.mark.parametrize("row", COVER["factors"], ids=lambda row: row["name"])
def test_cover_factors(row: dict[str, Any]) -> None:
    found = seen(row)
    assert found.warp_factor.value == pytest.approx(row["warp_factor"], abs=row["half_digit"])
    assert found.weft_factor.value == pytest.approx(row["weft_factor"], abs=row["half_digit"])


@pytest.mark.parametrize("row", COVER["weaves"], ids=lambda row: row["said"])
def test_what_looms_can_do(row: dict[str, Any]) -> None:
    figures = {"threads": f"{row['factor'] * 6} /in", "count": "36 Ne"}
    limit = predict(declared(figures, figures)).limit
    assert limit is not None
    assert row["lowest"] < limit.tightness.value < row["highest"]


def test_the_jammed_square_cloth() -> None:
    row = COVER["jammed"]
    # jam needs both yarns' heights: D = 2
    angle = math.acos(0.5)
    yarn = Section(1.0, 1.0)
    assert math.sin(angle) == pytest.approx(row["spacing"], abs=5e-4)
    assert jam(2 * math.sin(angle), 2 * math.sin(angle), warp=yarn, weft=yarn) == pytest.approx(1)
    assert angle == pytest.approx(row["thread"], abs=5e-5)
    assert angle / math.sin(angle) - 1 == pytest.approx(row["crimp"], abs=5e-5)
    figures = {"threads": f"{28 / math.sqrt(3):.9f} /in", "count": "1 Ne"}
    found = predict(declared(figures, figures))
    assert found.warp_factor.value == pytest.approx(row["factor"], abs=0.005)
    assert found.cover.value == pytest.approx(row["cover"], abs=5e-5)


def test_peirces_constants_and_the_metric_trap() -> None:
    row = COVER["peirce"]
    one = round_diameter(1.0, PEIRCE_YARN_DENSITY)
    assert one == pytest.approx(row["mm_root_tex"], abs=5e-6)
    of_1_1 = round_diameter(1.0, 1 / 1.1)
    assert of_1_1 == pytest.approx(row["mm_root_tex_of_1_1"], abs=5e-6)
    ne_1 = CountSystem.NE.to_tex(1.0)
    assert MM_PER_INCH / round_diameter(ne_1, 1 / 1.1) == pytest.approx(
        row["exact_of_1_1"], abs=0.005
    )
    factor = predict(declared(*({"threads": "28 /in", "count": "1 Ne"},) * 2)).warp_factor.value
    metric = read_sett("28 /in").per_cm * math.sqrt(ne_1) / 10
    assert factor == pytest.approx(row["per_inch"])
    assert metric == pytest.approx(row["metric_full"], abs=0.05)
    assert metric / factor == pytest.approx(row["metric_share"], abs=5e-4)


@pytest.mark.parametrize("row", COVER["mesh"], ids=lambda row: f"{row['diameter_um']:.0f} µm")
def test_open_area_of_monofilament_screens(row: dict[str, Any]) -> None:
    """The count is worked from the diameter, so the whole road from count to cover is held."""
    diameter, pitch = row["diameter_um"] / 1000, (row["diameter_um"] + row["opening_um"]) / 1000
    tex = 1000 * 1.39 * math.pi * diameter**2 / 4
    figures = {
        "threads": f"{1 / pitch:.9f} /mm",
        "count": f"{tex:.9f} tex f 1",
        "fibre": "polyester",
    }
    found = predict(declared(figures, figures))
    assert found.ends.diameter.value == pytest.approx(diameter, rel=1e-6)
    assert 1 - found.cover.value == pytest.approx(row["recomputed_open"], abs=5e-4)
    assert 1 - found.cover.value == pytest.approx(row["printed_open"], abs=0.005)


def test_a_yarn_measured_by_its_twist_is_packed_as_our_table_says() -> None:
    row = COVER["twisted"]
    diameter = 10 * math.tan(math.radians(row["angle_deg"])) / math.pi / row["turns_per_cm"]
    assert diameter == pytest.approx(row["recomputed_mm"], abs=5e-4)
    assert diameter == pytest.approx(row["printed_mm"], abs=1.5e-3)
    loosest, closest = PACKING["woollen"][0], PACKING["compact"][1]
    cotton = DENSITY["cotton"]
    thick = round_diameter(row["tex"], loosest * cotton)
    thin = round_diameter(row["tex"], closest * cotton)
    assert thin < diameter < thick


def test_brierleys_sett_of_a_twill() -> None:
    row = SETTS["brierley"]
    sett = brierley_sett(read_count(row["count"]), 2.0, row["weave"])
    assert sett is not None
    assert 2.54 * sett.value == pytest.approx(row["recomputed_per_inch"], abs=0.005)
    assert 10 * sett.value == pytest.approx(row["recomputed_per_dm"], abs=0.05)
    assert 2.54 * sett.value == pytest.approx(row["printed_per_inch"], abs=0.035)
    assert 10 * sett.value == pytest.approx(row["printed_per_dm"], abs=0.55)


def test_taylors_diameters_an_inch() -> None:
    row = SETTS["taylor"]
    for count, printed in zip(row["counts"], row["printed"], strict=True):
        diameters = ashenhurst_diameters(read_count(f"{count} Ne"), firmness=row["firmness"])
        assert diameters == pytest.approx(0.95 * math.sqrt(840 * count), rel=1e-9)
        assert diameters == pytest.approx(printed, rel=row["within"])


def test_taylors_twill_from_a_plain_sett() -> None:
    row = SETTS["taylor_twill"]
    twill = weave(row["weave"])
    mean_float = twill.ends_repeat / twill.intersections[0]
    count = read_count("40 Ne")
    ratio = ashenhurst_sett(count, mean_float).value / ashenhurst_sett(count, 1.0).value
    assert row["plain"] * ratio == pytest.approx(row["printed"], abs=1e-5)


def test_ashenhursts_rule_on_a_folded_cotton() -> None:
    row = SETTS["ashenhurst"]
    count = read_count(row["count"]).folded(row["plies"])
    found = {
        "diameters": ashenhurst_diameters(count),
        "plain": 2.54 * ashenhurst_sett(count, 1.0).value,
        "twill": 2.54 * ashenhurst_sett(count, 2.0).value,
    }
    for name, value in found.items():
        assert value == pytest.approx(row["recomputed"][name], abs=0.05)
        # whole threads, cut at every step
        assert row["printed"][name] <= value < row["printed"][name] + 1


def test_fibre_densities_are_the_handbooks() -> None:
    assert FIBRES["density"] | FIBRES["other"] == DENSITY


def test_every_row_names_its_source() -> None:
    rows = [
        row
        for table in (MASS, COVER, SETTS)
        for part in table.values()
        for row in (part if isinstance(part, list) else [part])
    ]
    for row in [*rows, FIBRES, FIBRES["other_source"]]:
        assert row["source"] and row["edition"] and row["page"]
