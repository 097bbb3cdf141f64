"""Lots of several places: means, scatter, places merged, the standard's number and distances.

Truth is theory: the mean and its standard deviation; Student's t for few places. Truth is
published: ISO 7211-2 asks for five places and the distances of verdict/standard.py.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy import stats
from verdict_sheets import sheet

from imgcover.cloth.prediction import predict
from imgcover.findings import Flag, has
from imgcover.quantity import Measured
from imgcover.verdict.decision import Decision
from imgcover.verdict.line import Quantity
from imgcover.verdict.lot import LotVerdict, judge_lot
from imgcover.verdict.observed import Observed, Spread
from imgcover.verdict.place import merged
from imgcover.verdict.pooled import pooled
from imgcover.verdict.standard import shortest_length_mm
from imgcover.verdict.verdict import Scope

DECLARED = sheet('[tolerance]\nends = "2 %"\npicks = "2 %"')
PREDICTED = predict(DECLARED)


def seen(ends: float, picks: float, *, place: str = "", u: float = 0.02) -> Observed:
    return Observed(
        ends=Measured(ends, u, "1/cm"),
        picks=Measured(picks, u, "1/cm"),
        ends_length_mm=40.0,
        picks_length_mm=40.0,
        place=place,
    )


def lot_of(*pictures: Observed, risk: float | None = None) -> LotVerdict:
    return judge_lot(DECLARED, PREDICTED, pictures, lot="L-7", risk=risk)


FIVE = [seen(e, p) for e, p in zip((30.0, 30.1, 29.9, 30.05, 29.95), (25.0,) * 5, strict=True)]


def test_five_even_places_decide_the_lot() -> None:
    lot = lot_of(*FIVE)
    assert lot.decision is Decision.CONFORMS
    assert lot.verdict.scope is Scope.LOT
    assert (lot.n_places, lot.required) == (5, 5)
    assert not has(lot.verdict.findings, Flag.FEWER_PLACES_THAN_STANDARD)
    line = lot.verdict.lines[0]
    scatter = np.std((30.0, 30.1, 29.9, 30.05, 29.95), ddof=1)
    assert line.n == 5
    assert line.measured == pytest.approx(30.0)
    assert line.u == pytest.approx(scatter / math.sqrt(5))
    assert line.freedom == pytest.approx(4)
    # U = k u with Student's k for what 2 u would leave with many places
    factor = stats.t.ppf(stats.norm.cdf(2.0), 4)
    assert line.guard == pytest.approx(factor * line.u)


def test_one_place_never_decides_a_lot() -> None:
    lot = lot_of(seen(30.0, 25.0), *[])
    assert lot.decision is Decision.UNDECIDED
    assert all("one place never decides a lot" in line.reason for line in lot.verdict.lines)
    far = lot_of(seen(20.0, 25.0))
    assert far.decision is Decision.UNDECIDED


def test_two_pictures_of_one_place_are_one_place() -> None:
    lot = lot_of(seen(30.0, 25.0, place="1"), seen(30.01, 25.0, place="1"))
    assert lot.n_places == 1
    assert lot.decision is Decision.UNDECIDED


def test_fewer_places_than_the_standards_are_said() -> None:
    lot = lot_of(*FIVE[:4])
    (finding,) = [f for f in lot.verdict.findings if f.flag is Flag.FEWER_PLACES_THAN_STANDARD]
    assert "4 places" in finding.message
    assert "5" in finding.message


def test_short_distances_are_said() -> None:
    """25 to 40 threads a cm want 3 cm, 10 to 25 want 5 cm: the picks' 40 mm are too short."""
    fewer_picks = [replace(each, picks=Measured(24.6, 0.02, "1/cm")) for each in FIVE]
    lot = lot_of(*fewer_picks)
    (finding,) = [f for f in lot.verdict.findings if f.flag is Flag.SHORTER_LENGTH_THAN_STANDARD]
    assert "picks over 40 mm instead of 50 mm at 5 of 5 places" in finding.message
    assert "ends" not in finding.message


@pytest.mark.parametrize(
    ("per_cm", "length"), [(9.9, 100), (10, 50), (24.9, 50), (25, 30), (40, 30), (40.1, 20)]
)
def test_distances_of_the_standard(per_cm: float, length: float) -> None:
    """ISO 7211-2, from memory: under 10 a cm 10 cm; 10–25 5 cm; 25–40 3 cm; over 40 2 cm."""
    assert shortest_length_mm(per_cm) == length


def test_the_scale_does_not_average_out() -> None:
    common = [replace(each, scale_u=0.005) for each in [seen(30.0, 25.0, u=0.15)] * 5]
    line = lot_of(*common).verdict.lines[0]
    assert line.u is not None
    assert line.u >= 0.005 * 30.0


