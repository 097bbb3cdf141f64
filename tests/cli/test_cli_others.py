"""`imgcover predict`, `imgcover draw` and help.

Truth is theory (Peirce's cover of a declared construction), and a drawing told twice the same.
"""

from __future__ import annotations

import csv
import io
import json
import math
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from imgcover.cli.exits import ExitCode

Call = Callable[..., tuple[int, str, str]]
OTHER = """\
[article]
code = "=FORCE-80"
weave = "2/2 twill"
[warp]
threads = "80 /in"
count = "24 Ne"
[weft]
threads = "60 /in"
count = "24 Ne"
"""
ORDERS = """\
[[picture]]
file = "pictures/one.png"
article = "other.toml"
seed = 3
width = 64
height = 48
[picture.camera]
dpi = 600
"""


@pytest.fixture
def other(tmp_path: Path) -> Path:
    path = tmp_path / "other.toml"
    path.write_text(OTHER, "utf-8")
    return path


def test_predict_tells_peirces_cover(ended: Call) -> None:
    code, out, _ = ended("predict", "tarn.toml", "-f", "json")
    (told,) = json.loads(out)
    # Peirce 1937: d = 1/(28 √Ne) in, cover 1 − (1 − k1)(1 − k2)
    k1, k2 = (n / (28 * math.sqrt(24)) for n in (60, 52))
    assert code == ExitCode.CONFORMS
    assert told["predicted"]["cover"]["value"] == pytest.approx(1 - (1 - k1) * (1 - k2), rel=1e-7)
    assert told["article"]["code"] == "TARN-60"


def test_one_declaration_is_told_as_a_sheet(ended: Call) -> None:
    _, out, _ = ended("predict", "tarn.toml")
    assert out.startswith("TARN-60 as declared: cover 65.1 ± 2.0 %")
    assert max(map(len, out.splitlines())) <= 80
    for said in ("factor K", "tightness", "24s", "Read as", "Where the uncertainty comes from"):
        assert said in out


def test_several_stand_side_by_side_and_the_closer_is_named(ended: Call, other: Path) -> None:
    _, out, _ = ended("predict", "tarn.toml", str(other))
    assert out.splitlines()[0] == "=FORCE-80 is the closer cloth than TARN-60"
    assert "warp: =FORCE-80 has the closer warp than TARN-60" in out
    assert max(map(len, out.splitlines())) <= 80


def test_a_table_of_predictions_computes_nothing(ended: Call, other: Path) -> None:
    _, out, _ = ended("predict", "tarn.toml", str(other), "-f", "csv")
    rows = list(csv.DictReader(io.StringIO(out, newline="")))
    assert [row["article"] for row in rows] == ["TARN-60", "'=FORCE-80"]
    assert float(rows[1]["ends_per_cm"]) == pytest.approx(80 / 2.54)


def test_an_impossible_declaration_is_refused(ended: Call, tmp_path: Path) -> None:
    (tmp_path / "no.toml").write_text(OTHER.replace('"80 /in"', '"80"'), "utf-8")
    code, out, err = ended("predict", str(tmp_path / "no.toml"))
    assert (code, out) == (ExitCode.USAGE, "")
    assert "warp.threads" in err
    assert "unit is missing" in err


def test_draw_writes_a_picture_and_its_truth(ended: Call, other: Path, tmp_path: Path) -> None:
    folder = tmp_path / "drawn"
    code, out, _ = ended("draw", str(other), "--size", "64,48", "--dpi", "600", "--turn", "1",
                         "--departs", "picks=0.9", "-o", str(folder))  # fmt: skip
    assert code == ExitCode.CONFORMS
    names = sorted(each.name for each in folder.iterdir())
    assert names == ["FORCE-80-backlit-1.png", "FORCE-80-backlit-1.truth.toml"]
    assert all(str(folder / name) in out for name in names)


def test_recorded_drawings_are_the_same_anew_and_a_change_is_told(
    ended: Call, other: Path, tmp_path: Path
) -> None:
    recorded = tmp_path / "drawn.toml"
    recorded.write_text(ORDERS, "utf-8")
    assert ended("draw", "--recorded", str(recorded), "-o", str(tmp_path))[0] == 0
    code, out, _ = ended("draw", "--recorded", str(recorded), "--compare")
    assert (code, out) == (ExitCode.CONFORMS, "pictures/one.png: the same\n")
    recorded.write_text(ORDERS.replace("seed = 3", "seed = 4"), "utf-8")
    code, out, _ = ended("draw", "--compare", "--recorded", str(recorded))
    assert code == ExitCode.DOES_NOT_CONFORM
    assert "values differ" in out


@pytest.mark.parametrize(
    "arguments",
    [
        (),
        ("tarn.toml", "--recorded", "drawn.toml"),
        ("tarn.toml", "--compare"),
        ("tarn.toml", "--size", "9,9"),
        ("tarn.toml", "--size", "1200"),
        ("tarn.toml", "--dpi", "1"),
        ("tarn.toml", "--dpi", "nan"),
        ("tarn.toml", "--turn", "1000"),
        ("tarn.toml", "--departs", "weight=2"),
        ("tarn.toml", "--departs", "ends=9"),
        ("tarn.toml", "--seed", "-1"),
    ],
)
def test_what_cannot_be_drawn_is_refused(ended: Call, arguments: tuple[str, ...]) -> None:
    code, out, err = ended("draw", *arguments)
    assert (code, out) == (ExitCode.USAGE, "")
    assert err.startswith("imgcover: ")


def seconds(*command: str) -> float:
    """Processor time of a command, user and system: the load of the machine does not count."""
    before = os.times()
    subprocess.run([sys.executable, *command], check=True, capture_output=True)
    after = os.times()
    return sum(after[2:4]) - sum(before[2:4])


def test_help_answers_at_once() -> None:
    """Held to three imports of typer, which leaves no room for numerics."""
    typer = min(seconds("-c", "import typer") for _ in range(3))
    assert min(seconds("-m", "imgcover", "--help") for _ in range(3)) <= 3 * typer


@pytest.mark.parametrize("command", [[], ["measure"], ["predict"], ["draw"]])
def test_help_imports_no_numerics(command: list[str]) -> None:
    lines = (
        "import sys\nfrom imgcover.cli import run\n"
        f"try:\n    run({[*command, '--help']!r})\n"
        "except SystemExit:\n    pass\n"
        "heavy = {'numpy', 'scipy', 'cv2', 'PIL', 'skimage', 'matplotlib'} & set(sys.modules)\n"
        "sys.exit(f'imported {heavy}' if heavy else 0)"
    )
    ended = subprocess.run([sys.executable, "-c", lines], capture_output=True, text=True)
    assert ended.returncode == 0, ended.stderr
