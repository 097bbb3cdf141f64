"""What an inspector reads: the decision in the first line, nothing wider than a terminal.

Truth is the record that is told: every figure shown is one of its numbers, converted.
"""

from __future__ import annotations

import unicodedata

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from lot_example import lot_record
from report_records import per_cm, record, unreadable

from imgcover.findings import Flag, found
from imgcover.quantity import Measured
from imgcover.report.headline import headline
from imgcover.report.layout import figure
from imgcover.report.plain import columns
from imgcover.report.text import lot_text, record_text
from imgcover.verdict.lot import measured_lot
from imgcover.verdict.observed import Observed

CONFORMING = {"ends": per_cm(26.8), "picks": per_cm(25.3), "cover": Measured(0.66, 0.005, "1")}


def test_a_conforming_swatch_says_so_first() -> None:
    assert headline(record(**CONFORMING), units="inch") == (
        "harrow-02.png conforms: ends, picks and cover as declared"
    )


def test_short_picks_are_named_with_both_figures_in_the_asked_unit() -> None:
    short = record(**CONFORMING | {"picks": per_cm(22.8)})
    inch, cm = (headline(short, units=units) for units in ("inch", "cm"))
    assert inch == "harrow-02.png does not conform: picks 57.91 /in, declared 64"
    assert cm == "harrow-02.png does not conform: picks 22.800 /cm, declared 25.2"


def test_a_value_at_its_limit_is_undecided() -> None:
    near = record(**CONFORMING | {"ends": per_cm(27.3)})
    assert "undecided: ends 69.34 /in too near its limits to prove" in headline(near, units="inch")


def test_without_a_declaration_the_figures_are_the_answer() -> None:
    told = headline(record(**CONFORMING, declared=False), units="cm")
    assert told == "harrow-02.png measured: 26.800 ends × 25.300 picks /cm, cover 66.00 %"


def test_the_means_are_the_answer_of_a_lot_without_a_declaration() -> None:
    places = [
        Observed(ends=per_cm(26.8), picks=per_cm(25.3), place=place) for place in ("1", "2", "3")
    ]
    told = headline(measured_lot(places, lot="7"), units="cm")
    assert told.startswith("lot 7 measured: 26.80")
    assert "ends × 25.30" in told and told.endswith("picks /cm")
    text = lot_text(measured_lot(places, lot="7"), units="cm")
    assert [line.split()[:2] for line in text.splitlines()[3:5]] == [
        ["ends", "26.800"],
        ["picks", "25.300"],
    ]
    assert headline(measured_lot([Observed()], lot="7"), units="cm") == (
        "lot 7 not measured: neither ends nor picks could be read"
    )


def test_what_alone_keeps_a_lot_open_is_said_once() -> None:
    held = record(**CONFORMING, findings=(found(Flag.WARP_UNCERTAIN),))
    assert headline(held, units="cm") == (
        "harrow-02.png undecided: ends 26.800 /cm, held open; picks 25.300 /cm, held open"
    )
    assert headline(held, units="cm", most=120) == (
        f"harrow-02.png undecided: {Flag.WARP_UNCERTAIN.message}"
    )


def test_a_lot_of_which_nothing_could_be_judged_says_why() -> None:
    """Truth is the contract: what cannot be measured says why, from the first line on."""
    lot = lot_record("good")
    why = "nothing says how many pixels make a millimetre"
    for line in lot["lines"]:
        line |= {"measured": None, "decision": "undecided"}
        line["reason"] = f"{line['quantity']} not judged: {why}"
    told = headline({**lot, "decision": "undecided"}, units="inch")
    assert told == f"lot 4711 undecided: {why}"
    lot["lines"][-1]["reason"] = "optical cover not judged: the light was not stated"
    told = headline({**lot, "decision": "undecided"}, units="inch")
    assert told == f"lot 4711 undecided: {why}; the light…"
    # a figure that stands does not hide why the others are missing
    lot["lines"][-1] |= {"measured": 0.66, "decision": "conforms"}
    assert headline({**lot, "decision": "undecided"}, units="inch").endswith(why)


@pytest.mark.parametrize("declared", [True, False])
def test_an_unreadable_picture_says_why(declared: bool) -> None:
    told = headline(unreadable(declared=declared), units="cm")
    assert "the JPEG ends before its last line" in told
    assert told.startswith("torn.jpg undecided" if declared else "torn.jpg not measured")


def test_the_table_holds_measured_limits_and_decision() -> None:
    text = record_text(record(**CONFORMING | {"picks": per_cm(22.8)}), units="inch")
    row = next(line for line in text.splitlines() if line.startswith("  picks  "))
    # 64 /in less 2 %, plus 5 %
    for shown in ("57.91", "/in", "64 declared", "62.72 to 67.2", "does not conform"):
        assert shown in row


def test_findings_come_with_what_to_do() -> None:
    text = record_text(record(findings=(found(Flag.NO_SCALE),)), units="cm")
    assert "refusal no-scale: nothing says how many pixels" in text
    assert "give --pitch" in text.replace("\n      ", " ")


def test_a_held_line_says_what_holds_it() -> None:
    held = record(**CONFORMING, findings=(found(Flag.SCALES_DISAGREE),))
    text = record_text(held, units="inch")
    assert "undecided" in text.splitlines()[0]
    assert "held open" in text.splitlines()[0]
    assert "left undecided" in text


NAMES = st.text(st.characters(exclude_categories=()), min_size=1, max_size=90)
DENSITIES = st.none() | st.builds(
    per_cm, st.floats(0.5, 250.0), st.floats(1e-5, 5.0).filter(lambda u: u > 0)
)
COVERS = st.none() | st.builds(Measured, st.floats(0.0, 1.0), st.floats(1e-5, 0.3), st.just("1"))


@settings(max_examples=25, deadline=None)
@given(NAMES, DENSITIES, DENSITIES, COVERS, st.booleans(), st.sampled_from(["inch", "cm"]))
def test_no_line_is_wider_than_a_terminal_and_none_steers_it(
    name: str,
    ends: Measured | None,
    picks: Measured | None,
    cover: Measured | None,
    declared: bool,
    units: str,
) -> None:
    told = record(name=name, ends=ends, picks=picks, cover=cover, declared=declared, lot=name)
    text = record_text(told, units=units)  # type: ignore[arg-type]
    assert max(columns(line) for line in text.splitlines()) <= 80
    assert not [each for each in text if unicodedata.category(each) in ("Cf", "Cs")]
    assert not [each for each in text if unicodedata.category(each) == "Cc" and each != "\n"]


def test_a_number_is_rounded_by_its_uncertainty() -> None:
    assert figure({"value": 0.83714, "u": 0.0123, "unit": "1"}, "cm") == "83.7 ± 1.2 %"
    assert figure(None, "cm") == "–"


def test_causes_that_cannot_be_told_apart_and_the_mean_count_are_named() -> None:
    told = record(**CONFORMING | {"picks": per_cm(22.8)})
    told["verdict"]["diagnosis"][0]["tied_with"] = ["the scale is off", "equal shrinkage"]
    told["verdict"]["mean_count"] = {
        "tex": {"value": 18.5, "u": 0.4, "unit": "tex"},
        "ne": {"value": 31.92, "u": 0.7, "unit": "Ne"},
        "declared_tex": 18.454,
        "only_indicates": True,
    }
    text = " ".join(record_text(told, units="inch").split())
    assert "not to be told from: the scale is off; equal shrinkage" in text
    assert "18.50 ± 0.40 tex = 31.92 ± 0.70 Ne by mass and threads, declared 18.45 tex" in text
