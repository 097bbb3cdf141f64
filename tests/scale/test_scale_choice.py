"""Which of several scales counts, and what is said of the others?"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from imgcover.findings import Flag, Severity, has
from imgcover.quantity import Measured
from imgcover.scale.choice import PRECEDENCE, choose_scale
from imgcover.scale.metadata import scale_from_metadata
from imgcover.scale.pitch import parse_pitch, scale_from
from imgcover.scale.scale import Scale, ScaleSource

INCH = 25.4


def _scale(source: str, x: float, u: float = 0.01, y: float | None = None) -> Scale:
    return Scale(
        Measured(x, u, "px/mm"), Measured(x if y is None else y, u, "px/mm"), 0.001, source
    )


def test_the_first_of_the_order_counts_in_whatever_order_they_come() -> None:
    """Truth is the contract: certificate, rule, sheet, stated pitch, metadata."""
    assert PRECEDENCE == ("certificate", "rule", "sheet", "stated pitch", "metadata")
    for given in itertools.permutations(PRECEDENCE[:4], 3):
        choice = choose_scale([_scale(each, 23.6) for each in given])
        assert choice.scale is not None
        assert choice.scale.source == min(given, key=PRECEDENCE.index)
        assert {each.source for each in choice.scale.compared} == set(given) - {choice.scale.source}
        assert all(each.agrees for each in choice.scale.compared)
        assert choice.findings == ()


@pytest.mark.parametrize(
    ("difference", "agrees"), [(0.0, True), (0.028, True), (0.029, False), (-0.029, False)]
)
@pytest.mark.parametrize("axis", ["x", "y"])
def test_two_scales_disagree_beyond_twice_their_uncertainty(
    difference: float, agrees: bool, axis: str
) -> None:
    """Truth is theory: u = 0.01 each is 0.01414 of the difference; twice that is 0.0283."""
    rule = _scale("rule", 23.6)
    x, y = (23.6 + difference, 23.6) if axis == "x" else (23.6, 23.6 + difference)
    choice = choose_scale([_scale("stated pitch", x, y=y), rule, None])
    assert choice.scale is not None and choice.scale.x == rule.x
    assert choice.scale.compared[0].agrees == agrees
    assert has(choice.findings, Flag.SCALES_DISAGREE) != agrees
    assert choice.findings == choice.scale.findings


def test_honest_scales_agree_as_often_as_they_should() -> None:
    """Truth is theory: two normal readings lie within 2u of each other in 95.4 % of all cases.

    On two independent axes, in 91.1 %; 2,000 trials scatter by 0.6 %, and three times that is
    allowed.
    """
    rng = np.random.default_rng(4)
    agreed = sum(
        Scale(_near(rng, 0.05), _near(rng, 0.05), 0.0, "rule").agrees_with(
            Scale(_near(rng, 0.12), _near(rng, 0.12), 0.0, "stated pitch")
        )
        for _ in range(2000)
    )
    assert agreed / 2000 == pytest.approx(0.9545**2, abs=0.019)


def _near(rng: np.random.Generator, u: float) -> Measured:
    return Measured(rng.normal(23.6, u), u, "px/mm")


def test_one_exact_pitch_in_two_units_agrees_with_itself() -> None:
    """Truth is theory: 40 µm is 25 px/mm."""
    one, other = scale_from(parse_pitch("40um")), scale_from(parse_pitch("25px/mm"))
    assert one.agrees_with(other)


def test_without_any_scale_the_ways_are_listed() -> None:
    """Truth is the contract: no densities, and the message lists the ways to give a scale."""
    choice = choose_scale([None, None])
    assert choice.scale is None
    (finding,) = choice.findings
    assert finding.flag is Flag.NO_SCALE and finding.severity is Severity.REFUSAL
    for way in ("--pitch", "--rule", "--device", "--metadata"):
        assert way in finding.remedy


@pytest.mark.parametrize(
    "dpi", [(72, 72), (96, 96), (72.009, 72.009), (96.012, 96.012), (71.12, 71.12), (72, 600)]
)
def test_default_metadata_is_never_trusted(dpi: tuple[float, float]) -> None:
    """Truth is the contract; 2835 and 3780 a metre, 28 a centimetre are rounded 72 and 96."""
    assert scale_from_metadata(dpi) is None
    choice = choose_scale(dpi=dpi, use_metadata=True)
    assert choice.scale is None
    assert "when they know nothing" in choice.findings[0].message
    stated = choose_scale([_scale("stated pitch", 23.6)], dpi=dpi, use_metadata=True)
    assert stated.scale is not None and stated.scale.compared == ()
    assert has(stated.findings, Flag.METADATA_NOT_TRUSTED)


@pytest.mark.parametrize("dpi", [(3, 3), (100_000, 100_000), (600, 1e9)])
def test_absurd_metadata_is_never_trusted(dpi: tuple[float, float]) -> None:
    """Truth is the contract: as for stated pitches."""
    assert choose_scale(dpi=dpi, use_metadata=True).scale is None


def test_other_metadata_counts_only_when_asked_for() -> None:
    """Truth is the contract."""
    assert choose_scale(dpi=(600, 300)).scale is None
    assert "not asked for" in choose_scale(dpi=(600, 300)).findings[0].message
    choice = choose_scale(dpi=(600, 300), use_metadata=True)
    assert choice.scale is not None
    assert choice.scale.source == ScaleSource.METADATA
    assert (choice.scale.x.value, choice.scale.y.value) == pytest.approx((600 / INCH, 300 / INCH))
    assert choice.scale.y.u == pytest.approx(0.005 * 300 / INCH)
    assert has(choice.findings, Flag.SCALE_FROM_METADATA)


def test_metadata_that_nobody_asked_for_is_compared_and_can_only_warn() -> None:
    """Truth is the contract: a file's claim is a claim; a rule or a pitch outranks it."""
    rule = _scale("rule", 600 / INCH)
    agreeing = choose_scale([rule], dpi=(600, 600))
    assert agreeing.scale is not None
    assert [(each.source, each.agrees) for each in agreeing.scale.compared] == [("metadata", True)]
    assert agreeing.findings == ()
    other = choose_scale([rule], dpi=(300, 300))
    assert other.scale is not None and not other.scale.compared[0].agrees
    assert has(other.findings, Flag.METADATA_DISAGREES)
    assert not has(other.findings, Flag.SCALES_DISAGREE)


