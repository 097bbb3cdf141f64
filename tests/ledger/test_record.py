"""The record keeps its contract: every key always there, SI, eight digits, the same bytes.

Truth is the published layout of schema imgcover/record/1.
"""

from __future__ import annotations

import hashlib
import json
import math
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from imgcover.cloth.declaration import read_declaration
from imgcover.cloth.prediction import predict
from imgcover.cover.reading import CoverReading, Pores
from imgcover.findings import Flag, found
from imgcover.ledger.canonical import canonical, digest, number
from imgcover.ledger.provenance import Provenance, file_sha256
from imgcover.ledger.record import Answers, Sample, record_of
from imgcover.quantity import Measured
from imgcover.scale.scale import ComparedScale, Scale
from imgcover.threads.density import Density
from imgcover.threads.reading import ThreadReading, ThreadSet, Tile

NOW = "2031-05-04T08:00:00Z"
KEYS = {
    "": "schema picture sample light warp scale threads cover predicted verdict findings "
    "provenance envelope",
    "picture": "name sha256 pixels_sha256 width height bits dpi orientation clipped_low "
    "clipped_high",
    "sample": "lot article piece place operator conditioned note",
    "scale": "x y source compared",
    "threads": "ends picks angle skew bow pixels_per_end pixels_per_pick counted_ends "
    "counted_picks length_ends_mm length_picks_mm tiles_used tiles_left_out ends_range "
    "picks_range repeat",
    "cover": "optical threshold two_level upper_bound_open warp weft yarn_transmittance pores",
    "predicted": "model warp_factor weft_factor cloth_factor warp weft cover mass read_as",
    "provenance": "imgcover libraries article_sha256 device blank dark options",
    "envelope": "made_at",
}
"""As documented, section by section."""
SHEET = b"""
[article]
code = "GILL-20"
[warp]
threads = "20 /cm"
count = "30 tex"
[weft]
threads = "18 /cm"
count = "30 tex"
"""


def empty() -> Answers:
    return Answers(
        name="gill.png",
        provenance=Provenance(options={"light": None}),
        sample=Sample(),
        light=None,
        warp="vertical",
    )


def thread_set(per_px: tuple[float, float]) -> ThreadSet:
    return ThreadSet(
        frequency=per_px,
        counted=100.25,
        length_px=1002.5,
        u_relative=0.001,
        components={"phase": 0.001},
        local_scatter=0.004,
        local_low=0.98,
        local_high=1.03,
        parts=6,
        bow=None,
    )


def full() -> Answers:
    tiles = (Tile(0, 0, 9, 9, True, ""), Tile(9, 0, 9, 9, False, "blurred"))
    ends = Measured(20.04, 0.03, "1/cm")
    pitch = Measured(20.04, 0.1, "px/mm")
    return replace(
        empty(),
        scale=Scale(pitch, pitch, 0.007, "rule", (ComparedScale("metadata", pitch, pitch, True),)),
        threads=ThreadReading(
            thread_set((0.1, 0.0)), None, None, tiles, (2, 2), (), (found(Flag.TOO_COARSE),)
        ),
        density=Density(ends, None, Measured(0.5, 0.1, "deg"), None, None, 50.02, None, (), (), ()),
        cover=CoverReading(
            optical=Measured(2 / 3, 0.004, "1"),
            pores=Pores(9, None, None, None, 4.0, 4.5, (1, 2, 3, 4, 5), 6.0, "px2", None, 0.1),
        ),
        prediction=predict(read_declaration(SHEET, name="gill.toml")),
        findings=(found(Flag.NO_SCALE),),
    )


@pytest.mark.parametrize("section", KEYS)
def test_every_documented_key_is_there_and_no_other(section: str) -> None:
    told = record_of(full(), made_at=NOW)
    assert list(told[section] if section else told) == KEYS[section].split()


def test_what_no_room_could_say_is_null() -> None:
    told = record_of(empty(), made_at=NOW)
    assert list(told) == KEYS[""].split()
    for section in ("scale", "threads", "cover", "predicted", "verdict"):
        assert told[section] is None
    assert list(told["picture"]) == KEYS["picture"].split()
    assert told["findings"] == []


def test_a_number_carries_its_uncertainty_and_unit() -> None:
    told = record_of(full(), made_at=NOW)
    assert told["threads"]["ends"] == {"value": 20.04, "u": 0.03, "unit": "1/cm"}
    # extremes of the field: 0.98 and 1.03 of the density
    assert told["threads"]["ends_range"] == pytest.approx([19.6392, 20.6412])
    assert told["threads"]["picks"] is told["threads"]["picks_range"] is None
    assert (told["threads"]["tiles_used"], told["threads"]["tiles_left_out"]) == (1, 1)
    assert told["cover"]["optical"]["value"] == 0.66666667
    assert told["cover"]["pores"]["area_unit"] == "px2"
    # 20 threads per cm of 30 tex: K = n/√Ne with n per inch, Ne = 590.541/30
    k = 20 * 2.54 / math.sqrt(590.5412474482356 / 30)
    assert told["predicted"]["warp_factor"]["value"] == pytest.approx(k, rel=1e-7)


def test_pixels_are_told_where_no_scale_was_found() -> None:
    told = record_of(replace(full(), scale=None, density=None), made_at=NOW)
    assert told["threads"]["ends"] is None
    assert told["threads"]["pixels_per_end"] == 10.0
    assert told["threads"]["counted_ends"] == 100.25


def test_the_hash_covers_everything_but_the_envelope() -> None:
    one, later = (record_of(full(), made_at=at) for at in (NOW, "2032-01-01T00:00:00Z"))
    assert one != later
    assert digest(one) == digest(later)
    bare = {key: value for key, value in one.items() if key != "envelope"}
    assert digest(one) == hashlib.sha256(canonical(bare).encode()).hexdigest()
    for section in bare:
        assert digest({**one, section: "changed"}) != digest(one)


def test_the_canonical_line_is_json_of_the_record() -> None:
    told = record_of(full(), made_at=NOW)
    assert json.loads(canonical(told)) == told
    assert "\n" not in canonical(told)
    with pytest.raises(ValueError, match="JSON compliant"):
        canonical({"value": math.nan})


@given(st.floats(1e-12, 1e12), st.floats(-1e-12, 1e-12))
def test_rounding_hides_the_last_bits_and_nothing_that_is_measured(
    value: float, bit: float
) -> None:
    # half a unit of the eighth digit: a thousandth of the smallest relative u met, 5e-5
    assert abs(number(value) - value) <= 5e-8 * value
    assert number(number(value)) == number(value)
    assert abs(number(value * (1 + bit)) - number(value)) <= 1.1e-7 * value


def test_a_hash_of_what_is_no_ordinary_file_is_null() -> None:
    assert file_sha256(Path("no-such-picture.png")) is None
    assert file_sha256(Path("/dev/zero")) is None
    assert file_sha256(b"") == hashlib.sha256(b"").hexdigest()
