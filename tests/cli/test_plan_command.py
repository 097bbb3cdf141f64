"""`imgcover plan`: told before anyone scans.

Truth is theory: pixels a thread are the resolution over the declared sett; and the measurement of
the same drawn swatches, seeds 11 to 13, which the plan never saw.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import pytest

from imgcover.cli.exits import ExitCode

Call = Callable[..., tuple[int, str, str]]
PLANNED = ("plan", "tarn.toml", "--pitch", "1000dpi", "--detail", "22um", "-f", "json")
"""The swatches were drawn sharper than a flatbed's: blur of 0.6 px at 1000 dpi, 15 µm."""


def test_a_plan_is_told_as_a_sheet(ended: Call) -> None:
    code, out, _ = ended("plan", "tarn.toml")
    assert code == ExitCode.CONFORMS
    assert out.startswith("TARN-60: ends and picks can be told, cover to ± ")
    assert max(map(len, out.splitlines())) <= 80
    for said in ("60 /in", "10, comfortable", "600dpi is usual", "shortest, ISO 7211-2", "Assumed"):
        assert said in out


def test_the_planned_u_is_what_the_bench_then_finds(ended: Call) -> None:
    _, out, _ = ended(*PLANNED)
    (told,) = json.loads(out)
    assert told["schema"] == "imgcover/plan/1"
    assert told["ends"]["pixels"] == pytest.approx(1000 / 60)
    _, out, _ = ended("measure", "good-1.png", "--pitch", "1000dpi", "--light", "backlit",
                      "-a", "tarn.toml", "-f", "json")  # fmt: skip
    (record,) = json.loads(out)
    lines = {line["quantity"]: line for line in record["verdict"]["lines"]}
    # the swatch shows 12 mm, the plan counts over 50: its u is the smaller, by less than half
    share = told["ends"]["u"] / (lines["ends"]["u"] / lines["ends"]["measured"])
    assert 0.5 < share < 1.1
    # some thirty pores a side against forty: of cover the plan is as good to a factor of two
    assert 0.4 < told["cover"]["u_reading"] / record["cover"]["optical"]["u"] < 2


def test_what_is_too_fine_is_planned_with_what_would_do(ended: Call) -> None:
    code, out, _ = ended("plan", "tarn.toml", "--pitch", "150dpi")
    assert code == ExitCode.CONFORMS
    assert out.startswith("TARN-60: neither ends nor picks can be told")
    assert "2.5 pixels a thread: threads so fine are refused; use 600dpi" in out


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--pitch", "600"), "--pitch"),
        (("--pitch-u", "0.2%"), "--pitch-u"),
        (("--detail", "small"), "--detail"),
        (("--scatter", "1"), "--scatter"),
        (("--risk", "0.7"), "--risk"),
        (("--device", "no-such-device"), "--device"),
    ],
)
def test_an_impossible_option_is_refused(ended: Call, options: tuple[str, ...], said: str) -> None:
    code, out, err = ended("plan", "tarn.toml", *options)
    assert (code, out) == (ExitCode.USAGE, "")
    assert said in err


def test_a_plan_goes_into_a_file_and_two_plans_are_the_same(ended: Call, tmp_path: Path) -> None:
    target = tmp_path / "plan.json"
    _, out, _ = ended(*PLANNED)
    ended(*PLANNED, "-o", str(target))
    assert target.read_text("utf-8") == out
