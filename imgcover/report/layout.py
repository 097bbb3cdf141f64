"""Text for people: numbers rounded by their u, columns, no line longer than a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from imgcover.quantity import rounded
from imgcover.report.plain import columns, shortened

if TYPE_CHECKING:
    from imgcover.cloth.declaration import Declaration

WIDTH = 80
"""Columns of the narrowest terminal and of a printed page."""
CM_PER_INCH = 2.54
MOST_DIGITS = 5
"""A thread in a thousand metres is nobody's concern: past it digits only widen a column."""

Units = Literal["inch", "cm"]


def units_of(declaration: Declaration | None) -> Units:
    """Say densities as the declaration does; by the centimetre where there is none."""
    if declaration is None:
        return "cm"
    return "inch" if "in" in declaration.warp.threads.text else "cm"


@dataclass(frozen=True, slots=True)
class Shown:
    """How a unit of the record is shown: times a factor, under another name."""

    factor: float
    unit: str


def shown_as(unit: str, units: Units) -> Shown:
    """Say how a number of the record's unit is shown.

    Examples
    --------
    >>> shown_as("1/cm", "inch")
    Shown(factor=2.54, unit='/in')
    """
    if unit == "1/cm":
        return Shown(CM_PER_INCH, "/in") if units == "inch" else Shown(1.0, "/cm")
    if unit == "1":
        return Shown(100.0, "%")
    return Shown(1.0, {"g/m2": "g/m²", "deg": "°"}.get(unit, unit))


def figure(measured: Mapping[str, Any] | None, units: Units) -> str:
    """Write a number of the record with its u and unit; a dash where it is null.

    Examples
    --------
    >>> figure({"value": 26.7717, "u": 0.134, "unit": "1/cm"}, "inch")
    '68.00 ± 0.34 /in'
    """
    if measured is None:
        return "–"
    how = shown_as(measured["unit"], units)
    value, u = _for_people(measured["value"] * how.factor, measured["u"] * how.factor)
    return f"{value} {how.unit}" if u == "0" else f"{value} ± {u} {how.unit}"


def near(value: float | None, u: float | None) -> str:
    """Write a number with the digits that `u` deserves, four where there is none."""
    if value is None:
        return ""
    return _for_people(value, u)[0] if u else f"{value:.4g}"


def _for_people(value: float, u: float) -> tuple[str, str]:
    """Round by u, but to no more digits than anyone reads."""
    if u == 0:
        return rounded(value, u)
    shown, shown_u = rounded(value, u)
    most = MOST_DIGITS - max(1, len(str(int(abs(value)))))
    if len(shown.partition(".")[2]) <= most:
        return shown, shown_u
    smallest = 10.0**-most
    return f"{value:.{most}f}", f"{u:.{most}f}" if u >= smallest else f"<{smallest:g}"


def brief(value: float) -> str:
    """Write a number that has no u of its own, such as a limit, to four digits."""
    return f"{value:.4g}"


def table(rows: Sequence[Sequence[str]], *, indent: int = 2, gap: int = 2) -> list[str]:
    """Set rows in columns as wide as their widest cell; the first column is cut to make room."""
    widths = [max(columns(row[at]) for row in rows) for at in range(len(rows[0]))]
    over = indent + sum(widths) + gap * (len(widths) - 1) - WIDTH
    if over > 0:
        widths[0] = max(8, widths[0] - over)
    lines = []
    for row in rows:
        cells = [
            text + " " * (width - columns(text))
            for text, width in zip((shortened(row[0], widths[0]), *row[1:]), widths, strict=True)
        ]
        lines.append((" " * indent + (" " * gap).join(cells)).rstrip())
    return lines


def facts(rows: Sequence[tuple[str, str]], *, indent: int = 2) -> list[str]:
    """Set names and what is said of them in two columns, the second wrapped."""
    width = max(columns(name) for name, _ in rows) + 2
    lines = []
    for name, said in rows:
        first = " " * indent + name + " " * (width - columns(name))
        lines += wrapped(said, first=first, then=" " * (indent + width))
    return lines


def wrapped(text: str, *, first: str = "  ", then: str = "    ") -> list[str]:
    """Break a sentence into lines that fit; words longer than a line are cut."""
    if columns(text) == len(text):
        return textwrap.wrap(text, WIDTH, initial_indent=first, subsequent_indent=then)
    # letters two columns wide, or none: textwrap counts each as one
    lines, line, bare = [], first, True
    for word in text.split():
        joined = line + word if bare else f"{line} {word}"
        if columns(joined) > WIDTH:
            if not bare:
                lines.append(line)
                line = then
            joined = line
            for letter in word:
                if columns(joined + letter) > WIDTH:
                    lines.append(joined)
                    joined = then
                joined += letter
        line, bare = joined, False
    return [*lines, line]


__all__ = [
    "WIDTH",
    "Shown",
    "Units",
    "brief",
    "facts",
    "figure",
    "near",
    "shown_as",
    "table",
    "wrapped",
]
