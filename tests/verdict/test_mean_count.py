"""The mean count from the balance and the counted threads.

Truth is published: the worked masses of GATE Textile 2009 question 37 and 2017 question 43. Truth
is a referee: the uncertainties package, and Monte Carlo draws, for the u.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from uncertainties import ufloat

from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.quantity import Measured
from imgcover.verdict.mean_count import MOISTURE_U, mean_count
from imgcover.verdict.observed import Observed


def declared(warp: str, weft: str, *, state: str = "grey", size: str = "0 %") -> Declaration:
    ends, ends_count, ends_crimp = warp.split(", ")
    picks, picks_count, picks_crimp = weft.split(", ")
    text = f"""
        [article]
        code = "M-1"
        state = "{state}"
        [warp]
        threads = "{ends}"
        count = "{ends_count}"
        crimp = "{ends_crimp}"
        size = "{size}"
        [weft]
        threads = "{picks}"
        count = "{picks_count}"
        crimp = "{picks_crimp}"
    """
    return read_declaration(text.encode(), name="article.toml")


def weighed(ends: float, picks: float, gsm: float, u: float = 0.0) -> Observed:
    return Observed(
        ends=Measured(ends, u * ends, "1/cm"),
        picks=Measured(picks, u * picks, "1/cm"),
        gsm=Measured(gsm, u * gsm, "g/m2"),
        conditioned=True,
    )


@pytest.mark.parametrize(
    ("warp", "weft", "gsm", "mean_tex"),
    [
        ("40 /cm, 30 tex, 10 %", "30 /cm, 20 tex, 10 %", 198.0, (40 * 30 + 30 * 20) / 70),
        (
            *("25 /cm, 25 tex, 6 %", "15 /cm, 32 tex, 8 %", 118.09),
            (25 * 25 * 1.06 + 15 * 32 * 1.08) / (25 * 1.06 + 15 * 1.08),
        ),
    ],
)
def test_published_masses_give_back_their_counts(
    warp: str, weft: str, gsm: float, mean_tex: float
) -> None:
    """The printed masses are rounded to 0.01 g/m²: 5e-5 of them."""
    ends, picks = (float(each.split(" ")[0]) for each in (warp, weft))
    count = mean_count(declared(warp, weft), weighed(ends, picks, gsm))
    assert count is not None
    assert count.tex.value == pytest.approx(mean_tex, rel=1e-4)
    assert count.declared_tex == pytest.approx(mean_tex, rel=1e-9)
    assert count.ne.value == pytest.approx(590.541 / count.tex.value, rel=1e-5)


def test_finer_yarn_than_declared_shows() -> None:
    """Truth is theory: the same cloth of yarn a tenth finer weighs a tenth less."""
    sheet = declared("40 /cm, 30 tex, 10 %", "30 /cm, 30 tex, 10 %")
    count = mean_count(sheet, weighed(40, 30, 0.9 * 231.0))
    assert count is not None
    assert count.tex.value == pytest.approx(27.0)


def test_u_against_the_uncertainties_package_and_draws() -> None:
    sheet = declared("40 /cm, 30 tex, 10 %", "30 /cm, 20 tex, 10 %", size="8 %")
    observed = weighed(40.4, 29.7, 214.0, 0.004)
    count = mean_count(sheet, observed)
    assert count is not None
    rounding = 0.01 / math.sqrt(12)  # "10 %" and "8 %" are written to one percent
    inputs = {
        "ends": (40.4, 0.004 * 40.4),
        "picks": (29.7, 0.004 * 29.7),
        "gsm": (214.0, 0.004 * 214),
        "warp": (0.10, rounding),
        "weft": (0.10, rounding),
        "size": (0.08, rounding),
    }

    def ratio(v: dict[str, object]) -> object:
        warp = v["ends"] * 30 * (1 + v["warp"]) * (1 + v["size"])  # type: ignore[operator]
        weft = v["picks"] * 20 * (1 + v["weft"])  # type: ignore[operator]
        return v["gsm"] * 10 / (warp + weft)  # type: ignore[operator]

    referee = ratio({name: ufloat(*each) for name, each in inputs.items()})
    assert count.tex.u / count.tex.value == pytest.approx(
        referee.s / referee.n,  # type: ignore[attr-defined]
        rel=1e-3,
    )
    rng = np.random.default_rng(51)
    drawn = ratio({name: rng.normal(*each, 100_000) for name, each in inputs.items()})
    # 100 000 draws know a standard deviation to 0.22 %; four of these
    assert np.std(drawn) / np.mean(drawn) == pytest.approx(  # type: ignore[call-overload]
        count.tex.u / count.tex.value, rel=0.01
    )


def test_a_damp_room_adds_to_the_u() -> None:
    sheet = declared("40 /cm, 30 tex, 10 %", "30 /cm, 20 tex, 10 %")
    dry = mean_count(sheet, weighed(40, 30, 198.0, 0.004))
    damp = mean_count(sheet, replace(weighed(40, 30, 198.0, 0.004), conditioned=False))
    assert dry is not None
    assert damp is not None
    relative = [count.tex.u / count.tex.value for count in (dry, damp)]
    assert relative[1] == pytest.approx(math.hypot(relative[0], MOISTURE_U))


def test_a_scale_shared_by_both_setts_does_not_average_out() -> None:
    sheet = declared("40 /cm, 30 tex, 10 %", "30 /cm, 20 tex, 10 %")
    own = mean_count(sheet, weighed(40, 30, 198.0, 0.01))
    shared = mean_count(sheet, replace(weighed(40, 30, 198.0, 0.01), scale_u=0.01))
    assert own is not None
    assert shared is not None
    assert shared.tex.u > 1.1 * own.tex.u


@pytest.mark.parametrize(("state", "indicates"), [("grey", False), ("finished", True)])
def test_an_unsaid_treatment_only_indicates(state: str, indicates: bool) -> None:
    """Size is declared here, the change in finishing is not: 5 % is added, and it is said."""
    sheet = declared("40 /cm, 30 tex, 10 %", "30 /cm, 20 tex, 10 %", state=state)
    count = mean_count(sheet, weighed(40, 30, 198.0))
    assert count is not None
    assert count.only_indicates is indicates
    assert (count.tex.u / count.tex.value > 0.05) is indicates


def test_without_a_weighing_or_a_count_there_is_none() -> None:
    sheet = declared("40 /cm, 30 tex, 10 %", "30 /cm, 20 tex, 10 %")
    whole = weighed(40, 30, 198.0)
    for missing in ("ends", "picks", "gsm"):
        assert mean_count(sheet, replace(whole, **{missing: None})) is None
