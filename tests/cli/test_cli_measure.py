"""`imgcover measure`: decisions, exit codes and formats, from pictures to the shell.

Truth is drawn: the good swatches are woven as declared, `short.png` with a fifth fewer picks.
"""

from __future__ import annotations

import csv
import io
import json
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from imgcover.cli.exits import ExitCode

Ended = tuple[int, str, str]
Call = Callable[..., Ended]
GOOD = ("measure", "good-1.png", "--pitch", "1000dpi")
DECLARED = ("-a", "tarn.toml")


def record(out: str) -> dict[str, Any]:
    (only,) = (json.loads(line) for line in out.splitlines())
    assert isinstance(only, dict)
    return only


def test_a_good_swatch_conforms(ended: Call) -> None:
    code, out, err = ended(*GOOD, *DECLARED, "--light", "backlit")
    assert (code, err) == (ExitCode.CONFORMS, "")
    assert out.splitlines()[0] == "good-1.png conforms: ends, picks and cover as declared"


def test_short_picks_do_not_conform_and_are_named(ended: Call) -> None:
    code, out, _ = ended("measure", "short.png", "--pitch", "1000dpi", *DECLARED)
    assert code == ExitCode.DOES_NOT_CONFORM
    assert out.startswith("short.png does not conform: picks 4")
    assert "declared 52" in out.splitlines()[0]
    assert "picks short" in out


def test_with_nothing_declared_the_figures_are_told_and_nothing_is_decided(ended: Call) -> None:
    code, out, _ = ended(*GOOD, "-f", "jsonl")
    told = record(out)
    assert code == ExitCode.CONFORMS
    assert told["verdict"] is None
    assert told["predicted"] is None
    assert told["cover"] is None
    assert "light-not-stated" in {each["code"] for each in told["findings"]}


def test_measured_densities_and_cover_agree_with_what_was_drawn(ended: Call, goods: Path) -> None:
    _, out, _ = ended(*GOOD, "--light", "backlit", "-f", "jsonl")
    told = record(out)
    kept = tomllib.loads((goods / "TARN-60-backlit-11.truth.toml").read_text("utf-8"))
    truth = kept["picture"][0]
    # pitch is exact here, so only the count's own u is left beside the 0.5 % stated for the dpi
    for key in ("ends", "picks"):
        measured = told["threads"][key]
        assert abs(measured["value"] - truth[f"{key}_per_cm"]) < 3 * measured["u"]
        assert measured["u"] < 0.02 * measured["value"]
    # 1.5 points is what this stage is held to
    assert abs(told["cover"]["optical"]["value"] - truth["cover"]) < 0.015


def test_without_a_scale_there_are_no_densities_and_the_ways_to_give_one_are_listed(
    ended: Call,
) -> None:
    code, out, _ = ended("measure", "good-1.png", "-f", "jsonl")
    told = record(out)
    assert code == ExitCode.UNDECIDED
    assert told["scale"] is None
    assert told["threads"]["ends"] is None
    assert told["threads"]["pixels_per_end"] == pytest.approx(1000 / 60, rel=0.02)
    (finding,) = [each for each in told["findings"] if each["code"] == "no-scale"]
    for way in ("--pitch", "--rule", "--device", "--metadata"):
        assert way in finding["remedy"]


def test_the_files_own_claim_is_used_only_when_asked(ended: Call) -> None:
    code, out, _ = ended("measure", "good-1.png", "--metadata", "-f", "jsonl")
    assert code == ExitCode.CONFORMS
    assert record(out)["scale"]["source"] == "metadata"


def test_an_unreadable_picture_has_a_record_of_its_own(ended: Call) -> None:
    code, out, _ = ended("measure", "torn.png", "missing.png", *DECLARED, "-f", "jsonl")
    torn, missing = (json.loads(line) for line in out.splitlines())
    assert code == ExitCode.UNDECIDED
    for told in (torn, missing):
        assert told["threads"] is told["cover"] is told["scale"] is None
        assert told["findings"][0]["code"] == "picture-unreadable"
        assert told["verdict"]["decision"] == "undecided"
        assert told["predicted"]["cover"]["value"] > 0
    assert len(torn["picture"]["sha256"]) == 64
    assert missing["picture"]["sha256"] is None


