"""The loom's light does what light does.

Truth is theory: two layers pass the product of what each passes, the upper thread is the one that
is seen, and every camera setting can be read back from the picture it made.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from imgcover.loom.camera import CameraSpec, bare, expose
from imgcover.loom.cloth import ClothSpec, Fault
from imgcover.loom.drawing import draw
from imgcover.tone import LINEAR, SRGB
from imgcover.weave import weave

EVEN = ClothSpec(
    ends_per_mm=1.0,
    picks_per_mm=1.0,
    end_diameter_mm=0.6,
    pick_diameter_mm=0.6,
    diameter_cv=0.0,
    spacing_cv=0.0,
    wander=0.0,
    waviness=0.0,
    twist=0.0,
    float_cv=0.0,
)
CLEAN = CameraSpec(
    px_per_mm=20.0,
    blur_px=0.0,
    exposure=1.0,
    falloff=0.0,
    read_noise=0.0,
    shot_noise=0.0,
    tone=LINEAR,
    bits=16,
)


def rng(seed: int = 4) -> np.random.Generator:
    return np.random.default_rng(seed)


def test_a_yarn_passes_tau_and_a_crossing_its_square() -> None:
    light = draw(replace(EVEN, tau=0.2), CLEAN, 200, 200, rng()).stored / 65535
    # flat section at the middle of a yarn: the thickest tenth is within a percent of tau
    assert light.min() == pytest.approx(0.2**2, rel=0.02)
    assert light.max() == 1.0
    rows = light.min(axis=1)  # where no pick lies, the darkest point of a row is an end's middle
    assert rows.max() == pytest.approx(0.2, rel=0.02)


@pytest.mark.parametrize(
    "name", ["plain", "2/1 twill", "2/2 twill s", "5-end satin", "2/2 hopsack"]
)
def test_the_upper_thread_is_the_weaves(name: str) -> None:
    cloth = replace(EVEN, weave=name, end_lightness=(0.1,), pick_lightness=(0.8,))
    camera = replace(CLEAN, light="reflected", bed=0.0)
    light = draw(cloth, camera, 400, 400, rng()).stored / 65535
    # even cloth of 20 px a thread: find the phase of the lattice, then look at the crossings
    at = {
        axis: int(np.argmax([light.mean(axis=axis)[k::20].mean() for k in range(20)]))
        for axis in (0, 1)
    }
    best = max(
        agreement(light[dy::20, dx::20], name)
        for dy in range(at[1] - 10, at[1] + 10)
        for dx in range(at[0] - 10, at[0] + 10)
        if dy >= 0 and dx >= 0
    )
    assert best == 1.0


def agreement(crossings: np.ndarray, name: str) -> float:
    """Best share of crossings that look as the weave says, over the weave's own shifts."""
    pattern = weave(name)
    dark = crossings < 0.3
    picks, ends = np.indices(dark.shape)
    return max(
        float(
            (
                pattern.matrix[(picks + j) % pattern.picks_repeat, (ends + i) % pattern.ends_repeat]
                == dark
            ).mean()
        )
        for j in range(pattern.picks_repeat)
        for i in range(pattern.ends_repeat)
    )


def test_colour_pictures_hold_both_tints() -> None:
    cloth = replace(EVEN, end_tint=(1.0, 0.2, 0.2), pick_tint=(0.2, 0.2, 1.0))
    camera = replace(CLEAN, light="reflected", colour=True, bed=0.0, bits=8)
    stored = draw(cloth, camera, 120, 120, rng()).stored.astype(float)
    assert stored.shape == (120, 120, 3)
    red, blue = stored[..., 0] > stored[..., 2] + 20, stored[..., 2] > stored[..., 0] + 20
    assert red.mean() > 0.15
    assert blue.mean() > 0.15


