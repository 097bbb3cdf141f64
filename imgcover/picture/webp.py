"""Reads WebP: the RIFF frame is walked to its end before a pixel is decoded.

References
----------
WebP container specification (RFC 9649).
"""

from __future__ import annotations

import struct

import imagecodecs

from imgcover.findings import Finding, Flag, found
from imgcover.picture.exif import read_exif
from imgcover.picture.header import Header, Stored, damaged, through_codec
from imgcover.picture.profile import tone_of_profile
from imgcover.tone import Tone

HAS_ALPHA, IS_ANIMATED = 0x10, 0x02
"""Bits of the VP8X flags (RFC 9649, 2.7)."""


def is_webp(data: bytes) -> bool:
    """Whether the data begin as a WebP file does."""
    return data[:4] == b"RIFF" and data[8:12] == b"WEBP"


def read_webp(data: bytes, name: str) -> Header:
    """Check a WebP file to its promised end, and read what it says.

    Parameters
    ----------
    data : bytes
        The whole file.
    name : str
        What to call it in an error.

    Raises
    ------
    PictureError
        When the file is cut short or damaged.
    ProfileError
        When its colour profile cannot be honoured.
    """
    chunks = _walk(data, name)
    width, height, alpha, animated = _canvas(chunks, name)
    exif = read_exif(chunks.get(b"EXIF", b""))
    tone, tone_from = _profile(chunks)
    if tone is None and exif.tone is not None:
        tone, tone_from = exif.tone, "its EXIF colour space"
    first: tuple[Finding, ...] = (found(Flag.FIRST_PAGE_ONLY),) if animated else ()
    return Header(
        kind="WebP",
        width=width,
        height=height,
        bits=8,
        samples=4 if alpha else 3,
        decode=lambda: _decode(data, name, alpha=alpha),
        orientation=exif.orientation,
        dpi=exif.dpi,
        tone=tone,
        tone_from=tone_from,
        findings=(*exif.findings, *first),
    )


def _walk(data: bytes, name: str) -> dict[bytes, bytes]:
    """Collect the first chunk of each kind; every one must lie inside the file."""
    promised = int.from_bytes(data[4:8], "little") + 8
    if promised > len(data):
        raise damaged(name, "the WebP is truncated: it is shorter than it promises")
    chunks: dict[bytes, bytes] = {}
    at = 12
    while at + 8 <= promised:
        kind, size = struct.unpack_from("<4sI", data, at)
        if at + 8 + size > promised:
            raise damaged(name, "the WebP is truncated: a chunk goes on past its end")
        chunks.setdefault(kind, data[at + 8 : at + 8 + size])
        at += 8 + size + size % 2
    return chunks


def _canvas(chunks: dict[bytes, bytes], name: str) -> tuple[int, int, bool, bool]:
    """Give width, height, whether there is alpha, and whether the picture moves."""
    if head := chunks.get(b"VP8X"):
        if len(head) < 10:
            raise damaged(name, "the WebP header is malformed")
        width = 1 + int.from_bytes(head[4:7], "little")
        height = 1 + int.from_bytes(head[7:10], "little")
        return width, height, bool(head[0] & HAS_ALPHA), bool(head[0] & IS_ANIMATED)
    if (head := chunks.get(b"VP8L")) and len(head) >= 5 and head[0] == 0x2F:
        (fields,) = struct.unpack_from("<I", head, 1)
        return 1 + (fields & 0x3FFF), 1 + (fields >> 14 & 0x3FFF), bool(fields >> 28 & 1), False
    if (head := chunks.get(b"VP8 ")) and head[3:6] == b"\x9d\x01\x2a" and len(head) >= 10:
        width, height = struct.unpack_from("<HH", head, 6)
        return width & 0x3FFF, height & 0x3FFF, False, False
    raise damaged(name, "the WebP holds no picture")


def _profile(chunks: dict[bytes, bytes]) -> tuple[Tone | None, str]:
    if b"ICCP" not in chunks:
        return None, ""
    return tone_of_profile(chunks[b"ICCP"]), "its ICC profile"


def _decode(data: bytes, name: str, *, alpha: bool) -> Stored:
    array: Stored = through_codec(
        name, "WebP", lambda: imagecodecs.webp_decode(data, hasalpha=alpha)
    )
    return array


__all__ = ["is_webp", "read_webp"]
