"""What is asked of one picture: every option that can touch a digit or a decision, read once.

The command line and a lot sheet say the same options in the same words; both are read here.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal, get_args

from imgcover.errors import OptionError
from imgcover.ledger.record import Sample
from imgcover.quantity import Measured
from imgcover.scale.bars import parse_bars
from imgcover.scale.pitch import StatedPitch, parse_pitch, parse_pitch_u
from imgcover.scale.rule_class import RuleClass
from imgcover.scale.sheet import Bars
from imgcover.threads.field import Region
from imgcover.tone import Tone

if TYPE_CHECKING:
    from imgcover.cloth.declaration import Declaration

Light = Literal["backlit", "reflected"]
Warp = Literal["vertical", "horizontal"]
RuleUnit = Literal["auto", "mm", "inch"]
Backing = Literal["light", "dark"]

STATED_GSM_U = 0.01
"""Relative u of a mass where none is stated: a cut of 100 cm² is cut to about half a percent, and
moisture moves cotton as much again."""
STATED_BARS_U_MM = 0.15
"""Reading both ends of a bar on a steel rule to a tenth of a millimetre or so."""
LEAST_GSM, MOST_GSM = 1.0, 5_000.0
"""g/m²: the finest silk veil weighs some 10, the heaviest belting 4,000; anything else is a figure
in another unit, such as 0.118 kg/m²."""
HIGHEST_RISK = 0.5
"""A risk of one half or more would let anything through."""


@dataclass(frozen=True, slots=True)
class Enclosed:
    """A file that an option names, as it travels to a machine that does not see it.

    Parameters
    ----------
    name : str
        The file's, without its folder.
    sha256 : str
        Of the content, which is not compared again.
    content : bytes
    """

    name: str
    sha256: str
    content: bytes = field(compare=False, repr=False)


@dataclass(frozen=True, slots=True, kw_only=True)
class Options:
    """How a picture is to be read and judged.

    Parameters
    ----------
    light, warp : str or None, str
        As stated.
    pitch, pitch_y, pitch_u : StatedPitch, StatedPitch, float, or None
        The stated scale along the stored file's columns and rows, and its relative u.
    rule, rule_class : str or None, int
        Whether a rule is to be found, of which unit and class.
    sheet, bars : bool, Bars or None
        Whether the printed sheet is to be found, and its bars as measured.
    device : str, Enclosed or None
        Name or path of the device's certificate.
    metadata : bool
        Whether the file's own claim may be the scale.
    tone : Tone or None
        None: as the file says, else sRGB.
    blank, dark : Path, Enclosed or None
        Exposures without cloth and without light.
    backing : str or None
        Of a swatch on a card.
    gsm : Measured or None
        Mass from the balance, g/m2.
    region : Region or None
        The part to measure, px of the shown picture.
    risk : float or None
        None takes the guard band U = 2 u.
    """

    light: Light | None = None
    warp: Warp = "vertical"
    pitch: StatedPitch | None = None
    pitch_y: StatedPitch | None = None
    pitch_u: float | None = None
    rule: RuleUnit | None = None
    rule_class: int = 2
    sheet: bool = False
    bars: Bars | None = None
    device: str | Enclosed | None = None
    metadata: bool = False
    tone: Tone | None = None
    blank: Path | Enclosed | None = None
    dark: Path | Enclosed | None = None
    backing: Backing | None = None
    gsm: Measured | None = None
    region: Region | None = None
    risk: float | None = None

    def record(self) -> dict[str, Any]:
        """Lay the options out for the record's provenance; files are there by their hashes."""
        return {
            "light": self.light,
            "warp": self.warp,
            "pitch": None if self.pitch is None else self.pitch.text,
            "pitch_y": None if self.pitch_y is None else self.pitch_y.text,
            "pitch_u": self.pitch_u,
            "rule": self.rule,
            "rule_class": self.rule_class if self.rule is not None else None,
            "sheet": self.sheet,
            "bars": None if self.bars is None else [self.bars.a, self.bars.b, self.bars.u],
            "metadata": self.metadata,
            "tone": None if self.tone is None else str(self.tone),
            "backing": self.backing,
            "gsm": None if self.gsm is None else [self.gsm.value, self.gsm.u],
            "region": None if self.region is None else list(_corners(self.region)),
            "risk": self.risk,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Request:
    """One picture to be measured.

    Parameters
    ----------
    source : Path or bytes
        The file, or what it holds.
    name : str
        What the picture is called: the file's name, without its folder.
    options : Options
    declaration : Declaration or None
        What it is held against.
    sample : Sample
        Where the swatch comes from.
    """

    source: Path | bytes
    name: str
    options: Options = field(default_factory=Options)
    declaration: Declaration | None = None
    sample: Sample = field(default_factory=Sample)


def read_options(words: Mapping[str, str]) -> Options:
    """Read options from words, as the command line and a lot sheet say them.

    Parameters
    ----------
    words : mapping of str to str
        By option name without dashes in front: "pitch-y", "gsm", "region", …; switches say "yes".

    Raises
    ------
    OptionError, ScaleError
        When an option says something impossible; `where` names it.
    """
    said = dict(words)
    pitch, pitch_y = said.get("pitch"), said.get("pitch-y")
    if pitch_y is not None and pitch is None:
        raise OptionError("--pitch-y", "there is no --pitch beside it", "give both, or --pitch")
    if "pitch-u" in said and pitch is None:
        raise OptionError("--pitch-u", "there is no --pitch that it belongs to", "give --pitch")
    return Options(
        light=_choice(said, "light", Light),
        warp=_choice(said, "warp", Warp) or "vertical",
        pitch=None if pitch is None else parse_pitch(pitch),
        pitch_y=None if pitch_y is None else parse_pitch(pitch_y, option="--pitch-y"),
        pitch_u=None if "pitch-u" not in said else parse_pitch_u(said["pitch-u"]),
        rule=_choice(said, "rule", RuleUnit),
        rule_class=int(_choice(said, "rule-class", Literal["1", "2", "3"]) or 2),
        sheet=said.get("sheet") == "yes",
        bars=_bars(said),
        device=said.get("device"),
        metadata=said.get("metadata") == "yes",
        tone=_tone(said.get("tone")),
        blank=None if "blank" not in said else Path(said["blank"]),
        dark=None if "dark" not in said else Path(said["dark"]),
        backing=_choice(said, "backing", Backing),
        gsm=_gsm(said.get("gsm"), said.get("gsm-u")),
        region=_region(said.get("region")),
        risk=_risk(said.get("risk")),
    )


def _choice(said: Mapping[str, str], name: str, choices: Any) -> Any:
    word = said.get(name)
    allowed = get_args(choices)
    if word is not None and word not in allowed:
        raise OptionError(f"--{name}", f"{word!r} is none of {', '.join(allowed)}", "choose one")
    return word


def _tone(text: str | None) -> Tone | None:
    try:
        return None if text is None else Tone.parse(text)
    except ValueError as fault:
        raise OptionError("--tone", str(fault), "write srgb, linear or gamma:2.2") from None


def _number(name: str, text: str, *, low: float, high: float, example: str) -> float:
    """Read a number strictly between two limits."""
    if "," in text:
        raise OptionError(f"--{name}", f"{text!r} has a comma instead of a decimal point", example)
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not low < value < high:
        raise OptionError(
            f"--{name}", f"{text!r} is not a number above {low:g} and below {high:g}", example
        )
    return value


def _bars(said: Mapping[str, str]) -> Bars | None:
    """The bars of the printed sheet, read with a rule of the stated class."""
    text, u_text = said.get("bars"), said.get("bars-u")
    if said.get("sheet") != "yes" or text is None:
        for name in ("bars", "bars-u"):
            if name in said:
                raise OptionError(f"--{name}", "it goes with --sheet and --bars", "give both")
        return None
    u = STATED_BARS_U_MM
    if u_text is not None:
        u = _number("bars-u", u_text, low=0.0, high=5.0, example="write mm: --bars-u 0.15")
    return parse_bars(text, u=u, rule_class=RuleClass(int(said.get("rule-class", "2"))))


def _gsm(text: str | None, u_text: str | None) -> Measured | None:
    if text is None:
        if u_text is not None:
            raise OptionError("--gsm-u", "there is no --gsm that it belongs to", "give --gsm")
        return None
    value = _number("gsm", text, low=LEAST_GSM, high=MOST_GSM, example="write g/m2: --gsm 118")
    u = STATED_GSM_U * value
    if u_text is not None:
        u = _number("gsm-u", u_text, low=0.0, high=value, example="write g/m2: --gsm-u 1")
    return Measured(value, u, "g/m2")


def _region(text: str | None) -> Region | None:
    if text is None:
        return None
    parts = [part.strip() for part in text.split(",")]
    if len(parts) != 4 or not all(part.isascii() and part.isdecimal() for part in parts):
        raise OptionError(
            "--region", f"{text!r} is not X,Y,W,H in whole pixels", "write --region 100,80,900,700"
        )
    x, y, width, height = (int(part) for part in parts)
    if not (width and height):
        raise OptionError("--region", f"{text!r} is empty", "give a width and a height above 0")
    return Region(x=x, y=y, width=width, height=height)


def _corners(region: Region) -> tuple[int, int, int, int]:
    return region.x, region.y, region.width, region.height


def _risk(text: str | None) -> float | None:
    if text is None:
        return None
    return _number("risk", text, low=0.0, high=HIGHEST_RISK, example="write --risk 0.05")


__all__ = [
    *("Backing", "Enclosed", "Light", "Options", "Request", "RuleUnit", "Warp", "read_options"),
]
