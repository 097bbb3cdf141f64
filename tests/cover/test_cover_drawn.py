"""Cover of drawn backlit cloth: counted truth, symmetry, and what is refused."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.cover.reader import read_cover
from imgcover.cover.reading import CoverReading, Lattice
from imgcover.findings import Flag
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import draw
from imgcover.tone import SRGB

Light = NDArray[np.float32]
WITHIN = 0.012
"""The worst that the cover room is held to; the sweep's RMS is a quarter of it."""
SAME = 0.003
"""A turn or another exposure moves the cover by less than its usual u."""
CLOTHS = {
    "plain": ClothSpec(1.8, 1.6, 0.28, 0.3),
    "2/2 twill": ClothSpec(2.2, 1.9, 0.3, 0.32, weave="2/2 twill", tau=0.12),
    "5-end satin": ClothSpec(1.5, 1.4, 0.4, 0.36, weave="5-end satin", hairs_per_mm=0.3),
}


@cache
def drawn(name: str) -> tuple[Light, float, Lattice]:
    """Linear light, counted cover, and the lattice in cycles a pixel."""
    cloth = CLOTHS[name]
    camera = CameraSpec(20.0, falloff=0.15, glare=0.01, blur_px=0.8)
    picture = draw(cloth, camera, 420, 400, np.random.default_rng(11))
    light = SRGB.to_linear(picture.stored.astype(np.float32) / 255).astype(np.float32)
    truth = picture.truth
    return light, truth.cover, Lattice((truth.ends / 20, 0.0), (0.0, truth.picks / 20))


def read(light: Light, lattice: Lattice) -> CoverReading:
    return read_cover(np.ascontiguousarray(light), light="backlit", lattice=lattice)


def value(reading: CoverReading) -> float:
    assert reading.optical is not None, reading.findings
    return reading.optical.value


@pytest.mark.parametrize("name", CLOTHS)
def test_cover_is_what_was_drawn(name):
    """Truth is drawn: loom, seed 11, counted from the fine drawing."""
    light, cover, lattice = drawn(name)
    reading = read(light, lattice)
    assert abs(value(reading) - cover) < WITHIN
    assert reading.optical is not None
    assert abs(reading.optical.value - cover) < 4 * reading.optical.u


def test_exposure_does_not_matter():
    """Truth is symmetry: cover is an area."""
    light, _, lattice = drawn("plain")
    dim = read((0.6 * light).astype(np.float32), lattice)
    assert value(dim) == pytest.approx(value(read(light, lattice)), abs=SAME)


def test_transpose_and_half_turn_do_not_matter():
    """Truth is symmetry: the same cloth laid otherwise."""
    light, _, lattice = drawn("2/2 twill")
    straight = value(read(light, lattice))
    laid = Lattice((lattice.picks[1], 0.0), (0.0, lattice.ends[0]))
    assert value(read(light.T, laid)) == pytest.approx(straight, abs=SAME)
    assert value(read(light[::-1, ::-1], lattice)) == pytest.approx(straight, abs=SAME)


def test_light_must_be_stated_and_come_from_behind():
    """Truth is the contract: light unsaid or from the front, cover is null and says why."""
    light, _, lattice = drawn("plain")
    unsaid = read_cover(light, light=None, lattice=lattice)
    front = read_cover(light, light="reflected", lattice=lattice)
    assert unsaid.optical is None and front.optical is None
    assert [f.flag for f in unsaid.findings] == [Flag.LIGHT_NOT_STATED]
    assert [f.flag for f in front.findings] == [Flag.COVER_NEEDS_BACKLIGHT]


def test_reflected_light_called_backlit_is_refused():
    """Truth is drawn: loom, seed 5, lit from the front: no pore lets light through."""
    camera = CameraSpec(20.0, light="reflected")
    picture = draw(CLOTHS["plain"], camera, 420, 400, np.random.default_rng(5))
    light = SRGB.to_linear(picture.stored.astype(np.float32) / 255).astype(np.float32)
    truth = picture.truth
    reading = read(light, Lattice((truth.ends / 20, 0.0), (0.0, truth.picks / 20)))
    assert reading.optical is None
    assert all(f.remedy for f in reading.findings)
