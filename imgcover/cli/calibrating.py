"""What `imgcover calibrate` does: files in, one room asked, words and a file out."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

from imgcover.cli.exits import ExitCode
from imgcover.cli.output import keep_apart, opened, tell
from imgcover.errors import OutputError, PictureError, ScaleError
from imgcover.picture.reader import read_picture
from imgcover.quantity import Measured
from imgcover.scale.bars import parse_bars
from imgcover.scale.certificate import (
    FURTHEST,
    find_certificate,
    read_certificate,
    write_certificate,
)
from imgcover.scale.certificate_use import Holding, check_certificate
from imgcover.scale.rule_class import RuleClass
from imgcover.scale.sheet import SHEET_NAME, Bars, draw_sheet
from imgcover.scale.sheet_device import DeviceReading, SheetRefused, read_device
from imgcover.scale.sheet_scan import SheetCorners, find_corners
from imgcover.tone import SRGB, Tone

ENDING = {
    Holding.HOLDS: ExitCode.CONFORMS,
    Holding.FAILS: ExitCode.DOES_NOT_CONFORM,
    Holding.OPEN: ExitCode.UNDECIDED,
}
MM_PER_INCH = 25.4
USUAL = 0.007
"""Relative difference from the nominal resolution that is worth a word, and refused where both axes
have it alike: flatbeds' halves and units differ by 0.6 %, copiers shrink by that and more."""


def write_sheet(output: Path) -> ExitCode:
    """Draw the sheet into a file of the kind that its name says."""
    kind = output.suffix.lower().removeprefix(".")
    if kind not in ("pdf", "svg", "png"):
        raise OutputError(str(output), "is no .pdf, .svg or .png", "name the file so")
    data = draw_sheet("pdf" if kind == "pdf" else "svg" if kind == "svg" else "png")
    part = output.with_name(f".{output.name}.{os.getpid()}.part")
    try:
        part.write_bytes(data)
        part.replace(output)
    except OSError as fault:
        with contextlib.suppress(OSError):
            part.unlink(missing_ok=True)
        reason = fault.strerror or type(fault).__name__
        raise OutputError(str(output), f"cannot be written ({reason})", "choose a place") from fault
    tell(f"{output}: print at 100 %, measure both bars, scan, then: imgcover calibrate read")
    return ExitCode.CONFORMS


def read_scans(
    scans: Sequence[Path],
    *,
    bars: str | None,
    bars_u: float,
    rule_class: int,
    name: str,
    dpi: str | None,
    days: int,
    tone: str | None,
    output: Path | None,
) -> ExitCode:
    """Read scans and write the certificate, or say why there is none."""
    if bars is None:
        raise ScaleError(
            "--bars",
            "printers do not keep their scale: without measured bars the sheet says nothing",
            "measure bar A and bar B with a steel rule and give --bars A,B in mm",
        )
    keep_apart("--output", output, scans)
    measured = parse_bars(bars, u=bars_u, rule_class=RuleClass(rule_class))
    taken = _take(scans, tone=tone)
    nominal = _nominal(taken.dpi, dpi)
    reading = _device(taken, measured)
    if reading is None:
        return ExitCode.UNDECIDED
    if not _plausible((reading.x, reading.y), nominal):
        return ExitCode.UNDECIDED
    today = datetime.now(UTC).date()
    text = write_certificate(
        reading,
        name=name,
        resolution_dpi=nominal,
        tone=str(taken.tone),
        made=today,
        valid_until=_later(today, days),
        sheet=SHEET_NAME,
        bars=measured,
        scans_sha256=taken.hashes,
    )
    with opened(output) as write:
        write(text)
    for line in _told(reading):
        tell(line)
    return ExitCode.CONFORMS


def check_scans(
    scans: Sequence[Path],
    *,
    device: str,
    bars: str | None,
    bars_u: float,
    rule_class: int,
    tone: str | None,
) -> ExitCode:
    """Hold new scans against a certificate and say the decision first."""
    path = find_certificate(device)
    certificate = read_certificate(path, name=path.name)
    measured = certificate.bars
    if bars is not None:
        measured = parse_bars(bars, u=bars_u, rule_class=RuleClass(rule_class))
    taken = _take(scans, tone=tone or certificate.tone)
    if taken.dpi is not None:
        for claimed, nominal in zip(taken.dpi, certificate.resolution_dpi, strict=True):
            if abs(claimed / nominal - 1) > FURTHEST:
                raise ScaleError(
                    scans[0].name,
                    f"was scanned at {claimed:g} dpi, the certificate is for {nominal:g}",
                    "scan the sheet at the certificate's resolution",
                )
    known = certificate.sheet_errors if bars is None else None
    reading = _device(taken, measured, known)
    if reading is None:
        return ExitCode.UNDECIDED
    checked = check_certificate(
        certificate, reading, same_sheet=known is not None, on=datetime.now(UTC).date()
    )
    with opened(None) as write:
        write(f"{certificate.name}: {checked.decision}\n")
        for reason in checked.reasons:
            write(f"  {reason}\n")
    return ENDING[checked.decision]


