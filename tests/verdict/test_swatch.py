"""What a swatch's verdict says, line by line.

Truth is the rules as stated: DESIGN's meanings of a tolerance, of the bases of cover, of what
leaves a line undecided.
"""

from __future__ import annotations

import math

import pytest
from verdict_sheets import sheet

from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import predict
from imgcover.findings import Flag, has
from imgcover.quantity import Measured
from imgcover.verdict.decision import Decision
from imgcover.verdict.line import Basis, Line, Quantity
from imgcover.verdict.observed import Observed, Spread
from imgcover.verdict.standing import HOLDS
from imgcover.verdict.swatch import judge
from imgcover.verdict.verdict import Scope, Verdict

SETTS = '[tolerance]\nends = "2 %"\npicks = "-2 % +5 %"'


def per_cm(value: float, u: float = 0.05) -> Measured:
    return Measured(value, u, "1/cm")


def fraction(value: float, u: float = 0.004) -> Measured:
    return Measured(value, u, "1")


GOOD = Observed(ends=per_cm(30.1), picks=per_cm(25.1))


def verdict_on(declaration: Declaration, observed: Observed, risk: float | None = None) -> Verdict:
    return judge(declaration, predict(declaration), observed, risk=risk)


def line_of(verdict: Verdict, quantity: Quantity) -> Line:
    (line,) = [each for each in verdict.lines if each.quantity is quantity]
    return line


def test_a_good_swatch_conforms_and_says_why() -> None:
    verdict = verdict_on(sheet(SETTS), GOOD)
    ends = line_of(verdict, Quantity.ENDS)
    assert verdict.scope is Scope.SWATCH
    assert verdict.decision is Decision.CONFORMS
    assert (ends.declared, ends.lower, ends.upper) == pytest.approx((30.0, 29.4, 30.6))
    assert (ends.accept_lower, ends.accept_upper) == pytest.approx((29.5, 30.5))
    assert (ends.guard, ends.u, ends.n) == pytest.approx((0.1, 0.05, 1))
    assert ends.basis is Basis.DECLARED
    assert "30.100 ± 0.050 a cm against 30.000 a cm declared, +0.3 %" in ends.reason
    assert verdict.diagnosis == ()


def test_picks_short_of_the_lower_limit_do_not_conform() -> None:
    verdict = verdict_on(sheet(SETTS), Observed(ends=per_cm(30.0), picks=per_cm(23.5)))
    picks = line_of(verdict, Quantity.PICKS)
    assert verdict.decision is picks.decision is Decision.DOES_NOT_CONFORM
    assert "-6.0 %" in picks.reason
    assert verdict.diagnosis[0].cause == "picks short"


def test_a_surplus_within_a_wider_upper_limit_conforms() -> None:
    verdict = verdict_on(sheet(SETTS), Observed(ends=per_cm(30.0), picks=per_cm(26.1)))
    assert line_of(verdict, Quantity.PICKS).decision is Decision.CONFORMS


def test_one_sided_tolerances_leave_the_other_side_open() -> None:
    only_lower = sheet('[tolerance]\nends = "-2 %"\npicks = "+5 %"')
    verdict = verdict_on(only_lower, Observed(ends=per_cm(40.0), picks=per_cm(20.0)))
    ends, picks = (line_of(verdict, q) for q in (Quantity.ENDS, Quantity.PICKS))
    assert (ends.upper, picks.lower) == (None, None)
    assert ends.decision is picks.decision is Decision.CONFORMS
    assert "at least" in ends.reason
    assert "at most" in picks.reason


def test_between_the_limits_and_the_guard_band_nothing_is_said() -> None:
    verdict = verdict_on(sheet(SETTS), Observed(ends=per_cm(29.45), picks=per_cm(25.0)))
    assert line_of(verdict, Quantity.ENDS).decision is Decision.UNDECIDED
    assert verdict.decision is Decision.UNDECIDED


