"""Is a picture that is not whole ever measured, and does anything but PictureError come out?"""

from __future__ import annotations

import time

import numpy as np
import picture_files as files
import pytest
from PIL import Image

from imgcover.errors import PictureError
from imgcover.picture.reader import read_picture

RGB = files.grainy(120, 90)
IMAGE = Image.fromarray(RGB)
TURNED = files.exif(orientation=6, x=600.0, y=600.0, unit=2)
SRGB_LIKE = files.profile(*[files.gamma_curve(2.2)] * 3)
WHOLE = {
    "png": files.pillow(IMAGE, "PNG", dpi=(600, 600), icc_profile=SRGB_LIKE, exif=TURNED),
    "png 16": files.opencv(files.deep(), ".png"),
    "png palette": files.pillow(IMAGE.quantize(64), "PNG"),
    "jpeg": files.pillow(IMAGE, "JPEG", exif=TURNED, icc_profile=SRGB_LIKE),
    "jpeg 4:4:4": files.pillow(IMAGE, "JPEG", subsampling=0),
    "jpeg progressive": files.pillow(IMAGE, "JPEG", progressive=True),
    "jpeg restarts": files.pillow(IMAGE, "JPEG", restart_marker_rows=1),
    "jpeg grey": files.pillow(IMAGE.convert("L"), "JPEG"),
    "tiff": files.tiff(RGB),
    "tiff strips": files.tiff(RGB, rowsperstrip=16, compression="lzw", predictor=True),
    "tiff tiles": files.tiff(RGB, tile=(32, 32), compression="zlib"),
    "tiff jpeg": files.tiff(RGB, compression="jpeg"),
    "tiff packbits": files.tiff(np.ascontiguousarray(RGB[..., 0]), compression="packbits"),
    "tiff palette": files.pillow(IMAGE.quantize(32), "TIFF"),
    "tiff pages": files.pillow(IMAGE, "TIFF", save_all=True, append_images=[IMAGE] * 2),
    "tiff pillow": files.pillow(IMAGE, "TIFF", compression="tiff_lzw"),
    "bmp": files.pillow(IMAGE, "BMP"),
    "bmp palette": files.pillow(IMAGE.convert("L"), "BMP"),
    "webp": files.pillow(IMAGE, "WEBP"),
    "webp lossless": files.pillow(IMAGE, "WEBP", lossless=True, exif=TURNED),
}
JPEGS = [kind for kind in WHOLE if kind.startswith("jpeg")]


@pytest.mark.parametrize("kind", WHOLE)
def test_a_truncated_file_is_refused_wherever_it_is_cut(kind: str) -> None:
    """Truth is drawn: whole files, cut at 60 places from the first byte to the last but one.

    A TIFF may end in a few zeros of padding, which hold nothing and are not missed.
    """
    data = WHOLE[kind]
    read_picture(data, name=kind)
    for end in np.linspace(0, len(data.rstrip(b"\0")) - 1, 60).astype(int):
        with pytest.raises(PictureError) as refused:
            read_picture(data[:end], name=kind)
        assert refused.value.where == kind
        assert refused.value.fault and refused.value.remedy


@pytest.mark.parametrize("kind", JPEGS)
@pytest.mark.parametrize("kept", [0.55, 0.7, 0.85, 0.95, 0.97])
def test_a_jpeg_without_its_last_lines_is_refused_though_it_has_an_end(
    kind: str, kept: float
) -> None:
    """Truth is drawn: scan data cut short, the end mark put back, as a broken copy leaves it.

    Pillow, OpenCV and imagecodecs all decode these files, with grey in place of what is missing.
    A cut inside the very last 16 × 16 pixels is not noticed where they are coded in one pass.
    """
    data = WHOLE[kind]
    begin = data.rindex(b"\xff\xda") if "progressive" not in kind else data.index(b"\xff\xda")
    cut = data[: begin + int(kept * (len(data) - begin))] + b"\xff\xd9"
    with pytest.raises(PictureError, match=r"truncated|damaged"):
        read_picture(cut, name=kind)


def test_a_jpeg_whose_restart_marks_skip_is_refused() -> None:
    """Truth is drawn: one stretch between restart marks taken out."""
    data = WHOLE["jpeg restarts"]
    first, second = data.index(b"\xff\xd1"), data.index(b"\xff\xd2")
    with pytest.raises(PictureError, match="a stretch of its scan data is missing"):
        read_picture(data[:first] + data[second:], name="gap.jpg")


def test_a_progressive_jpeg_without_its_last_scan_is_refused() -> None:
    """Truth is drawn: the last scan, which brings the finest detail, taken out whole."""
    data = WHOLE["jpeg progressive"]
    with pytest.raises(PictureError, match="scans are missing"):
        read_picture(data[: data.rindex(b"\xff\xda")] + b"\xff\xd9", name="soft.jpg")


def test_a_flat_grey_jpeg_is_whole() -> None:
    """Truth is drawn: a picture that is really mid grey, as missing blocks would be."""
    for progressive in (False, True):
        flat = Image.new("RGB", (64, 48), (128, 128, 128))
        data = files.pillow(flat, "JPEG", progressive=progressive)
        assert (read_picture(data, name="grey.jpg").stored == 128).all()


@pytest.mark.parametrize("change", ["checksum", "end mark", "data", "order"])
def test_a_png_that_was_altered_is_refused(change: str) -> None:
    """Truth is drawn: one fault each."""
    data = WHOLE["png 16"]
    damaged = {
        "checksum": data[:80] + bytes([data[80] ^ 1]) + data[81:],
        "end mark": data[:-12],
        "data": files.png_of(44, 60, 8, 2, b"\x78\x9c\x03\x00\x00\x00\x00\x01"),
        "order": data[:8] + files.chunk(b"IEND", b"") + data[8:],
    }[change]
    with pytest.raises(PictureError, match="PNG"):
        read_picture(damaged, name="altered.png")


def test_any_damage_is_read_or_refused_quickly_and_quietly(
    capfd: pytest.CaptureFixture[str],
) -> None:
    """Truth is drawn: 1,000 files with flipped bits, false bytes and gaps, seed 4."""
    rng = np.random.default_rng(4)
    read = slowest = 0.0
    for number in range(1000):
        kind = list(WHOLE)[number % len(WHOLE)]
        data = _damage(WHOLE[kind], rng)
        begun = time.perf_counter()
        try:
            read_picture(data, name=kind)
            read += 1
        except PictureError as refused:
            assert len(str(refused).splitlines()) == 1
        slowest = max(slowest, time.perf_counter() - begun)
    assert 0 < read < 700
    assert slowest < 5
    assert capfd.readouterr() == ("", "")


def _damage(data: bytes, rng: np.random.Generator) -> bytes:
    damaged = bytearray(data)
    how = rng.integers(3)
    if how == 2:
        begin = int(rng.integers(len(data)))
        del damaged[begin : begin + int(rng.integers(1, 200))]
        return bytes(damaged)
    reach = len(data) if how == 0 else min(len(data), 400)  # headers hold most of the traps
    for place in rng.integers(reach, size=3):
        damaged[place] = rng.integers(256) if how else damaged[place] ^ (1 << rng.integers(8))
    return bytes(damaged)
