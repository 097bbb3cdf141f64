"""Reads PNG: every chunk is checked before a pixel is decoded.

References
----------
Portable Network Graphics, third edition (W3C, 2025).
"""

from __future__ import annotations

import struct
import zlib
from dataclasses import dataclass

import imagecodecs

from imgcover.findings import Finding, Flag, found
from imgcover.picture.exif import one_dpi, positive_pair, read_exif
from imgcover.picture.header import Header, Stored, damaged, not_read_here, through_codec
from imgcover.picture.profile import ProfileError, tone_of_profile
from imgcover.tone import HIGHEST_GAMMA, LINEAR, LOWEST_GAMMA, SRGB, Tone

SIGNATURE = b"\x89PNG\r\n\x1a\n"
DEPTHS = {0: (1, 2, 4, 8, 16), 2: (8, 16), 3: (1, 2, 4, 8), 4: (8, 16), 6: (8, 16)}
"""Bit depths each colour type allows (table 8)."""
SAMPLES = {0: 1, 2: 3, 3: 3, 4: 2, 6: 4}
"""Decoded values a pixel of each colour type; a palette is looked up into RGB."""
CRITICAL = {b"IHDR", b"PLTE", b"IDAT", b"IEND"}
"""Chunks a reader must understand (5.3)."""
DEFLATE_LIMIT = 1032
"""Deflate cannot pack tighter than this many to one (zlib technical notes)."""
PROFILE_LIMIT = 4 << 20
"""No tone curve needs a larger profile; a compressed one could swell to gigabytes."""
CICP_TONES = {1: None, 4: Tone("gamma", 2.2), 5: Tone("gamma", 2.8), 8: LINEAR, 13: SRGB}
"""Transfer characteristics of ITU-T H.273, table 3; 1 (a video curve) and the rest are refused."""


@dataclass(frozen=True, slots=True)
class _Chunks:
    """First place of each chunk kind, and how much image data there is."""

    places: dict[bytes, tuple[int, int]]
    image_bytes: int
    data: bytes

    def get(self, kind: bytes) -> bytes:
        begin, end = self.places.get(kind, (0, 0))
        return self.data[begin:end]


