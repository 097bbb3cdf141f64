"""What do a file's EXIF block and its other side notes say of turn, resolution and tone?"""

from __future__ import annotations

from dataclasses import dataclass

from imgcover.findings import Finding, Flag, found
from imgcover.picture.ifd import Directory, DirectoryError, open_tree
from imgcover.tone import SRGB, Tone

ORIENTATION, X_RESOLUTION, Y_RESOLUTION, RESOLUTION_UNIT = 274, 282, 283, 296
"""Tags shared by TIFF 6.0 and EXIF."""
EXIF_DIRECTORY, INTEROP_DIRECTORY, COLOUR_SPACE = 34665, 40965, 40961
"""Pointers to the EXIF and interoperability directories, and ColorSpace (EXIF 2.32, 4.6)."""
ADOBE_RGB = Tone("gamma", 2.19921875)
"""Adobe RGB (1998), 4.3.4.2: the exponent is 2 + 51/256."""
DEFAULT_DPI = (72.0, 96.0)
"""What programs write when they know nothing."""
ONE_CLAIM = 0.005
"""Two notes of one resolution may differ by this much: whole pixels a centimetre round by 0.2 %."""


@dataclass(frozen=True, slots=True)
class Exif:
    """What an EXIF block says: stored orientation, dpi along stored axes, transfer curve."""

    orientation: int = 1
    dpi: tuple[float, float] | None = None
    tone: Tone | None = None
    findings: tuple[Finding, ...] = ()


def read_exif(block: bytes) -> Exif:
    """Read an EXIF block; a damaged one says nothing but a finding.

    Parameters
    ----------
    block : bytes
        From the byte-order mark on, with or without the leading "Exif" mark; empty when absent.
    """
    block = block.removeprefix(b"Exif\0\0")
    if not block:
        return Exif()
    try:
        tree = open_tree(block)
        first = tree.directory(tree.first)
        orientation, findings = orientation_of(first)
        return Exif(orientation, dpi_of(first), tone_of(first), findings)
    except DirectoryError as fault:
        message = f"the EXIF block could not be read ({fault}): no turn was applied"
        return Exif(findings=(found(Flag.EXIF_UNREADABLE, message),))


def orientation_of(directory: Directory) -> tuple[int, tuple[Finding, ...]]:
    """Give the stored orientation, 1 when it is absent; an impossible one is a finding."""
    stored = directory.number(ORIENTATION, 1)
    if 1 <= stored <= 8:
        return stored, ()
    if stored == 0:  # many devices write 0 for "not known"
        return 1, ()
    message = f"the stored orientation {stored} is none of 1 to 8: no turn was applied"
    return 1, (found(Flag.ORIENTATION_UNKNOWN, message),)


def dpi_of(directory: Directory) -> tuple[float, float] | None:
    """Give the claimed dots per inch along stored columns and rows; None without a claim."""
    x, y = directory.ratio(X_RESOLUTION), directory.ratio(Y_RESOLUTION)
    per_inch = {2: 1.0, 3: 2.54}.get(directory.number(RESOLUTION_UNIT, 2))
    return None if per_inch is None else positive_pair(x, y, per_inch)


def positive_pair(
    x: float | None, y: float | None, factor: float = 1.0
) -> tuple[float, float] | None:
    """Multiply a pair of claims; None when either is absent or not positive."""
    if not x or not y or x <= 0 or y <= 0:
        return None
    return x * factor, y * factor


def one_dpi(
    *claims: tuple[float, float] | None,
) -> tuple[tuple[float, float] | None, tuple[Finding, ...]]:
    """Reconcile the places where one file states its resolution.

    A default gives way to a statement; two statements that differ cancel each other, with a
    finding.
    """
    stated = [claim for claim in claims if claim is not None]
    meant = [claim for claim in stated if not is_default_dpi(claim)]
    if not meant:
        return (stated[0] if stated else None), ()
    for other in meant[1:]:
        if any(abs(a / b - 1) > ONE_CLAIM for a, b in zip(meant[0], other, strict=True)):
            message = (
                f"the file states two resolutions, {meant[0][0]:.6g} and {other[0]:.6g} dpi: "
                "neither was used"
            )
            return None, (found(Flag.DPI_CONTRADICTS_ITSELF, message),)
    return meant[0], ()


def is_default_dpi(dpi: tuple[float, float]) -> bool:
    """Whether a claim is what programs write when they know nothing, rounding included."""
    return any(abs(axis - default) < 1.0 for axis in dpi for default in DEFAULT_DPI)


def tone_of(first: Directory) -> Tone | None:
    """Give the transfer curve that the EXIF colour space stands for, if one is stated."""
    if EXIF_DIRECTORY not in first:
        return None
    exif = first.tree.directory(first.number(EXIF_DIRECTORY, 0))
    space = exif.number(COLOUR_SPACE, 0)
    if space == 1:
        return SRGB
    if space == 2:
        return ADOBE_RGB
    if space == 0xFFFF and INTEROP_DIRECTORY in exif:
        # the DCF option file: Adobe RGB is "uncalibrated" plus R03
        interop = first.tree.directory(exif.number(INTEROP_DIRECTORY, 0))
        if interop.raw(1).startswith(b"R03"):
            return ADOBE_RGB
    return None


__all__ = [
    "ADOBE_RGB",
    "DEFAULT_DPI",
    "Exif",
    "dpi_of",
    "is_default_dpi",
    "one_dpi",
    "orientation_of",
    "positive_pair",
    "read_exif",
    "tone_of",
]
