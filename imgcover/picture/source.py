"""Fetches the bytes of a picture, and says by its content which kind of file it is."""

from __future__ import annotations

import os
import stat
from collections.abc import Callable
from pathlib import Path

from imgcover.errors import PictureError
from imgcover.picture import bmp, jpeg, png, tiff, webp
from imgcover.picture.header import SAVE_PLAIN, Header
from imgcover.picture.profile import ProfileError

MOST_BYTES = 2 << 30
"""The largest picture accepted, 300 million pixels of 16-bit RGB, takes 1.8 GB uncompressed."""
OTHER_KINDS = (
    (0, b"GIF8", "a GIF"),
    (0, b"%PDF", "a PDF document"),
    (0, b"8BPS", "a Photoshop document"),
    (4, b"ftyp", "an HEIC, AVIF or video file"),
    (0, b"\0\0\0\x0cjP  ", "a JPEG 2000 file"),
    (0, b"\xff\x4f\xff\x51", "a JPEG 2000 file"),
    (0, b"\xff\x0a", "a JPEG XL file"),
    (0, b"\0\0\0\x0cJXL ", "a JPEG XL file"),
    (0, b"PK\x03\x04", "a ZIP archive or office document"),
    (0, b"\x1f\x8b", "a gzip archive"),
    (0, b"\x76\x2f\x31\x01", "an OpenEXR file"),
    (0, b"SIMPLE  =", "a FITS file"),
    (0, b"II\x1a\0\0\0HEAPCCDR", "a camera's raw file"),
    (0, b"FUJIFILM", "a camera's raw file"),
)
"""Place, mark and name of kinds that are recognised only to be refused by name."""
SUFFIXES = {
    "PNG": (".png", ".apng"),
    "JPEG": (".jpg", ".jpeg", ".jpe", ".jfif"),
    "TIFF": (".tif", ".tiff", ".btf", ".tf8"),
    "BMP": (".bmp", ".dib"),
    "WebP": (".webp",),
}
"""What each kind of file is usually called."""


def fetch(source: Path, name: str) -> bytes:
    """Read a regular file; nothing else is waited for or followed.

    Raises
    ------
    PictureError
        When there is no such file, it may not be read, is empty, too large, or no regular file.
    """
    try:
        # a pipe without a writer would block for ever
        handle = os.open(source, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0))
    except FileNotFoundError as error:
        raise PictureError(name, "there is no such file", "check the path") from error
    except PermissionError as error:
        raise PictureError(
            name, "the file may not be read", "check that it is a file and its permissions"
        ) from error
    except (OSError, ValueError) as error:
        said = getattr(error, "strerror", None) or str(error)
        raise PictureError(name, f"the file cannot be opened ({said})", "check the path") from error
    try:
        with os.fdopen(handle, "rb") as file:
            status = os.fstat(file.fileno())
            _check_regular(status.st_mode, name)
            if status.st_size > MOST_BYTES:
                raise PictureError(name, "the file is larger than 2 GiB", "crop the picture")
            return file.read(MOST_BYTES)
    except OSError as error:
        said = error.strerror or str(error)
        raise PictureError(
            name, f"the file cannot be read ({said})", "check that it is a file, not a folder"
        ) from error


def _check_regular(mode: int, name: str) -> None:
    if stat.S_ISDIR(mode):
        raise PictureError(name, "it is a folder, not a picture", "name the pictures in it")
    if not stat.S_ISREG(mode):
        raise PictureError(
            name, "it is a pipe or a device, not a file", "give a file, or - for standard input"
        )


def read_header(data: bytes, name: str) -> Header:
    """Find out by its content which kind of picture the data are, and read their header.

    Raises
    ------
    PictureError
        When they are empty, no picture, not whole, or a picture of a sort not read here.
    """
    reader = _reader(data)
    if reader is not None:
        try:
            return reader(data, name)
        except ProfileError as fault:
            raise PictureError(
                name,
                f"the embedded colour profile {fault}",
                "convert the picture to sRGB, or save it without the profile and say --tone",
            ) from fault
    if not data:
        raise PictureError(name, "the file is empty", "scan or export it again")
    for at, mark, told in OTHER_KINDS:
        if data[at:].startswith(mark) if at == 0 else data[at : at + len(mark)] == mark:
            raise PictureError(name, f"it is {told}, which is not read here", SAVE_PLAIN)
    told = "text" if _is_text(data[:512]) else "no picture of a known kind"
    raise PictureError(
        name, f"the file holds {told}", "give a PNG, JPEG, TIFF, BMP or WebP picture"
    )


def _reader(data: bytes) -> Callable[[bytes, str], Header] | None:
    if data.startswith(png.SIGNATURE):
        return png.read_png
    if data.startswith(jpeg.SIGNATURE):
        return jpeg.read_jpeg
    if data.startswith(tiff.SIGNATURES):
        return tiff.read_tiff
    if webp.is_webp(data):
        return webp.read_webp
    if data.startswith(bmp.SIGNATURE) and data[6:10] == b"\0\0\0\0":
        return bmp.read_bmp
    return None


def _is_text(sample: bytes) -> bool:
    try:
        text = sample.decode("utf-8", errors="strict" if len(sample) < 512 else "ignore")
    except UnicodeDecodeError:
        return False
    return all(each.isprintable() or each in "\r\n\t" for each in text)


def is_misnamed(name: str, kind: str) -> bool:
    """Whether a file's suffix belongs to another kind of picture than its content.

    Examples
    --------
    >>> is_misnamed("swatch.JPG", "PNG"), is_misnamed("swatch", "PNG")
    (True, False)
    """
    suffix = Path(name).suffix.lower()
    usual = {each for suffixes in SUFFIXES.values() for each in suffixes}
    return suffix in usual and suffix not in SUFFIXES[kind]


__all__ = ["fetch", "is_misnamed", "read_header"]