def test_a_stated_risk_sets_the_guard_band() -> None:
    line = line_of(verdict_on(sheet(SETTS), GOOD, risk=0.05), Quantity.ENDS)
    assert line.risk == 0.05
    assert line.guard == pytest.approx(1.6449 * 0.05, rel=1e-4)


def test_no_tolerance_shows_the_deviation_and_names_the_key() -> None:
    line = line_of(verdict_on(sheet(), GOOD), Quantity.ENDS)
    assert line.decision is Decision.UNDECIDED
    assert (line.lower, line.upper, line.guard) == (None, None, None)
    assert "+0.3 %" in line.reason
    assert "no tolerance declared" in line.reason
    assert "[tolerance] ends" in line.reason


def test_variation_over_the_field_widens_a_lines_u() -> None:
    uneven = Observed(ends=per_cm(30.0), picks=per_cm(25.0), ends_spread=Spread(0.02, 4))
    line = line_of(verdict_on(sheet(SETTS), uneven), Quantity.ENDS)
    assert line.u == pytest.approx(math.hypot(0.05, 30 * 0.02 / 2))


@pytest.mark.parametrize("flag", HOLDS)
def test_what_weakens_a_count_keeps_its_line_open(flag: Flag) -> None:
    weak = Observed(ends=per_cm(30.0), picks=per_cm(20.0), flags=frozenset({flag}))
    verdict = verdict_on(sheet(SETTS), weak)
    assert verdict.decision is Decision.UNDECIDED
    assert flag.message in line_of(verdict, Quantity.PICKS).reason


def test_cover_is_held_against_the_approved_swatch_first() -> None:
    more = ("[cover]\ndeclared = 0.5", '[reference]\noptical_cover = "0.64 u 0.003"')
    tolerance = f'{SETTS}\ncover = "4 points"'
    observed = Observed(ends=per_cm(30.0), picks=per_cm(25.0), cover=fraction(0.65))
    line = line_of(verdict_on(sheet(tolerance, *more), observed), Quantity.COVER)
    assert line.basis is Basis.REFERENCE
    assert line.u == pytest.approx(0.005)
    assert (line.lower, line.upper) == pytest.approx((0.60, 0.68))
    assert line.decision is Decision.CONFORMS


def test_then_against_the_declared_cover() -> None:
    declared = sheet(f'{SETTS}\ncover = "2 points"', "[cover]\ndeclared = 0.60")
    observed = Observed(ends=per_cm(30.0), picks=per_cm(25.0), cover=fraction(0.66))
    line = line_of(verdict_on(declared, observed), Quantity.COVER)
    assert line.basis is Basis.DECLARED
    assert line.decision is Decision.DOES_NOT_CONFORM


def test_then_against_the_model_with_its_u() -> None:
    declared = sheet(f'{SETTS}\ncover = "9 points"')
    expected = predict(declared).cover
    observed = Observed(ends=per_cm(30.0), picks=per_cm(25.0), cover=fraction(expected.value))
    line = line_of(verdict_on(declared, observed), Quantity.COVER)
    assert line.basis is Basis.MODEL
    assert line.u == pytest.approx(math.hypot(0.004, expected.u))
    assert line.decision is Decision.CONFORMS


def test_without_tolerance_or_figure_cover_is_not_judged_but_compared() -> None:
    expected = predict(sheet()).cover
    far = Observed(
        ends=per_cm(30.0), picks=per_cm(25.0), cover=fraction(expected.value + 4 * expected.u)
    )
    verdict = verdict_on(sheet(SETTS), far)
    assert [line.quantity for line in verdict.lines] == [Quantity.ENDS, Quantity.PICKS]
    assert has(verdict.findings, Flag.COVER_DIFFERS_FROM_MODEL)
    assert verdict.diagnosis
    hardly = Observed(
        ends=per_cm(30.0), picks=per_cm(25.0), cover=fraction(expected.value + 2.2 * expected.u)
    )
    (finding,) = [
        each
        for each in verdict_on(sheet(SETTS), hardly).findings
        if each.flag is Flag.COVER_DIFFERS_FROM_MODEL
    ]
    assert "can still be chance" in finding.remedy
    near = Observed(
        ends=per_cm(30.0), picks=per_cm(25.0), cover=fraction(expected.value + expected.u)
    )
    assert not has(verdict_on(sheet(SETTS), near).findings, Flag.COVER_DIFFERS_FROM_MODEL)


