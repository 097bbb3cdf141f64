"""How far may a figure stray: "2 %", "-2 % +5 %", "4 /10cm", "4 points"?"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

from imgcover.cloth.sett import PER_MM
from imgcover.cloth.stated import StatementError, as_text, read_figure

PERCENT = {"%": 0.01}
SETT_UNITS = {unit: worth for unit, worth in PER_MM.items() if unit != "/mm"}
"""A tolerance of whole threads a millimetre is a slip for a percentage; it is not offered."""
COVER_UNITS = {"points": 0.01, "point": 0.01}
"""Of cover, a percentage could mean points or a share of the figure: only points are read."""
MASS_UNITS = {"g/m2": 1.0, "gsm": 1.0, "oz/yd2": 28.349523125 / 0.9144**2}
WIDEST_SHARE = 0.5
"""A tolerance past half the figure accepts anything; it is taken for a slip."""


@dataclass(frozen=True, slots=True)
class Tolerance:
    """A tolerance below and above a declared figure.

    Parameters
    ----------
    below, above : float or None
        How far under and over is still right, never negative; None where that side is open.
    relative : bool
        Whether they are shares of the declared figure, else in its inside unit (1/mm, g/m2,
        fraction).
    text : str
        What was declared.
    """

    below: float | None
    above: float | None
    relative: bool
    text: str

    def limits(self, declared: float) -> tuple[float | None, float | None]:
        """Work out the tolerance limits, in the unit of `declared`.

        Parameters
        ----------
        declared : float
            The declared figure in its inside unit: 1/mm, g/m2, or a fraction for cover.

        Returns
        -------
        tuple of (float or None, float or None)
            The lower and the upper limit; None where that side is open.

        Examples
        --------
        >>> read_tolerance("-2 % +5 %", units=SETT_UNITS, example="2 %").limits(2.0)
        (1.96, 2.1)
        """
        scale = abs(declared) if self.relative else 1.0
        lower = None if self.below is None else declared - self.below * scale
        upper = None if self.above is None else declared + self.above * scale
        return lower, upper


def read_tolerance(
    value: object, *, units: Mapping[str, float], example: str, percent: bool = True
) -> Tolerance:
    """Read a tolerance.

    Parameters
    ----------
    value : object
        What the file holds.
    units : mapping of str to float
        The absolute units allowed and their worth in the inside unit.
    example : str
        A valid spelling, for the remedy.
    percent : bool
        Whether a share of the declared figure may be written.

    Raises
    ------
    StatementError
        When it cannot be read in exactly one way.
    """
    text = as_text(value, example).replace("±", "").replace("+-", "").replace("+/-", "").strip()
    parts = re.split(r"(?<=\S)\s*(?=[+-]\s*\d)", text)
    allowed = {**(PERCENT if percent else {}), **units}
    read = [_read_side(part, allowed, example) for part in parts]
    relatives = {relative for _, _, relative in read}
    signs = [sign for sign, _, _ in read]
    if len(relatives) > 1 or len(read) > 2 or (len(read) == 2 and sorted(signs) != ["+", "-"]):
        raise StatementError(
            f'expected one tolerance, or one below and one above, got "{text}"',
            'write "2 %", "-2 %", "+5 %" or "-2 % +5 %"' if percent else f'write "{example}"',
        )
    below = next((size for sign, size, _ in read if sign in ("", "-")), None)
    above = next((size for sign, size, _ in read if sign in ("", "+")), None)
    return Tolerance(below, above, relatives.pop(), text)


def _read_side(part: str, units: Mapping[str, float], example: str) -> tuple[str, float, bool]:
    sign = part[:1] if part[:1] in ("+", "-") else ""
    stated = read_figure(part.lstrip("+- "), units=units, example=example)
    if stated.u is not None:
        raise StatementError(f'a tolerance has no u, got "{part}"', f'write "{example}"')
    relative = stated.text.endswith("%")
    if relative and stated.value > WIDEST_SHARE:
        raise StatementError(
            f'expected a tolerance of at most {WIDEST_SHARE:.0%}, got "{part}"', "check the number"
        )
    return sign, stated.value, relative


def read_sett_tolerance(value: object) -> Tolerance:
    """Read a tolerance of ends or picks: a share, or threads a length."""
    return read_tolerance(value, units=SETT_UNITS, example="2 %")


def read_cover_tolerance(value: object) -> Tolerance:
    """Read a tolerance of cover: points of covered area only."""
    return read_tolerance(value, units=COVER_UNITS, example="4 points", percent=False)


def read_mass_tolerance(value: object) -> Tolerance:
    """Read a tolerance of mass: a share, or mass an area."""
    return read_tolerance(value, units=MASS_UNITS, example="5 %")


__all__ = [
    "COVER_UNITS",
    "MASS_UNITS",
    "SETT_UNITS",
    "Tolerance",
    "read_cover_tolerance",
    "read_mass_tolerance",
    "read_sett_tolerance",
    "read_tolerance",
]
