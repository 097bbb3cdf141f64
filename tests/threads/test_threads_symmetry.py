"""What must not change a count, and what must change it by a known factor.

Truth is symmetry: one cloth (loom, seed 4) seen otherwise. Tolerances are parts of the stated u:
both readings look at the same threads, and u is mostly that of the outermost ones.
"""

from __future__ import annotations

from functools import cache

import cv2
import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from sweep_threads import light_of

from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import draw
from imgcover.threads.reader import Direction, Plain, read_threads
from imgcover.threads.reading import ThreadReading, ThreadSet

FEW = settings(max_examples=4, deadline=None, suppress_health_check=[HealthCheck.too_slow])


@cache
def light() -> NDArray[np.float32]:
    """A twill of about thirty by twenty-four threads, 260 × 240 pixels, slightly turned."""
    cloth = ClothSpec(2.0, 1.7, 0.36, 0.4, weave="2/1 twill", spacing_cv=0.02)
    camera = CameraSpec(px_per_mm=17.0, light="reflected", rotation_deg=1.3, skew_deg=0.7)
    return light_of(draw(cloth, camera, 260, 240, np.random.default_rng(4)).stored)


def read(picture: NDArray[np.float32], warp: Direction = "vertical") -> ThreadReading:
    return read_threads(Plain(np.ascontiguousarray(picture, np.float32)), warp=warp)


@cache
def usual() -> tuple[ThreadSet, ThreadSet]:
    return both(read(light()))


def both(reading: ThreadReading) -> tuple[ThreadSet, ThreadSet]:
    assert reading.ends is not None and reading.picks is not None
    return reading.ends, reading.picks


def alike(got: tuple[ThreadSet, ThreadSet], *, factor: float = 1.0, part_of_u: float = 0.1) -> None:
    """Hold densities that are `factor` times the usual ones, within a part of u."""
    for one, other in zip(got, usual(), strict=True):
        ratio = np.hypot(*one.frequency) / np.hypot(*other.frequency)
        assert ratio == pytest.approx(factor, rel=part_of_u * other.u_relative)


def test_the_cloth_is_read() -> None:
    """Truth is drawn: two and 1.7 threads a mm at 17 px/mm."""
    ends, picks = usual()
    assert ends.pixels_a_thread == pytest.approx(8.5, rel=0.01)
    assert picks.pixels_a_thread == pytest.approx(10.0, rel=0.01)


@FEW
@given(gain=st.floats(0.05, 1.0))
def test_exposure(gain: float) -> None:
    """The square root of light scales with the root of the exposure: nothing else changes."""
    alike(both(read(light() * np.float32(gain))), part_of_u=0.01)


@FEW
@given(lift=st.floats(0.0, 0.4), contrast=st.floats(0.25, 1.0))
def test_brightness_and_contrast(lift: float, contrast: float) -> None:
    """Stray light bends the square root: lines gain and lose, and with them places at the edge."""
    alike(both(read(lift + contrast * light())), part_of_u=0.5)


def test_inverted_light() -> None:
    """Dark threads on light ground are the same threads; their ridges are weighed otherwise."""
    alike(both(read(1 - light())), part_of_u=0.5)


def test_transposed_ends_are_picks() -> None:
    """The order of unwrapping differs, and rounds otherwise."""
    picks, ends = both(read(light().T))
    alike((ends, picks), part_of_u=0.05)


def test_warp_across() -> None:
    """The same picture with the warp said to run across: the sets change their names only."""
    picks, ends = both(read(light(), "horizontal"))
    assert (ends.frequency, picks.frequency) == tuple(each.frequency for each in usual())


@pytest.mark.parametrize("axes", [(0, 1), (0,), (1,)])
def test_half_turn_and_mirrors(axes: tuple[int, ...]) -> None:
    """The coarse grid starts at the first pixel and ends up to a step before the last.

    So a flipped picture is counted between other outermost threads, and may differ by the u that
    is stated for just these.
    """
    alike(both(read(np.flip(light(), axes))), part_of_u=1.0)


@pytest.mark.parametrize("factor", [1.5, 2.0])
def test_resampled_by_a_known_factor(factor: float) -> None:
    """Half as many threads a pixel; the interpolation adds no thread."""
    size = (round(260 * factor), round(240 * factor))
    larger = cv2.resize(light(), size, interpolation=cv2.INTER_CUBIC)
    alike(both(read(np.asarray(larger, np.float32))), factor=1 / factor, part_of_u=0.5)


def test_the_same_picture_gives_the_same_digits() -> None:
    assert both(read(light().copy())) == usual()
