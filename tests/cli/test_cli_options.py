"""Every option of `measure` is heard, and one that says something impossible is refused by name.

Truth is the contract: an option can be refused, it can never be passed over in silence.
"""

from __future__ import annotations

import json
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import cv2
import numpy as np
import pytest
from PIL import Image

from imgcover.cli.exits import ExitCode
from imgcover.cloth.declaration import read_declaration
from imgcover.ledger.store import Ledger
from imgcover.ledger.verify import verify

Call = Callable[..., tuple[int, str, str]]
GOOD = ("measure", "good-1.png", "--pitch", "1000dpi")


def told(out: str) -> dict[str, Any]:
    record: dict[str, Any] = json.loads(out.splitlines()[0])
    return record


@pytest.mark.parametrize(
    ("arguments", "named"),
    [
        (("--pitch", "600"), "--pitch"),
        (("--pitch", "-3dpi"), "--pitch"),
        (("--pitch-y", "600dpi"), "--pitch-y"),
        (("--pitch-u", "0.2%"), "--pitch-u"),
        (("--pitch", "600dpi", "--pitch-u", "300%"), "--pitch-u"),
        (("--tone", "gamma:99"), "--tone"),
        (("--gsm", "a lot"), "--gsm"),
        (("--gsm", "nan"), "--gsm"),
        (("--gsm", "118,5"), "comma"),
        (("--gsm", "0.118"), "above 1"),
        (("--gsm-u", "1"), "--gsm-u"),
        (("--region", "1,2,3"), "--region"),
        (("--region", "0,0,0,5"), "--region"),
        (("--region", "-1,0,5,5"), "--region"),
        (("--risk", "0.7"), "--risk"),
        (("--risk", "nan"), "--risk"),
        (("--light", "moon"), "--light"),
        (("--warp", "diagonal"), "--warp"),
        (("--rule", "cubit"), "--rule"),
        (("--rule-class", "4"), "--rule-class"),
        (("--backing", "striped"), "--backing"),
        (("--units", "ell"), "--units"),
        (("--format", "xml"), "--format"),
        (("--blank", "nowhere.png"), "nowhere.png"),
        (("--dark", "torn.png"), "torn.png"),
        (("--article", "nowhere.toml"), "nowhere.toml"),
    ],
)
def test_what_cannot_be_meant_is_refused_by_name_before_anything_is_told(
    ended: Call, arguments: tuple[str, ...], named: str
) -> None:
    code, out, err = ended("measure", "good-1.png", *arguments)
    assert code == ExitCode.USAGE
    assert out == ""
    assert named in err
    assert err.count("\n") == 1


def test_an_invalid_declaration_names_its_key(ended: Call, goods: Path, tmp_path: Path) -> None:
    text = (goods / "tarn.toml").read_text("utf-8").replace("threads", "thread", 1)
    (tmp_path / "bad.toml").write_text(text, "utf-8")
    code, out, err = ended(*GOOD, "-a", str(tmp_path / "bad.toml"))
    assert (code, out) == (ExitCode.USAGE, "")
    assert "warp.thread" in err
    assert 'nearest valid key: "threads"' in err


def test_options_that_touch_a_digit_are_kept_in_the_record(ended: Call) -> None:
    asked = ("--pitch-u", "0.1%", "--tone", "gamma:2.2", "--region", "0,0,440,450", "--risk",
             "0.05", "--gsm", "118", "--gsm-u", "2", "--warp", "horizontal")  # fmt: skip
    _, out, _ = ended(*GOOD, *asked, "-f", "jsonl")
    options = told(out)["provenance"]["options"]
    assert options["pitch"] == "1000dpi"
    assert options["pitch_u"] == 0.001
    assert options["tone"] == "gamma:2.2"
    assert options["region"] == [0, 0, 440, 450]
    assert options["risk"] == 0.05
    assert options["gsm"] == [118.0, 2.0]
    assert options["warp"] == "horizontal"


def test_warp_horizontal_exchanges_ends_and_picks(ended: Call) -> None:
    _, upright, _ = ended(*GOOD, "-f", "jsonl")
    _, level, _ = ended(*GOOD, "--warp", "horizontal", "-f", "jsonl")
    one, other = told(upright)["threads"], told(level)["threads"]
    assert one["ends"] == other["picks"]
    assert one["picks"] == other["ends"]


def test_a_stated_uncertainty_replaces_the_half_percent_of_a_dpi(ended: Call) -> None:
    _, out, _ = ended(*GOOD, "--pitch-u", "0.2%", "-f", "jsonl")
    x = told(out)["scale"]["x"]
    assert x["u"] / x["value"] == pytest.approx(0.002)


def test_a_region_outside_the_picture_is_a_refusal_of_that_picture(ended: Call) -> None:
    code, out, _ = ended(*GOOD, "--region", "400,400,100,100", "-f", "jsonl")
    assert code == ExitCode.UNDECIDED
    assert told(out)["threads"] is None
    assert "region-outside" in {each["code"] for each in told(out)["findings"]}


def test_mass_from_the_balance_is_judged(ended: Call, goods: Path, tmp_path: Path) -> None:
    text = (goods / "tarn.toml").read_text(
        "utf-8"
    ) + 'mass = "5 %"\n[mass]\ndeclared = "118 g/m2"\n'
    (tmp_path / "weighed.toml").write_text(text, "utf-8")
    _, out, _ = ended(*GOOD, "-a", str(tmp_path / "weighed.toml"), "--gsm", "90", "-f", "jsonl")
    lines = {line["quantity"]: line for line in told(out)["verdict"]["lines"]}
    assert lines["mass"]["measured"] == 90
    assert lines["mass"]["decision"] == "does not conform"