def read_png(data: bytes, name: str) -> Header:
    """Check a PNG file from its first chunk to its last, and read what it says.

    Parameters
    ----------
    data : bytes
        The whole file.
    name : str
        What to call it in an error.

    Raises
    ------
    PictureError
        When a chunk is missing, cut short or altered, or the picture is of a sort not read here.
    ProfileError
        When its colour profile cannot be honoured.
    """
    chunks = _walk(data, name)
    head = chunks.get(b"IHDR")
    if len(head) != 13:
        raise damaged(name, "the PNG header is malformed")
    width, height, depth, colour, packing, filtering, interlace = struct.unpack(">IIBBBBB", head)
    if depth not in DEPTHS.get(colour, ()) or packing or filtering or interlace > 1:
        raise damaged(name, "the PNG header is malformed")
    if depth == 1:
        raise not_read_here(name, "the picture has only two levels, and the cloth's own are lost")
    has_key = b"tRNS" in chunks.places
    samples = SAMPLES[colour] + (1 if has_key and colour in (0, 2, 3) else 0)
    raw_bytes = height * (1 + width * depth * (1 if colour == 3 else SAMPLES[colour]) // 8)
    if chunks.image_bytes * DEFLATE_LIMIT < raw_bytes:
        raise damaged(name, f"the PNG claims {width} × {height} pixels but holds far fewer")
    exif = read_exif(chunks.get(b"eXIf"))
    dpi, contradiction = one_dpi(_physical(chunks), exif.dpi)
    tone, tone_from = _tone(chunks, name)
    if tone is None and exif.tone is not None:
        tone, tone_from = exif.tone, "its EXIF colour space"
    return Header(
        kind="PNG",
        width=width,
        height=height,
        bits=16 if depth == 16 else 8,
        samples=samples,
        decode=lambda: _decode(data, name),
        orientation=exif.orientation,
        dpi=dpi,
        tone=tone,
        tone_from=tone_from,
        findings=(*exif.findings, *contradiction, *_animation(chunks)),
    )


def _walk(data: bytes, name: str) -> _Chunks:
    """Go from chunk to chunk, hold each against its checksum, and stop at the end mark."""
    view = memoryview(data)
    places: dict[bytes, tuple[int, int]] = {}
    image_bytes, at = 0, len(SIGNATURE)
    while at + 12 <= len(data):
        (size,) = struct.unpack_from(">I", data, at)
        kind, begin, end = data[at + 4 : at + 8], at + 8, at + 8 + size
        if end + 4 > len(data):
            break
        if zlib.crc32(view[at + 4 : end]) != struct.unpack_from(">I", data, end)[0]:
            raise damaged(name, f"the PNG is damaged: a {_told(kind)} chunk fails its checksum")
        if kind[0] & 0x20 == 0 and kind not in CRITICAL:
            raise not_read_here(name, f"the PNG needs an unknown {_told(kind)} chunk")
        if not places and kind != b"IHDR":
            raise damaged(name, "the PNG does not begin with its header")
        places.setdefault(kind, (begin, end))
        image_bytes += size if kind == b"IDAT" else 0
        if kind == b"IEND":
            return _Chunks(places, image_bytes, data)
        at = end + 4
    raise damaged(name, "the PNG is truncated: it stops before its end mark")


def _told(kind: bytes) -> str:
    return kind.decode("ascii") if kind.isalpha() else "nameless"


def _decode(data: bytes, name: str) -> Stored:
    array: Stored = through_codec(name, "PNG", lambda: imagecodecs.png_decode(data))
    return array


def _physical(chunks: _Chunks) -> tuple[float, float] | None:
    """Pixels a metre as dots an inch (11.3.4.3)."""
    block = chunks.get(b"pHYs")
    if len(block) != 9 or block[8] != 1:
        return None
    x, y = struct.unpack_from(">II", block)
    return positive_pair(x, y, 0.0254)


def _animation(chunks: _Chunks) -> tuple[Finding, ...]:
    return (found(Flag.FIRST_PAGE_ONLY),) if b"acTL" in chunks.places else ()


def _tone(chunks: _Chunks, name: str) -> tuple[Tone | None, str]:
    """Find the claimed curve: cICP before iCCP before sRGB before gAMA (table 5.3)."""
    if block := chunks.get(b"cICP"):
        tone = CICP_TONES.get(block[1]) if len(block) == 4 else None
        if tone is None:
            raise not_read_here(name, "the PNG states a video tone curve")
        return tone, "its cICP chunk"
    if block := chunks.get(b"iCCP"):
        return tone_of_profile(_unpacked(block)), "its ICC profile"
    if b"sRGB" in chunks.places:
        return SRGB, "its sRGB chunk"
    block = chunks.get(b"gAMA")
    if len(block) != 4:
        return None, ""
    (stored,) = struct.unpack(">I", block)
    if stored in range(45000, 46001):  # 1/2.2: what writers of sRGB put here
        return SRGB, "its gAMA chunk"
    gamma = 100000 / stored if stored else 0.0
    if not LOWEST_GAMMA <= gamma <= HIGHEST_GAMMA:
        raise not_read_here(name, f"the PNG states a gamma of {stored}/100000")
    return (LINEAR if stored == 100000 else Tone("gamma", round(gamma, 4))), "its gAMA chunk"


def _unpacked(block: bytes) -> bytes:
    _, mark, packed = block.partition(b"\0")
    if not mark or packed[:1] != b"\0":
        raise ProfileError("is damaged")
    try:
        return zlib.decompressobj().decompress(packed[1:], PROFILE_LIMIT)
    except zlib.error as error:
        raise ProfileError("is damaged") from error


__all__ = ["SIGNATURE", "read_png"]
