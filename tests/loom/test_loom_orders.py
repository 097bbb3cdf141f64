"""Recorded pictures are drawn again as they were, and any change is told.

Truth is symmetry: the same order gives the same file; one changed value does not.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from imgcover.cloth.declaration import read_declaration
from imgcover.errors import DeclarationError, OutputError
from imgcover.loom.article import Departure, article_cloth, draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.loom.keeping import decode, encode
from imgcover.loom.order import read_orders
from imgcover.loom.redraw import compare, draw_into, redraw

ARTICLE = """
[article]
code = "T-1 / blue"
weave = "2/1 twill"
[warp]
threads = "30 /cm"
count = "36 Ne"
[weft]
threads = "24 /cm"
count = "36 Ne"
"""
ORDERS = """
[[picture]]
file = "pictures/one.png"
article = "t1.toml"
seed = 3
width = 120
height = 100
[picture.cloth]
diameter_cv = 0.1
faults = [{ kind = "slub", x = 0.5, y = 0.5, size_mm = 1.0, strength = 2.0 }]
[picture.camera]
dpi = 600
light = "reflected"

[[picture]]
file = "broken.jpg"
article = "t1.toml"
seed = 4
width = 90
height = 90
keep = 0.5
note = "cut short"
[picture.departs]
picks = 0.9
[picture.camera]
dpi = 600
tone = "gamma:2.2"
jpeg = 80
colour = true
"""
CAMERA = CameraSpec(px_per_mm=600 / 25.4)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "t1.toml").write_text(ARTICLE)
    (tmp_path / "drawn.toml").write_text(ORDERS)
    return tmp_path


def test_an_article_is_drawn_as_declared_but_for_its_departure(folder: Path) -> None:
    declared = read_declaration(folder / "t1.toml")
    cloth = article_cloth(declared)
    assert cloth.weave == "2/1 twill"
    assert (cloth.ends_per_mm, cloth.picks_per_mm) == pytest.approx((3.0, 2.4))
    # Peirce 1937: 1/(28 √36) in
    assert cloth.end_diameter_mm == pytest.approx(25.4 / (28 * 6), rel=1e-6)
    loose = article_cloth(declared, Departure(picks=0.9, weft_tex=0.81))
    assert loose.picks_per_mm == pytest.approx(2.16)
    assert loose.pick_diameter_mm == pytest.approx(0.9 * cloth.pick_diameter_mm)
    assert loose.ends_per_mm == cloth.ends_per_mm
    drawn = draw_article(declared, CAMERA, seed=1, width=200, height=200)
    assert drawn.truth.ends == pytest.approx(3.0, rel=0.02)
    with pytest.raises(ValueError, match="picks must lie between"):
        Departure(picks=10)


def test_recorded_pictures_are_drawn_again_the_same(folder: Path) -> None:
    written = list(redraw(folder / "drawn.toml", folder))
    assert [each.name for each in written] == ["one.png", "broken.jpg"]
    assert decode(written[0].read_bytes()) is not None
    assert decode(written[1].read_bytes()) is None, "cut short on purpose"
    assert all(each.same for each in compare(folder / "drawn.toml"))


def test_a_changed_picture_or_truth_is_told(folder: Path) -> None:
    one, broken = redraw(folder / "drawn.toml", folder)
    stored = decode(one.read_bytes())
    assert stored is not None
    changed = stored.copy()
    changed[5, 7] ^= 1
    drawn = replace(read_orders(folder / "drawn.toml")[0].draw(folder), stored=changed)
    one.write_bytes(encode(drawn, CAMERA, "one.png"))
    broken.write_bytes(broken.read_bytes() + b"x")
    told = [each.differs for each in compare(folder / "drawn.toml")]
    assert told[0] == "1 of 12000 values differ, by up to 1"
    assert "bytes instead of" in told[1]
    one.unlink()
    assert "cannot be read" in next(iter(compare(folder / "drawn.toml"))).differs
    list(redraw(folder / "drawn.toml", folder))
    truth = folder / "truth.toml"
    truth.write_text(truth.read_text().replace("cover = 0.", "cover = 0.9", 1))
    assert "truth: cover" in next(iter(compare(folder / "drawn.toml"))).differs


def test_the_picture_states_its_resolution(folder: Path) -> None:
    from PIL import Image

    declared = read_declaration(folder / "t1.toml")
    path, truth = draw_into(folder / "out", declared, CAMERA, seed=7, width=100, height=80)
    assert path.name == "T-1-blue-backlit-7.png"
    assert "ends_per_cm" in truth.read_text()
    with Image.open(path) as picture:
        assert picture.size == (100, 80)
        assert picture.info["dpi"] == pytest.approx((600, 600), abs=0.1)


@pytest.mark.parametrize(
    ("bits", "colour", "name", "kept"),
    [
        (8, False, "a.png", True),
        (8, True, "a.tif", True),
        (16, False, "a.png", True),
        (16, True, "a.png", False),
        (16, False, "a.jpg", False),
        (8, False, "a.gif", False),
    ],
)
def test_files_hold_what_was_drawn_or_are_refused(
    bits: int, colour: bool, name: str, kept: bool, folder: Path
) -> None:
    camera = replace(CAMERA, bits=bits, colour=colour)
    declared = read_declaration(folder / "t1.toml")
    drawn = draw_article(declared, camera, seed=1, width=60, height=50)
    if not kept:
        with pytest.raises(ValueError, match="kept as"):
            encode(drawn, camera, name)
        return
    back = decode(encode(drawn, camera, name))
    assert back is not None
    assert back.dtype == drawn.stored.dtype
    assert np.array_equal(back, drawn.stored)


@pytest.mark.parametrize(
    ("old", "new", "told"),
    [
        ("seed = 3", "sead = 3", "unknown key 'sead'.*seed"),
        ("seed = 3", "", "seed is missing"),
        ("seed = 3", "seed = -1", "whole number"),
        ("diameter_cv = 0.1", "diameter = 0.1", "unknown key 'diameter'.*diameter_cv"),
        ("diameter_cv = 0.1", "ends_per_mm = 3.0", "unknown key"),
        ("dpi = 600", "", "dpi is missing"),
        ("width = 120", "width = 1200000", "width and height"),
        ('file = "pictures/one.png"', 'file = "../one.png"', "leads out"),
        ('kind = "slub"', 'kinds = "slub"', "unknown key"),
        ('"gamma:2.2"', '"gama"', "tone must be"),
        ("[picture.camera]", "[picture.camera", "not TOML"),
    ],
)
def test_wrong_orders_are_refused_by_name(folder: Path, old: str, new: str, told: str) -> None:
    path = folder / "drawn.toml"
    path.write_text(ORDERS.replace(old, new, 1))
    with pytest.raises(DeclarationError, match=told):
        read_orders(path)


def test_missing_files_are_told(folder: Path) -> None:
    with pytest.raises(DeclarationError, match="cannot be read"):
        read_orders(folder / "none.toml")
    (folder / "empty.toml").write_text("")
    with pytest.raises(DeclarationError, match="lists no picture"):
        read_orders(folder / "empty.toml")
    (folder / "blocked").write_text("a file where a folder should be")
    with pytest.raises(OutputError, match="cannot be written"):
        next(iter(redraw(folder / "drawn.toml", folder / "blocked")))
