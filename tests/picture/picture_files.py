"""Picture files for the tests of the picture room, written by libraries the room does not use.

Pillow, OpenCV and tifffile write; `imgcover.picture` reads. Chunks and profiles that none of them
writes are put together here, byte by byte.
"""

from __future__ import annotations

import io
import struct
import zlib
from typing import Any

import cv2
import numpy as np
import tifffile
from numpy.typing import NDArray
from PIL import Image


def grainy(rows: int = 60, columns: int = 44, *, seed: int = 4) -> NDArray[np.uint8]:
    """RGB of smooth grain, no two rows, columns or channels alike."""
    noise = np.random.default_rng(seed).integers(0, 256, (rows, columns, 3), dtype=np.uint8)
    return cv2.GaussianBlur(noise, (0, 0), 1.0)


def deep(rows: int = 60, columns: int = 44, *, seed: int = 4) -> NDArray[np.uint16]:
    """16-bit RGB whose low bytes matter."""
    return np.random.default_rng(seed).integers(0, 65536, (rows, columns, 3), dtype=np.uint16)


def pillow(image: Image.Image, kind: str, **options: Any) -> bytes:
    """Save with Pillow."""
    buffer = io.BytesIO()
    image.save(buffer, kind, **options)
    return buffer.getvalue()


def tiff(array: NDArray[Any], **options: Any) -> bytes:
    """Save with tifffile."""
    buffer = io.BytesIO()
    if array.ndim == 3 and array.shape[2] >= 3:
        options.setdefault("photometric", "rgb")
    tifffile.imwrite(buffer, array, **options)
    return buffer.getvalue()


def opencv(array: NDArray[Any], suffix: str, *options: int) -> bytes:
    """Save with OpenCV; RGB order in."""
    stored = array[..., ::-1] if array.ndim == 3 else array
    return cv2.imencode(suffix, stored, options)[1].tobytes()


def chunk(kind: bytes, body: bytes) -> bytes:
    """One PNG chunk."""
    return struct.pack(">I", len(body)) + kind + body + struct.pack(">I", zlib.crc32(kind + body))


def with_chunk(png: bytes, kind: bytes, body: bytes) -> bytes:
    """A PNG with one more chunk right after its header."""
    return png[:33] + chunk(kind, body) + png[33:]


def png_of(width: int, height: int, depth: int, colour: int, packed: bytes) -> bytes:
    """A PNG put together from its header fields and packed image data."""
    head = struct.pack(">IIBBBBB", width, height, depth, colour, 0, 0, 0)
    return (
        b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", head) + chunk(b"IDAT", packed) + chunk(b"IEND", b"")
    )


def exif(**tags: int | float) -> Image.Exif:
    """An EXIF block: orientation, x and y resolution, unit, colour space."""
    numbers = {"orientation": 274, "x": 282, "y": 283, "unit": 296}
    block = Image.Exif()
    for name, value in tags.items():
        if name == "space":
            block.get_ifd(34665)[40961] = value
        else:
            block[numbers[name]] = value
    return block


def profile(*curves: bytes) -> bytes:
    """An ICC profile: grey for one tone curve, RGB matrix for three, neither for none."""
    signatures = [b"kTRC"] if len(curves) == 1 else [b"rTRC", b"gTRC", b"bTRC"][: len(curves)]
    tags = list(zip(signatures, curves, strict=True))
    tags.append((b"wtpt", _xyz(0.9642, 1.0, 0.8249)))
    if len(curves) == 3:  # the sRGB primaries, adapted to D50
        tags += [
            (b"rXYZ", _xyz(0.4360, 0.2225, 0.0139)),
            (b"gXYZ", _xyz(0.3851, 0.7169, 0.0971)),
            (b"bXYZ", _xyz(0.1431, 0.0606, 0.7141)),
        ]
    body, table = b"", struct.pack(">I", len(tags))
    start = 128 + 4 + 12 * len(tags)
    for signature, data in tags:
        table += struct.pack(">4sII", signature, start + len(body), len(data))
        body += data + b"\0" * (-len(data) % 4)
    space = b"GRAY" if len(curves) == 1 else b"RGB "
    head = struct.pack(
        ">I4sI4s4s4s12s4s4sI", start + len(body), b"\0" * 4, 0x02400000, b"mntr", space, b"XYZ ",
        b"\0" * 12, b"acsp", b"\0" * 4, 0,
    )  # fmt: skip
    head += struct.pack(">4sIQI", b"\0" * 4, 0, 0, 0) + _xyz(0.9642, 1.0, 0.8249)[8:]
    return head.ljust(128, b"\0") + table + body


def gamma_curve(gamma: float) -> bytes:
    """A one-number tone curve."""
    return struct.pack(">4sIIH", b"curv", 0, 1, round(gamma * 256))


def linear_curve() -> bytes:
    """The identity."""
    return struct.pack(">4sII", b"curv", 0, 0)


def table_curve(light: NDArray[np.float64]) -> bytes:
    """A sampled tone curve."""
    values = np.round(light * 65535).astype(">u2")
    return struct.pack(">4sII", b"curv", 0, len(values)) + values.tobytes()


def parametric_curve(function: int, *numbers: float) -> bytes:
    """A parametric tone curve."""
    fixed = [round(each * 65536) for each in numbers]
    return struct.pack(f">4sIHH{len(fixed)}i", b"para", 0, function, 0, *fixed)


def _xyz(x: float, y: float, z: float) -> bytes:
    return struct.pack(">4sI3i", b"XYZ ", 0, *(round(each * 65536) for each in (x, y, z)))
