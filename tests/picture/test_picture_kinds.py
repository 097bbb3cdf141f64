"""Does every kind of file come out as it was written, at its full depth?"""

from __future__ import annotations

import io
from pathlib import Path

import cv2
import numpy as np
import picture_files as files
import pytest
import tifffile
from PIL import Image

from imgcover.findings import Flag, has
from imgcover.picture.reader import read_picture

RGB = files.grainy()
GREY = np.ascontiguousarray(RGB[..., 1])
DEEP = files.deep()
DEEP_GREY = np.ascontiguousarray(DEEP[..., 1])
OPAQUE = np.dstack([RGB, np.full(RGB.shape[:2], 255, np.uint8)])
TILED = {"tile": (32, 16)}

LOSSLESS = {
    "png": (files.pillow(Image.fromarray(RGB), "PNG"), RGB),
    "png grey": (files.pillow(Image.fromarray(GREY), "PNG"), GREY),
    "png alpha": (files.pillow(Image.fromarray(OPAQUE), "PNG"), RGB),
    "png 16": (files.opencv(DEEP, ".png"), DEEP),
    "png 16 grey": (files.opencv(DEEP_GREY, ".png"), DEEP_GREY),
    "bmp": (files.pillow(Image.fromarray(RGB), "BMP"), RGB),
    "bmp grey": (files.pillow(Image.fromarray(GREY), "BMP"), GREY),
    "bmp odd width": (files.pillow(Image.fromarray(RGB[:, :43]), "BMP"), RGB[:, :43]),
    "bmp opencv": (files.opencv(RGB, ".bmp"), RGB),
    "webp": (files.pillow(Image.fromarray(RGB), "WEBP", lossless=True), RGB),
    "webp alpha": (files.pillow(Image.fromarray(OPAQUE), "WEBP", lossless=True, exact=True), RGB),
    "tiff": (files.tiff(RGB), RGB),
    "tiff strips": (files.tiff(RGB, rowsperstrip=7), RGB),
    "tiff grey": (files.tiff(GREY), GREY),
    "tiff 16": (files.tiff(DEEP), DEEP),
    "tiff big": (files.tiff(DEEP, bigtiff=True), DEEP),
    "tiff big-endian": (files.tiff(DEEP, byteorder=">"), DEEP),
    "tiff lzw": (files.tiff(DEEP, compression="lzw", rowsperstrip=9), DEEP),
    "tiff lzw predictor": (files.tiff(DEEP, compression="lzw", predictor=True), DEEP),
    "tiff lzw 8": (files.tiff(RGB, compression="lzw", predictor=True, rowsperstrip=9), RGB),
    "tiff swapped predictor": (
        files.tiff(DEEP, byteorder=">", compression="zlib", predictor=True),
        DEEP,
    ),
    "tiff deflate tiles": (files.tiff(DEEP, compression="zlib", **TILED), DEEP),
    "tiff tiles": (files.tiff(RGB, **TILED), RGB),
    "tiff packbits": (files.tiff(RGB, compression="packbits"), RGB),
    "tiff zstd": (files.tiff(RGB, compression="zstd"), RGB),
    "tiff planes": (files.tiff(np.moveaxis(DEEP, 2, 0), planarconfig="separate"), DEEP),
    "tiff white is zero": (files.tiff(GREY, photometric="miniswhite"), 255 - GREY),
    "tiff alpha": (files.tiff(OPAQUE, extrasamples=["unassalpha"]), RGB),
    "tiff pillow": (files.pillow(Image.fromarray(RGB), "TIFF", compression="tiff_lzw"), RGB),
    "tiff pillow grey 16": (files.pillow(Image.fromarray(DEEP_GREY), "TIFF"), DEEP_GREY),
    "tiff opencv": (files.opencv(DEEP, ".tif"), DEEP),
}


@pytest.mark.parametrize("kind", LOSSLESS)
def test_a_lossless_file_gives_back_what_was_written(kind: str) -> None:
    """Truth is drawn: the array that Pillow, OpenCV or tifffile was given, seed 4."""
    data, written = LOSSLESS[kind]
    picture = read_picture(data, name=kind)
    assert picture.stored.dtype == written.dtype
    assert picture.bits == 8 * written.dtype.itemsize
    np.testing.assert_array_equal(picture.stored, written)


@pytest.mark.parametrize("colours", [4, 16, 200])
@pytest.mark.parametrize("kind", ["PNG", "TIFF", "BMP"])
def test_a_palette_is_looked_up(kind: str, colours: int) -> None:
    """Truth is a referee: Pillow's own conversion of the palette picture to RGB."""
    palette = Image.fromarray(RGB).quantize(colours)
    options = {"bits": 8} if kind == "PNG" else {}
    picture = read_picture(files.pillow(palette, kind, **options), name="palette")
    np.testing.assert_array_equal(picture.stored, np.asarray(palette.convert("RGB")))


