"""Which of several declared cloths is the closer.

Truth is theory: Peirce's factors by hand; a constant that two cloths share cannot part them.
"""

from __future__ import annotations

from dataclasses import replace

import pytest
from declared_sheets import sheet

from imgcover.cloth.comparison import Comparison, ComparisonLine, compare
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import predict
from imgcover.report.predicted import comparison_text, prediction_record

POPLIN = sheet("133 /in", "72 /in", "40 Ne", "40 Ne", code="POPLIN")
SQUARE = sheet("68 /in", "64 /in", "32 Ne", "32 Ne", code="SQUARE")
TEXTURED = sheet("26 /cm", "25 /cm", "167 dtex f 48", "167 dtex f 48", code="TEXTURED",
                 of_warp='fibre = "polyester"\nspinning = "textured"',
                 of_weft='fibre = "polyester"\nspinning = "textured"')  # fmt: skip


def side_by_side(*sheets: Declaration) -> Comparison:
    return compare([predict(each) for each in sheets])


def line(comparison: Comparison, respect: str) -> ComparisonLine:
    return next(each for each in comparison.lines if each.respect == respect)


def test_the_closer_cloth_is_named_with_its_reasons() -> None:
    table = side_by_side(SQUARE, POPLIN)
    assert [each.respect for each in table.lines] == [
        "warp", "weft", "whole", "tightness", "mass"
    ]  # fmt: skip
    assert {each.closest for each in table.lines} == {1}
    assert line(table, "warp").reason == (
        "POPLIN has the closer warp than SQUARE: K 21.03 against 12.02, "
        "k = K/28 0.751 against 0.429"
    )
    assert "cover 85.2% against 66.0%" in line(table, "whole").reason


def test_a_shared_constant_does_not_blur_the_difference() -> None:
    """Both warps are Peirce's: 1 % more ends is a closer warp, though each k has u = 4 %."""
    near = sheet("68.7 /in", "64 /in", "32 Ne", "32 Ne", code="NEAR")
    warp = line(side_by_side(SQUARE, near), "warp")
    assert warp.closest == 1
    assert warp.values[0] is not None
    assert warp.ahead[0].u < 0.02 * warp.values[0].u
    assert line(side_by_side(SQUARE, near), "weft").closest is None


def test_cloths_on_different_constants_are_a_tie_within_their_uncertainty() -> None:
    """0.43 by Peirce and 0.45 by polyester of loose packing: u of the difference is 0.04."""
    warp = line(side_by_side(SQUARE, TEXTURED), "warp")
    assert warp.closest is None
    assert "cannot be told apart" in warp.reason
    assert "width over spacing" in warp.reason


def test_one_cloth_in_two_systems_is_a_tie() -> None:
    metric = sheet("26.771654 /cm", "25.196850 /cm", "18.454414 tex", "18.454414 tex",
                   code="METRIC")  # fmt: skip
    table = side_by_side(SQUARE, metric)
    for respect in ("warp", "weft", "whole", "mass"):
        assert line(table, respect).ahead[0].value < 1e-6 * 100
    assert line(table, "mass").closest is None


def test_undeclared_crimp_of_two_cloths_is_not_one_constant() -> None:
    """Truth is theory: twice the crimp's and the finish's share, in squares."""
    mass = line(side_by_side(SQUARE, SQUARE), "mass")
    assert mass.values[0] is not None
    assert mass.ahead[0].u == pytest.approx(2**0.5 * mass.values[0].u, rel=1e-6)
    assert "SQUARE (1) and SQUARE (2) cannot be told apart" in mass.reason


def test_three_cloths_are_ranked_and_none_is_ranked_without_a_weave() -> None:
    table = side_by_side(SQUARE, TEXTURED, POPLIN)
    warp = line(table, "warp")
    # 0.751 by Peirce stands alone; 0.45 and 0.43 rest on different constants
    assert warp.closest == 2
    assert warp.order == (2, 1, 0)
    assert warp.apart == (True, False)
    assert warp.reason.startswith(
        "the closest warp is that of POPLIN, then TEXTURED or SQUARE (or: not told apart within "
        "the uncertainty): K 21.03,"
    )
    assert len(line(table, "whole").values) == 3
    bare = predict(SQUARE)
    without = predict(replace(bare.construction, weave=None))
    found = line(compare([bare, without]), "tightness")
    assert found.closest is None
    assert found.values[1] is None


def test_the_first_lines_give_the_whole_order_and_leave_the_figures_to_the_table() -> None:
    text = comparison_text(side_by_side(SQUARE, SQUARE, POPLIN))
    assert " ".join(text.partition("\n\n")[0].split()) == (
        "the closest cloth is POPLIN, then SQUARE (1) or SQUARE (2) (or: not told apart within the "
        "uncertainty)"
    )


def test_three_cloths_alike_are_said_to_be() -> None:
    mass = line(side_by_side(SQUARE, SQUARE, SQUARE), "mass")
    assert mass.closest is None
    assert mass.reason.startswith("SQUARE (1), SQUARE (2) and SQUARE (3) cannot be told apart")


def test_each_cloths_record_says_where_it_stands() -> None:
    """Truth is arithmetic: POPLIN's K is above SQUARE's, which is above that of half its ends."""
    half = sheet("34 /in", "32 /in", "32 Ne", "32 Ne", code="HALF")
    sheets = (SQUARE, half, POPLIN)
    table = side_by_side(*sheets)
    records = [
        prediction_record(predict(each), declaration=each, comparison=table, index=k)
        for k, each in enumerate(sheets)
    ]
    warps = [each["comparison"]["warp"] for each in records]
    assert [each["rank"] for each in warps] == [2, 3, 1]
    assert [each["ahead"] and each["ahead"]["of"] for each in warps] == ["HALF", None, "SQUARE"]
    # half the ends of one yarn: half its closeness ahead, and so sure
    assert warps[0]["ahead"]["by"]["value"] == pytest.approx(warps[0]["value"]["value"] / 2)
    assert warps[0]["ahead"]["told_apart"] is True
    assert prediction_record(predict(SQUARE), declaration=SQUARE)["comparison"] is None


def test_one_cloth_is_no_comparison() -> None:
    with pytest.raises(ValueError, match="two or more"):
        compare([predict(SQUARE)])
