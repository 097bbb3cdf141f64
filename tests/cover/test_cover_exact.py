"""Cover of figures whose area is a formula, of published meshes, and what stays the same."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.cover.reader import read_cover
from imgcover.cover.reading import CoverReading, Lattice
from imgcover.findings import Flag
from imgcover.loom.analytic import Exact, discs, grating, mesh

Light = NDArray[np.float32]
AREA = 0.001
"""What exact figures of 8 px and more are held to: a tenth of a point."""
PUBLISHED = 0.006
"""Catalogue openings are rounded to whole per cent; the rule recomputes them to 0.4 of one."""


def lit(exact: Exact, *, noise: float = 0.0) -> Light:
    light = 0.8 * exact.light
    if noise:
        light = light + np.random.default_rng(4).normal(0, noise, light.shape)
    return np.ascontiguousarray(light, np.float32)


def wires(pitch: float, share: float, *, dark: float = 0.0, blur: float = 0.0) -> Exact:
    side = round(36 * pitch)
    bar = share * pitch
    return mesh(
        side,
        side,
        pitch_px=(pitch, pitch),
        bar_px=(bar, bar),
        start_px=(0.3, 0.7),
        dark=dark,
        blur_px=blur,
    )


def read_wires(exact: Exact, pitch: float) -> CoverReading:
    lattice = Lattice((1 / pitch, 0.0), (0.0, 1 / pitch))
    return read_cover(lit(exact, noise=0.002), light="backlit", lattice=lattice)


def off(reading: CoverReading, covered: float) -> float:
    assert reading.optical is not None, reading.findings
    return abs(reading.optical.value - covered)


@pytest.mark.parametrize("pitch, share", [(8.0, 0.45), (12.0, 0.36), (16.0, 0.36)])
def test_meshes_to_a_tenth_of_a_point(pitch, share):
    """Truth is theory: 1 − (1 − d/p)² of opaque wires."""
    exact = wires(pitch, share)
    reading = read_wires(exact, pitch)
    assert off(reading, 1 - (1 - share) ** 2) < AREA
    assert reading.warp is not None and abs(reading.warp.value - share) < 2 * AREA


@pytest.mark.parametrize(
    "exact, covered",
    [
        (grating(320, 320, pitch_px=8, bar_px=4, start_px=0.3), 0.5),
        (grating(400, 400, pitch_px=25, bar_px=7.5, start_px=0.3), 0.3),
        (discs(480, 480, pitch_px=12, radius_px=3.6), np.pi * 0.09),
        (discs(480, 480, pitch_px=16, radius_px=6.4, hole=True), 1 - np.pi * 0.16),
    ],
)
def test_bars_and_discs_without_known_threads(exact, covered):
    """Truth is theory: d/p of bars, π r²/p² of discs, one less that of round holes."""
    reading = read_cover(lit(exact), light="backlit")
    assert off(reading, covered) < AREA
    assert Flag.COVER_BY_LEVELS_ONLY in [f.flag for f in reading.findings]


@pytest.mark.parametrize(
    "wire_um, gap_um, opened", [(40, 73, 0.42), (48, 65, 0.33), (54, 59, 0.27)]
)
def test_published_mesh_openings(wire_um, gap_um, opened):
    """Truth is published: monofilament screens of 90 wires a cm, catalogue openings."""
    pitch = 16.0
    exact = wires(pitch, wire_um / (wire_um + gap_um), blur=0.4)
    reading = read_wires(exact, pitch)
    assert off(reading, 1 - opened) < PUBLISHED


@pytest.mark.parametrize("share", [0.15, 0.25])
@pytest.mark.parametrize("dark", [0.1, 0.25, 0.4])
def test_thin_flat_translucent_wires_are_right_or_refused(share, dark):
    """Truth is theory: where the section of a wire cannot be seen, u says so or there is none."""
    exact = wires(12.0, share, dark=dark, blur=0.8)
    reading = read_wires(exact, 12.0)
    if reading.optical is None:
        assert Flag.COVER_NOT_RESOLVED in [f.flag for f in reading.findings]
    else:
        assert off(reading, exact.covered) < 3 * reading.optical.u


def test_two_levels_are_asked_to_be_two():
    """Truth is theory: a soft wave has no edge, and its half level is no cover."""
    x = np.arange(400)
    wave = 0.4 + 0.3 * np.sin(2 * np.pi * x / 40)
    light = np.ascontiguousarray(np.broadcast_to(wave, (400, 400)), np.float32)
    assert read_cover(light, light="backlit").optical is None
    assert read_cover(light, light="reflected", backing="light").optical is None
