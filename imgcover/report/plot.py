"""Every place of a lot against the limits, as a drawing that prints."""

from __future__ import annotations

import io
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

WIDTH_INCH = 7.0
"""The type area of an A4 page with the margins of the lot page."""
PANEL_INCH = 1.2
FOOT_INCH = 0.42
LEFT_INCH, RIGHT_INCH = 0.68, 6.94
"""Between them the values are drawn; left of them stand their figures."""
INK = "#1c2026"
FAINT = "#80868e"
LIMIT = "#b3261e"
INSIDE = "#dfe9dd"
"""Paler than the points in grey print, so that a photocopy still shows them."""
MOST_TICKS = 25
"""Numbers along the foot that can still be read."""
EXPANDED = 2.0
"""Bars reach over ± U = 2 u, as the guard band does by default (JCGM 106)."""


@dataclass(frozen=True, slots=True)
class Point:
    """One place: its number in the lot's table, its value and u."""

    number: int
    value: float
    u: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Panel:
    """One quantity of a lot, every number in its shown unit.

    Parameters
    ----------
    title, unit : str
        Our own words, never text from outside.
    points : tuple of Point
        May be empty.
    mean, mean_u : float or None
        Of the lot.
    declared, lower, upper, accept_lower, accept_upper : float or None
        What it is held against; None where there is nothing.
    """

    title: str
    unit: str
    points: tuple[Point, ...]
    mean: float | None = None
    mean_u: float | None = None
    declared: float | None = None
    lower: float | None = None
    upper: float | None = None
    accept_lower: float | None = None
    accept_upper: float | None = None


def places_drawing(panels: Sequence[Panel], *, places: int) -> str:
    """Draw one panel a quantity, one under the other.

    Everything goes into few collections on one plain sheet: a page a lot is drawn by the thousand,
    and ready-made axes with their ticks take four times as long.

    Parameters
    ----------
    panels : sequence of Panel
        At least one.
    places : int
        How many numbers the foot carries.

    Returns
    -------
    str
        An `svg` element, the same to the byte for the same panels.
    """
    # imported here: half a second that only a page pays
    from matplotlib import rc_context

    height = FOOT_INCH + PANEL_INCH * len(panels)
    strokes, fields, words = _Strokes(), _Fields(), _Words()
    marks: list[tuple[float, float]] = []
    for n, panel in enumerate(panels):
        base = height - PANEL_INCH * (n + 1)
        frame = _Frame(base + 0.12, PANEL_INCH - 0.18, *_span(panel), places)
        _draw_limits(frame, panel, strokes, fields)
        _draw_axis(frame, panel, strokes, words)
        marks += _draw_points(frame, panel, strokes)
    step = math.ceil(places / MOST_TICKS)
    for number in range(1, places + 1, step):
        words.add(frame.x(number), FOOT_INCH - 0.04, str(number), ha="center", va="top")
    words.add(
        (LEFT_INCH + RIGHT_INCH) / 2,
        0.02,
        "place, as numbered in the table",
        ha="center",
        va="bottom",
        color=FAINT,
    )
    with rc_context({"svg.hashsalt": "imgcover", "svg.fonttype": "path", "font.size": 8}):
        return _element(_sheet(height, fields, strokes, marks, words))


@dataclass(frozen=True, slots=True)
class _Frame:
    """Where a panel lies on the sheet, in inches, and which values it spans."""

    base: float
    height: float
    low: float
    high: float
    places: int

    def x(self, number: float) -> float:
        share = (number - 0.4) / (self.places + 0.2)
        return LEFT_INCH + share * (RIGHT_INCH - LEFT_INCH)

    def y(self, value: float) -> float:
        inside = min(max(value, self.low), self.high)
        return self.base + (inside - self.low) / (self.high - self.low) * self.height


class _Strokes:
    """Straight lines, gathered."""

    def __init__(self) -> None:
        self.ends: list[tuple[tuple[float, float], tuple[float, float]]] = []
        self.colours: list[str] = []
        self.widths: list[float] = []
        self.dashes: list[Any] = []

    def across(self, y: float, colour: str, width: float, *, dashed: bool = False) -> None:
        self.add((LEFT_INCH, y), (RIGHT_INCH, y), colour, width, dashed=dashed)

    def add(
        self,
        start: tuple[float, float],
        end: tuple[float, float],
        colour: str,
        width: float,
        *,
        dashed: bool = False,
    ) -> None:
        self.ends.append((start, end))
        self.colours.append(colour)
        self.widths.append(width)
        self.dashes.append((0, (6, 3)) if dashed else "solid")


class _Fields:
    """Shaded bands across a panel, gathered."""

    def __init__(self) -> None:
        self.corners: list[list[tuple[float, float]]] = []
        self.colours: list[tuple[str, float]] = []

    def add(self, low: float, high: float, colour: str, alpha: float) -> None:
        self.corners.append(
            [(LEFT_INCH, low), (RIGHT_INCH, low), (RIGHT_INCH, high), (LEFT_INCH, high)]
        )
        self.colours.append((colour, alpha))


