"""Every place of a lot against the limits, as a drawing that prints."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

POINTS = 72
"""A drawing's own unit is the printer's point, a 72nd of an inch."""
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
LETTERS = 9.0
"""Height of the letters, points; they are of the page's own face."""
CENTRED, HANGING = 0.35, 0.75
"""From the middle and from the top of a figure to its foot, in heights of the letters."""
STEPS = (1.0, 2.0, 2.5, 5.0, 10.0)
MOST_STEPS = 4
"""Between the figures of an axis: more would touch in a panel of this height."""
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

    Written as the few lines, bands and words that it is: a page a lot is drawn by the thousand, and
    a drawing library takes a hundred times as long for the same marks.

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
    sheet = _Sheet(FOOT_INCH + PANEL_INCH * len(panels))
    for n, panel in enumerate(panels):
        base = sheet.height - PANEL_INCH * (n + 1)
        frame = _Frame(base + 0.12, PANEL_INCH - 0.18, *_span(panel), places)
        _draw_limits(sheet, frame, panel)
        _draw_axis(sheet, frame, panel)
        _draw_points(sheet, frame, panel)
    for number in range(1, places + 1, math.ceil(places / MOST_TICKS)):
        sheet.words(str(number), frame.x(number), FOOT_INCH - 0.04, drop=HANGING)
    middle = (LEFT_INCH + RIGHT_INCH) / 2
    sheet.words("place, as numbered in the table", middle, 0.04, colour=FAINT)
    return sheet.element()


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


class _Sheet:
    """A sheet in inches from its lower left corner; nothing on it is text from outside."""

    def __init__(self, height: float) -> None:
        self.height = height
        self._parts: list[str] = []

    def band(self, low: float, high: float, colour: str, *, strength: float = 1.0) -> None:
        left, top = self._at(LEFT_INCH, high)
        right, foot = self._at(RIGHT_INCH, low)
        self._parts.append(
            f'<path d="M{left} {top}H{right}V{foot}H{left}z" fill="{colour}"'
            f' fill-opacity="{strength:g}"/>'
        )

    def across(self, y: float, colour: str, width: float, *, dashed: bool = False) -> None:
        self.line((LEFT_INCH, y), (RIGHT_INCH, y), colour, width, dashed=dashed)

    def line(
        self,
        start: tuple[float, float],
        end: tuple[float, float],
        colour: str,
        width: float,
        *,
        dashed: bool = False,
    ) -> None:
        (x, y), (to_x, to_y) = self._at(*start), self._at(*end)
        dashes = ' stroke-dasharray="4.2 2.1"' if dashed else ""
        self._parts.append(
            f'<path d="M{x} {y}L{to_x} {to_y}" stroke="{colour}" stroke-width="{width:g}"{dashes}/>'
        )

    def mark(self, x: float, y: float) -> None:
        left, top = self._at(x, y)
        self._parts.append(
            f'<circle cx="{left}" cy="{top}" r="2" fill="white" stroke="{INK}" stroke-width="0.9"/>'
        )

    def words(
        self,
        text: str,
        x: float,
        y: float,
        *,
        drop: float = 0.0,
        anchor: str = "middle",
        colour: str = INK,
        upright: bool = False,
    ) -> None:
        """Set words whose foot lies `drop` heights of the letters below y."""
        left, top = self._at(x, y)
        turn = f' transform="rotate(-90 {left} {top})"' if upright else ""
        self._parts.append(
            f'<text x="{left}" y="{top}" dy="{drop:g}em" text-anchor="{anchor}"'
            f' fill="{colour}"{turn}>{text}</text>'
        )

    def element(self) -> str:
        size = f"{POINTS * WIDTH_INCH:g} {POINTS * self.height:g}"
        body = "\n".join(self._parts)
        return (
            f'<svg viewBox="0 0 {size}" fill="none" font-size="{LETTERS:g}" role="img"'
            f' aria-label="places against limits">\n{body}\n</svg>'
        )

    def _at(self, x: float, y: float) -> tuple[str, str]:
        # a hundredth of a point is finer than any printer
        return f"{POINTS * x:.2f}", f"{POINTS * (self.height - y):.2f}"


def _draw_limits(sheet: _Sheet, frame: _Frame, panel: Panel) -> None:
    if panel.accept_lower is not None or panel.accept_upper is not None:
        floor = frame.low if panel.accept_lower is None else panel.accept_lower
        ceiling = frame.high if panel.accept_upper is None else panel.accept_upper
        if ceiling > floor:
            sheet.band(frame.y(floor), frame.y(ceiling), INSIDE)
    if panel.mean is not None:
        reach = EXPANDED * (panel.mean_u or 0.0)
        low, high = frame.y(panel.mean - reach), frame.y(panel.mean + reach)
        sheet.band(low, high, FAINT, strength=0.28)
    for limit in (panel.lower, panel.upper):
        if limit is not None:
            sheet.across(frame.y(limit), LIMIT, 1.1)
    if panel.declared is not None:
        sheet.across(frame.y(panel.declared), INK, 0.7, dashed=True)
    if panel.mean is not None:
        sheet.across(frame.y(panel.mean), INK, 1.2)


def _draw_axis(sheet: _Sheet, frame: _Frame, panel: Panel) -> None:
    sheet.line((LEFT_INCH, frame.base), (LEFT_INCH, frame.base + frame.height), FAINT, 0.6)
    sheet.across(frame.base, FAINT, 0.6)
    ticks = _ticks(frame.low, frame.high)
    digits = max((len(f"{tick:g}".partition(".")[2]) for tick in ticks), default=0)
    for tick in ticks:
        y = frame.y(tick)
        sheet.line((LEFT_INCH - 0.04, y), (LEFT_INCH, y), FAINT, 0.6)
        sheet.words(f"{tick:.{digits}f}", LEFT_INCH - 0.07, y, drop=CENTRED, anchor="end")
    middle = frame.base + frame.height / 2
    sheet.words(f"{panel.title}, {panel.unit}", 0.1, middle, drop=CENTRED, upright=True)


def _draw_points(sheet: _Sheet, frame: _Frame, panel: Panel) -> None:
    cap = min(0.04, 0.3 * (frame.x(2) - frame.x(1)))
    for point in panel.points:
        x, reach = frame.x(point.number), EXPANDED * point.u
        low, high = frame.y(point.value - reach), frame.y(point.value + reach)
        sheet.line((x, low), (x, high), INK, 0.9)
        for y in (low, high):
            sheet.line((x - cap, y), (x + cap, y), INK, 0.9)
    for point in panel.points:
        sheet.mark(frame.x(point.number), frame.y(point.value))


def _ticks(low: float, high: float) -> list[float]:
    """Round values inside a span, at most a few steps apart.

    Examples
    --------
    >>> _ticks(65.2, 70.9)
    [66.0, 68.0, 70.0]
    """
    rough = (high - low) / MOST_STEPS
    decade = 10.0 ** math.floor(math.log10(rough))
    step = next((each * decade for each in STEPS if each * decade >= rough), 10 * decade)
    return [n * step for n in range(math.ceil(low / step), math.floor(high / step) + 1)]


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


__all__ = ["Panel", "Point", "places_drawing"]
