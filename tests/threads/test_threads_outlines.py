"""Threads followed by their outlines, and when a count is held for lost.

Truth is symmetry for the outlines; theory for what is lost; drawn for the striped cloth.
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from numpy.typing import NDArray
from sweep_threads import light_of

from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import draw
from imgcover.threads.field import DARKEST, Field, Region, outlines
from imgcover.threads.reader import Plain, read_threads
from imgcover.threads.reading import ThreadSet
from imgcover.threads.telling import is_lost

PERIOD = 10.0


def field(light: NDArray[np.float64]) -> Field:
    return Field(light.astype(np.float32), Region(0, 0, light.shape[1], light.shape[0]), 1)


def grid() -> NDArray[np.float64]:
    y, x = np.mgrid[:80, :120]
    return 0.4 + 0.2 * np.cos(2 * np.pi * x / PERIOD) * np.cos(2 * np.pi * y / PERIOD)


def test_outlines_do_not_know_which_thread_is_the_lighter() -> None:
    """Light and its reciprocal have the same edges: the logarithm only changes sign."""
    light = grid() + DARKEST
    turned = 0.2 / light
    one = outlines(field(light - DARKEST), PERIOD).light
    other = outlines(field(turned - DARKEST), PERIOD).light
    assert other == pytest.approx(one, abs=1e-3 * float(one.max()))


def test_outlines_do_not_know_the_exposure() -> None:
    """Twice the light on everything but the darkest steps changes nothing."""
    one = outlines(field(grid()), PERIOD).light
    other = outlines(field(2 * grid() + DARKEST), PERIOD).light
    assert other == pytest.approx(one, abs=1e-3 * float(one.max()))


def test_stripes_that_turn_the_contrast_over_are_counted() -> None:
    """Ends by turns darker and lighter than the picks, seven of each.

    Truth is drawn: counted by the loom. Its spectrum has a line beside the ends' own, a fourteenth
    off; a count that follows it is off by 7 %. Right means within a fifth of an end.
    """
    cloth = ClothSpec(
        ends_per_mm=2.0,
        picks_per_mm=1.6,
        end_diameter_mm=0.42,
        pick_diameter_mm=0.45,
        weave="plain",
        end_lightness=(0.12,) * 7 + (0.8,) * 7,
        pick_lightness=(0.4,),
        spacing_cv=0.02,
        diameter_cv=0.06,
    )
    camera = CameraSpec(px_per_mm=20.0, light="reflected", blur_px=0.8)
    drawn = draw(cloth, camera, 560, 480, np.random.default_rng(5))
    reading = read_threads(Plain(light_of(drawn.stored)))
    assert reading.ends is not None and reading.picks is not None
    ends = 20.0 * np.hypot(*reading.ends.frequency)
    assert ends == pytest.approx(drawn.truth.ends, rel=0.2 / reading.ends.counted)


STEADY = ThreadSet((0.1, 0.0), 50.0, 500.0, 0.001, {"edge": 0.001}, 0.01, 0.98, 1.02, 6, None)


@pytest.mark.parametrize(
    ("threads", "u", "lost"),
    [
        (50.0, 0.001, False),
        (50.0, 0.006, True),  # 0.30 threads: 2 u is more than half a thread
        (400.0, 0.001, False),  # 0.40 threads, but a tenth of a percent decides everything
        (12.0, 0.010, False),  # 0.12 threads: few threads, none lost
        (30.0, 0.008, True),  # 0.24 threads and loose
    ],
)
def test_a_count_is_lost_when_a_thread_more_or_less_is_not_excluded(
    threads: float, u: float, lost: bool
) -> None:
    each = dataclasses.replace(STEADY, counted=threads, u_relative=u)
    assert is_lost(each) is lost


def test_a_density_that_jumps_from_tile_to_tile_is_lost() -> None:
    assert is_lost(dataclasses.replace(STEADY, local_scatter=0.06))
