"""How each room is asked: from the options of a request to what the room takes.

Rooms are loaded when they are first asked: what finds rules, sheets and certificates is seldom
needed and takes as long to load as a small picture to count; the rest is loaded by `getting_ready`
while the picture is decoded, which leaves Python free.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import astuple, dataclass, replace
from datetime import UTC, datetime
from functools import lru_cache
from importlib import import_module
from pathlib import Path
from threading import Thread
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import CoverReading, Lattice, Pitch
from imgcover.errors import OptionError, PictureError
from imgcover.findings import Finding, Flag, found, has
from imgcover.ledger.provenance import library_versions
from imgcover.picture.picture import Picture
from imgcover.picture.reader import read_picture
from imgcover.request import Enclosed, Options
from imgcover.scale.choice import choose_scale
from imgcover.scale.clear import clear_part
from imgcover.scale.pitch import scale_from
from imgcover.scale.rule_class import RuleClass
from imgcover.scale.scale import Scale
from imgcover.threads.density import Density, density_of
from imgcover.threads.field import Region
from imgcover.threads.reading import ThreadReading
from imgcover.tone import Tone
from imgcover.weave import weave

if TYPE_CHECKING:
    from imgcover.scale.certificate import Certificate
    from imgcover.scale.rule_scale import RuleScale
    from imgcover.scale.sheet_scale import SheetScale

SWAPPED_FROM = 5
"""From this orientation on, stored columns became shown rows (TIFF 6.0, tag 274)."""

UNTOLD_STEP = 3.5
"""Step of a format that drops what is faint without telling how much: that of quality 85."""

ALWAYS_ASKED = ("imgcover.threads.reader", "imgcover.cover.reader")
"""Every picture that can be read comes to these rooms."""


@contextmanager
def getting_ready() -> Iterator[None]:
    """Load the rooms that every picture comes to, and ask for versions, beside what is done."""

    def load() -> None:
        library_versions()
        for room in ALWAYS_ASKED:
            import_module(room)

    beside = Thread(target=load)
    beside.start()
    try:
        yield
    finally:
        beside.join()


@dataclass(frozen=True, slots=True, eq=False)
class FoundScale:
    """What the scale room said.

    Parameters
    ----------
    scale : Scale or None
        The one that counts.
    findings : tuple of Finding
    areas : tuple of ndarray, shape (n, 2)
        Corners, x and y in px, of what lies in the picture to find the scale by: it is no cloth.
    """

    scale: Scale | None
    findings: tuple[Finding, ...]
    areas: tuple[NDArray[np.float64], ...]


def find_scale(picture: Picture, options: Options) -> FoundScale:
    """Ask the scale room for everything that was offered to find the scale with.

    Raises
    ------
    CertificateError
        When the device's certificate cannot be read.
    """
    seen = [each for each in (_rule(picture, options), _sheet(picture, options)) if each]
    chosen = choose_scale(
        [_certified(picture, options), *(each.scale for each in seen), _stated(picture, options)],
        dpi=picture.dpi,
        use_metadata=options.metadata,
        # who states how sure a pitch is has measured it
        nominal=options.pitch is not None and options.pitch.is_nominal and options.pitch_u is None,
    )
    said = (finding for each in (*seen, chosen) for finding in each.findings)
    areas = tuple(area for each in seen for area in each.areas)
    return FoundScale(chosen.scale, tuple(dict.fromkeys(said)), areas)


def _rule(picture: Picture, options: Options) -> RuleScale | None:
    if options.rule is None:
        return None
    from imgcover.scale.rule_scale import measure_rules

    return measure_rules(
        picture,
        unit=options.rule,
        rule_class=RuleClass(options.rule_class),
        within=astuple(_asked(picture, options)),
    )


def _sheet(picture: Picture, options: Options) -> SheetScale | None:
    if not options.sheet:
        return None
    from imgcover.scale.sheet_scale import measure_sheet

    return measure_sheet(picture, options.bars)


def certificate(device: str | Enclosed | None) -> Certificate | None:
    """Read the certificate that names the device, or is the file.

    Raises
    ------
    CertificateError
        When it cannot be read or is none.
    """
    if device is None:
        return None
    from imgcover.scale.certificate import find_certificate, read_certificate

    if isinstance(device, Enclosed):
        return read_certificate(device.content, name=device.name)
    path = find_certificate(device)
    return read_certificate(path, name=path.name)


def _certified(picture: Picture, options: Options) -> Scale | None:
    held = certificate(options.device)
    if held is None:
        return None
    from imgcover.scale.certificate_use import scale_from_certificate

    unsure = has(picture.findings, Flag.ORIENTATION_UNKNOWN) or has(
        picture.findings, Flag.EXIF_UNREADABLE
    )
    return scale_from_certificate(
        held,
        dpi=picture.dpi,
        swapped=None if unsure else picture.orientation >= SWAPPED_FROM,
        on=datetime.now(UTC).date(),
    )


def _stated(picture: Picture, options: Options) -> Scale | None:
    if options.pitch is None:
        return None
    return scale_from(
        options.pitch,
        options.pitch_y,
        pitch_u=options.pitch_u,
        swapped=picture.orientation >= SWAPPED_FROM,
    )


def count_threads(
    picture: Picture, options: Options, found_scale: FoundScale, *, declared_weave: str | None
) -> ThreadReading:
    """Ask the threads room for the ends and picks of the region, where it is cloth.

    Parameters
    ----------
    picture : Picture
    options : Options
    found_scale : FoundScale
        Its areas are left out.
    declared_weave : str or None
        Handed on as what may break a tie; densities and counts never are.
    """
    region = _asked(picture, options)
    if not _lies_in(region, picture):
        message = (
            f"the region {region.x},{region.y},{region.width},{region.height} does not lie inside "
            f"the picture of {picture.columns} × {picture.rows} pixels"
        )
        return ThreadReading(None, None, None, (), None, (), (found(Flag.REGION_OUTSIDE, message),))
    clear = clear_part(
        found_scale.areas,
        (picture.rows, picture.columns),
        within=astuple(region),
    )
    from imgcover.threads.reader import read_threads

    return read_threads(
        picture,
        warp=options.warp,
        weave=None if declared_weave is None else weave(declared_weave),
        region=Region(*clear),
    )


def density_in(threads: ThreadReading, scale: Scale | None, options: Options) -> Density | None:
    """Put the scale to the threads, where there is one."""
    return None if scale is None else density_of(threads, scale, warp=options.warp)


def noticed(threads: ThreadReading, density: Density | None) -> tuple[Finding, ...]:
    """What was noticed of the threads; said in lengths where the density can."""
    if density is None:
        return threads.findings
    exacter = {each.flag for each in density.findings}
    return (*(each for each in threads.findings if each.flag not in exacter), *density.findings)


def measure_cover(
    picture: Picture, threads: ThreadReading, scale: Scale | None, options: Options
) -> CoverReading:
    """Ask the cover room for the cover of what was found to be cloth."""
    if options.light is None:
        return CoverReading(findings=(found(Flag.LIGHT_NOT_STATED),))
    if not any(tile.used for tile in threads.tiles):
        return CoverReading(findings=(found(Flag.NO_CLOTH_TO_COVER),))
    blank, dark = (exposure(path, options.tone) for path in (options.blank, options.dark))
    for taken in (blank, dark):
        if taken is not None and taken.stored.shape[:2] != picture.stored.shape[:2]:
            return CoverReading(findings=(_other_size(taken, picture),))
    from imgcover.cover.reader import read_cover
    from imgcover.picture.losses import step_of_losses

    lattice, warp_across = _lattice(threads)
    reading = read_cover(
        picture,
        light=options.light,
        field=_field(picture, threads),
        lattice=lattice,
        pitch=None if scale is None else Pitch(scale.x, scale.y),
        backing=options.backing,
        blank=blank,
        dark=dark,
        loss_step=step_of_losses(picture.stored) or (UNTOLD_STEP if picture.lossy else 0.0),
    )
    return reading if warp_across else _exchanged(reading)


def exposure(path: Path | Enclosed | None, tone: Tone | None) -> Picture | None:
    """Read a blank or dark exposure, once for all pictures that share it.

    Raises
    ------
    OptionError
        When it cannot be read.
    """
    if path is None:
        return None
    if isinstance(path, Enclosed):
        return _exposure(path, tone, 0, 0)
    try:
        state = path.stat()
    except OSError as fault:
        raise OptionError(
            path.name, f"cannot be read ({fault.strerror})", "check --blank and --dark"
        ) from None
    return _exposure(path, tone, state.st_mtime_ns, state.st_size)


@lru_cache(maxsize=4)
def _exposure(path: Path | Enclosed, tone: Tone | None, changed_ns: int, size: int) -> Picture:
    """The file's time and size are part of the key: a watched folder may replace it."""
    source = path.content if isinstance(path, Enclosed) else path
    try:
        return read_picture(source, name=path.name, tone=tone)
    except PictureError as fault:
        raise OptionError(path.name, fault.fault, fault.remedy) from fault


