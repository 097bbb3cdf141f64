"""Does a picture give linear light, block means, hashes and clipped shares as they are defined?"""

from __future__ import annotations

import hashlib
from dataclasses import replace

import numpy as np
import picture_files as files
import pytest
from numpy.typing import NDArray
from PIL import Image

from imgcover.findings import Flag, has
from imgcover.picture.picture import Channel, Picture
from imgcover.picture.reader import read_picture
from imgcover.tone import LINEAR, SRGB, Tone

RGB = files.grainy(613, 401)
WEIGHTS = (0.2126, 0.7152, 0.0722)
TONES = [SRGB, LINEAR, Tone("gamma", 2.2)]


def _read(array: NDArray[np.generic], tone: Tone | None = None) -> Picture:
    return read_picture(files.tiff(array), name="swatch.tif", tone=tone)


def _light(picture: Picture) -> NDArray[np.float64]:
    """Linear light by its definition, in double precision and whole."""
    top = np.iinfo(picture.stored.dtype).max
    light = picture.tone.to_linear(picture.stored / top)
    if picture.channel == "luminance":
        return light @ np.array(WEIGHTS)
    if picture.channel == "grey":
        return light
    return light[..., ["red", "green", "blue"].index(picture.channel)]


@pytest.mark.parametrize("tone", TONES)
@pytest.mark.parametrize("channel", ["luminance", "red", "green", "blue"])
@pytest.mark.parametrize("depth", [8, 16])
def test_light_is_what_the_curve_says(tone: Tone, channel: Channel, depth: int) -> None:
    """Truth is theory: the curve in double precision; 1e-6 is what float32 leaves of it."""
    array = RGB if depth == 8 else files.deep(301, 203)
    picture = replace(_read(array, tone), channel=channel)
    light = picture.light()
    assert light.dtype == np.float32
    np.testing.assert_allclose(light, _light(picture), rtol=0, atol=1e-6)


def test_a_window_is_a_part_of_the_whole() -> None:
    """Truth is symmetry: the window of the light is the light of the window."""
    for array in (RGB, np.ascontiguousarray(RGB[..., 0]), files.deep(90, 70)):
        picture = _read(array)
        window = np.s_[17:83, 5:64]
        np.testing.assert_array_equal(picture.light(window), picture.light()[window])
        assert picture.light(np.s_[3:3, 5:9]).shape == (0, 4)


@pytest.mark.parametrize("factor", [1, 2, 7, 16, 400])
@pytest.mark.parametrize("depth", [8, 16])
def test_coarse_is_the_mean_of_each_block(factor: int, depth: int) -> None:
    """Truth is theory: means of light, not of stored values; 1e-6 is what float32 leaves."""
    picture = _read(RGB if depth == 8 else RGB.astype(np.uint16) * 257)
    rows, columns = picture.rows // factor, picture.columns // factor
    blocks = _light(picture)[: rows * factor, : columns * factor]
    means = blocks.reshape(rows, factor, columns, factor).mean(axis=(1, 3))
    coarse = picture.coarse(factor)
    assert coarse.dtype == np.float32
    np.testing.assert_allclose(coarse, means, rtol=0, atol=1e-6)


@pytest.mark.parametrize("factor", [0, -3, 402])
def test_a_factor_that_leaves_nothing_is_a_wrong_call(factor: int) -> None:
    """Truth is the contract: at least one block."""
    with pytest.raises(ValueError, match="factor must be 1 to 401"):
        _read(RGB).coarse(factor)


def test_hashes_are_of_file_and_pixels() -> None:
    """Truth is theory: SHA-256 of the bytes as the docstring lays them out."""
    data = files.pillow(Image.fromarray(RGB), "PNG")
    picture = read_picture(data, name="x")
    assert picture.sha256 == hashlib.sha256(data).hexdigest()
    laid = b"613x401x3 uint8\n" + RGB.tobytes()
    assert picture.pixels_sha256 == hashlib.sha256(laid).hexdigest()
    deep = files.deep()
    laid = b"60x44x3 uint16\n" + deep.astype("<u2").tobytes()
    assert _read(deep).pixels_sha256 == hashlib.sha256(laid).hexdigest()


