"""A device's certificate: what a sheet's scans said of it, kept for the pictures to come (TOML).

Its axes are those of the stored file: x along a row, y from row to row. A picture that is shown
turned has them turned with it.
"""

from __future__ import annotations

import hashlib
import json
import math
import tomllib
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any, Literal

from platformdirs import user_config_path
from pydantic import BaseModel, ConfigDict, Field, ValidationError

from imgcover.errors import CertificateError
from imgcover.quantity import Measured
from imgcover.scale.sheet import Bars
from imgcover.scale.sheet_device import DeviceReading

SCHEMA = "imgcover/certificate/1"
LARGEST_FILE = 1_000_000
"""Bytes: a certificate has a few thousand."""
MORE_DIGITS = 9


class _Part(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True)


class _Device(_Part):
    name: str = Field(min_length=1, max_length=200)
    resolution_dpi: tuple[float, float] = Field(description="what the device calls itself")


class _Pitch(_Part):
    x: float = Field(gt=0)
    x_u: float = Field(ge=0)
    y: float = Field(gt=0)
    y_u: float = Field(ge=0)
    ratio_u: float = Field(ge=0)
    x_own_u: float = Field(ge=0)
    y_own_u: float = Field(ge=0)


class _Shear(_Part):
    rad: float
    u: float = Field(ge=0)


class _Distortion(_Part):
    largest_mm: float = Field(ge=0)
    places_mm: tuple[tuple[float, float], ...]
    shifts_mm: tuple[tuple[float, float], ...]


class _Dates(_Part):
    made: date
    valid_until: date


class _Evidence(_Part):
    sheet: str
    bars_mm: tuple[float, float]
    bars_u_mm: float = Field(gt=0)
    scans_sha256: tuple[str, ...] = Field(min_length=1)
    turned: bool
    corners: int = Field(gt=0)
    sheet_errors: tuple[float, float, float]


class _Content(_Part):
    certificate: Literal["imgcover/certificate/1"]
    device: _Device
    pitch: _Pitch
    shear: _Shear
    distortion: _Distortion
    tone: str
    dates: _Dates
    evidence: _Evidence


@dataclass(frozen=True, slots=True)
class Certificate:
    """A device's certificate as read.

    Parameters
    ----------
    name : str
        Of the device.
    resolution_dpi : (float, float)
        What the device calls its resolution along the stored file's x and y.
    x, y : Measured
        Pixels a millimetre along the stored file's axes.
    ratio_u : float
        Relative standard uncertainty of y over x.
    shear : Measured
        Departure of the axes from a right angle, rad.
    largest_mm : float
        Largest local distortion that was found.
    tone : str
        Transfer curve the scans were read with.
    made, valid_until : date
    bars : Bars
        Of the sheet it was made with.
    sheet_errors : (float, float, float) or None
        That sheet's own errors; None where its scans lay one way only.
    u_own : (float, float)
        Relative standard uncertainties of x and y but for what is common to scans of one sheet.
    scans_sha256 : tuple of str
        The scans it rests on.
    sha256 : str
        Of the file itself.
    """

    name: str
    resolution_dpi: tuple[float, float]
    x: Measured
    y: Measured
    ratio_u: float
    shear: Measured
    largest_mm: float
    tone: str
    made: date
    valid_until: date
    bars: Bars
    sheet_errors: tuple[float, float, float] | None
    u_own: tuple[float, float]
    scans_sha256: tuple[str, ...]
    sha256: str


def read_certificate(source: Path | bytes, *, name: str) -> Certificate:
    """Read and check a certificate.

    Parameters
    ----------
    source : Path or bytes
        The file, or what it holds.
    name : str
        What to call it in messages.

    Returns
    -------
    Certificate

    Raises
    ------
    CertificateError
        When it cannot be read, is damaged, or says something impossible.
    """
    data = source if isinstance(source, bytes) else _fetch(source, name)
    try:
        content = _Content.model_validate_json(_as_json(data))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as fault:
        raise CertificateError(name, f"is no TOML ({fault})", _ANEW) from None
    except ValidationError as fault:
        first = fault.errors()[0]
        key = ".".join(str(each) for each in first["loc"])
        raise CertificateError(f"{name}: {key}", str(first["msg"]), _ANEW) from None
    dates, pitch = content.dates, content.pitch
    if dates.valid_until < dates.made:
        raise CertificateError(f"{name}: dates", "it ends before it was made", _ANEW)
    try:
        bars = Bars(*content.evidence.bars_mm, content.evidence.bars_u_mm)
    except ValueError as fault:
        raise CertificateError(f"{name}: evidence.bars_mm", str(fault), _ANEW) from None
    for axis, value, dpi in zip(
        "xy", (pitch.x, pitch.y), content.device.resolution_dpi, strict=True
    ):
        if not abs(value * 25.4 / dpi - 1) < FURTHEST:
            fault_ = f"{value:g} px/mm is not what {dpi:g} dpi can be"
            raise CertificateError(f"{name}: pitch.{axis}", fault_, _ANEW)
    return Certificate(
        content.device.name,
        content.device.resolution_dpi,
        Measured(pitch.x, pitch.x_u, "px/mm"),
        Measured(pitch.y, pitch.y_u, "px/mm"),
        pitch.ratio_u,
        Measured(content.shear.rad, content.shear.u, "rad"),
        content.distortion.largest_mm,
        content.tone,
        dates.made,
        dates.valid_until,
        bars,
        content.evidence.sheet_errors if content.evidence.turned else None,
        (pitch.x_own_u / pitch.x, pitch.y_own_u / pitch.y),
        content.evidence.scans_sha256,
        hashlib.sha256(data).hexdigest(),
    )


