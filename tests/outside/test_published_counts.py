"""Counts against published tables and against another program's units.

Truth is published: ASTM D2260 and the books named in yarn_counts.toml; and pint, whose registry
holds the textile units independently of this house.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.cloth.count import read_count
from imgcover.cloth.count_system import CountSystem

TABLE = tomllib.loads((Path(__file__).parent / "yarn_counts.toml").read_text("utf-8"))
UNITS = pint.UnitRegistry()
BY_LABEL = {system.label: system for system in CountSystem}


def significant(value: float, digits: int) -> float:
    return float(f"{value:.{digits}g}")


@pytest.mark.parametrize("row", TABLE["worth"], ids=lambda row: row["unit"])
def test_a_count_of_one_is_worth_what_is_printed(row: dict[str, Any]) -> None:
    tex = BY_LABEL[row["unit"]].to_tex(1.0)
    assert significant(tex, row["digits"]) == pytest.approx(row["worth"], rel=1e-12)


def test_cotton_count_times_denier() -> None:
    row = TABLE["cotton_times_denier"]
    product = 32 * CountSystem.DEN.from_tex(CountSystem.NE.to_tex(32))
    assert significant(product, row["digits"]) == row["product"]


@pytest.mark.parametrize("row", TABLE["rounded_tex"], ids=lambda row: row["count"])
def test_rounded_tex_lies_within_two_percent(row: dict[str, Any]) -> None:
    """The standard's rounded values are for naming yarns; we never round."""
    assert read_count(row["count"]).tex == pytest.approx(row["tex"], rel=0.02)


@pytest.mark.parametrize("row", TABLE["folded"], ids=lambda row: row["text"])
def test_unlike_yarns_folded(row: dict[str, Any]) -> None:
    assert read_count(row["text"]).ne == pytest.approx(row["printed"], abs=row["within"])


@pytest.mark.parametrize("row", TABLE["equivalent"], ids=lambda row: row["unit"])
def test_one_yarn_in_two_systems(row: dict[str, Any]) -> None:
    counts = read_count(row["text"]).in_all_systems()
    assert counts[row["unit"]] == pytest.approx(row["printed"], abs=row["within"])


# Differences of meaning from pint: it knows no worsted, lea, run or spun silk count, and its
# indirect counts are lengths a mass, to be turned over; its jute is pounds a 14 400 yd spyndle.
DIRECT = {"tex": "tex", "dtex": "dtex", "den": "denier", "lb/spyndle": "jute"}
INDIRECT = {"Ne": "Ne", "Nm": "Nm"}


@given(st.floats(0.5, 500))
def test_direct_counts_agree_with_pint(count: float) -> None:
    for label, unit in DIRECT.items():
        tex = UNITS.Quantity(count, unit).to("g/km").magnitude
        assert BY_LABEL[label].to_tex(count) == pytest.approx(tex, rel=1e-12)


@given(st.floats(0.5, 500))
def test_indirect_counts_agree_with_pint(count: float) -> None:
    for label, unit in INDIRECT.items():
        tex = (1 / UNITS.Quantity(count, unit)).to("g/km").magnitude
        assert BY_LABEL[label].to_tex(count) == pytest.approx(tex, rel=1e-12)


@given(st.sampled_from([560, 300, 1600]), st.floats(0.5, 300))
def test_hank_counts_agree_with_pints_pound_and_yard(yards: int, count: float) -> None:
    label = {560: "worsted", 300: "linen lea", 1600: "woollen run"}[yards]
    hanks = UNITS.Quantity(count * yards, "yard / pound")
    assert BY_LABEL[label].to_tex(count) == pytest.approx((1 / hanks).to("g/km").magnitude)


def test_every_row_names_its_source() -> None:
    rows = [row for part in TABLE.values() for row in (part if isinstance(part, list) else [part])]
    assert len(rows) >= 16
    for row in rows:
        assert row["source"] and row["edition"] and row["page"]