def test_the_same_pixels_in_other_files_have_the_same_hash() -> None:
    """Truth is symmetry: PNG, TIFF, BMP, and PNG with an alpha that hides nothing."""
    opaque = np.dstack([RGB, np.full(RGB.shape[:2], 255, np.uint8)])
    hashes = {
        read_picture(data, name="x").pixels_sha256
        for data in (
            files.pillow(Image.fromarray(RGB), "PNG"),
            files.tiff(RGB, compression="lzw"),
            files.pillow(Image.fromarray(RGB), "BMP"),
            files.pillow(Image.fromarray(opaque), "PNG"),
        )
    }
    assert len(hashes) == 1


@pytest.mark.parametrize("dtype", [np.uint8, np.uint16])
def test_clipped_shares_of_grey(dtype: type) -> None:
    """Truth is drawn: 3 % at the bottom, 7 % at the top, the rest one level inside."""
    top = np.iinfo(dtype).max
    grey = np.full(10_000, top - 1, dtype)
    grey[:5000], grey[:300], grey[-700:] = 1, 0, top
    picture = _read(np.random.default_rng(4).permutation(grey).reshape(100, 100))
    assert picture.clipped_low == pytest.approx(0.03)
    assert picture.clipped_high == pytest.approx(0.07)
    assert has(picture.findings, Flag.CLIPPED_LIGHT)
    assert has(picture.findings, Flag.CLIPPED_DARK)


def test_clipped_shares_of_colour() -> None:
    """Truth is drawn: luminance is lost with any colour at the top, dark with all at the bottom."""
    colour = np.full((100, 100, 3), 100, np.uint8)
    colour[10, :, 2] = 255  # one row: blue alone at the top
    colour[20:40, :, 0] = 0  # twenty rows: red alone at the bottom
    colour[50:53] = 0  # three rows: all at the bottom
    picture = _read(colour)
    assert picture.channel == "luminance"
    assert (picture.clipped_low, picture.clipped_high) == pytest.approx((0.03, 0.01))


@pytest.mark.parametrize(("bits", "shift"), [(12, 0), (12, 4), (14, 2), (10, 0), (8, 8)])
def test_a_saturated_converter_clips_below_the_files_largest_value(bits: int, shift: int) -> None:
    """Truth is drawn: 5 % at the end of a 12-bit camera, in a 16-bit file."""
    values = np.random.default_rng(4).integers(1, (1 << bits) - 1, 10_000, dtype=np.uint16)
    values[:500] = (1 << bits) - 1
    picture = _read((values << shift).reshape(100, 100))
    assert picture.clipped_high == pytest.approx(0.05)


def test_clipped_shares_of_one_channel_are_its_own() -> None:
    """Truth is drawn: red at the top sends the picture to green, which is dark in three rows."""
    colour = np.full((100, 100, 3), (100, 110, 100), np.uint8)
    colour[:30, :, 0] = 255
    colour[::2, :, 1] = 90  # rows that only green tells apart
    colour[51:54, :, 1] = 0
    picture = _read(colour)
    assert picture.channel == "green"
    assert (picture.clipped_low, picture.clipped_high) == pytest.approx((0.03, 0.0))


def test_a_clean_picture_has_no_findings_of_clipping() -> None:
    """Truth is drawn: nothing at either end."""
    picture = _read(np.clip(RGB, 1, 254))
    assert (picture.clipped_low, picture.clipped_high) == (0, 0)
    assert not has(picture.findings, Flag.CLIPPED_LIGHT)
    assert not has(picture.findings, Flag.CLIPPED_DARK)
