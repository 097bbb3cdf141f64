"""What is drawn over a picture lies where the picture has it, so that a doubter can count along.

Truth is theory: gratings and phases whose threads lie at places known beforehand.
"""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.cover.reading import CoverReading, Histogram, LightField, Seen
from imgcover.errors import OutputError
from imgcover.picture.picture import Picture
from imgcover.quantity import Measured
from imgcover.report.canvas import ENDS, LEFT_OUT, PICKS
from imgcover.report.closeup import close_up
from imgcover.report.overlay import overlay, write_overlay
from imgcover.report.strips import (
    Marked,
    counting_strip,
    marked_sets,
    path_across,
    strip_pixels,
    thread_places,
)
from imgcover.scale.scale import Scale
from imgcover.threads.reading import ThreadReading, ThreadSet, Tile, Track
from imgcover.tone import SRGB

ROWS, COLUMNS = 240, 300
PITCH = 12.0
"""px from thread to thread, both ways."""
FIRST_END, FIRST_PICK = 5.0, 3.0
"""Where the lightest line of the first thread of each set lies, px."""
TILES = tuple(
    Tile(x, y, 60, 60, not (x == 120 and y == 120), "blurred" if x == y == 120 else "")
    for y in range(0, ROWS, 60)
    for x in range(0, COLUMNS, 60)
)


def thread_set(frequency: tuple[float, float]) -> ThreadSet:
    return ThreadSet(frequency, 24.0, 288.0, 1e-3, {}, 0.01, 0.98, 1.02, 5, None)


def reading(*, turn: float = 0.0, bend: float = 0.0) -> ThreadReading:
    """Threads at `PITCH`, turned by `turn` rad; ends bent aside by `bend` cycles at the middle."""
    x, y = np.arange(0.0, COLUMNS, 6.0), np.arange(0.0, ROWS, 6.0)
    ends = (math.cos(turn) / PITCH, math.sin(turn) / PITCH)
    picks = (-math.sin(turn) / PITCH, math.cos(turn) / PITCH)
    across = ends[0] * (x[None, :] - FIRST_END) + ends[1] * y[:, None]
    across = across + bend * np.sin(np.pi * y / ROWS)[:, None]
    down = picks[0] * x[None, :] + picks[1] * (y[:, None] - FIRST_PICK)
    track = Track(x, y, across, down, np.ones(across.shape, np.bool_))
    return ThreadReading(thread_set(ends), thread_set(picks), track, TILES, (1, 1), (), ())


def grating() -> NDArray[np.uint8]:
    """Bright lines at the ends' and the picks' places."""
    x, y = np.arange(COLUMNS), np.arange(ROWS)
    ends = np.cos(2 * np.pi * (x - FIRST_END) / PITCH)[None, :]
    picks = np.cos(2 * np.pi * (y - FIRST_PICK) / PITCH)[:, None]
    return np.asarray(128 + 60 * ends + 60 * picks, np.uint8)


def picture() -> Picture:
    return Picture("gill.png", grating(), SRGB, "grey", "", "", 8, None, 1, 0.0, 0.0)


def test_the_way_across_avoids_what_was_left_out() -> None:
    both = reading()
    assert both.ends is not None
    path = path_across(both.ends, TILES)
    assert path.across == (1.0, 0.0)
    assert path.length == pytest.approx(COLUMNS - 1)
    # the row of tiles that holds the one left out would meet a tile less
    assert not 120 <= path.start[1] < 180


def test_threads_are_marked_where_they_lie_and_numbered_in_turn() -> None:
    ends, picks = marked_sets(reading(), backlit=False)
    for marked, first, side in ((ends, FIRST_END, COLUMNS), (picks, FIRST_PICK, ROWS)):
        places = thread_places(marked, path_across(marked.threads, TILES))
        expected = np.arange(first, side - 1, PITCH)
        assert [number for number, _ in places] == list(range(1, len(expected) + 1))
        # half a pixel is the step in which the way is walked
        assert np.allclose([place for _, place in places], expected, atol=0.5)


def test_before_light_the_marks_lie_between_the_gaps() -> None:
    ends = marked_sets(reading(), backlit=True)[0]
    (_, first), *_ = thread_places(ends, path_across(ends.threads, TILES))
    assert first == pytest.approx(FIRST_END + PITCH / 2, abs=0.5)


def test_marks_follow_threads_that_bend() -> None:
    ends = marked_sets(reading(bend=0.25), backlit=False)[0]
    path = path_across(ends.threads, TILES)
    bent = 0.25 * math.sin(math.pi * path.start[1] / ROWS)
    places = np.array([place for _, place in thread_places(ends, path)])
    assert np.allclose((places - FIRST_END) / PITCH % 1, 1 - bent, atol=0.5 / PITCH)