class _Words:
    """Words and where they stand."""

    def __init__(self) -> None:
        self.placed: list[tuple[float, float, str, dict[str, Any]]] = []

    def add(self, x: float, y: float, text: str, **style: Any) -> None:
        self.placed.append((x, y, text, {"color": INK, **style}))


def _draw_limits(frame: _Frame, panel: Panel, strokes: _Strokes, fields: _Fields) -> None:
    if panel.accept_lower is not None or panel.accept_upper is not None:
        floor = frame.low if panel.accept_lower is None else panel.accept_lower
        ceiling = frame.high if panel.accept_upper is None else panel.accept_upper
        if ceiling > floor:
            fields.add(frame.y(floor), frame.y(ceiling), INSIDE, 1.0)
    for limit in (panel.lower, panel.upper):
        if limit is not None:
            strokes.across(frame.y(limit), LIMIT, 1.1)
    if panel.declared is not None:
        strokes.across(frame.y(panel.declared), INK, 0.7, dashed=True)
    if panel.mean is not None:
        reach = EXPANDED * (panel.mean_u or 0.0)
        fields.add(frame.y(panel.mean - reach), frame.y(panel.mean + reach), FAINT, 0.28)
        strokes.across(frame.y(panel.mean), INK, 1.2)


def _draw_axis(frame: _Frame, panel: Panel, strokes: _Strokes, words: _Words) -> None:
    from matplotlib.ticker import MaxNLocator

    top = frame.base + frame.height
    strokes.add((LEFT_INCH, frame.base), (LEFT_INCH, top), FAINT, 0.6)
    strokes.across(frame.base, FAINT, 0.6)
    ticks = MaxNLocator(nbins=4, steps=[1, 2, 2.5, 5, 10]).tick_values(frame.low, frame.high)
    inside = [float(tick) for tick in ticks if frame.low <= tick <= frame.high]
    digits = max((len(f"{tick:g}".partition(".")[2]) for tick in inside), default=0)
    for tick in inside:
        y = frame.y(tick)
        strokes.add((LEFT_INCH - 0.04, y), (LEFT_INCH, y), FAINT, 0.6)
        words.add(LEFT_INCH - 0.07, y, f"{tick:.{digits}f}", ha="right", va="center")
    middle = frame.base + frame.height / 2
    words.add(0.1, middle, f"{panel.title}, {panel.unit}", ha="center", va="center", rotation=90)


def _draw_points(frame: _Frame, panel: Panel, strokes: _Strokes) -> list[tuple[float, float]]:
    cap = min(0.04, 0.3 * (frame.x(2) - frame.x(1)))
    marks = []
    for point in panel.points:
        x, reach = frame.x(point.number), EXPANDED * point.u
        ends = [(x, frame.y(point.value - reach)), (x, frame.y(point.value + reach))]
        strokes.add(ends[0], ends[1], INK, 0.9)
        for _, y in ends:
            strokes.add((x - cap, y), (x + cap, y), INK, 0.9)
        marks.append((x, frame.y(point.value)))
    return marks


def _sheet(
    height: float,
    fields: _Fields,
    strokes: _Strokes,
    marks: Sequence[tuple[float, float]],
    words: _Words,
) -> str:
    """Put everything on one sheet, whose unit is the inch."""
    from matplotlib.collections import LineCollection, PolyCollection
    from matplotlib.figure import Figure
    from matplotlib.lines import Line2D

    figure = Figure(figsize=(WIDTH_INCH, height))
    inches = figure.dpi_scale_trans
    figure.add_artist(
        PolyCollection(fields.corners, facecolors=fields.colours, linewidths=0, transform=inches)
    )
    figure.add_artist(
        LineCollection(
            strokes.ends,
            colors=strokes.colours,
            linewidths=strokes.widths,
            linestyles=strokes.dashes,
            transform=inches,
        )
    )
    if marks:
        x, y = zip(*marks, strict=True)
        points = Line2D(x, y, linestyle="none", marker="o", markersize=4, transform=inches)
        points.set(markeredgecolor=INK, markerfacecolor="white", markeredgewidth=0.9)
        figure.add_artist(points)
    for left, base, text, style in words.placed:
        figure.text(left, base, text, transform=inches, **style)
    written = io.StringIO()
    figure.savefig(written, format="svg", metadata={"Date": None, "Creator": None})
    return written.getvalue()


def _span(panel: Panel) -> tuple[float, float]:
    """Leave room round everything that is drawn."""
    drawn = [panel.mean, panel.declared, panel.lower, panel.upper]
    drawn += [point.value - EXPANDED * point.u for point in panel.points]
    drawn += [point.value + EXPANDED * point.u for point in panel.points]
    heights = [each for each in drawn if each is not None]
    if not heights:
        return 0.0, 1.0
    low, high = min(heights), max(heights)
    room = 0.08 * (high - low) or 0.02 * abs(high) or 1.0
    return low - room, high + room


def _element(text: str) -> str:
    """Keep the element alone: its prolog names a document type on another host."""
    return text[text.index("<svg") :]


__all__ = ["Panel", "Point", "places_drawing"]
