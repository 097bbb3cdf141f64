"""Reads BMP: uncompressed 8-bit palettes, 24-bit and 32-bit colour.

References
----------
Microsoft, "Bitmap Structures" (BITMAPFILEHEADER, BITMAPINFOHEADER, BITMAPV5HEADER).
"""

from __future__ import annotations

import struct

import numpy as np
from numpy.typing import NDArray

from imgcover.picture.exif import positive_pair
from imgcover.picture.header import Header, Stored, damaged, not_read_here
from imgcover.picture.profile import ProfileError, tone_of_profile
from imgcover.tone import Tone

SIGNATURE = b"BM"
HEADER_SIZES = (40, 52, 56, 108, 124)
"""BITMAPINFOHEADER and its successors; the 12-byte one of 1987 is refused."""
BGRA_MASKS = (0x00FF0000, 0x0000FF00, 0x000000FF)
"""Red, green and blue in the byte order nearly every 32-bit bitmap uses."""
EMBEDDED, LINKED = b"DEBM", b"KNIL"
"""bV5CSType values PROFILE_EMBEDDED and PROFILE_LINKED as they lie in the file."""
FILE_HEADER = 14


def read_bmp(data: bytes, name: str) -> Header:
    """Check that a BMP file holds every row it promises, and read what it says.

    Parameters
    ----------
    data : bytes
        The whole file.
    name : str
        What to call it in an error.

    Raises
    ------
    PictureError
        When rows are missing, or the picture is of a sort not read here.
    ProfileError
        When its colour profile cannot be honoured.
    """
    if len(data) < FILE_HEADER + 40:
        raise damaged(name, "the BMP is truncated: its header is cut short")
    claimed, pixels_at, size = struct.unpack_from("<2xI4xII", data)
    if size not in HEADER_SIZES or len(data) < FILE_HEADER + size:
        raise not_read_here(name, "the BMP has a header of an unknown kind")
    width, signed_height, planes, depth, packing = struct.unpack_from("<iiHHI", data, 18)
    x_metre, y_metre, used = struct.unpack_from("<iiI", data, 38)
    height = abs(signed_height)
    if planes != 1 or width < 0:
        raise damaged(name, "the BMP header is malformed")
    if depth not in (8, 24, 32) or packing not in (0, 3) or (packing == 3 and depth != 32):
        raise not_read_here(name, f"the BMP is packed, or has {depth} bits a pixel")
    alpha = depth == 32 and packing == 3 and _alpha_mask(data, size, name) != 0
    stride = (width * depth // 8 + 3) // 4 * 4
    if claimed > len(data) or pixels_at + stride * height > len(data):
        raise damaged(name, "the BMP is truncated: it holds fewer rows than it promises")
    if pixels_at < FILE_HEADER + size:
        raise damaged(name, "the BMP header is malformed")
    palette = _palette(data, size, pixels_at, used, name) if depth == 8 else None
    tone = _profile(data, size)
    return Header(
        kind="BMP",
        width=width,
        height=height,
        bits=8,
        samples=4 if alpha else 3,
        decode=lambda: _decode(
            np.frombuffer(data, np.uint8, stride * height, pixels_at).reshape(height, stride),
            width,
            depth // 8,
            palette,
            alpha=alpha,
            bottom_first=signed_height > 0,
        ),
        dpi=positive_pair(x_metre, y_metre, 0.0254),
        tone=tone,
        tone_from="" if tone is None else "its ICC profile",
    )


def _decode(
    rows: NDArray[np.uint8],
    width: int,
    size: int,
    palette: NDArray[np.uint8] | None,
    *,
    alpha: bool,
    bottom_first: bool,
) -> Stored:
    if bottom_first:
        rows = rows[::-1]
    if palette is not None:
        return palette[rows[:, :width]]
    pixels = rows[:, : width * size].reshape(len(rows), width, size)
    channels = [2, 1, 0, 3] if alpha else [2, 1, 0]
    return np.ascontiguousarray(pixels[..., channels])


def _palette(data: bytes, size: int, pixels_at: int, used: int, name: str) -> NDArray[np.uint8]:
    count = used or 256
    begin = FILE_HEADER + size
    if count > 256 or begin + 4 * count > pixels_at:
        raise damaged(name, "the BMP is damaged: its palette is incomplete")
    palette = np.zeros((256, 3), np.uint8)
    palette[:count] = np.frombuffer(data, np.uint8, 4 * count, begin).reshape(count, 4)[:, 2::-1]
    return palette


def _alpha_mask(data: bytes, size: int, name: str) -> int:
    """Check the colour masks and give the alpha mask, 0 when the header knows none."""
    begin = FILE_HEADER + 40
    if len(data) < begin + 16 or struct.unpack_from("<III", data, begin) != BGRA_MASKS:
        raise not_read_here(name, "the BMP has an unusual order of colours")
    return int(struct.unpack_from("<I", data, begin + 12)[0]) if size >= 56 else 0


def _profile(data: bytes, size: int) -> Tone | None:
    if size != 124:
        return None
    kind = data[FILE_HEADER + 56 : FILE_HEADER + 60]
    at, length = struct.unpack_from("<II", data, FILE_HEADER + 112)
    if kind == LINKED:
        raise ProfileError("is only a link to another file")
    return tone_of_profile(data[FILE_HEADER + at :][:length]) if kind == EMBEDDED else None


__all__ = ["SIGNATURE", "read_bmp"]
