"""The prediction's u against two referees that know nothing of its code.

Truth is theory: Monte Carlo after JCGM 101, drawing every constant; and the `uncertainties`
package, which carries derivatives through the textbook formulas.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from declared_sheets import sheet
from uncertainties import ufloat, umath

from imgcover.cloth.constant import Constant, combined
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import predict
from imgcover.cloth.weaving_limit import tightness_of

DRAWS = 4000
"""The standard deviation of so many draws is itself known to 1.1 %."""

SHEETS = {
    "cotton": sheet("68 /in", "64 /in", "32 Ne", "32 Ne"),
    "poplin": sheet("133 /in", "72 /in", "40 Ne", "40 Ne", of_warp='crimp = "12 %"'),
    "blend": sheet("30 /cm", "24 /cm", "2/60 Nm", "30 Nm", weave="2/2 twill",
                   of_warp='fibre = "polyester 55 %, wool 45 %"\nspinning = "worsted"',
                   of_weft='fibre = "wool"\nspinning = "woollen"\nflattening = "1.4 u 0.1"'),
    "filament": sheet("40 /cm", "28 /cm", "78 dtex f 24", "84 dtex f 36",
                      of_warp='fibre = "nylon"', of_weft='fibre = "nylon"\nspinning = "textured"'),
    "own figures": sheet("20 /cm", "18 /cm", "50 tex", "50 tex",
                         of_warp='fibre = "flax"\npacking = "0.58 u 0.03"',
                         of_weft='yarn_density = "0.85 g/cm3 u 0.06"'),
}  # fmt: skip


@pytest.mark.parametrize("name", SHEETS)
def test_u_agrees_with_the_scatter_of_drawn_constants(name: str) -> None:
    seen = predict(SHEETS[name])
    cloth = seen.construction
    rng = np.random.default_rng(101)
    names = {each.name: each for each in cloth.constants if each.u > 0}
    draws = [
        {key: rng.normal(each.value, each.u) for key, each in names.items()} for _ in range(DRAWS)
    ]
    # r, the relative u of the loosest packing or density
    loosest = max(each.u / each.value for each in names.values() if "crimp" not in each.name)
    for result, value, u in [
        (cloth.cover, seen.cover.value, seen.cover.u),
        (cloth.mass, seen.mass.value, seen.mass.u),
        (cloth.warp.fraction, seen.warp.value, seen.warp.u),
        (cloth.weft.fraction, seen.weft.value, seen.weft.u),
        (cloth.warp.diameter, seen.ends.diameter.value, seen.ends.diameter.u),
    ]:
        drawn = np.array([result(each) for each in draws])
        # four standard errors of the scatter, and its next order for 1/√x: the scatter of draws is
        # 1 + 2.44 r² times r/2, half the difference 1 + 0.63 r² times
        assert drawn.std() == pytest.approx(u, rel=0.045 + 1.81 * loosest**2)
        # the mean strays by the curvature of 1/√x: 3/8 r² of a diameter whose u is r/2, so 3/4 r
        # of u for each of at most three such constants,
        # 0.07 u is four standard errors of the mean
        assert abs(drawn.mean() - value) < (0.75 * loosest * math.sqrt(3) + 0.07) * u


def test_u_of_tightness_agrees_with_the_scatter_of_drawn_constants() -> None:
    seen = predict(SHEETS["blend"])
    assert seen.limit is not None
    cloth = seen.construction
    rng = np.random.default_rng(7)
    names = {each.name: each for each in cloth.constants if each.u > 0}
    drawn = [
        tightness_of(cloth, {key: rng.normal(each.value, each.u) for key, each in names.items()})
        for _ in range(800)
    ]
    # 800 draws know their scatter to 2.5 %
    assert np.std(np.array(drawn, dtype=float)) == pytest.approx(seen.limit.tightness.u, rel=0.09)


def test_u_agrees_with_derivatives_where_warp_and_weft_share_the_constant() -> None:
    seen = predict(sheet("68 /in", "64 /in", "32 Ne", "32 Ne"))
    # u of the packing, 0.05 of 0.60, is the only thing Peirce leaves open
    density = ufloat(0.9137, 0.9137 * 0.05 / 0.60)
    diameter = umath.sqrt(4 * 18.4544e-3 / (math.pi * density))
    k1, k2 = diameter * 68 / 25.4, diameter * 64 / 25.4
    cover = 1 - (1 - k1) * (1 - k2)
    assert seen.cover.value == pytest.approx(cover.nominal_value, rel=1e-4)
    # 1 %: a derivative and a half difference part by the square of 8 %
    assert seen.cover.u == pytest.approx(cover.std_dev, rel=0.01)
    assert seen.ends.diameter.u == pytest.approx(diameter.std_dev, rel=0.01)
    assert diameter.std_dev / diameter.nominal_value == pytest.approx(0.0417, abs=2e-4)


def test_mass_agrees_with_derivatives() -> None:
    declared: Declaration = sheet(
        "40 /cm", "30 /cm", "30 tex", "20 tex", of_article='state = "grey"',
        of_warp='crimp = "10 % u 2 %"\nsize = "8 % u 1 %"',
    )  # fmt: skip
    seen = predict(declared)
    warp = 120 * (1 + ufloat(0.10, 0.02)) * (1 + ufloat(0.08, 0.01))
    weft = 60 * (1 + ufloat(0.075, 0.13 / math.sqrt(12)))
    total = warp + weft
    assert seen.mass.value == pytest.approx(total.nominal_value, rel=1e-12)
    assert seen.mass.u == pytest.approx(total.std_dev, rel=1e-6)


def test_one_constant_counts_once_and_two_add_in_squares() -> None:
    same = [Constant("x", 2.0, 0.1, ""), Constant("x", 2.0, 0.1, "")]
    value, budget = combined(lambda drawn: 2 * drawn.get("x", 2.0), same, unit="1")
    assert (value.value, value.u, len(budget)) == (4.0, pytest.approx(0.2), 1)
    apart = [Constant("x", 2.0, 0.1, ""), Constant("y", 2.0, 0.1, "")]
    value, budget = combined(
        lambda drawn: drawn.get("x", 2.0) + drawn.get("y", 2.0), apart, unit="1"
    )
    assert value.u == pytest.approx(0.1 * math.sqrt(2))
    assert [each.name for each in budget] == ["x", "y"]


def test_the_budget_adds_up_to_u() -> None:
    for declared in SHEETS.values():
        seen = predict(declared)
        for key, result in (("cover", seen.cover), ("mass", seen.mass)):
            total = math.sqrt(sum(each.effect**2 for each in seen.budget[key]))
            assert total == pytest.approx(result.u)
            assert all(each.source for each in seen.budget[key])
