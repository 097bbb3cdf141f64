"""What pitch does the user state, and how well is it known?"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from imgcover.errors import ScaleError
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.scale import Scale, ScaleSource

INCH_MM = 25.4
STATED_DPI_U = 0.005
"""Relative. Flatbeds' x and y differ by up to 1 %, and so do two units of one model."""
LOWEST, HIGHEST = 1.0, 2000.0
"""px/mm. Below 1 (25 dpi) no thread has 3 pixels; above 2000 (half a micrometre a pixel) light
itself blurs."""
LARGEST_U = 0.1
"""A pitch known to no better than 10 % says nothing about a cloth."""
UNITS = {"dpi": "dpi", "px/mm": "px/mm", "um": "um", "µm": "um", "μm": "um"}
"""As written to as meant; the two mu are U+00B5 and U+03BC, which keyboards mix up."""
WAYS = "write it as 600dpi, 23.62px/mm or 42.3um"


@dataclass(frozen=True, slots=True)
class StatedPitch:
    """A pitch as the user states it.

    Parameters
    ----------
    px_per_mm : float
        Pixels a millimetre.
    u_relative : float
        Relative standard uncertainty that its way of being stated carries.
    text : str
        As it was written.
    """

    px_per_mm: float
    u_relative: float
    text: str

    @property
    def is_nominal(self) -> bool:
        """Whether it is a device's setting, in dots an inch, and not a measured pitch."""
        return self.u_relative > 0


def parse_pitch(text: str, *, option: str = "--pitch") -> StatedPitch:
    """Read a pitch.

    Parameters
    ----------
    text : str
        A number and dpi, px/mm, um or µm, with or without a space.
    option : str
        What to call it in an error.

    Returns
    -------
    StatedPitch
        Stated dpi carries 0.5 %: it is a device's nominal figure. px/mm and µm, which somebody
        measured or computed, count as exact.

    Raises
    ------
    ScaleError
        When there is no number, no known unit, or no sensible pitch.

    Examples
    --------
    >>> parse_pitch("600 dpi").px_per_mm
    23.62204724409449
    >>> parse_pitch("42.3µm").px_per_mm
    23.64066193853428
    """
    match = re.fullmatch(r"\s*([-+]?\d*\.?\d*(?:[eE][-+]?\d+)?)\s*(\S*)\s*", text, re.ASCII)
    number, unit = match.groups() if match else ("", "")
    if "," in text:
        raise ScaleError(option, f"{text!r} has a comma instead of a decimal point", WAYS)
    meant = UNITS.get(unit if unit in UNITS else unit.lower())
    try:
        value = float(number)
    except ValueError:
        raise ScaleError(option, f"{text!r} is not a pitch", WAYS) from None
    if meant is None:
        told = f"has the unknown unit {unit!r}" if unit else "has no unit"
        raise ScaleError(option, f"{text!r} {told}; known are dpi, px/mm, um", WAYS)
    if value <= 0:
        raise ScaleError(option, f"a pitch must be more than zero, got {text!r}", WAYS)
    px_per_mm = {"dpi": value / INCH_MM, "px/mm": value, "um": 1000 / value}[meant]
    if not LOWEST <= px_per_mm <= HIGHEST:
        raise ScaleError(
            option,
            f"{text!r} means {px_per_mm:.4g} pixels a millimetre, and no picture of cloth that "
            f"can be counted has under {LOWEST:g} or over {HIGHEST:g}",
            "check the number and its unit",
        )
    return StatedPitch(px_per_mm, STATED_DPI_U if meant == "dpi" else 0.0, text.strip())


def parse_pitch_u(text: str, *, option: str = "--pitch-u") -> float:
    """Read the relative standard uncertainty of a pitch.

    Parameters
    ----------
    text : str
        A percentage, such as "0.2%" or "0.2 %".
    option : str
        What to call it in an error.

    Returns
    -------
    float
        As a fraction.

    Raises
    ------
    ScaleError
        When it is no percentage from 0 to below 10 %.

    Examples
    --------
    >>> parse_pitch_u("0.2 %")
    0.002
    """
    match = re.fullmatch(r"\s*(\d+(?:\.\d*)?|\.\d+)\s*%\s*", text, re.ASCII)
    share = float(match[1]) / 100 if match else math.nan
    if not 0 <= share < LARGEST_U:
        raise ScaleError(
            option,
            f"{text!r} is not a share between 0 % and {100 * LARGEST_U:g} %",
            "write it as 0.2%",
        )
    return share


def scale_from(
    x: StatedPitch,
    y: StatedPitch | None = None,
    *,
    pitch_u: float | None = None,
    swapped: bool = False,
) -> Scale:
    """Make a scale of a stated pitch.

    Parameters
    ----------
    x : StatedPitch
        Along the stored file's columns, and its rows too unless `y` is given.
    y : StatedPitch, optional
        Along the stored file's rows.
    pitch_u : float, optional
        Relative standard uncertainty of each, in place of what their way of being stated carries.
    swapped : bool
        Whether the stored columns became shown rows (orientations 5 to 8).

    Returns
    -------
    Scale
        Along the shown axes.

    Notes
    -----
    One stated figure does not make the axes equal: a flatbed's optics set the pitch across, its
    stepper the pitch along. So the two errors count as independent, and y/x carries both.
    """
    y = x if y is None else y
    u_x, u_y = (each.u_relative if pitch_u is None else pitch_u for each in (x, y))
    return Scale(
        x=Measured(x.px_per_mm, x.px_per_mm * u_x, "px/mm"),
        y=Measured(y.px_per_mm, y.px_per_mm * u_y, "px/mm"),
        ratio_u=math.hypot(u_x, u_y),
        source=ScaleSource.STATED,
        findings=_taken_as_exact(x, y) if pitch_u is None else (),
    ).turned(swapped=swapped)


def _taken_as_exact(*pitches: StatedPitch) -> tuple[Finding, ...]:
    exact = dict.fromkeys(each.text for each in pitches if each.u_relative == 0)
    if not exact:
        return ()
    message = f"the stated pitch {' and '.join(exact)} was taken as exact"
    return (found(Flag.PITCH_TAKEN_AS_EXACT, message),)


__all__ = ["StatedPitch", "parse_pitch", "parse_pitch_u", "scale_from"]
