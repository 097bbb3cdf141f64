"""How counts are read and said back.

Truth is the notation: ISO 1139 for tex, the trade's a/b for hank counts; the tex values follow from
0.45359237 kg and 0.9144 m, worked out here anew.
"""

from __future__ import annotations

import pytest

from imgcover.cloth.count import read_count
from imgcover.cloth.count_system import CountSystem
from imgcover.cloth.stated import StatementError

NE = 453592.37 / (840 * 0.9144)
"""Tex of a 1s cotton yarn."""

READ = [
    # text, tex, plies, filaments of a single
    ("32 Ne", NE / 32, 1, None),
    ("32Ne", NE / 32, 1, None),
    ("32s Ne", NE / 32, 1, None),
    ("Ne 32", NE / 32, 1, None),
    ("32.5 NeC", NE / 32.5, 1, None),
    ("2/40 Ne", NE / 20, 2, None),
    ("40/2 Ne", NE / 20, 2, None),
    ("40s/2 Ne", NE / 20, 2, None),
    ("Ne 40/2", NE / 20, 2, None),
    ("40 Ne/2", NE / 20, 2, None),
    ("40/1 Ne", NE / 40, 1, None),
    ("12/13 Ne", NE * 12 / 13, 12, None),
    ("40 Ne x 3", NE * 3 / 40, 3, None),
    ("60/2 Nm", 1000 / 30, 2, None),
    ("Nm 60/2", 1000 / 30, 2, None),
    ("2/48 worsted", 453592.37 / (560 * 0.9144) / 24, 2, None),
    ("48 NeK", 453592.37 / (560 * 0.9144) / 48, 1, None),
    ("55 linen lea", 453592.37 / (300 * 0.9144) / 55, 1, None),
    ("14 run", 453592.37 / (1600 * 0.9144) / 14, 1, None),
    ("60/2 spun silk", NE / 60, 2, None),
    ("2/60 spun silk", NE / 60, 2, None),
    ("60 spun silk", NE / 60, 1, None),
    ("30 tex", 30, 1, None),
    ("30 tex x 2", 60, 2, None),
    ("30 tex × 2", 60, 2, None),
    ("R 60 tex/2", 60, 2, None),
    ("R60 tex/2", 60, 2, None),
    ("R 60 tex", 60, 1, None),
    ("20 tex f 36", 20, 1, 36),
    ("167 dtex f 48", 16.7, 1, 48),
    ("167 dtex/48", 16.7, 1, 48),
    ("167 dtex f 48 x 2", 33.4, 2, 48),
    ("167 dtex/48 x2", 33.4, 2, 48),
    ("150/48 den", 150 / 9, 1, 48),
    ("150 denier", 150 / 9, 1, None),
    ("1.2 ktex", 1200, 1, None),
    ("8 lb/spyndle", 8 * 453592.37 / (14400 * 0.9144), 1, None),
    ("8 jute x 2", 16 * 453592.37 / (14400 * 0.9144), 2, None),
    ("40 Ne + 20 Ne", NE / 40 + NE / 20, 2, None),
    ("40Ne+20Ne", NE / 40 + NE / 20, 2, None),
    ("20 tex + 10 Nm", 120, 2, None),
]


@pytest.mark.parametrize(("text", "tex", "plies", "filaments"), READ)
def test_a_count_is_read_in_one_way(
    text: str, tex: float, plies: int, filaments: int | None
) -> None:
    count = read_count(text)
    assert count.tex == pytest.approx(tex, rel=1e-12)
    assert (count.plies, count.filaments) == (plies, filaments)


