"""Is the channel with the clearest cloth chosen, and luminance wherever it will do?"""

from __future__ import annotations

import numpy as np
import picture_files as files
import pytest
from numpy.typing import NDArray
from PIL import Image

from imgcover.findings import Flag, has
from imgcover.picture.channel import choose_channel
from imgcover.picture.reader import read_picture
from imgcover.tone import SRGB

WEIGHTS = np.array([0.2126, 0.7152, 0.0722])
RED_YARN = np.array([0.50, 0.20, 0.20])


def _dots(warp: NDArray[np.float64], weft: NDArray[np.float64]) -> NDArray[np.float64]:
    """Plain weave as dots of two colours, 9 px a thread, linear light, softened."""
    rows, columns = np.mgrid[0:600, 0:500] * 2 * np.pi / 18
    share = 0.5 + 0.5 * np.tanh(3 * np.sin(rows) * np.sin(columns))
    return share[..., None] * warp + (1 - share[..., None]) * weft


def _photographed(light: NDArray[np.float64], *, noise: float, seed: int) -> NDArray[np.uint8]:
    stored = 255 * SRGB.from_linear(np.clip(light, 0, 1))
    stored = stored + np.random.default_rng(seed).normal(0, noise, stored.shape)
    return np.clip(stored.round(), 0, 255).astype(np.uint8)


def _blue_green_as_light_as_red() -> NDArray[np.float64]:
    other = np.array([0.10, 0.0, 0.20])
    other[1] = (RED_YARN @ WEIGHTS - other @ WEIGHTS) / WEIGHTS[1]
    return other


@pytest.mark.parametrize("noise", [2.0, 8.0, 30.0])
@pytest.mark.parametrize("seed", range(3))
def test_grey_cloth_is_measured_in_luminance(noise: float, seed: int) -> None:
    """Truth is theory: three colours averaged have less noise than any one of them."""
    stored = _photographed(_dots(np.full(3, 0.5), np.full(3, 0.4)), noise=noise, seed=seed)
    assert choose_channel(stored, SRGB).channel == "luminance"


@pytest.mark.parametrize("noise", [4.0, 12.0])
@pytest.mark.parametrize("seed", range(2))
def test_yarns_of_one_luminance_are_measured_in_the_channel_that_parts_them(
    noise: float, seed: int
) -> None:
    """Truth is drawn: red differs by 0.40, green by 0.12, blue by nothing, luminance by nothing."""
    light = _dots(RED_YARN, _blue_green_as_light_as_red())
    assert np.ptp(light @ WEIGHTS) < 1e-12
    choice = choose_channel(_photographed(light, noise=noise, seed=seed), SRGB)
    assert choice.channel == "red"
    assert "times as clear" in choice.reason


def test_two_colours_that_luminance_parts_well_stay_in_luminance() -> None:
    """Truth is the contract: luminance unless a channel is clearly better."""
    light = _dots(np.array([0.05, 0.08, 0.25]), np.full(3, 0.7))
    assert choose_channel(_photographed(light, noise=4, seed=4), SRGB).channel == "luminance"


def test_noise_is_measured_in_luminance() -> None:
    """Truth is symmetry: no channel of noise is clearer than another."""
    for seed in range(4):
        stored = _photographed(np.full((400, 400, 3), 0.3), noise=10, seed=seed)
        assert choose_channel(stored, SRGB).channel == "luminance"


def test_a_clipped_channel_is_left() -> None:
    """Truth is drawn: a warm lamp takes red past the largest value, not green and blue."""
    light = _dots(np.array([1.5, 0.8, 0.6]), np.full(3, 0.2))
    choice = choose_channel(_photographed(light, noise=3, seed=4), SRGB)
    assert choice.channel in ("green", "blue")
    assert "largest value" in choice.reason


def test_where_every_channel_is_clipped_luminance_stays() -> None:
    """Truth is symmetry: white light clips all three alike."""
    light = _dots(np.full(3, 1.5), np.full(3, 0.2))
    assert choose_channel(_photographed(light, noise=3, seed=4), SRGB).channel == "luminance"


@pytest.mark.parametrize("shape", [(1, 1), (1, 300), (2, 2), (5, 700), (193, 193)])
def test_small_pictures_have_a_channel_too(shape: tuple[int, int]) -> None:
    """Truth is the contract: any size is read."""
    stored = np.random.default_rng(4).integers(1, 250, (*shape, 3), dtype=np.uint8)
    assert choose_channel(stored, SRGB).channel in ("luminance", "red", "green", "blue")
    assert choose_channel(stored[..., 0], SRGB).channel == "grey"
    read_picture(files.pillow(Image.fromarray(stored), "PNG"), name="small.png")


def test_the_choice_is_said_and_the_same_each_time() -> None:
    """Truth is symmetry: the same file twice."""
    light = _dots(RED_YARN, _blue_green_as_light_as_red())
    data = files.pillow(Image.fromarray(_photographed(light, noise=4, seed=4)), "PNG")
    first, second = read_picture(data, name="x"), read_picture(data, name="x")
    assert first.channel == second.channel == "red"
    assert has(first.findings, Flag.CHANNEL_CHOSEN)
    assert first.findings == second.findings
