"""What is not woven, or cannot be counted, is refused with a reason and a remedy.

Truth is drawn: loom's patterns, seed 5; and photographs that come with scikit-image.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import skimage.data
from numpy.typing import NDArray
from sweep_threads import light_of

from imgcover.findings import Flag, Severity, has
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import draw
from imgcover.loom.patterns import draw_pattern
from imgcover.threads.field import Region
from imgcover.threads.reader import Plain, read_threads
from imgcover.threads.reading import ThreadReading

KINDS = (
    *("rib knit", "purl knit", "net", "lace", "laid paper", "gravel", "brick", "text", "stripes"),
    *("corrugated", "white noise", "blank", "gradient", "screen", "perforated", "halftone"),
    *("checkerboard", "scales", "dots", "pickets"),
)


def refused(reading: ThreadReading) -> ThreadReading:
    """Hold that nothing was counted, and that each finding says what to do."""
    assert reading.ends is None and reading.picks is None
    assert any(each.severity is Severity.REFUSAL for each in reading.findings)
    assert all(each.message.strip() and each.remedy.strip() for each in reading.findings)
    return reading


@pytest.mark.parametrize("kind", KINDS)
def test_what_is_not_woven_is_not_counted(kind: str) -> None:
    stored = draw_pattern(kind, np.random.default_rng(5), width=300, height=300)
    refused(read_threads(Plain(light_of(stored))))


@pytest.mark.parametrize("name", ["brick", "grass", "gravel"])
def test_photographs_of_other_things_are_not_counted(name: str) -> None:
    """Truth is a photograph: pictures that scikit-image carries inside its package."""
    refused(read_threads(Plain(light_of(getattr(skimage.data, name)()))))


@pytest.mark.parametrize("level", [0.0, 0.4, 1.0])
def test_one_even_shade_has_no_threads(level: float) -> None:
    reading = refused(read_threads(Plain(np.full((200, 260), level, np.float32))))
    assert has(reading.findings, Flag.NO_CROSSING_THREADS)


CLOTH = ClothSpec(2.0, 2.0, 0.3, 0.28, spacing_cv=0.01, hairs_per_mm=0.0)


def cloth_light(
    cloth: ClothSpec, px_per_mm: float, size: int = 240, seed: int = 4
) -> NDArray[np.float32]:
    camera = CameraSpec(px_per_mm=px_per_mm, light="backlit")
    drawn = draw(cloth, camera, size, size, np.random.default_rng(seed))
    return light_of(drawn.stored)


def test_fewer_than_six_threads_are_too_few() -> None:
    """Truth is theory: a frame of 90 pixels at 18 pixels a thread shows five."""
    light = cloth_light(CLOTH, 36.0, 200)
    reading = refused(read_threads(Plain(light[:90, :90])))
    assert [each.flag for each in reading.findings] == [Flag.TOO_FEW_THREADS]
    tiny = refused(read_threads(Plain(light[:17, :17])))
    assert [each.flag for each in tiny.findings] == [Flag.TOO_FEW_THREADS]


@pytest.mark.parametrize("px", [2.4, 2.7])
def test_threads_finer_than_three_pixels_are_refused_with_a_resolution(px: float) -> None:
    """Eight pixels a thread are safe: 8 / px, rounded up, is the factor to be told."""
    picks_apart = replace(CLOTH, picks_per_mm=1.0, pick_diameter_mm=0.5)
    reading = read_threads(Plain(cloth_light(picks_apart, 2 * px, 300)))
    assert reading.ends is None
    (told,) = [each for each in reading.findings if each.flag is Flag.TOO_COARSE]
    assert "resolution" in told.remedy


def test_waves_at_the_pixels_limit_are_said_to_be_folded() -> None:
    """Two crossing gratings of 2.04 pixels: what shows is the beat with the pixels."""
    y, x = np.mgrid[:256, :256]
    light = 0.5 + 0.2 * np.cos(2 * np.pi * 0.49 * x) + 0.2 * np.cos(2 * np.pi * 0.49 * y)
    light += 0.04 * np.cos(2 * np.pi * 0.12 * x) + 0.04 * np.cos(2 * np.pi * 0.12 * y)
    light += 0.01 * np.random.default_rng(1).standard_normal(light.shape)
    reading = refused(read_threads(Plain(np.asarray(light, np.float32))))
    (told,) = reading.findings
    assert told.flag is Flag.TOO_COARSE and "folded over" in told.message


def test_one_set_alone_is_not_cloth() -> None:
    """A silent second axis: a perfect grating of ends with grain, nothing across."""
    x = np.arange(300)
    light = np.tile(0.5 + 0.3 * np.cos(2 * np.pi * x / 9.3), (300, 1))
    light += 0.02 * np.random.default_rng(3).standard_normal(light.shape)
    refused(read_threads(Plain(np.asarray(light, np.float32))))


def test_threads_that_cannot_be_followed_are_lost() -> None:
    """Two setts in one frame, half each: no density is that of the field."""
    finer = replace(CLOTH, ends_per_mm=2.6, end_diameter_mm=0.22)
    light = np.hstack([cloth_light(CLOTH, 16.0)[:, :160], cloth_light(finer, 16.0)[:, :160]])
    reading = refused(read_threads(Plain(np.ascontiguousarray(light))))
    assert has(reading.findings, Flag.THREADS_LOST)


def test_a_region_is_read_alone_and_its_tiles_lie_in_it() -> None:
    """Cloth on the left, noise on the right: the cloth's region is counted, the noise refused."""
    cloth = cloth_light(CLOTH, 16.0)
    noise = np.random.default_rng(2).uniform(0, 1, cloth.shape).astype(np.float32)
    source = Plain(np.ascontiguousarray(np.hstack([cloth, noise])))
    reading = read_threads(source, region=Region(10, 5, 220, 225))
    alone = read_threads(Plain(np.ascontiguousarray(cloth[5:230, 10:230])))
    assert reading.ends is not None and reading.ends == alone.ends and reading.picks == alone.picks
    assert min(each.x for each in reading.tiles) == 10
    assert max(each.x + each.width for each in reading.tiles) == 230
    refused(read_threads(source, region=Region(250, 0, 220, 225)))
