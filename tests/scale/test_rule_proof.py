"""Which unit do long and short lines spell? Tables of line lengths, no picture."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.loom.rule import STEP_MM, STEPS, Division
from imgcover.scale.rule_frame import Frame
from imgcover.scale.rule_hierarchy import Graduation, levels
from imgcover.scale.rule_lines import Row
from imgcover.scale.rule_proof import prove

LENGTHS_MM = {
    Division.MM: (3.0, 4.5, 6.0),
    Division.HALF_MM: (2.5, 3.5, 5.0, 6.5),
    Division.TENTH: (3.0, 4.5, 6.5),
    Division.SIXTEENTH: (2.5, 3.5, 4.8, 6.2, 8.5),
    Division.THIRTYSECOND: (2.0, 3.0, 4.0, 5.0, 6.2, 8.5),
    Division.SIXTYFOURTH: (1.8, 2.5, 3.2, 4.0, 5.0, 6.2, 8.5),
}
PITCH = 8.0
FULL = {"mm": 45, "inch": 140}


def row(reach: NDArray[np.float64]) -> Row:
    """A row of lines with these heights, in pitches."""
    numbers = np.arange(len(reach))
    ends = reach * PITCH
    return Row(
        Frame(0, 0, 0, np.pi / 2),
        PITCH,
        numbers,
        numbers * PITCH,
        ends,
        ends,
        ends,
        tip=np.ones(len(reach)),
        faint_tip=np.ones(len(reach)),
        wide=np.zeros(len(reach)),
        strength=np.ones(len(reach)),
        light=False,
        zone=float(ends.min()),
    )


def heights(division: Division, count: int, start: int = 3, seed: int = 1) -> NDArray[np.float64]:
    """Line heights of a division in pitches, with a tenth of a pitch of scatter at most."""
    level = levels(np.arange(start, start + count), STEPS[division])
    generator = np.random.default_rng(seed)
    return np.array(LENGTHS_MM[division])[level] / STEP_MM[division] + generator.uniform(
        -0.08, 0.08, count
    )


@pytest.mark.parametrize("division", list(Division))
@pytest.mark.parametrize("start", [0, 7, 13])
def test_each_division_is_told(division: Division, start: int) -> None:
    """Truth is drawn: lengths by division. Tenths of an inch look like millimetres, so they stay
    open until the user says which."""
    count = FULL["mm" if "mm" in division else "inch"]
    proof = prove(row(heights(division, count, start)), "auto")
    assert proof is not None
    if division is Division.TENTH:
        assert set(proof.graduations) == {Graduation.MM, Graduation.TENTH_INCH}
        said = prove(row(heights(division, count, start)), "inch")
        assert said is not None and said.graduations == (Graduation.TENTH_INCH,)
    else:
        assert [each.value for each in proof.graduations] == [division.value]


def test_an_inch_scale_with_one_inch_line_stays_open() -> None:
    """Truth is theory: with its longest lines seen once, a sixteenth may be a thirty-second."""
    proof = prove(row(heights(Division.SIXTEENTH, 30, start=17)), "auto")
    assert proof is not None and not proof.proven
    assert {Graduation.SIXTEENTH_INCH, Graduation.THIRTYSECOND_INCH} <= set(proof.graduations)


def test_one_inch_line_between_its_halves_is_enough_of_sixty_fourths() -> None:
    """Truth is theory: six lengths on both sides of a seventh are all that a binary scale has; the
    halves exclude half the period, and no scale has twice as many."""
    whole = prove(row(heights(Division.SIXTYFOURTH, 90, start=20)), "auto")
    assert whole is not None and whole.graduations == (Graduation.SIXTYFOURTH_INCH,)
    one_half = prove(row(heights(Division.SIXTYFOURTH, 60, start=50)), "auto")
    assert one_half is None or not one_half.proven


def test_lines_that_fade_are_told_by_what_is_left_of_them() -> None:
    """Truth is drawn: thirty-seconds of an inch; every second inch line is half as strong from
    where the quarters end, and shows faintly to its end, all others are whole."""
    whole = row(heights(Division.THIRTYSECOND, 140))
    worn = (whole.numbers + 3) % 64 == 0
    reach = np.where(worn, 6.0 * PITCH, whole.reach)
    faded = replace(whole, reach=reach, beyond=reach, tip=np.where(worn, 0.5, 1.0))
    proof = prove(faded, "auto")
    assert proof is not None and proof.graduations == (Graduation.THIRTYSECOND_INCH,)
    unseen = prove(replace(faded, faint=reach), "auto")
    assert unseen is None or not unseen.proven


def test_a_line_too_many_at_the_end_is_left_out() -> None:
    """Truth is drawn: a row followed onto the frame's edge, where ink stands on both sides; a line
    with clear gaps beside it is one, and says that the period is another."""
    lengths = heights(Division.SIXTEENTH, 62)
    lengths[-1] = 20.0
    edge = np.zeros(62)
    edge[-1] = 1.0
    proof = prove(replace(row(lengths), wide=edge), "auto")
    assert proof is not None and proof.graduations == (Graduation.SIXTEENTH_INCH,)
    clear = prove(row(lengths), "auto")
    assert clear is None or not clear.proven


def test_ten_lines_prove_nothing() -> None:
    """Truth is theory: a dozen lines with two longer ones come by chance too often."""
    assert prove(row(heights(Division.MM, 13, start=4)), "auto") is None


def test_the_stated_unit_does_not_make_a_rule() -> None:
    """Truth is theory: an inch scale is not a millimetre scale because someone says so."""
    for division, count, unit in ((Division.SIXTEENTH, 140, "mm"), (Division.MM, 60, "inch")):
        proof = prove(row(heights(division, count)), unit)
        assert proof is None or not proof.graduations


def test_every_second_ten_longer_is_not_millimetres() -> None:
    """Truth is theory: lines long at 10 and longer at 20 may be half millimetres without their
    first level: a period of ten is disproved by its own longest lines."""
    level = levels(np.arange(90), (1, 10, 20))
    proof = prove(row(np.array([3.5, 5.5, 7.5])[level]), "auto")
    assert proof is None or not proof.proven


def test_decimal_inches_are_not_millimetres() -> None:
    """Truth is theory: fiftieths of an inch lengthen every fifth, tenth and fiftieth line; a
    millimetre scale has no longer lines five centimetres apart. One such line may be an accident,
    and where only every tenth is longer the two are alike."""
    level = levels(np.arange(170), (1, 5, 10, 50))
    lengths = np.array([3.0, 4.2, 5.8, 8.0])[level]
    proof = prove(row(lengths), "auto")
    assert proof is None or not proof.graduations
    alike = prove(row(np.array([3.0, 4.2, 5.8, 5.8])[level]), "auto")
    assert alike is not None and alike.proven


def test_a_misplaced_foot_does_not_turn_tenths_into_millimetres() -> None:
    """Truth is drawn: tenths of an inch of 3, 4.5 and 6.5 mm; cloth in step with the lines makes
    all of them look 2 mm taller, as seen on a drawn picture (seed 5021)."""
    taller = heights(Division.TENTH, 60) + 2.0 / 2.54
    proof = prove(row(taller), "auto")
    assert proof is not None and not proof.proven
    assert set(proof.graduations) == {Graduation.MM, Graduation.TENTH_INCH}


def test_twentieths_of_an_inch_are_not_half_millimetres() -> None:
    """Truth is theory: both lengthen every second, tenth and twentieth line. Lines of 3.4 to
    7.4 mm, an inch's, pass for half millimetres by their foot; that they rise by 4 mm tells."""
    level = levels(np.arange(110), (1, 2, 10, 20))
    taller = np.array([3.4, 4.6, 6.0, 7.4])[level] / 1.27 + 0.8
    proof = prove(row(taller), "auto")
    assert proof is None or not proof.graduations