@pytest.mark.parametrize(
    ("pitch", "flag"),
    [
        ("600dpi", Flag.SCALES_DISAGREE),
        ("23.62px/mm", Flag.METADATA_DISAGREES),
        ("42.3um", Flag.METADATA_DISAGREES),
    ],
)
def test_a_setting_told_from_memory_does_not_outweigh_the_file_s(pitch: str, flag: Flag) -> None:
    """Truth is the contract: of two settings one is wrong, and nobody can say which; a pitch that
    was measured stands against what the file claims."""
    stated = parse_pitch(pitch)
    for dpi in ((800, 800), (600, 800)):
        choice = choose_scale([scale_from(stated)], dpi=dpi, nominal=stated.is_nominal)
        both = {each.code for each in choice.findings} & {
            Flag.SCALES_DISAGREE.code,
            Flag.METADATA_DISAGREES.code,
        }
        assert both == {flag.code}
    agreeing = choose_scale([scale_from(stated)], dpi=(599.9988, 600), nominal=stated.is_nominal)
    assert not has(agreeing.findings, flag)


def test_metadata_that_was_asked_for_can_undecide() -> None:
    """Truth is the contract: a given way that disagrees is a finding and leaves it open."""
    choice = choose_scale([_scale("rule", 600 / INCH)], dpi=(300, 300), use_metadata=True)
    assert has(choice.findings, Flag.SCALES_DISAGREE)


def test_every_ways_own_findings_are_kept() -> None:
    """Truth is the contract: nothing noticed is lost."""
    stated = scale_from(parse_pitch("42.3um"))
    choice = choose_scale([_scale("rule", 23.64, u=0.05), stated])
    assert has(choice.findings, Flag.PITCH_TAKEN_AS_EXACT)


def test_turning_a_scale_turns_what_it_was_compared_with() -> None:
    """Truth is symmetry."""
    choice = choose_scale([_scale("rule", 20.0, y=30.0), _scale("sheet", 20.0, y=30.0)])
    assert choice.scale is not None
    turned = choice.scale.turned(swapped=True)
    assert (turned.x.value, turned.compared[0].x.value) == (30.0, 30.0)
    assert turned.turned(swapped=True) == choice.scale
    assert choice.scale.turned(swapped=False) is choice.scale


def test_a_compared_scale_lies_in_the_record_as_numbers_with_units() -> None:
    """Truth is the contract of the record."""
    choice = choose_scale([_scale("rule", 20.0), _scale("sheet", 20.0)])
    assert choice.scale is not None
    assert choice.scale.compared[0].record() == {
        "source": "sheet",
        "x": {"value": 20.0, "u": 0.01, "unit": "px/mm"},
        "y": {"value": 20.0, "u": 0.01, "unit": "px/mm"},
        "agrees": True,
    }


@pytest.mark.parametrize(("x", "ratio_u"), [(0.0, 0.0), (-1.0, 0.0), (1.0, -0.1), (1.0, np.nan)])
def test_a_scale_that_cannot_be_is_a_wrong_call(x: float, ratio_u: float) -> None:
    """Truth is theory: pixels a millimetre are positive, an uncertainty is not negative."""
    with pytest.raises(ValueError, match="must"):
        Scale(Measured(x, 0.0, "px/mm"), Measured(1.0, 0.0, "px/mm"), ratio_u, "rule")
