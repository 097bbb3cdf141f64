"""Keeps drawn pictures and their truth as files."""

from __future__ import annotations

import io
from dataclasses import asdict
from pathlib import PurePath

import numpy as np
from PIL import Image

from imgcover.loom.camera import CameraSpec, Stored
from imgcover.loom.drawing import Drawn
from imgcover.loom.truth import Truth

DIGITS = 6
"""Significant digits of a truth: ten times finer than anything measured."""
KINDS = (".png", ".jpg", ".tif")
"""Files that can be kept; the suffix decides."""
JPEG_QUALITY = 90
"""Where the camera names none."""

NAMES = {
    "ends": ("ends_per_cm", 10.0),
    "picks": ("picks_per_cm", 10.0),
    "angle": ("angle_deg", 1.0),
    "skew": ("skew_deg", 1.0),
    "open_width": ("open_width_mm", 1.0),
    "open_height": ("open_height_mm", 1.0),
    "pore_area": ("pore_area_mm2", 1.0),
    "largest_pore": ("largest_pore_mm2", 1.0),
}
"""How fields of a truth are written down, unit in the name, and by what they are multiplied."""


def encode(drawn: Drawn, camera: CameraSpec, name: str) -> bytes:
    """Put a picture into the file that its name asks for, with the stated resolution.

    Raises
    ------
    ValueError
        When the suffix is unknown, or that kind of file cannot hold the picture's depth.
    """
    suffix = PurePath(name).suffix.lower()
    if suffix not in KINDS:
        raise ValueError(f"a drawn picture is kept as {', '.join(KINDS)}, got {name!r}")
    deep = drawn.stored.dtype == np.uint16
    if deep and (suffix != ".png" or drawn.stored.ndim == 3):
        raise ValueError(f"16 bits are kept as a grey .png, got {name!r}")
    dpi = (round(camera.px_per_mm * 25.4, 2), round(camera.y_per_mm * 25.4, 2))
    file = io.BytesIO()
    picture = Image.fromarray(drawn.stored)
    if suffix == ".png":
        picture.save(file, "PNG", dpi=dpi, compress_level=9)
    elif suffix == ".jpg":
        picture.save(file, "JPEG", dpi=dpi, quality=camera.jpeg or JPEG_QUALITY, subsampling=0)
    else:
        picture.save(file, "TIFF", dpi=dpi, compression="tiff_deflate")
    return file.getvalue()


def decode(content: bytes) -> Stored | None:
    """Read a kept picture back; None where it is not whole.

    Returns
    -------
    ndarray, shape (rows, columns) or (rows, columns, 3) RGB, uint8 or uint16
        The stored values.
    """
    try:
        with Image.open(io.BytesIO(content)) as picture:
            picture.load()
            grey16 = picture.mode.startswith("I")
            return np.asarray(picture).astype(np.uint16) if grey16 else np.asarray(picture)
    except (OSError, SyntaxError):
        return None


def truth_table(truth: Truth) -> dict[str, float]:
    """Name what was counted, with its units, rounded to the digits that are written."""
    table = {}
    for key, value in asdict(truth).items():
        if key != "corners":
            name, factor = NAMES.get(key, (key, 1.0))
            table[name] = float(f"{value * factor:.{DIGITS}g}")
    return table


def truth_toml(name: str, truth: Truth) -> str:
    """Write one picture's truth as a TOML table of its own."""
    lines = [f"[[picture]]\nfile = {_quoted(name)}"]
    lines += [f"{key} = {value!r}" for key, value in truth_table(truth).items()]
    corners = ", ".join(f"[{x:.1f}, {y:.1f}]" for x, y in truth.corners)
    lines.append(f"corners_px = [{corners}]")
    return "\n".join(lines) + "\n"


def _quoted(text: str) -> str:
    """Write a text as TOML reads it."""
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


__all__ = ["KINDS", "decode", "encode", "truth_table", "truth_toml"]