SAID = [
    ("2/40 Ne", "read as 2 × 40s, resultant 20s = 29.5 tex"),
    ("32 Ne", "read as single 32s = 18.5 tex"),
    ("30 tex x 2", "read as 2 × 30 tex, resultant 60 tex = 9.842s"),
    ("R 60 tex/2", "read as 2 × 30 tex, resultant 60 tex = 9.842s"),
    ("167 dtex f 48", "read as single 167 dtex of 48 filaments = 16.7 tex"),
    ("22 dtex f 1", "read as single 22 dtex of 1 filament = 2.2 tex"),
    ("60/2 spun silk", "read as 2 × 120s spun silk, resultant 60s spun silk = 9.84 tex"),
    ("2/48 worsted", "read as 2 × 48s worsted, resultant 24s worsted = 36.9 tex"),
    ("40 Ne + 20 Ne", "read as 40s + 20s, resultant 13.33s = 44.3 tex"),
]


@pytest.mark.parametrize(("text", "words"), SAID)
def test_a_count_is_said_back_in_words(text: str, words: str) -> None:
    assert read_count(text).said == words


REFUSED = [
    ("32", "no unit"),
    ("32s", "no unit"),
    ("2/40", "no unit"),
    ("32 Nee", "unit"),
    ("32 c.c.", "unit"),
    ("cotton", "unit"),
    ("", "unit"),
    ("Ne 32 Ne", "unit"),
    ("2/12 Ne", "write plies"),
    ("12/1 Ne", "write plies"),
    ("10/2 spun silk", "write plies"),
    ("40/20 Ne", "write plies"),
    ("2.5/40 Ne", "write plies"),
    ("0 Ne", "above zero"),
    ("-32 Ne", "above zero"),
    ("2/-40 Ne", "above zero"),
    ("29,5 tex", "decimal point"),
    ("60 tex/2", "resultant"),
    ("60/2 tex", "resultant"),
    ("R 60 tex/2 x 2", "folded once more"),
    ("R 334 dtex/2", "resultant"),
    ("R 20 Ne/2", "notations"),
    ("40 Ne f 12", "notations"),
    ("2/40 Ne x 2", "folds twice"),
    ("60 spun silk x 2", "resultant"),
    ("167/48 dtex f 48", "one way"),
    ("167/48 dtex/2", "two strokes"),
    ("8/2 jute", "one way"),
    ("30 tex x 2.5", "whole number"),
    ("30 tex x 0", "above zero"),
    ("40 Ne x 2 + 20 Ne", "both sides of +"),
    ("40 Ne + 20", "no unit"),
    ("900000 Ne", "no cloth is woven of"),
    ("30 ktex", "no cloth is woven of"),
    ("\x1b[31m32 Ne", "short text"),
    (32, "unit is missing"),
    (True, "true or false"),
    (["32 Ne"], "a list"),
]


@pytest.mark.parametrize(("text", "words"), REFUSED)
def test_a_count_that_can_be_read_in_two_ways_is_refused(text: object, words: str) -> None:
    with pytest.raises(StatementError) as refusal:
        read_count(text)
    assert words in str(refusal.value)


def test_an_unknown_unit_lists_every_unit_and_guesses_none() -> None:
    with pytest.raises(StatementError) as refusal:
        read_count("32 Nec.")
    for system in CountSystem:
        assert system.label in refusal.value.remedy
    assert "none is guessed" in refusal.value.fault


def test_plies_written_apart_fold_a_single_and_agree_with_a_folded_count() -> None:
    assert read_count("12 Ne").folded(2).said == "read as 2 × 12s, resultant 6s = 98.4 tex"
    assert read_count("2/40 Ne").folded(2) == read_count("2/40 Ne")
    # where the notation gives the resultant, plies only divide it
    assert read_count("60 spun silk").folded(2).tex == pytest.approx(NE / 60)
    assert read_count("R 60 tex").folded(2).tex == 60
    with pytest.raises(StatementError, match="says 2 plies, but plies = 3"):
        read_count("2/40 Ne").folded(3)
    with pytest.raises(StatementError, match="says 2 plies"):
        read_count("40 Ne + 20 Ne").folded(2)


def test_a_hypothesis_scales_every_single() -> None:
    coarser = read_count("2/40 Ne").times(1.1)
    assert coarser.ne == pytest.approx(20 / 1.1)
    assert coarser.singles_tex[0] * coarser.plies == pytest.approx(coarser.tex)