@dataclass(slots=True)
class _Taken:
    """Scans as read: their corners, hashes, one resolution and one tone."""

    corners: list[SheetCorners] = field(default_factory=list)
    hashes: tuple[str, ...] = ()
    dpi: tuple[float, float] | None = None
    tone: Tone = SRGB


def _plausible(pitches: tuple[Measured, Measured], nominal: tuple[float, float]) -> bool:
    """Hold the pitches against the stated resolution; say what speaks against them.

    A copier shrinks both ways alike. A flatbed's two pitches come from its optics and from its
    carriage, which have nothing in common.
    """
    offs = [
        pitch.value * MM_PER_INCH / claimed - 1
        for pitch, claimed in zip(pitches, nominal, strict=True)
    ]
    x, y = offs
    alike = x * y > 0 and min(abs(x), abs(y)) > USUAL
    for axis, off, claimed in zip("xy", offs, nominal, strict=True):
        if abs(off) > FURTHEST or alike:
            both = f"x and y would be {100 * x:+.1f} and {100 * y:+.1f} %"
            tell(
                f"refused: {both if alike else f'{axis} would be {100 * off:+.1f} %'} off the "
                f"stated {claimed:g} dpi; no flatbed is. Is the sheet a copy, or was a bar "
                "measured wrongly? Measure the bars of the very sheet that was scanned"
            )
            return False
        if abs(off) > USUAL:
            tell(
                f"{axis} is {100 * off:+.1f} % off the stated {claimed:g} dpi, more than most "
                "flatbeds are: see that the bars are those of the very sheet that was scanned, and "
                "that it is no copy"
            )
    return True


def _take(scans: Sequence[Path], *, tone: str | None) -> _Taken:
    """Read the scans one after the other: two A4 at 600 dpi need not be held at once."""
    taken = _Taken()
    for path in scans:
        picture = read_picture(
            path, name=path.name, tone=None if tone is None else Tone.parse(tone)
        )
        if picture.orientation != 1:
            raise PictureError(
                path.name, "was turned after scanning", "take the file as the scanner wrote it"
            )
        if taken.dpi is not None and picture.dpi is not None and picture.dpi != taken.dpi:
            raise ScaleError(
                path.name, "was scanned at another resolution", "scan all at one resolution"
            )
        taken.dpi = taken.dpi or picture.dpi
        taken.tone = picture.tone
        taken.hashes += (picture.sha256,)
        taken.corners.append(find_corners(picture))
    if len(set(taken.hashes)) < len(taken.hashes):
        raise ScaleError("SCAN", "the same scan comes twice", "scan the sheet again")
    return taken


def _device(
    taken: _Taken, bars: Bars, known: tuple[float, float, float] | None = None
) -> DeviceReading | None:
    try:
        return read_device(taken.corners, bars, known=known)
    except SheetRefused as why:
        tell(f"refused: {why}")
        return None


def _nominal(found: tuple[float, float] | None, said: str | None) -> tuple[float, float]:
    """Return the resolution by which the device goes: as said, else as the file states."""
    if said is None:
        if found is None:
            raise ScaleError("--dpi", "no file states its resolution", "give --dpi N as it was set")
        return round(found[0], 2), round(found[1], 2)  # a PNG keeps dots a metre
    parts = said.split(",")
    try:
        numbers = [float(part) for part in parts]
    except ValueError:
        numbers = []
    if len(numbers) not in (1, 2) or not all(20 <= each <= 20_000 for each in numbers):
        raise ScaleError("--dpi", f"takes N or X,Y dots an inch, got {said!r}", "give --dpi 600")
    return numbers[0], numbers[-1]


def _later(today: date, days: int) -> date:
    return today + timedelta(days=days)


def _told(reading: DeviceReading) -> list[str]:
    lines = [
        f"x {reading.x}, y {reading.y}; y/x differs from 1 by "
        f"{100 * (reading.y.value / reading.x.value - 1):+.3f} % ± {100 * reading.ratio_u:.3f} %",
        f"largest local distortion {reading.bed.largest:.3f} mm; {reading.corners} corners read",
    ]
    if not reading.apart:
        lines.append(
            "the sheet lay one way only: its own errors count as the bed's. A second scan, the "
            "sheet turned a quarter, parts them and halves the uncertainty"
        )
    return lines


__all__ = ["check_scans", "read_scans", "write_sheet"]