def test_places_that_agree_by_chance_are_not_trusted_beyond_their_own_u() -> None:
    same = [seen(30.0, 25.0, u=0.3)] * 5
    line = lot_of(*same).verdict.lines[0]
    assert line.u == pytest.approx(0.3 / math.sqrt(5))
    uneven = [replace(each, ends_spread=Spread(0.02, 4)) for each in same]
    wider = lot_of(*uneven).verdict.lines[0]
    assert wider.u == pytest.approx(math.hypot(0.3, 0.3) / math.sqrt(5))


def test_a_weak_place_keeps_the_lot_open() -> None:
    weak = replace(FIVE[0], flags=frozenset({Flag.RESTS_ON_DECLARED_WEAVE}))
    assert lot_of(weak, *FIVE[1:]).decision is Decision.UNDECIDED


def test_backlit_and_reflected_pictures_of_a_place_become_one() -> None:
    reflected = replace(seen(30.0, 25.0, place="A"), flags=frozenset({Flag.COVER_NEEDS_BACKLIGHT}))
    backlit = replace(seen(30.02, 25.0, place="A"), cover=Measured(0.66, 0.004, "1"))
    (place,) = merged([reflected, backlit])
    assert place.cover == Measured(0.66, 0.004, "1")
    assert place.ends is not None
    assert place.ends.value == pytest.approx(30.01)
    assert place.ends.u == 0.02
    assert Flag.COVER_NEEDS_BACKLIGHT not in place.flags


def test_a_sound_picture_of_a_place_stands_for_a_weak_one() -> None:
    weak = replace(seen(40.0, 25.0, place="A"), flags=frozenset({Flag.RESTS_ON_DECLARED_WEAVE}))
    (place,) = merged([weak, seen(30.0, 25.0, place="A")])
    assert place.ends == Measured(30.0, 0.02, "1/cm")
    assert not place.flags


def test_pictures_of_a_place_that_disagree_are_said_and_widen_u() -> None:
    lot = lot_of(
        seen(30.0, 25.0, place="A"), seen(30.4, 25.0, place="A"), seen(30.2, 25.0, place="B")
    )
    assert has(lot.verdict.findings, Flag.PICTURES_OF_A_PLACE_DISAGREE)
    assert lot.places[0].ends is not None
    assert lot.places[0].ends.u == pytest.approx(math.hypot(0.02, 0.2))


def test_places_without_a_count_do_not_count() -> None:
    lot = lot_of(*FIVE, Observed(flags=frozenset({Flag.TOO_COARSE})))
    assert lot.n_places == 5
    assert lot.decision is Decision.CONFORMS


def test_a_lot_without_any_count_is_open() -> None:
    lot = lot_of(Observed(flags=frozenset({Flag.TOO_COARSE})))
    assert lot.decision is Decision.UNDECIDED
    assert lot.n_places == 0


def test_the_lot_record_holds_every_key() -> None:
    record = lot_of(*FIVE).record()
    keys = "schema lot article n_places required places lines decision findings"
    assert set(keys.split()) <= set(record)
    assert record["schema"] == "imgcover/lot/1"
    assert len(record["places"]) == 5
    assert record["means"]["ends"]["scatter"] == pytest.approx(
        np.std((30.0, 30.1, 29.9, 30.05, 29.95), ddof=1)
    )


def test_the_diagnosis_of_a_lot_rests_on_its_mean() -> None:
    short = [seen(30.0, p) for p in (23.1, 22.9, 23.0, 23.05, 22.95)]
    lot = lot_of(*short)
    assert lot.decision is Decision.DOES_NOT_CONFORM
    assert lot.verdict.diagnosis[0].cause == "picks short"


def test_the_u_of_a_mean_covers_the_truth() -> None:
    """Truth is drawn: 2000 lots of five places; 2 u of a t with 4 degrees holds 88.4 %."""
    rng = np.random.default_rng(61)
    inside = 0
    for _ in range(2000):
        values = [Measured(v, 0.0, "1/cm") for v in rng.normal(30.0, 0.3, 5)]
        mean = pooled(values, common_u=0.0).mean
        inside += abs(mean.value - 30.0) <= 2 * mean.u
    expected = 1 - 2 * stats.t.sf(2.0, 4)
    assert abs(inside / 2000 - expected) < 4 * math.sqrt(expected * (1 - expected) / 2000)


def test_mass_of_a_lot_may_be_weighed_once() -> None:
    declared = sheet(
        '[tolerance]\nends = "2 %"\npicks = "2 %"\nmass = "5 %"',
        instead=("[mass]", '[mass]\ndeclared = "112 g/m2"'),
    )
    once = replace(FIVE[0], gsm=Measured(112.5, 0.5, "g/m2"))
    lot = judge_lot(declared, predict(declared), [once, *FIVE[1:]], lot="L-8")
    (line,) = [each for each in lot.verdict.lines if each.quantity is Quantity.MASS]
    assert line.decision is Decision.CONFORMS
    assert line.n == 1


def test_no_place_is_a_wrong_call() -> None:
    with pytest.raises(ValueError, match="places"):
        pooled([], common_u=0.0)
