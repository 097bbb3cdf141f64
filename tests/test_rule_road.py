"""A rule in the picture, from its lines to the densities: measured by rule as measured by pitch.

Truth is drawn: loom, seed 31, on which a millimetre rule is laid.
"""

from __future__ import annotations

from typing import Any

import cv2
import numpy as np
import pytest

from imgcover.cloth.declaration import read_declaration
from imgcover.inspection import inspect
from imgcover.loom.article import draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.loom.rule import Division, DrawnRule, DrawnScale, draw_rule, lay_rule
from imgcover.loom.truth import Truth
from imgcover.request import Request, read_options
from imgcover.tone import SRGB

PX_PER_MM = 600 / 25.4
SHEET = b"""
[article]
code = "FELL"
weave = "plain"
[warp]
threads = "60 /in"
count = "24 Ne"
[weft]
threads = "52 /in"
count = "24 Ne"
"""
RULE_TOP = 420
"""px: cloth above, the rule below."""


@pytest.fixture(scope="module")
def drawn() -> tuple[bytes, Truth]:
    """A PNG of cloth with a rule along its lower edge, turned by a degree."""
    camera = CameraSpec(px_per_mm=PX_PER_MM, light="reflected")
    cloth = draw_article(
        read_declaration(SHEET, name="fell.toml"), camera, seed=31, width=1300, height=1000
    )
    rule = DrawnRule(DrawnScale(Division.MM, (3.5, 5.0, 6.5)), None, width=20.0, body=0.95)
    flat = draw_rule(rule, px_per_mm=3 * PX_PER_MM, generator=np.random.default_rng(2))
    turn = np.radians(1.0)
    place = np.array(
        [
            [PX_PER_MM * np.cos(turn), -PX_PER_MM * np.sin(turn), -300.0],
            [PX_PER_MM * np.sin(turn), PX_PER_MM * np.cos(turn), RULE_TOP],
            [0.0, 0.0, 1.0],
        ]
    )
    light = lay_rule(SRGB.lut(8)[cloth.stored], flat, px_per_mm=3 * PX_PER_MM, mm_to_picture=place)
    stored = np.round(255 * SRGB.from_linear(np.clip(light, 0, 1))).astype(np.uint8)
    done, coded = cv2.imencode(".png", stored)
    assert done
    return coded.tobytes(), cloth.truth


def record(content: bytes, **words: str) -> dict[str, Any]:
    options = read_options({key.replace("_", "-"): word for key, word in words.items()})
    return inspect(Request(source=content, name="fell.png", options=options)).record


def test_the_rule_gives_the_scale_and_the_densities(drawn: tuple[bytes, Truth]) -> None:
    content, truth = drawn
    told = record(content, rule="auto")
    assert told["scale"]["source"] == "rule"
    # the demand: the scale within 0.3 %
    assert told["scale"]["x"]["value"] == pytest.approx(PX_PER_MM, rel=0.003)
    for key, per_mm in (("ends", truth.ends), ("picks", truth.picks)):
        measured = told["threads"][key]
        assert abs(measured["value"] - 10 * per_mm) < 3 * measured["u"]


def test_by_rule_and_by_pitch_agree_within_their_uncertainty(drawn: tuple[bytes, Truth]) -> None:
    content, _ = drawn
    region = f"0,0,1300,{RULE_TOP - 40}"
    by_rule = record(content, rule="mm", region=region)["threads"]["ends"]
    by_pitch = record(content, pitch="600dpi", region=region)["threads"]["ends"]
    apart = abs(by_rule["value"] - by_pitch["value"])
    assert apart < 2 * np.hypot(by_rule["u"], by_pitch["u"])


def test_the_rules_own_area_is_never_counted_as_cloth(drawn: tuple[bytes, Truth]) -> None:
    content, _ = drawn
    options = read_options({"rule": "auto"})
    threads = inspect(Request(source=content, name="fell.png", options=options)).answers.threads
    assert threads is not None
    assert threads.tiles
    # the rule's upper edge falls by a degree: it starts 5 px higher at the left
    assert max(tile.y + tile.height for tile in threads.tiles if tile.used) <= RULE_TOP + 8


def test_a_stated_pitch_that_the_rule_belies_leaves_the_decision_open(
    drawn: tuple[bytes, Truth],
) -> None:
    content, _ = drawn
    told = record(content, rule="auto", pitch="640dpi")
    assert told["scale"]["source"] == "rule"
    (compared,) = [each for each in told["scale"]["compared"] if each["source"] == "stated pitch"]
    assert compared["agrees"] is False
    assert "scales-disagree" in {each["code"] for each in told["findings"]}


def test_no_rule_is_found_where_there_is_none(drawn: tuple[bytes, Truth]) -> None:
    camera = CameraSpec(px_per_mm=PX_PER_MM, light="reflected")
    bare = draw_article(
        read_declaration(SHEET, name="fell.toml"), camera, seed=32, width=700, height=700
    )
    done, coded = cv2.imencode(".png", bare.stored)
    assert done
    told = record(coded.tobytes(), rule="auto")
    assert told["scale"] is None
    assert {"no-rule-found", "no-scale"} <= {each["code"] for each in told["findings"]}
