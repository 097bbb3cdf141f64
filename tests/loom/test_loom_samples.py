"""The sample folder is whole, small, and what its orders draw.

Truth is drawn: loom, the seeds of samples-synthetic/drawn.toml. `.ci/run` compares all of them;
here one is.
"""

from __future__ import annotations

import csv
import tomllib
from pathlib import Path

import pytest

from imgcover.cloth.declaration import read_declaration
from imgcover.loom import redraw
from imgcover.loom.keeping import decode
from imgcover.loom.order import Order, read_orders

SAMPLES = Path(__file__).resolve().parents[2] / "samples-synthetic"
ORDERS = read_orders(SAMPLES / "drawn.toml")


def test_orders_truth_sheet_and_pictures_name_the_same_files() -> None:
    ordered = [order.file for order in ORDERS]
    with (SAMPLES / "lots.csv").open(newline="") as file:
        assert [row["picture"] for row in csv.DictReader(file)] == ordered
    truth = tomllib.loads((SAMPLES / "truth.toml").read_text())
    assert [each["file"] for each in truth["picture"]] == ordered
    kept = sorted(each.name for each in (SAMPLES / "pictures").iterdir())
    assert kept == sorted(Path(each).name for each in ordered)
    assert 10 <= len(ordered) <= 15


def test_every_article_reads_and_every_picture_is_small() -> None:
    articles = sorted((SAMPLES / "articles").glob("*.toml"))
    assert 5 <= len(articles) <= 6
    for path in articles:
        assert read_declaration(path).article.code == path.stem
    for order in ORDERS:
        assert (SAMPLES / order.file).stat().st_size < 400_000
        assert (decode((SAMPLES / order.file).read_bytes()) is None) == (order.keep < 1)


def test_the_lots_are_what_the_scenario_says() -> None:
    truth = {
        each["file"]: each
        for each in tomllib.loads((SAMPLES / "truth.toml").read_text())["picture"]
    }
    for order in ORDERS:
        told, declared = truth[order.file], read_declaration(SAMPLES / order.article)
        ends, picks = declared.warp.threads.per_cm, declared.weft.threads.per_cm
        short = 0.93 if "short" in order.note else 1.0
        # a good lot lies well inside the tightest tolerance of the folder, 2.5 %
        assert told["ends_per_cm"] == pytest.approx(ends, rel=0.01)
        assert told["picks_per_cm"] == pytest.approx(picks * short, rel=0.01)
        assert (abs(told["angle_deg"]) > 45) == ("quarter turn" in order.note)
        assert (told["pixels_per_end"] < 3) == ("200 dpi" in order.note)
    finer = [truth[each.file]["cover"] for each in ORDERS if "46s" in each.note]
    reference = read_declaration(SAMPLES / "articles" / "ML-020.toml").reference.optical_cover
    assert reference is not None
    # beyond the tolerance of 4 points
    assert max(finer) < reference.value - 0.05


def test_samples_are_drawn_again_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    def only(_: Path) -> tuple[Order, ...]:
        return tuple(order for order in ORDERS if order.file == "pictures/R5103-2.png")

    monkeypatch.setattr(redraw, "read_orders", only)
    (told,) = redraw.compare(SAMPLES / "drawn.toml")
    assert told.differs == ""
