"""What belongs to the field, how light and laying it otherwise matter, and shut cloth."""

from __future__ import annotations

from functools import cache

import cv2
import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.cover.reader import read_cover
from imgcover.cover.reading import CoverReading, Lattice
from imgcover.findings import Flag
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import draw
from imgcover.picture.losses import step_of_losses
from imgcover.tone import LINEAR, SRGB, Tone

Light = NDArray[np.float32]
ENDS, PICKS = 1.8, 1.6
SIDE = 360
WITHIN = 0.006
"""Half of the worst that the cover room is held to: these are easy cloths."""


@cache
def drawn(
    diameter: float = 0.3,
    *,
    tau: float = 0.05,
    light: str = "backlit",
    bed: float = 0.15,
    shade: float = 0.75,
    tone: Tone = SRGB,
    bits: int = 8,
    exposure: float = 0.85,
    px_per_mm: float = 20.0,
    blurred_third: float = 0.0,
) -> tuple[Light, float, Lattice]:
    """Linear light, counted cover, and the lattice in cycles a pixel."""
    cloth = ClothSpec(
        ENDS,
        PICKS,
        diameter,
        diameter,
        tau=tau,
        end_lightness=(shade,),
        pick_lightness=(shade,),
    )
    camera = CameraSpec(
        px_per_mm,
        blur_px=0.7,
        light=light,
        bed=bed,
        tone=tone,
        bits=bits,
        exposure=exposure,
        blurred_third=blurred_third,
    )
    picture = draw(cloth, camera, SIDE, SIDE, np.random.default_rng(21))
    stored = picture.stored.astype(np.float32) / np.iinfo(picture.stored.dtype).max
    truth = picture.truth
    lattice = Lattice((truth.ends / px_per_mm, 0.0), (0.0, truth.picks / px_per_mm))
    return tone.to_linear(stored).astype(np.float32), truth.cover, lattice


def read(light: Light, lattice: Lattice | None, **more: object) -> CoverReading:
    return read_cover(np.ascontiguousarray(light), light="backlit", lattice=lattice, **more)


def value(reading: CoverReading) -> float:
    assert reading.optical is not None, reading.findings
    return reading.optical.value


def test_thicker_yarn_never_covers_less():
    """Truth is symmetry: loom, seed 21, the same cloth with ever thicker yarn."""
    covers = [value(read(*drawn(d)[::2])) for d in (0.24, 0.27, 0.3, 0.33, 0.36)]
    assert covers == sorted(covers)
    assert covers[-1] - covers[0] == pytest.approx(drawn(0.36)[1] - drawn(0.24)[1], abs=WITHIN)


@pytest.mark.parametrize("tone, bits", [(LINEAR, 16), (Tone("gamma", 2.2), 8)])
@pytest.mark.parametrize("exposure", [0.85, 0.4])
def test_tone_depth_and_exposure_do_not_matter(tone, bits, exposure):
    """Truth is symmetry: one cloth, stored in other ways; a tenth of a point for the noise."""
    usual = value(read(*drawn()[::2]))
    other = drawn(tone=tone, bits=bits, exposure=exposure)
    assert value(read(*other[::2])) == pytest.approx(usual, abs=0.001)


def test_bare_light_beside_the_cloth_is_not_open_cloth():
    """Truth is drawn: loom, seed 21; a fifth of the frame is then bare light, or a label."""
    light, cover, lattice = drawn()
    bare, label = light.copy(), light.copy()
    bare[:, :70] = 0.85
    label[20:130, 30:190] = 0.01
    for other in (bare, label):
        reading = read(other, lattice)
        assert abs(value(reading) - cover) < WITHIN
        assert any(not seen.inside.all() for seen in reading.seen), "what is masked is shown"


def test_a_third_out_of_focus_is_refused():
    """Truth is drawn: loom, seed 21; one blur for the whole field would be 3 points off."""
    light, _, lattice = drawn(blurred_third=1.2)
    reading = read(light, lattice)
    assert reading.optical is None
    assert [f.flag for f in reading.findings] == [Flag.COVER_UNEVEN]


def test_sharpened_small_pores_are_refused():
    """Truth is drawn: loom, seed 21, sharpened as scanning programs do: no blur explains it."""
    light, _, lattice = drawn(0.36)
    stored = SRGB.from_linear(light)
    stored = np.clip(stored + 0.7 * (stored - cv2.GaussianBlur(stored, (0, 0), 2.0)), 0, 1)
    reading = read(SRGB.to_linear(stored).astype(np.float32), lattice)
    assert reading.optical is None
    assert [f.flag for f in reading.findings] == [Flag.COVER_UNEVEN]


def test_nearly_shut_cloth_has_a_bound_and_is_never_shut_by_default():
    """Truth is drawn: loom, seed 21; open area of 1.5 %, and next to none."""
    light, cover, lattice = drawn(0.5, px_per_mm=30.0)
    reading = read(light, lattice)
    bound = reading.upper_bound_open
    assert bound is not None and reading.optical is not None
    assert Flag.NEARLY_SHUT in [f.flag for f in reading.findings]
    assert 1 - cover < bound.value + 2 * bound.u < 0.05
    shut, _, other = drawn(0.62, px_per_mm=30.0)
    refused = read(shut, other)
    assert refused.optical is None and refused.upper_bound_open is not None


def test_without_threads_u_holds_thin_rims():
    """Truth is drawn: loom, seed 21; two levels alone see translucent yarn too thin."""
    for tau in (0.01, 0.15):
        light, cover, _ = drawn(tau=tau)
        reading = read(light, None)
        if reading.optical is None:
            assert reading.upper_bound_open is not None
            assert reading.upper_bound_open.value > 1 - cover
        else:
            assert abs(reading.optical.value - cover) < 2.5 * reading.optical.u


def test_a_card_must_differ_clearly():
    """Truth is drawn: loom, seed 21, lit from the front on a white card."""
    light, cover, lattice = drawn(0.25, light="reflected", bed=0.95, shade=0.2, px_per_mm=40.0)
    dark = read_cover(light, light="reflected", lattice=lattice, backing="light")
    assert dark.optical is not None
    assert abs(dark.optical.value - cover) < 2 * dark.optical.u
    assert dark.optical.u >= 0.02
    light, _, lattice = drawn(0.25, light="reflected", bed=0.95, shade=0.9, px_per_mm=40.0)
    alike = read_cover(light, light="reflected", lattice=lattice, backing="light")
    assert alike.optical is None
    assert Flag.COVER_NEEDS_BACKLIGHT in [f.flag for f in alike.findings]


def test_losses_of_the_file_widen_u():
    """Truth is drawn: loom, seed 21, through JPEG: u holds what it does, or it is refused."""
    light, cover, lattice = drawn()
    kept = read(light, lattice)
    assert kept.optical is not None
    for quality, answered in ((90, True), (85, True), (60, False)):
        stored = np.round(255 * SRGB.from_linear(light)).astype(np.uint8)
        stored = cv2.imdecode(
            cv2.imencode(".jpg", stored, [cv2.IMWRITE_JPEG_QUALITY, quality])[1],
            cv2.IMREAD_UNCHANGED,
        )
        again = SRGB.to_linear(stored.astype(np.float32) / 255).astype(np.float32)
        lossy = read(again, lattice, loss_step=step_of_losses(stored))
        assert (lossy.optical is not None) == answered
        if lossy.optical is not None:
            assert lossy.optical.u > 1.2 * kept.optical.u
            assert abs(lossy.optical.value - cover) < 2 * lossy.optical.u
            assert Flag.COVER_FROM_LOSSY in [f.flag for f in lossy.findings]
