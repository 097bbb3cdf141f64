"""Reads JPEG: the markers are walked to the end before a pixel is decoded.

A JPEG decoder given too few bytes fills the rest with mid grey and says nothing. So the end mark,
the restart marks and the script of scans are checked before decoding; after it, any block of
exactly mid grey sends the file through a strict parser, which takes ten times as long. Progressive
files always go there: what they lose is detail, not area. A cut inside the very last block of a
baseline file, 16 × 16 pixels at most, goes unnoticed.

References
----------
ITU-T T.81 (1992), annex B (markers), annex G (progressive scans).
"""

from __future__ import annotations

import imagecodecs
import numpy as np

from imgcover.findings import Finding
from imgcover.picture.exif import one_dpi, positive_pair, read_exif
from imgcover.picture.header import Header, Stored, damaged, not_read_here, through_codec
from imgcover.picture.markers import Segments, walk
from imgcover.picture.profile import tone_of_profile
from imgcover.tone import Tone

SIGNATURE = b"\xff\xd8\xff"
ICC_MARK, EXIF_MARK, JFIF_MARK = b"ICC_PROFILE\0", b"Exif\0\0", b"JFIF\0"
MID_GREY = 128
"""Every sample of a block whose coefficients are all zero (T.81, A.3.1)."""
BLOCK = 8


def read_jpeg(data: bytes, name: str) -> Header:
    """Check a JPEG file from its first marker to its end mark, and read what it says.

    Parameters
    ----------
    data : bytes
        The whole file; what follows the first picture's end mark is not looked at.
    name : str
        What to call it in an error.

    Raises
    ------
    PictureError
        When the file is cut short or damaged, or the picture is of a sort not read here.
    ProfileError
        When its colour profile cannot be honoured.
    """
    segments = walk(data, name)
    frame = segments.frame
    if len(frame.components) not in (1, 3):
        raise not_read_here(name, f"the JPEG has {len(frame.components)} colour channels")
    exif = read_exif(next((each for each in segments.app1 if each.startswith(EXIF_MARK)), b""))
    dpi, contradiction = one_dpi(_density(segments), exif.dpi)
    tone, tone_from = _profile(segments)
    if tone is None and exif.tone is not None:
        tone, tone_from = exif.tone, "its EXIF colour space"
    findings: tuple[Finding, ...] = (*exif.findings, *contradiction)
    return Header(
        kind="JPEG",
        width=frame.width,
        height=frame.height,
        bits=8,
        samples=len(frame.components),
        decode=lambda: _decode(data[: segments.end], name, strictly=frame.progressive),
        orientation=exif.orientation,
        dpi=dpi,
        tone=tone,
        tone_from=tone_from,
        findings=findings,
    )


def _decode(data: bytes, name: str, *, strictly: bool) -> Stored:
    array: Stored = through_codec(name, "JPEG", lambda: imagecodecs.jpeg8_decode(data))
    if (strictly or has_grey_block(array)) and not parses_strictly(data):
        raise damaged(name, "the JPEG is truncated: its scan data end before the picture does")
    return array


def parses_strictly(data: bytes) -> bool:
    """Whether a parser that forgives nothing reads every coefficient the file promises."""
    try:
        imagecodecs.jpegxl_encode_jpeg(data)
    except Exception:  # the codec's own exception class is not public
        return False
    return True


def has_grey_block(array: Stored) -> bool:
    """Whether any 8 × 8 block holds nothing but mid grey, as blocks without data do.

    Parameters
    ----------
    array : ndarray, shape (rows, columns) or (rows, columns, 3), uint8
        A decoded JPEG.

    Notes
    -----
    Where colour is stored at half the resolution, a block's outermost pixels take some colour
    from its neighbours, so only the inner 6 × 6 are looked at. The last block may be a narrow
    rest; when data end early it is empty for certain, and the very last pixel tells.
    """
    if (array[-1, -1] == MID_GREY).all():
        return True
    middles = array[BLOCK // 2 :: BLOCK, BLOCK // 2 :: BLOCK] == MID_GREY
    if middles.ndim == 3:
        middles = middles.all(axis=2)
    for row, column in zip(*np.nonzero(middles), strict=True):
        top, left = BLOCK * row, BLOCK * column
        if (array[top + 1 : top + BLOCK - 1, left + 1 : left + BLOCK - 1] == MID_GREY).all():
            return True
    return False


def _density(segments: Segments) -> tuple[float, float] | None:
    """Dots an inch from the JFIF mark; unit 0 states only the pixels' aspect (T.871, 10.1)."""
    block = next((each for each in segments.app0 if each.startswith(JFIF_MARK)), b"")
    if len(block) < 12 or block[7] not in (1, 2):
        return None
    x, y = int.from_bytes(block[8:10], "big"), int.from_bytes(block[10:12], "big")
    return positive_pair(x, y, 1.0 if block[7] == 1 else 2.54)


def _profile(segments: Segments) -> tuple[Tone | None, str]:
    """Join the numbered parts of the ICC profile and find its curve (ICC.1:2022, B.4)."""
    parts = {each[12]: each[14:] for each in segments.app2 if each.startswith(ICC_MARK)}
    if not parts:
        return None, ""
    return tone_of_profile(b"".join(parts[key] for key in sorted(parts))), "its ICC profile"


__all__ = ["SIGNATURE", "has_grey_block", "parses_strictly", "read_jpeg"]
