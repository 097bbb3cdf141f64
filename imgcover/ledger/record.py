"""What is remembered of one picture: every key always present, SI, and the same bytes every time.

Schema imgcover/record/1. Densities are in 1/cm, lengths in mm, mass in g/m², angles in degrees,
fractions in 1; only `*_factor` is threads per inch over √Ne, as the trade tables it. A number is
`{value, u, unit}` with one standard uncertainty; null is what could not be measured, and a finding
says why.
"""

from __future__ import annotations

import re
from dataclasses import asdict, dataclass
from typing import TYPE_CHECKING

from imgcover.cover.reading import CoverReading, Pores
from imgcover.findings import Finding
from imgcover.ledger.canonical import Record, number
from imgcover.ledger.provenance import Provenance
from imgcover.ledger.sections import findings_section, laid, predicted_section, quantity, tidied
from imgcover.picture.picture import Picture
from imgcover.quantity import Measured
from imgcover.scale.scale import Scale
from imgcover.threads.density import Density
from imgcover.threads.reading import ThreadReading, ThreadSet

if TYPE_CHECKING:
    from imgcover.cloth.prediction import Prediction
    from imgcover.verdict.verdict import Verdict

SCHEMA = "imgcover/record/1"
CONDITIONED = frozenset({"yes", "y", "true", "1", "x", "conditioned"})
"""As people tick a box; what a workbook's TRUE is read as is among them."""
CONDITIONED_AS = re.compile(r"yes[ ,;(]|iso 139$|\d{4}-\d\d-\d\d\b")
"""A yes with more behind it, the standard, or the day it was done."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Sample:
    """Where a swatch comes from, as its sheet or the command line says; None is not said."""

    lot: str | None = None
    article: str | None = None
    piece: str | None = None
    place: str | None = None
    operator: str | None = None
    conditioned: str | None = None
    note: str | None = None

    @property
    def is_conditioned(self) -> bool:
        """Whether the sheet says that the swatch was conditioned: yes, when, or to ISO 139.

        Of any other word nobody can tell; moisture then stays in the u of its mass.
        """
        said = (self.conditioned or "").strip().lower()
        return said in CONDITIONED or CONDITIONED_AS.match(said) is not None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Answers:
    """What each room said of one picture; None is a room that had nothing to say.

    Parameters
    ----------
    name : str
        What the picture is called.
    sha256 : str or None
        Of the file, where its bytes could be read at all.
    picture, scale, threads, density, cover, prediction, verdict
        The rooms' answers.
    sample : Sample
        Where the swatch comes from.
    light, warp : str or None, str
        As stated.
    findings : tuple of Finding
        Everything noticed on the way, each once.
    provenance : Provenance
    """

    name: str
    provenance: Provenance
    sample: Sample
    light: str | None
    warp: str
    sha256: str | None = None
    picture: Picture | None = None
    scale: Scale | None = None
    threads: ThreadReading | None = None
    density: Density | None = None
    cover: CoverReading | None = None
    prediction: Prediction | None = None
    verdict: Verdict | None = None
    findings: tuple[Finding, ...] = ()


def record_of(answers: Answers, *, made_at: str) -> Record:
    """Lay the rooms' answers out as the record.

    Parameters
    ----------
    answers : Answers
    made_at : str
        UTC, ISO 8601; kept in the envelope, which no hash covers.
    """
    return {
        "schema": SCHEMA,
        "picture": _picture(answers),
        "sample": laid(asdict(answers.sample)),
        "light": answers.light,
        "warp": answers.warp,
        "scale": _scale(answers.scale),
        "threads": _threads(answers.threads, answers.density),
        "cover": _cover(answers.cover),
        "predicted": predicted_section(answers.prediction),
        "verdict": None if answers.verdict is None else laid(answers.verdict.record()),
        "findings": findings_section(answers.findings),
        "provenance": laid(answers.provenance.record()),
        "envelope": {"made_at": made_at},
    }


def _picture(answers: Answers) -> Record:
    picture = answers.picture
    section: Record = {"name": answers.name, "sha256": answers.sha256}
    keys = ("pixels_sha256", "width", "height", "bits", "dpi", "orientation")
    if picture is None:
        return laid({**section, **dict.fromkeys((*keys, "clipped_low", "clipped_high"))})
    section |= {
        "pixels_sha256": picture.pixels_sha256,
        "width": picture.columns,
        "height": picture.rows,
        "bits": picture.bits,
        "dpi": picture.dpi,
        "orientation": picture.orientation,
        "clipped_low": picture.clipped_low,
        "clipped_high": picture.clipped_high,
    }
    return laid(section)


def _scale(scale: Scale | None) -> Record | None:
    if scale is None:
        return None
    return {
        "x": quantity(scale.x),
        "y": quantity(scale.y),
        "source": scale.source,
        "compared": [tidied(each.record()) for each in scale.compared],
    }


def _threads(reading: ThreadReading | None, density: Density | None) -> Record | None:
    if reading is None or (reading.ends is None and reading.picks is None):
        return None
    ends, picks = reading.ends, reading.picks
    return laid(
        {
            "ends": None if density is None else quantity(density.ends),
            "picks": None if density is None else quantity(density.picks),
            "angle": None if density is None else quantity(density.angle),
            "skew": None if density is None else quantity(density.skew),
            "bow": None if density is None else quantity(density.bow),
            "pixels_per_end": None if ends is None else ends.pixels_a_thread,
            "pixels_per_pick": None if picks is None else picks.pixels_a_thread,
            "counted_ends": None if ends is None else ends.counted,
            "counted_picks": None if picks is None else picks.counted,
            "length_ends_mm": None if density is None else density.length_ends_mm,
            "length_picks_mm": None if density is None else density.length_picks_mm,
            "tiles_used": sum(tile.used for tile in reading.tiles),
            "tiles_left_out": sum(not tile.used for tile in reading.tiles),
            "ends_range": None if density is None else _range(density.ends, ends),
            "picks_range": None if density is None else _range(density.picks, picks),
            "repeat": reading.repeat,
        }
    )


def _range(density: Measured | None, threads: ThreadSet | None) -> list[float] | None:
    """Extremes of the local density, in the density's unit."""
    if density is None or threads is None:
        return None
    return [density.value * threads.local_low, density.value * threads.local_high]


def _cover(cover: CoverReading | None) -> Record | None:
    if cover is None or (cover.optical is None and cover.upper_bound_open is None):
        return None
    return {
        "optical": quantity(cover.optical),
        "threshold": quantity(cover.threshold),
        "two_level": quantity(cover.two_level),
        "upper_bound_open": quantity(cover.upper_bound_open),
        "warp": quantity(cover.warp),
        "weft": quantity(cover.weft),
        "yarn_transmittance": quantity(cover.yarn_transmittance),
        "pores": _pores(cover.pores),
    }


def _pores(pores: Pores | None) -> Record | None:
    if pores is None:
        return None
    return {
        "counted": pores.counted,
        "per_cm2": quantity(pores.per_cm2),
        "width": quantity(pores.width),
        "height": quantity(pores.height),
        "area_percentiles": tidied(dict(zip(AREA_PERCENTILES, pores.areas, strict=True))),
        "largest": number(pores.largest),
        "area_unit": pores.unit,
        "blocked": tidied(pores.blocked),
        "merged": tidied(pores.merged),
    }


AREA_PERCENTILES = ("5", "25", "50", "75", "95")
"""The percentiles in which `Pores.areas` gives the distribution."""


__all__ = ["AREA_PERCENTILES", "SCHEMA", "Answers", "Sample", "record_of"]