def test_light_fields_are_what_was_asked_for() -> None:
    flat = np.ones((200, 300), dtype=np.float32)

    def seen(**settings: float) -> np.ndarray:
        return expose(flat, replace(CLEAN, **settings), rng()) / 65535

    assert np.ptp(seen(exposure=0.8)) < 1e-4
    assert seen(exposure=0.8).mean() == pytest.approx(0.8, abs=1e-4)
    corner = seen(falloff=0.3)
    assert corner[0, 0] == pytest.approx(0.7 * corner.max(), abs=0.01)
    tilted = seen(tilt=0.5)
    assert tilted[100, -1] == pytest.approx(0.5 * tilted[100, 0], abs=0.02)
    assert seen(exposure=0.5, glare=0.1).mean() == pytest.approx(0.5 * 1.1, abs=1e-4)
    shadow = seen(shadowed_third=0.6)
    assert shadow[:, 270:].mean() == pytest.approx(0.4, abs=0.01)
    assert shadow[:, :150].mean() == pytest.approx(1.0, abs=0.01)
    noisy = seen(exposure=0.5, shot_noise=0.02)
    assert noisy.std() == pytest.approx(0.02 * np.sqrt(0.5), rel=0.05)


def test_blank_and_dark_frames_hold_the_light_and_the_glare() -> None:
    camera = replace(CLEAN, exposure=0.8, falloff=0.2, glare=0.05)
    blank, dark = bare(camera, 90, 60, rng()), bare(camera, 90, 60, rng(), lit=False)
    assert blank.shape == dark.shape == (60, 90)
    assert dark / 65535 == pytest.approx(0.8 * 0.05, abs=1e-4)
    cloth = draw(EVEN, camera, 90, 60, rng()).stored.astype(float)
    # what the cloth lets through: the picture less the dark, over the blank less the dark
    through = (cloth - dark) / (blank.astype(float) - dark)
    plain = draw(EVEN, replace(CLEAN, exposure=0.8), 90, 60, rng()).stored / (0.8 * 65535)
    assert through == pytest.approx(plain, abs=1e-3)
    assert bare(replace(camera, colour=True), 9, 6, rng()).shape == (6, 9, 3)


def test_depth_tone_and_jpeg_are_what_was_asked_for() -> None:
    half = np.full((64, 64), 0.5, dtype=np.float32)
    eight = expose(half, replace(CLEAN, bits=8, tone=SRGB), rng())
    assert eight.dtype == np.uint8
    assert (eight == 188).all()  # sRGB of one half: 0.7354 × 255
    lossy = expose(
        np.float32(0.5) + half * np.float32(0.4) * rng().standard_normal((64, 64)).astype("f4"),
        replace(CLEAN, bits=8, jpeg=30),
        rng(),
    )
    assert lossy.dtype == np.uint8
    with pytest.raises(ValueError, match="JPEG picture has 8 bits"):
        replace(CLEAN, jpeg=80)
    with pytest.raises(ValueError, match="bits must be 8 or 16"):
        replace(CLEAN, bits=12)


@pytest.mark.parametrize("light", ["backlit", "reflected"])
def test_faults_can_be_seen_where_they_were_put(light: str) -> None:
    camera = replace(CLEAN, light=light)
    whole = draw(EVEN, camera, 240, 240, rng()).stored.astype(int)
    for kind, size, strength in (
        ("slub", 4.0, 2.0),
        ("stain", 2.0, 0.8),
        ("broken end", 4.0, 0.5),
        ("crease", 0.6, 0.6),
        ("thick end", 1.0, 1.6),
        ("missing pick", 1.0, 0.5),
    ):
        fault = Fault(kind, 0.5, 0.5, size, strength)
        marred = draw(replace(EVEN, faults=(fault,)), camera, 240, 240, rng()).stored.astype(int)
        apart = np.abs(marred - whole)
        assert apart[80:160, 80:160].max() > 4000, kind
        if kind in ("slub", "stain", "broken end"):
            assert apart[:20, :20].max() < 700, kind


def test_a_blurred_third_is_blurred_and_the_rest_is_not() -> None:
    sharp = draw(EVEN, CLEAN, 300, 120, rng()).stored.astype(float)
    soft = draw(EVEN, replace(CLEAN, blurred_third=9.0), 300, 120, rng()).stored.astype(float)
    assert soft[:, :70].std() < 0.5 * sharp[:, :70].std()
    assert soft[:, 150:] == pytest.approx(sharp[:, 150:], abs=700)


def test_impossible_cloth_is_refused() -> None:
    with pytest.raises(ValueError, match="ends_per_mm"):
        replace(EVEN, ends_per_mm=0.0)
    with pytest.raises(ValueError, match="tau"):
        replace(EVEN, tau=1.0)
    with pytest.raises(ValueError, match="nearest are"):
        replace(EVEN, weave="2/2 twil")
    with pytest.raises(ValueError, match="px_per_mm"):
        CameraSpec(px_per_mm=0)
