"""Whether a declared cloth can be woven.

Truth is theory: Peirce's jammed plain cloth has closed forms; a float lets threads lie closer.
"""

from __future__ import annotations

import math

import pytest
from declared_sheets import sheet
from hypothesis import given, settings
from hypothesis import strategies as st

from imgcover.cloth.count import read_count
from imgcover.cloth.diameter import Section
from imgcover.cloth.prediction import predict
from imgcover.cloth.weaving_limit import brierley_sett, jam
from imgcover.findings import Flag, has


def tightness(*args: str, **kwargs: str) -> float:
    limit = predict(sheet(*args, **kwargs)).limit  # type: ignore[arg-type]
    assert limit is not None
    return limit.tightness.value


@given(st.floats(0.05, 1), st.floats(0.05, 1), st.floats(0, math.pi / 2))
def test_jam_of_round_yarns_in_closed_form(d1: float, d2: float, angle: float) -> None:
    """Spacings D sin θ1, D sin θ2 with cos θ1 + cos θ2 = 1 are jammed, whatever the yarns."""
    both = d1 + d2
    cosine = math.cos(angle)
    ends = both * math.sqrt(1 - cosine**2)
    picks = both * math.sqrt(1 - (1 - cosine) ** 2)
    total = jam(ends, picks, warp=Section(d1, d1), weft=Section(d2, d2))
    assert total == pytest.approx(1.0, abs=1e-7)


def test_a_square_cotton_cloth_jams_at_k_16_17() -> None:
    k = 28 / math.sqrt(3)
    assert tightness(f"{k:.6f} /in", f"{k:.6f} /in", "1 Ne", "1 Ne") == pytest.approx(1, abs=1e-6)


@settings(max_examples=30, deadline=None)
@given(st.floats(0.3, 1.0))
def test_tightness_is_the_share_of_the_jammed_sett(share: float) -> None:
    k = share * 28 / math.sqrt(3) * 6
    assert tightness(f"{k:.6f} /in", f"{k:.6f} /in", "36 Ne", "36 Ne") == pytest.approx(
        share, abs=1e-6
    )


def test_longer_floats_leave_more_room() -> None:
    order = ["plain", "2/1 twill", "2/2 twill", "5-end satin", "8-end satin"]
    shares = [tightness("70 /in", "60 /in", "20 Ne", "20 Ne", weave=name) for name in order]
    assert shares == sorted(shares, reverse=True)
    # 2/1 twill: 3 ends with 2 intersections, one yarn beside another: p = (2 √3/2 D + d)/3
    spacing = (2 * math.sqrt(3) / 2 * 2 + 1) / 3
    yarn = Section(1.0, 1.0)
    assert jam(spacing, spacing, warp=yarn, weft=yarn, floats=(1.5, 1.5)) == pytest.approx(1.0)


def test_flattened_yarns_jam_by_their_height_and_lie_by_their_width() -> None:
    """Race-track: the straight part is added to the round yarn's crossing (Kemp 1958)."""
    flat = Section(1.5, 1.0)
    spacing = math.sqrt(3) + 0.5
    assert jam(spacing, spacing, warp=flat, weft=flat) == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("ends", "flag"),
    [("90 /in", None), ("104 /in", Flag.AT_THE_WEAVING_LIMIT), ("125 /in", Flag.CANNOT_BE_WOVEN)],
)
def test_what_cannot_be_woven_is_flagged_before_anyone_scans(ends: str, flag: Flag | None) -> None:
    findings = predict(sheet(ends, ends, "40 Ne", "40 Ne")).findings
    for each in (Flag.AT_THE_WEAVING_LIMIT, Flag.CANNOT_BE_WOVEN):
        assert has(findings, each) == (each is flag)


def test_yarns_pressed_far_past_their_spacing_are_still_told() -> None:
    assert tightness("120 /in", "90 /in", "2 Ne", "2 Ne", weave="8-end satin") > 2


def test_without_a_weave_no_limit_is_given() -> None:
    declared = sheet("60 /in", "60 /in", "30 Ne", "30 Ne")
    bare = type(declared)(
        **{
            key: getattr(declared, key)
            for key in declared.__slots__  # type: ignore[attr-defined]
            if key != "article"
        },
        article=declared.article.model_copy(update={"weave": None}),
    )
    assert predict(bare).limit is None


@pytest.mark.parametrize("name", ["2/2 warp rib", "2/2 herringbone"])
def test_brierley_is_silent_where_no_power_was_published(name: str) -> None:
    assert brierley_sett(read_count("20 Ne"), 2.0, name) is None


def test_brierley_is_for_cotton_only() -> None:
    seen = predict(sheet("20 /cm", "18 /cm", "30 tex", "30 tex", of_weft='fibre = "wool"'))
    assert seen.limit is not None
    assert seen.limit.brierley_ends is not None
    assert seen.limit.brierley_picks is None
