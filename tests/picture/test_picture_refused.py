"""What is no picture, or none that can be measured rightly, is refused by name, with a way on."""

from __future__ import annotations

import os
import struct
import tracemalloc
import zlib
from pathlib import Path

import numpy as np
import picture_files as files
import pytest
from PIL import Image

from imgcover.errors import PictureError
from imgcover.picture.reader import MOST_PIXELS, read_picture

RGB = files.grainy()
GREY = np.ascontiguousarray(RGB[..., 0])
HALF_CLEAR = np.dstack([RGB, GREY])


@pytest.mark.parametrize(
    ("data", "fault"),
    [
        (b"", "empty"),
        (b"these are not the threads\n", "text"),
        ("gewebt, 24 Fäden\n".encode(), "text"),
        (bytes(range(256)), "no picture of a known kind"),
        (files.pillow(Image.fromarray(RGB), "GIF"), "a GIF"),
        (b"%PDF-1.7\n", "a PDF"),
        (b"\0\0\0\x18ftypheic\0\0\0\0", "HEIC"),
        (b"PK\x03\x04....", "ZIP"),
        (b"BM is how this text begins", "text"),
    ],
)
def test_what_is_no_picture_is_named(data: bytes, fault: str) -> None:
    """Truth is drawn: the first bytes that each kind of file begins with."""
    with pytest.raises(PictureError, match=fault) as refused:
        read_picture(data, name="swatch.png")
    assert str(refused.value).startswith("swatch.png: ")


def test_a_place_that_is_no_file_is_named(tmp_path: Path) -> None:
    """Truth is drawn: a missing file, a folder, an empty file, an impossible name."""
    (tmp_path / "empty.png").touch()
    for path, fault in [
        (tmp_path / "none.png", "no such file"),
        (tmp_path, "folder|may not be read"),
        (tmp_path / "empty.png", "empty"),
        (tmp_path / ("n" * 4000), "cannot be opened"),
        (tmp_path / "nul\0.png", "cannot be opened"),
    ]:
        with pytest.raises(PictureError, match=fault):
            read_picture(path, name="place")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no named pipes")
def test_a_pipe_is_refused_and_not_waited_for(tmp_path: Path) -> None:
    """Truth is drawn: a pipe that nobody writes to."""
    os.mkfifo(tmp_path / "pipe.png")
    with pytest.raises(PictureError, match="pipe"):
        read_picture(tmp_path / "pipe.png", name="pipe.png")


def _huge_tiff() -> bytes:
    data = bytearray(files.tiff(GREY))
    for tag, value in ((256, 60_000), (257, 60_000)):
        at = data.index(struct.pack("<H", tag), 8)
        data[at + 2 : at + 12] = struct.pack("<HII", 4, 1, value)
    return bytes(data)


def _huge_bmp() -> bytes:
    data = bytearray(files.pillow(Image.fromarray(RGB), "BMP"))
    data[18:26] = struct.pack("<ii", 60_000, 60_000)
    return bytes(data)


BOMBS = {
    "png": files.png_of(60_000, 60_000, 8, 0, zlib.compress(bytes(10_000_000))),
    "png within the limit": files.png_of(17_000, 17_000, 8, 2, zlib.compress(bytes(10_000))),
    "png of the largest size": files.png_of(2**31 - 1, 2**31 - 1, 8, 2, zlib.compress(b"")),
    "tiff": _huge_tiff(),
    "bmp": _huge_bmp(),
    "png profile": files.with_chunk(
        files.pillow(Image.fromarray(RGB), "PNG"),
        b"iCCP",
        b"swollen\0\0" + zlib.compress(bytes(500_000_000), 9),
    ),
}


@pytest.mark.parametrize("kind", BOMBS)
def test_a_bomb_is_refused_before_it_goes_off(kind: str) -> None:
    """Truth is drawn: a few kilobytes that claim gigabytes; next to no memory is taken."""
    tracemalloc.start()
    with pytest.raises(PictureError):
        read_picture(BOMBS[kind], name=kind)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 20_000_000


def test_the_limit_is_said() -> None:
    """Truth is theory: 17,321 pixels squared are just over 300 million."""
    rows = 17_321
    packed = zlib.compress(bytes(rows * (rows + 1)), 1)
    with pytest.raises(PictureError, match=f"{MOST_PIXELS // 1_000_000} million"):
        read_picture(files.png_of(rows, rows, 8, 0, packed), name="large.png")


@pytest.mark.parametrize(
    ("data", "fault"),
    [
        (files.png_of(0, 9, 8, 0, zlib.compress(b"")), "no pixels"),
        (files.pillow(Image.fromarray(GREY > 99), "PNG"), "two levels"),
        (files.tiff(GREY.astype(np.float16)), "16-bit floating-point"),
        (files.tiff(GREY.astype(np.float32)), "32-bit floating-point"),
        (files.tiff(GREY.astype(np.int16)), "signed"),
        (files.tiff(GREY.astype(np.uint32)), "32 bits a sample"),
        (files.pillow(Image.fromarray(GREY > 99), "TIFF"), "1 bits a sample"),
        (files.pillow(Image.fromarray(RGB).convert("CMYK"), "TIFF"), "not grey or RGB"),
        (files.pillow(Image.fromarray(RGB).convert("LAB"), "TIFF"), "not grey or RGB"),
        (files.tiff(RGB, compression="lzma"), "packed by method"),
        (files.tiff(RGB, subfiletype=1), "preview"),
        (files.pillow(Image.fromarray(RGB).convert("CMYK"), "JPEG"), "4 colour channels"),
        (files.pillow(Image.fromarray(HALF_CLEAR), "PNG"), "transparent"),
        (files.pillow(Image.fromarray(HALF_CLEAR), "WEBP"), "transparent"),
        (files.tiff(HALF_CLEAR, extrasamples=["unassalpha"]), "transparent"),
        (files.pillow(Image.fromarray(HALF_CLEAR[..., 2:]), "PNG"), "transparent"),
        (
            files.pillow(Image.fromarray(RGB).quantize(16), "PNG", transparency=3),
            "transparent",
        ),
        (files.pillow(Image.fromarray(RGB).convert("1"), "BMP"), "1 bits a pixel"),
    ],
)
def test_what_cannot_be_measured_rightly_is_refused(data: bytes, fault: str) -> None:
    """Truth is drawn: one picture of each sort that is not read here."""
    with pytest.raises(PictureError, match=fault) as refused:
        read_picture(data, name="swatch")
    assert refused.value.remedy