def test_a_stated_risk_narrows_the_guard_band(ended: Call) -> None:
    def guard(*more: str) -> float:
        _, out, _ = ended(*GOOD, "-a", "tarn.toml", *more, "-f", "jsonl")
        (line,) = [each for each in told(out)["verdict"]["lines"] if each["quantity"] == "ends"]
        return float(line["guard"] / line["u"])

    # JCGM 106: 2 u by default, the normal 95 % quantile at 5 %
    assert guard() == pytest.approx(2.0, rel=0.01)
    assert guard("--risk", "0.05") == pytest.approx(1.645, rel=0.01)


def test_units_change_the_text_and_nothing_else(ended: Call) -> None:
    _, inch, _ = ended(*GOOD, "-a", "tarn.toml")
    _, metric, _ = ended(*GOOD, "-a", "tarn.toml", "--units", "cm")
    assert "60 declared" in inch
    assert "23.62 declared" in metric


def test_an_approved_swatch_becomes_the_reference_of_its_declaration(
    ended: Call, goods: Path, tmp_path: Path
) -> None:
    target = tmp_path / "reference.toml"
    ended(*GOOD, "--light", "backlit", "--as-reference", str(target))
    table = tomllib.loads(target.read_text("utf-8"))["reference"]
    whole = (goods / "tarn.toml").read_text("utf-8") + target.read_text("utf-8")
    approved = read_declaration(whole.encode(), name="approved.toml").reference.optical_cover
    assert approved is not None
    assert table["optical_cover"].startswith(f"{approved.value:.6f} u")
    # the same swatch held against itself differs from its reference by nothing
    (tmp_path / "approved.toml").write_text(whole, "utf-8")
    _, out, _ = ended(*GOOD, "--light", "backlit", "-a", str(tmp_path / "approved.toml"),
                      "-f", "jsonl")  # fmt: skip
    (line,) = [each for each in told(out)["verdict"]["lines"] if each["quantity"] == "cover"]
    assert line["basis"] == "reference"
    assert line["measured"] == pytest.approx(line["declared"], abs=1e-5)


def test_there_is_no_reference_without_a_cover(ended: Call, tmp_path: Path) -> None:
    code, _, err = ended(*GOOD, "--as-reference", str(tmp_path / "reference.toml"))
    assert code == ExitCode.UNDECIDED
    assert "the light was not stated" in err
    assert not (tmp_path / "reference.toml").exists()


def test_records_are_remembered_once_and_sealed(ended: Call, tmp_path: Path) -> None:
    ledger = tmp_path / "goods.ledger"
    for _ in range(2):
        ended("measure", "good-1.png", "torn.png", "--pitch", "1000dpi", "--ledger", str(ledger))
    with Ledger.read(ledger) as kept:
        rows = list(kept.rows())
        subjects = [row.entry.subject.rpartition(" ") for row in rows]
        assert [name for name, _, _ in subjects] == ["picture:/good-1.png", "picture:/torn.png"]
        assert verify(rows, head=None).holds


def test_another_swatch_under_the_same_name_supersedes_nothing(
    ended: Call, goods: Path, tmp_path: Path
) -> None:
    """Truth is the contract: a correction supersedes, another swatch's proof still holds."""
    ledger = tmp_path / "goods.ledger"
    with Image.open(goods / "good-1.png") as first:
        turned = first.rotate(180)
    (tmp_path / "december").mkdir()
    other = tmp_path / "december" / "good-1.png"
    turned.save(other)
    for picture, pitch in (("good-1.png", "900dpi"), (str(other), "1000dpi")):
        ended("measure", picture, "--pitch", pitch, "--ledger", str(ledger))
    ended("measure", "good-1.png", "--pitch", "1000dpi", "--ledger", str(ledger))
    with Ledger.read(ledger) as kept:
        assert [row.supersedes for row in kept.rows()] == [None, None, 1]


def test_an_overlay_is_drawn_beside_every_readable_picture(ended: Call, tmp_path: Path) -> None:
    folder = tmp_path / "overlays"
    ended("measure", "good-1.png", "torn.png", "--pitch", "1000dpi", "--light", "backlit",
          "--overlay", str(folder))  # fmt: skip
    assert [each.name for each in folder.iterdir()] == ["good-1.overlay.png"]
    drawn = cv2.imread(str(folder / "good-1.overlay.png"))
    assert drawn is not None
    assert drawn.shape[1] == 1600
    # each thread of both strips is marked in its set's colour (BGR here)
    for colour in ((110, 40, 214), (160, 150, 0)):
        marked = np.all(np.abs(drawn.astype(int) - colour) < 12, axis=2)
        assert marked.sum() > 500


@pytest.mark.parametrize(
    ("pitch", "decided"),
    [
        (("--pitch", "1000dpi"), False),
        (("--pitch", "1000dpi", "--pitch-u", "0.5%"), True),
        (("--pitch", "39.37px/mm"), True),
    ],
)
def test_two_settings_that_contradict_each_other_decide_nothing(
    ended: Call, goods: Path, tmp_path: Path, pitch: tuple[str, ...], decided: bool
) -> None:
    """Truth is the contract: right or refused. The file says 1200 dpi, the inspector 1000; a pitch
    whose uncertainty is known was measured, and stands."""
    claiming = tmp_path / "claiming.png"
    with Image.open(goods / "good-1.png") as first:
        first.save(claiming, dpi=(1200, 1200))
    _, out, _ = ended("measure", str(claiming), *pitch, "-a", "tarn.toml", "-f", "json")
    verdict = json.loads(out)[0]["verdict"]
    lines = {each["quantity"]: each["decision"] for each in verdict["lines"]}
    assert ("undecided" not in (lines["ends"], lines["picks"])) is decided
    assert decided or not verdict["diagnosis"]