def test_a_cover_that_was_asked_for_and_not_seen_is_open() -> None:
    declared = sheet(f'{SETTS}\ncover = "4 points"')
    reflected = Observed(
        ends=per_cm(30.0), picks=per_cm(25.0), flags=frozenset({Flag.COVER_NEEDS_BACKLIGHT})
    )
    verdict = verdict_on(declared, reflected)
    line = line_of(verdict, Quantity.COVER)
    assert (line.measured, line.u, line.decision) == (None, None, Decision.UNDECIDED)
    assert Flag.COVER_NEEDS_BACKLIGHT.message in line.reason
    assert verdict.decision is Decision.UNDECIDED


def test_a_mass_is_judged_where_it_was_weighed() -> None:
    declared = sheet(
        f'{SETTS}\nmass = "5 %"',
        instead=("[mass]", '[mass]\ndeclared = "112 g/m2"'),
    )
    weighed = Observed(ends=per_cm(30.0), picks=per_cm(25.0), gsm=Measured(111.0, 0.6, "g/m2"))
    line = line_of(verdict_on(declared, weighed), Quantity.MASS)
    assert (line.lower, line.upper) == pytest.approx((106.4, 117.6))
    assert line.decision is Decision.CONFORMS
    unweighed = verdict_on(declared, GOOD)
    assert Quantity.MASS not in [each.quantity for each in unweighed.lines]
    assert has(unweighed.findings, Flag.MASS_NOT_WEIGHED)
    assert unweighed.decision is Decision.CONFORMS


def test_a_count_that_was_refused_leaves_its_line_open_with_the_reason() -> None:
    refused = Observed(picks=per_cm(25.0), flags=frozenset({Flag.TOO_COARSE}))
    line = line_of(verdict_on(sheet(SETTS), refused), Quantity.ENDS)
    assert line.decision is Decision.UNDECIDED
    assert Flag.TOO_COARSE.message in line.reason


def test_a_refusal_of_the_cover_is_no_reason_for_the_ends() -> None:
    flags = frozenset({Flag.NO_CLOTH_TO_COVER, Flag.TWO_READINGS})
    verdict = verdict_on(sheet(f'{SETTS}\ncover = "4 points"'), Observed(flags=flags))
    ends, cover = (line_of(verdict, q) for q in (Quantity.ENDS, Quantity.COVER))
    assert ends.reason == f"ends not judged: {Flag.TWO_READINGS.message}"
    assert cover.reason == f"optical cover not judged: {Flag.NO_CLOTH_TO_COVER.message}"


def test_what_is_declared_never_changes_what_was_measured() -> None:
    values = [
        line_of(verdict_on(sheet(SETTS, instead=("30 /cm", f"{n} /cm")), GOOD), Quantity.ENDS)
        for n in (20, 30, 33.3)
    ]
    assert {line.measured for line in values} == {30.1}
    assert {line.u for line in values} == {0.05}


def test_the_record_holds_every_key_and_only_plain_values() -> None:
    record = verdict_on(sheet(SETTS), Observed(ends=per_cm(30.0), picks=per_cm(23.0))).record()
    keys = "quantity basis unit declared lower upper accept_lower accept_upper guard risk measured"
    assert set(f"{keys} u n decision reason".split()) <= set(record["lines"][0])
    assert set(record) >= {"scope", "decision", "lines", "diagnosis"}
    assert set(record["diagnosis"][0]) >= {"cause", "weight", "for", "against", "settle"}
    assert type(record["decision"]) is type(record["lines"][0]["basis"]) is str