FURTHEST = 0.015
"""Relative difference of pitch from nominal resolution beyond which the sheet, not the device, is
suspected: flatbeds stay within one per cent."""
_ANEW = "make it anew with: imgcover calibrate read"


def find_certificate(device: str) -> Path:
    """Find the file that `--device` names: a path, or a name in the user's device folder."""
    path = Path(device)
    if path.suffix == ".toml" or path.exists():
        return path
    return user_config_path("imgcover") / "devices" / f"{path.name}.toml"


def write_certificate(
    reading: DeviceReading,
    *,
    name: str,
    resolution_dpi: tuple[float, float],
    tone: str,
    made: date,
    valid_until: date,
    sheet: str,
    bars: Bars,
    scans_sha256: tuple[str, ...],
) -> str:
    """Write a certificate's text; `read_certificate` reads it back to nine digits."""
    places, shifts = reading.bed.lattice()
    content: dict[str, dict[str, Any]] = {
        "": {"certificate": SCHEMA, "tone": tone},
        "device": {"name": name, "resolution_dpi": list(resolution_dpi)},
        "pitch": {
            "x": reading.x.value,
            "x_u": reading.x.u,
            "y": reading.y.value,
            "y_u": reading.y.u,
            "ratio_u": reading.ratio_u,
            "x_own_u": reading.u_own[0] * reading.x.value,
            "y_own_u": reading.u_own[1] * reading.y.value,
        },
        "shear": {"rad": reading.shear.value, "u": reading.shear.u},
        "distortion": {
            "largest_mm": round(reading.bed.largest, 4),
            "places_mm": [[round(float(v), 1) for v in each] for each in places],
            "shifts_mm": [[round(float(v), 4) for v in each] for each in shifts],
        },
        "dates": {"made": made, "valid_until": valid_until},
        "evidence": {
            "sheet": sheet,
            "bars_mm": [bars.a, bars.b],
            "bars_u_mm": bars.u,
            "scans_sha256": list(scans_sha256),
            "turned": reading.apart,
            "corners": reading.corners,
            "sheet_errors": list(reading.sheet_errors),
        },
    }
    parts = []
    for title, table in content.items():
        lines = [f"{key} = {_toml(value)}" for key, value in table.items()]
        parts.append("\n".join(([f"[{title}]"] if title else []) + lines))
    remark = (
        "# Pitch in pixels a millimetre along the stored file's x and y; u is one standard\n"
        "# uncertainty, own_u without what all scans of one sheet have in common.\n"
        "# Made by imgcover calibrate read.\n"
    )
    return remark + "\n\n".join(parts) + "\n"


def _toml(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, float):
        if not math.isfinite(value):
            raise ValueError(f"a certificate holds finite numbers, got {value}")
        return repr(float(f"{value:.{MORE_DIGITS}g}"))
    if isinstance(value, int):
        return str(value)
    if isinstance(value, str):
        # a JSON string is a TOML basic string, but for the delete character
        return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007F")
    return "[" + ", ".join(_toml(each) for each in value) + "]"


def _as_json(data: bytes) -> str:
    """Turn TOML into JSON, so that pydantic reads lists as tuples and dates as dates."""
    return json.dumps(tomllib.loads(data.decode("utf-8")), default=lambda each: each.isoformat())


def _fetch(path: Path, name: str) -> bytes:
    try:
        if not path.is_file():
            raise CertificateError(name, "no such file", "check --device")
        if path.stat().st_size > LARGEST_FILE:
            raise CertificateError(name, "too large for a certificate", "check --device")
        return path.read_bytes()
    except OSError as fault:
        raise CertificateError(name, f"cannot be read ({fault.strerror})", "check it") from None


__all__ = [
    "FURTHEST",
    "Certificate",
    "find_certificate",
    "read_certificate",
    "write_certificate",
]
