"""A swatch that was approved, and one that was weighed, from the command to the decision.

Truth is drawn: loom, seeds 11, 12 and 15, whose cover was counted; and theory: the mass of a cloth
is the length of its yarn times its count.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from imgcover.cli.exits import ExitCode
from imgcover.cloth.declaration import read_declaration
from imgcover.loom.article import Departure
from imgcover.loom.camera import CameraSpec
from imgcover.loom.redraw import draw_into

Call = Callable[..., tuple[int, str, str]]
LIT = ("--pitch", "1000dpi", "--light", "backlit")


@pytest.fixture(scope="module")
def thin(goods: Path) -> str:
    """A swatch of yarn a third finer than declared: every sett right, far less covered."""
    drawn, _ = draw_into(
        goods,
        read_declaration(goods / "tarn.toml"),
        CameraSpec(px_per_mm=1000 / 25.4),
        seed=15,
        width=460,
        height=460,
        departure=Departure(warp_tex=0.65, weft_tex=0.65),
    )
    return drawn.rename(goods / "thin.png").name


def line(out: str, quantity: str) -> dict[str, Any]:
    (record,) = json.loads(out)
    (found,) = [each for each in record["verdict"]["lines"] if each["quantity"] == quantity]
    return dict(found)


def test_cover_is_judged_against_what_was_approved(
    ended: Call, goods: Path, thin: str, tmp_path: Path
) -> None:
    table, article = tmp_path / "reference.toml", tmp_path / "approved.toml"
    code, out, _ = ended("measure", "good-1.png", *LIT, "--as-reference", str(table), "-f", "json")
    assert code == ExitCode.CONFORMS
    approved = json.loads(out)[0]["cover"]
    article.write_text((goods / "tarn.toml").read_text("utf-8") + table.read_text("utf-8"), "utf-8")
    reference = read_declaration(article).reference
    for name in ("optical", "warp", "weft"):
        held = getattr(reference, f"{name}_cover")
        assert held.value == pytest.approx(approved[name]["value"], abs=1e-6)
        assert held.u == pytest.approx(approved[name]["u"], abs=1e-6)
    assert reference.source.startswith("imgcover record ")
    code, out, _ = ended("measure", "good-2.png", *LIT, "-a", str(article), "-f", "json")
    alike = line(out, "cover")
    assert (alike["basis"], alike["decision"]) == ("reference", "conforms")
    # u of both swatches, and nothing of the model's
    own = json.loads(out)[0]["cover"]["optical"]["u"]
    assert alike["u"] == pytest.approx(math.hypot(own, approved["optical"]["u"]), rel=1e-3)
    code, out, _ = ended("measure", thin, *LIT, "-a", str(article), "-f", "json")
    assert line(out, "cover")["decision"] == "does not conform"
    assert {line(out, each)["decision"] for each in ("ends", "picks")} == {"conforms"}
    assert code == ExitCode.DOES_NOT_CONFORM


def test_a_weighing_gives_the_count_that_was_used(ended: Call) -> None:
    _, out, _ = ended(
        "measure", "good-1.png", *LIT, "-a", "tarn.toml", "--gsm", "112", "-f", "json"
    )
    (record,) = json.loads(out)
    mean = record["verdict"]["mean_count"]
    ends, picks = (record["threads"][each]["value"] for each in ("ends", "picks"))
    # m of yarn in a square metre, crimp 6 and 7 %; 112 g of it
    expected = 112_000 / (100 * (1.06 * ends + 1.07 * picks))
    # crimp moves the mean to second order only; the sheet names no change in finishing
    assert mean["tex"]["value"] == pytest.approx(expected, rel=1e-3)
    assert mean["ne"]["value"] == pytest.approx(590.541 / expected, rel=1e-3)
    # 1 % of balance, 1 % of moisture, and the 5 % of an undeclared finish
    assert mean["tex"]["u"] / mean["tex"]["value"] > 0.05
    assert mean["only_indicates"]
    _, out, _ = ended("measure", "good-1.png", *LIT, "-a", "tarn.toml", "--gsm", "112")
    assert "mean count used" in out
    assert "it only indicates" in " ".join(out.split())
    assert max(map(len, out.splitlines())) <= 80


def test_a_weighed_lot_tells_it_too(ended: Call, goods: Path, tmp_path: Path) -> None:
    article = tmp_path / "weighed.toml"
    article.write_text(
        (goods / "tarn.toml").read_text("utf-8")
        + 'mass = "5 %"\n[mass]\ndeclared = "112 g/m2"\nfinish_change = "-3 %"\n',
        "utf-8",
    )
    _, out, _ = ended("measure", "good-1.png", "good-2.png", "--pitch", "1000dpi", "--lot", "4711",
                      "-a", str(article), "--gsm", "112")  # fmt: skip
    _, _, lot = out.partition("lot 4711")
    assert "mass" in lot
    assert "mean count used" in lot
    assert "only indicates" not in lot
