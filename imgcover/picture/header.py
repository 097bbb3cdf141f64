"""What does a picture file say of itself, before its pixels are decoded?"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias, TypeVar

import numpy as np
from numpy.typing import NDArray

from imgcover.errors import PictureError
from imgcover.findings import Finding
from imgcover.tone import Tone

Stored: TypeAlias = NDArray[np.uint8] | NDArray[np.uint16]
Decoded = TypeVar("Decoded")

RESCAN = "scan or export it again"
"""The remedy for a file that is damaged: nothing in it can be mended here."""
SAVE_PLAIN = "save it as an 8- or 16-bit grey or RGB PNG or TIFF"
"""The remedy for a file that is whole but of a sort not read here."""


@dataclass(frozen=True, slots=True)
class Header:
    """The claims of one picture file, and the way to its pixels.

    Parameters
    ----------
    kind : str
        "PNG", "JPEG", "TIFF", "BMP" or "WebP", by the file's content.
    width, height : int
        Stored columns and rows, before orientation.
    bits : int
        Depth of each decoded value, 8 or 16.
    samples : int
        Values a pixel: 1 grey, 2 grey and alpha, 3 RGB, 4 RGB and alpha.
    decode : callable
        Returns the stored array, shape (height, width) or (height, width, samples), uint8 or
        uint16; raises PictureError when the file is not whole.
    orientation : int
        1…8 as EXIF and TIFF 6.0 number them; 1 when nothing is said.
    dpi : (float, float) or None
        Claimed resolution along the stored columns and rows.
    tone : Tone or None
        Transfer curve the file claims; None when it claims none.
    tone_from : str
        Where that claim stands, in words: "its ICC profile".
    findings : tuple of Finding
        What was noticed while reading the header.
    """

    kind: str
    width: int
    height: int
    bits: int
    samples: int
    decode: Callable[[], Stored]
    orientation: int = 1
    dpi: tuple[float, float] | None = None
    tone: Tone | None = None
    tone_from: str = ""
    findings: tuple[Finding, ...] = ()


def damaged(name: str, fault: str) -> PictureError:
    """Make the error for a file that is not whole."""
    return PictureError(name, fault, RESCAN)


def not_read_here(name: str, fault: str) -> PictureError:
    """Make the error for a file that may be whole but is of a sort not read here."""
    return PictureError(name, fault, SAVE_PLAIN)


def through_codec(name: str, kind: str, call: Callable[[], Decoded]) -> Decoded:
    """Call a foreign decoder; whatever it raises becomes one clear PictureError.

    Raises
    ------
    PictureError
        When the decoder fails, in whatever way it fails.
    """
    try:
        return call()
    except PictureError:
        raise
    except MemoryError as error:
        raise PictureError(
            name, "the picture does not fit in this machine's memory", "crop it or scan a part"
        ) from error
    except Exception as error:  # each codec has its own exception classes
        said = str(error).splitlines()[0] if str(error) else type(error).__name__
        raise damaged(name, f"the {kind} data cannot be decoded ({said})") from error


__all__ = [
    "RESCAN",
    "SAVE_PLAIN",
    "Header",
    "Stored",
    "damaged",
    "not_read_here",
    "through_codec",
]