def test_a_place_that_was_not_followed_gets_no_marks_and_keeps_the_count() -> None:
    whole = reading()
    assert whole.track is not None
    valid = whole.track.valid.copy()
    valid[:, 20:30] = False
    holed = replace(whole, track=replace(whole.track, valid=valid))
    ends = marked_sets(holed, backlit=False)[0]
    places = dict(thread_places(ends, path_across(ends.threads, TILES)))
    assert not [each for each in places.values() if 123 < each < 174]
    for number, place in places.items():
        assert place == pytest.approx(FIRST_END + (number - 1) * PITCH, abs=0.6)


@pytest.mark.parametrize("turn", [0.0, 0.05, -0.3])
def test_a_strip_is_straightened_along_its_way(turn: float) -> None:
    """A grating turned by any angle comes out with upright lines."""
    y, x = np.mgrid[:ROWS, :COLUMNS]
    along = x * math.cos(turn) + y * math.sin(turn)
    turned = np.asarray(128 + 100 * np.cos(2 * np.pi * along / PITCH), np.uint8)
    both = reading(turn=turn)
    assert both.ends is not None
    path = path_across(both.ends, (Tile(60, 60, 180, 120, True, ""),))
    strip = strip_pixels(turned, path, scale=2.0, height=40)[..., 0].astype(float)
    # upright lines: columns hardly vary (rounding to 8 bits), rows carry all the contrast
    assert strip.std(axis=0).max() < 4
    assert strip.std(axis=1).min() > 60


def coloured(pixels: NDArray[np.uint8], colour: tuple[int, int, int]) -> int:
    return int(np.all(pixels == np.asarray(colour), axis=2).sum())


def test_every_thread_of_a_strip_has_its_tick() -> None:
    marked: Marked = marked_sets(reading(), backlit=False)[0]
    sheet = counting_strip(grating(), marked, tiles=TILES, title="ends", width=1600).pixels
    # 16 px a thread and more: one row; the line of ticks just above the strip meets each once
    line = np.all(sheet[44 + 26 - 3] == np.asarray(ENDS), axis=1)
    assert line.sum() == 25


def test_the_close_up_shows_both_sets_and_the_pores() -> None:
    seen = Seen(0, 0, np.zeros((ROWS, COLUMNS), np.float32), np.ones((ROWS, COLUMNS), np.bool_))
    drawn = close_up(
        grating(), marked=marked_sets(reading(), backlit=False), tiles=TILES, seen=[seen], side=400
    )
    assert drawn.pixels.shape == (400, 400, 3)
    # 14 lines of each set, 400 px long, but for where they cross
    for colour in (ENDS, PICKS):
        assert 4_000 < coloured(drawn.pixels, colour) < 8_000


def told(threads: ThreadReading) -> dict[str, object]:
    section = {"ends": None, "picks": None, "length_ends_mm": 12.0, "length_picks_mm": None}
    return {
        "picture": {"name": "gill.png"},
        "light": "backlit",
        "verdict": None,
        "threads": section if threads.ends else None,
        "cover": None,
        "findings": [],
    }


def test_the_whole_sheet_shows_field_left_out_tiles_and_levels(tmp_path: Path) -> None:
    share = np.zeros((ROWS, COLUMNS), np.float32)
    cover = CoverReading(
        seen=(Seen(0, 0, share, np.ones(share.shape, np.bool_)),),
        light_field=LightField("blank", np.linspace(0.5, 1, 25, dtype=np.float32).reshape(5, 5), 0),
        histogram=Histogram(np.linspace(0, 1, 11), np.arange(10)),
        mean_cell=np.eye(16, dtype=np.float32),
        open_level=0.9,
        yarn_level=0.1,
        threshold_level=0.5,
    )
    pitch = Measured(24.0, 0.1, "px/mm")
    both = reading()
    pixels = overlay(
        told(both),
        picture=picture(),
        threads=both,
        scale=Scale(pitch, pitch, 0.01, "stated pitch"),
        cover=cover,
        region=(10, 10, 200, 200),
        units="cm",
    )
    assert pixels.shape[1:] == (1600, 3)
    for colour in (ENDS, PICKS, LEFT_OUT):
        assert coloured(pixels, colour) > 100
    write_overlay(pixels, tmp_path / "made" / "gill.overlay.png")
    assert [each.name for each in (tmp_path / "made").iterdir()] == ["gill.overlay.png"]


def test_a_picture_without_threads_is_drawn_all_the_same() -> None:
    nothing = ThreadReading(None, None, None, (), None, (), ())
    pixels = overlay(
        told(nothing),
        picture=picture(),
        threads=nothing,
        scale=None,
        cover=None,
        region=None,
        units="inch",
    )
    # only the legend names the sets: nothing is marked
    assert coloured(pixels, ENDS) < 400


def test_a_folder_that_cannot_be_made_is_told(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    with pytest.raises(OutputError) as fault:
        write_overlay(np.zeros((2, 2, 3), np.uint8), tmp_path / "file" / "a.png")
    assert "a.png" in fault.value.where