@pytest.mark.parametrize("bits", [2, 4])
def test_a_shallow_palette_is_looked_up(bits: int) -> None:
    """Truth is a referee: Pillow's own conversion."""
    palette = Image.fromarray(RGB).quantize(1 << bits)
    picture = read_picture(files.pillow(palette, "PNG", bits=bits), name="palette")
    np.testing.assert_array_equal(picture.stored, np.asarray(palette.convert("RGB")))


def test_a_tiff_palette_of_16_bits_keeps_them() -> None:
    """Truth is drawn: a palette whose entries need 16 bits."""
    colours = np.random.default_rng(4).integers(0, 65536, (3, 256), dtype=np.uint16)
    data = files.tiff(GREY, photometric="palette", colormap=colours)
    picture = read_picture(data, name="palette")
    assert picture.bits == 16
    np.testing.assert_array_equal(picture.stored, colours.T[GREY])


JPEGS = {
    "4:2:0": files.pillow(Image.fromarray(RGB), "JPEG"),
    "4:4:4": files.pillow(Image.fromarray(RGB), "JPEG", subsampling=0),
    "progressive": files.pillow(Image.fromarray(RGB), "JPEG", progressive=True),
    "restarts": files.pillow(Image.fromarray(RGB), "JPEG", restart_marker_rows=1),
    "restarts in rows": files.pillow(Image.fromarray(RGB), "JPEG", restart_marker_blocks=2),
    "grey": files.pillow(Image.fromarray(GREY), "JPEG"),
    "rgb": files.pillow(Image.fromarray(RGB), "JPEG", keep_rgb=True),
    "opencv": files.opencv(RGB, ".jpg"),
    "tail": files.pillow(Image.fromarray(RGB), "JPEG") + b"what a telephone adds",
}


@pytest.mark.parametrize("kind", JPEGS)
def test_a_jpeg_decodes_as_two_referees_decode_it(kind: str) -> None:
    """Truth is a referee: Pillow to the digit, OpenCV within one level."""
    picture = read_picture(JPEGS[kind], name=kind)
    pillow = np.asarray(Image.open(io.BytesIO(JPEGS[kind])))
    np.testing.assert_array_equal(picture.stored, pillow)
    opencv = cv2.imdecode(np.frombuffer(JPEGS[kind], np.uint8), cv2.IMREAD_UNCHANGED)
    opencv = opencv[..., ::-1] if opencv.ndim == 3 else opencv
    np.testing.assert_allclose(picture.stored.astype(int), opencv.astype(int), atol=1)


@pytest.mark.parametrize("options", [{}, TILED, {"rowsperstrip": 16}])
def test_jpeg_inside_tiff(options: dict[str, object]) -> None:
    """Truth is a referee: tifffile's own decoding of its file."""
    data = files.tiff(RGB, compression="jpeg", **options)
    picture = read_picture(data, name="jpeg in tiff")
    np.testing.assert_array_equal(picture.stored, tifffile.imread(io.BytesIO(data)))


def test_lossy_webp_decodes_as_a_referee_decodes_it() -> None:
    """Truth is a referee: Pillow."""
    data = files.pillow(Image.fromarray(RGB), "WEBP", quality=70)
    pillow = np.asarray(Image.open(io.BytesIO(data)))
    np.testing.assert_array_equal(read_picture(data, name="w").stored, pillow)


def test_only_the_first_page_is_read_and_it_is_said() -> None:
    """Truth is drawn: three pages that differ."""
    pages = np.stack([RGB, 255 - RGB, RGB // 2])
    picture = read_picture(files.tiff(pages), name="pages.tif")
    np.testing.assert_array_equal(picture.stored, RGB)
    assert any("3 pages" in finding.message for finding in picture.findings)
    assert not has(read_picture(files.tiff(RGB), name="one.tif").findings, Flag.FIRST_PAGE_ONLY)


def test_the_first_frame_of_a_moving_png_is_read_and_it_is_said() -> None:
    """Truth is drawn: two frames that differ."""
    frames = [Image.fromarray(RGB), Image.fromarray(255 - RGB)]
    data = files.pillow(frames[0], "PNG", save_all=True, append_images=frames[1:])
    picture = read_picture(data, name="moving.png")
    np.testing.assert_array_equal(picture.stored, RGB)
    assert has(picture.findings, Flag.FIRST_PAGE_ONLY)


@pytest.mark.parametrize("name", ["swatch.jpg", "swatch.TIFF", "swatch.bmp"])
def test_a_misnamed_picture_is_read_by_its_content(name: str, tmp_path: Path) -> None:
    """Truth is drawn: a PNG under another suffix."""
    path = tmp_path / name
    path.write_bytes(files.pillow(Image.fromarray(RGB), "PNG"))
    picture = read_picture(path, name=name)
    np.testing.assert_array_equal(picture.stored, RGB)
    assert has(picture.findings, Flag.MISNAMED_PICTURE)


def test_grey_saved_as_colour_is_grey_again() -> None:
    """Truth is symmetry: three equal channels are one."""
    data = files.pillow(Image.fromarray(np.dstack([GREY] * 3)), "PNG")
    picture = read_picture(data, name="grey.png")
    assert picture.channel == "grey"
    np.testing.assert_array_equal(picture.stored, GREY)