def test_every_fifth_alone_is_left_open() -> None:
    """Truth is theory: two-millimetre scales lengthen every fifth line and no other."""
    proof = prove(row(np.where(np.arange(80) % 5 == 0, 5.5, 4.0)), "auto")
    assert proof is not None and set(proof.graduations) == {
        Graduation.MM,
        Graduation.TENTH_INCH,
    }


def test_lines_that_run_into_digits_do_not_double_a_scale() -> None:
    """Truth is theory: on a 1/16 inch scale the 1, 3 and 5 may have ink where their line ends and
    the 2 and 4 none; read as 1/32 inch it would be wrong by two."""
    level = levels(np.arange(90), (1, 2, 4, 8, 16))
    ends = np.array([1.5, 2.1, 2.9, 3.9, 5.5])[level]
    digit = np.arange(90) % 32 == 0
    held = row(np.where(digit, 7.5, ends))
    proof = prove(replace(held, wide=np.where(digit, 1.5, 0.0)), "auto")
    assert proof is None or Graduation.THIRTYSECOND_INCH not in proof.graduations


@pytest.mark.parametrize("seed", range(8))
def test_lines_of_random_length_are_no_rule(seed: int) -> None:
    """Truth is theory: a fringe has equal distances and any lengths."""
    generator = np.random.default_rng(seed)
    assert prove(row(generator.uniform(2, 9, 80)), "auto") is None
    mixed = np.where(generator.random(80) < 0.2, 6.0, 3.5)
    assert prove(row(mixed), "auto") is None


@pytest.mark.parametrize("period", [3, 4, 6, 7, 9, 12, 14])
def test_stripes_of_other_periods_are_no_rule(period: int) -> None:
    """Truth is theory: no rule lengthens every third or seventh line."""
    lengths = np.where(np.arange(84) % period == 0, 6.0, 3.5)
    assert prove(row(lengths), "auto") is None


def test_dust_and_wear_do_not_turn_the_unit() -> None:
    """Truth is drawn: one line in eight cut short, at random; it may stay open, never be wrong."""
    told = 0
    for seed in range(12):
        for division in (Division.MM, Division.HALF_MM, Division.SIXTEENTH, Division.THIRTYSECOND):
            lengths = heights(division, 140, seed=seed)
            generator = np.random.default_rng([10, seed])
            spoilt = generator.choice(140, 17, replace=False)
            lengths[spoilt] *= generator.uniform(0.3, 0.95, 17)
            proof = prove(row(lengths), "auto")
            if proof is not None and proof.proven:
                told += 1
                assert proof.graduations[0].value == division.value
    assert told >= 44  # nine in ten