def _asked(picture: Picture, options: Options) -> Region:
    return options.region or Region(0, 0, picture.columns, picture.rows)


def _lies_in(region: Region, picture: Picture) -> bool:
    return region.x + region.width <= picture.columns and region.y + region.height <= picture.rows


def _other_size(taken: Picture, picture: Picture) -> Finding:
    message = (
        f"{taken.name} has {taken.columns} × {taken.rows} pixels, the picture "
        f"{picture.columns} × {picture.rows}: cover was not measured"
    )
    return found(Flag.EXPOSURE_OTHER_SIZE, message)


def _lattice(threads: ThreadReading) -> tuple[Lattice | None, bool]:
    """The thread lattice with its first vector across the picture, and whether that is the warp."""
    ends, picks = threads.ends, threads.picks
    if ends is None or picks is None:
        return None, True
    warp_across = abs(ends.frequency[0]) >= abs(ends.frequency[1])
    first, second = (ends, picks) if warp_across else (picks, ends)
    return Lattice(first.frequency, second.frequency), warp_across


def _exchanged(reading: CoverReading) -> CoverReading:
    """Name the systems' shares when the warp runs across the picture."""
    return replace(reading, warp=reading.weft, weft=reading.warp)


def _field(picture: Picture, threads: ThreadReading) -> NDArray[np.bool_] | None:
    """Where the tiles lie that were counted; None where that is the whole picture."""
    field = np.zeros(picture.stored.shape[:2], np.bool_)
    for tile in threads.tiles:
        if tile.used:
            field[tile.y : tile.y + tile.height, tile.x : tile.x + tile.width] = True
    return None if field.all() else field


__all__ = [
    "FoundScale",
    "count_threads",
    "density_in",
    "exposure",
    "find_scale",
    "getting_ready",
    "measure_cover",
    "noticed",
]