def test_the_gravest_of_several_pictures_decides(ended: Call) -> None:
    code, _, err = ended("measure", "good-1.png", "torn.png", "short.png", *DECLARED,
                         "--pitch", "1000dpi", "--light", "backlit")  # fmt: skip
    assert code == ExitCode.DOES_NOT_CONFORM
    assert err == (
        "3 pictures: 1 without objection, 1 not conforming, 1 undecided or not measured\n"
    )


def test_places_of_one_lot_are_followed_by_the_lots_record(ended: Call) -> None:
    names = [f"good-{n}.png" for n in (1, 2, 3)]
    code, out, _ = ended("measure", *names, "--lot", "4711", *DECLARED, "--pitch", "1000dpi",
                         "--light", "backlit", "-f", "jsonl")  # fmt: skip
    *places, lot = (json.loads(line) for line in out.splitlines())
    assert [each["sample"]["place"] for each in places] == ["1", "2", "3"]
    assert {each["sample"]["lot"] for each in places} == {"4711"}
    assert lot["schema"] == "imgcover/lot/1"
    assert (lot["lot"], lot["article"], lot["n_places"]) == ("4711", "TARN-60", 3)
    assert {line["quantity"]: line["n"] for line in lot["lines"]}["ends"] == 3
    assert code == {"conforms": 0, "undecided": 3}[lot["decision"]]


def test_one_place_never_decides_a_lot(ended: Call) -> None:
    code, out, _ = ended(*GOOD, *DECLARED, "--lot", "4711", "-f", "jsonl")
    place, lot = (json.loads(line) for line in out.splitlines())
    assert code == ExitCode.UNDECIDED
    assert lot["decision"] == "undecided"
    assert place["verdict"]["scope"] == "swatch"


def test_a_lot_with_nothing_declared_is_summed_and_not_decided(ended: Call) -> None:
    code, out, _ = ended("measure", "good-1.png", "good-2.png", "--lot", "4711", "--pitch",
                         "1000dpi", "-f", "jsonl")  # fmt: skip
    lot = json.loads(out.splitlines()[-1])
    assert code == ExitCode.CONFORMS
    assert lot["decision"] is None
    assert lot["means"]["ends"]["n"] == 2


@pytest.mark.parametrize("form", ["json", "jsonl", "csv", "text"])
def test_every_format_tells_the_same_picture(ended: Call, form: str) -> None:
    code, out, _ = ended(*GOOD, *DECLARED, "-f", form)
    if form == "csv":
        (row,) = csv.DictReader(io.StringIO(out, newline=""))
        assert row["picture"] == "good-1.png"
    elif form == "text":
        assert out.startswith("good-1.png")
    else:
        told = json.loads(out) if form == "json" else [record(out)]
        assert [each["picture"]["name"] for each in told] == ["good-1.png"]
    assert code in (ExitCode.CONFORMS, ExitCode.UNDECIDED)


def test_standard_input_is_a_picture(
    ended: Call, goods: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    _, from_file, _ = ended(*GOOD, "-f", "jsonl")
    content = (goods / "good-1.png").read_bytes()
    monkeypatch.setattr("sys.stdin", io.TextIOWrapper(io.BytesIO(content)))
    _, piped, _ = ended("measure", "-", "--pitch", "1000dpi", "-f", "jsonl")
    one, other = record(from_file), record(piped)
    assert other["picture"].pop("name") == "-"
    assert one["picture"].pop("name") == "good-1.png"
    assert one["envelope"].keys() == other["envelope"].keys()
    assert {**one, "envelope": None} == {**other, "envelope": None}


def test_a_result_can_go_to_a_file(ended: Call, tmp_path: Path) -> None:
    target = tmp_path / "records.csv"
    code, out, _ = ended(*GOOD, "-f", "csv", "-o", str(target))
    assert (code, out) == (ExitCode.CONFORMS, "")
    assert target.read_text("utf-8").startswith("record,picture,")
    code, out, err = ended(*GOOD, "-o", str(tmp_path / "nowhere" / "x"))
    assert code == ExitCode.OUTPUT
    assert "nowhere" in err


def test_a_picture_is_never_written_over(ended: Call, goods: Path) -> None:
    before = (goods / "good-1.png").read_bytes()
    code, _, err = ended(*GOOD, "-o", "good-1.png")
    assert code == ExitCode.USAGE
    assert "also read from" in err
    assert (goods / "good-1.png").read_bytes() == before
