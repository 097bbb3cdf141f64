"""The spine: what is declared never steers what is measured, and records are the same every time.

Truth is symmetry: a measurement does not know its declaration, its folder or the hour.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import cv2
import numpy as np
import pytest

from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.inspection import inspect
from imgcover.ledger.canonical import canonical, digest
from imgcover.ledger.record import Sample
from imgcover.loom.camera import CameraSpec
from imgcover.loom.redraw import draw_into
from imgcover.request import Request, read_options

SHEET = """\
[article]
code = "BECK"
weave = "plain"
[warp]
threads = "{ends}"
count = "{count}"
[weft]
threads = "{picks}"
count = "{count}"
[tolerance]
ends = "3 %"
picks = "3 %"
cover = "4 points"
"""
MEASURED = ("picture", "light", "warp", "scale", "threads", "cover")
"""The sections of a record that come from the picture alone."""
OPTIONS = read_options({"pitch": "1000dpi", "light": "backlit"})


def sheet(ends: str = "60 /in", picks: str = "52 /in", count: str = "24 Ne") -> Declaration:
    text = SHEET.format(ends=ends, picks=picks, count=count)
    return read_declaration(text.encode(), name="beck.toml")


@pytest.fixture(scope="module")
def swatch(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Drawn: loom, seed 21."""
    folder = tmp_path_factory.mktemp("beck")
    camera = CameraSpec(px_per_mm=1000 / 25.4)
    path, _ = draw_into(folder, sheet(), camera, seed=21, width=420, height=420)
    return path


def record(
    source: Path | bytes, declaration: Declaration | None = None, *, name: str = "beck.png"
) -> dict[str, Any]:
    request = Request(source=source, name=name, options=OPTIONS, declaration=declaration)
    return inspect(request).record


@pytest.fixture(scope="module")
def bare(swatch: Path) -> dict[str, Any]:
    return record(swatch)


@pytest.mark.parametrize(
    "declaration",
    [
        sheet(),
        sheet(ends="30 /in", picks="26 /in"),
        sheet(ends="120 /in", picks="104 /in", count="80 Ne"),
        sheet(ends="52 /in", picks="60 /in", count="4 Ne"),
    ],
    ids=["as woven", "half", "double", "exchanged"],
)
def test_the_declaration_changes_no_measured_digit(
    swatch: Path, bare: dict[str, Any], declaration: Declaration
) -> None:
    declared = record(swatch, declaration)
    for section in MEASURED:
        assert canonical({section: declared[section]}) == canonical({section: bare[section]})
    # and the decision does follow the declaration, so the test could have failed
    expected = "conforms" if declaration.warp.threads.text == "60 /in" else "does not conform"
    lines = {line["quantity"]: line["decision"] for line in declared["verdict"]["lines"]}
    assert lines["ends"] == expected


def test_the_same_picture_gives_the_same_bytes_but_for_the_envelope(
    swatch: Path, bare: dict[str, Any]
) -> None:
    from_bytes = record(swatch.read_bytes())
    assert digest(from_bytes) == digest(bare)
    assert set(bare["envelope"]) == {"made_at"}
    for each in (bare, from_bytes):
        each = {key: value for key, value in each.items() if key != "envelope"}
        assert "made_at" not in canonical(each)


def test_a_record_names_no_folder_of_this_machine(swatch: Path, bare: dict[str, Any]) -> None:
    assert str(swatch.parent) not in json.dumps(bare)


def keys(value: Any, *, depth: int) -> Any:
    if isinstance(value, dict) and depth:
        return {key: keys(each, depth=depth - 1) for key, each in value.items()}
    return None


def test_every_key_is_always_present(bare: dict[str, Any], swatch: Path) -> None:
    torn = record(swatch.read_bytes()[:2000])
    assert keys(torn, depth=1) == keys(bare, depth=1)
    assert keys(torn["picture"], depth=1) == keys(bare["picture"], depth=1)
    for section in ("scale", "threads", "cover"):
        assert torn[section] is None


def encoded(pixels: np.ndarray[Any, Any]) -> bytes:
    done, coded = cv2.imencode(".png", pixels)
    assert done
    return coded.tobytes()


NOISE = np.random.default_rng(5).integers(0, 256, (300, 300)).astype(np.uint8)
RAMP = np.tile(np.arange(300, dtype=np.uint8)[None, :] // 2, (300, 1))


@pytest.mark.parametrize(
    "pixels",
    [
        np.zeros((300, 300), np.uint8),
        np.full((300, 300), 255, np.uint8),
        np.full((300, 300), 128, np.uint8),
        NOISE,
        RAMP,
        np.zeros((1, 1), np.uint8),
        np.zeros((2, 900), np.uint8),
    ],
    ids=["black", "white", "grey", "noise", "ramp", "one pixel", "a sliver"],
)
def test_what_is_no_cloth_is_refused_with_a_reason(pixels: np.ndarray[Any, Any]) -> None:
    told = record(encoded(pixels))
    assert told["threads"] is None
    assert told["cover"] is None
    refused = [each for each in told["findings"] if each["severity"] == "refusal"]
    assert refused
    assert all(each["remedy"] for each in refused)


@pytest.mark.parametrize(
    "content", [b"", b"not a picture", b"\x89PNG\r\n\x1a\n", b"PK\x03\x04" * 99]
)
def test_what_is_no_picture_has_a_record_that_says_so(content: bytes) -> None:
    told = record(content, sheet())
    assert told["findings"][0]["code"] == "picture-unreadable"
    assert told["verdict"]["decision"] == "undecided"
    assert len(told["picture"]["sha256"]) == 64


@pytest.mark.parametrize(
    ("said", "conditioned"),
    [
        *((None, False), ("", False), ("no", False), ("No", False), ("not yet", False)),
        *(("yes?", False), ("2 days late", False), ("ISO 139: no", False)),
        *(("yes", True), ("Yes, 24 h", True), ("2031-04-02", True), ("ISO 139", True)),
    ],
)
def test_only_a_yes_takes_moisture_out_of_the_mass(said: str | None, conditioned: bool) -> None:
    sample = Sample(conditioned=said)
    assert inspect(Request(source=b"", name="x", sample=sample)).observed.conditioned is conditioned


def test_a_name_that_is_no_unicode_can_be_recorded() -> None:
    told = record(b"", name="swatch\udcff.png")
    assert told["picture"]["name"] == "swatch\\udcff.png"
    canonical(told).encode("utf-8")
