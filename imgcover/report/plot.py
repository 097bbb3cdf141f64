"""Every place of a lot against the limits, as a drawing that prints."""

from __future__ import annotations

import io
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.axes import Axes

WIDTH_INCH = 7.0
"""The type area of an A4 page with the margins of the lot page."""
PANEL_INCH = 1.25
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
    from matplotlib.figure import Figure

    with rc_context({"svg.hashsalt": "imgcover", "svg.fonttype": "path", "font.size": 8}):
        figure = Figure(figsize=(WIDTH_INCH, 0.35 + PANEL_INCH * len(panels)))
        axes = figure.subplots(len(panels), 1, sharex=True, squeeze=False)[:, 0]
        for axis, panel in zip(axes, panels, strict=True):
            _draw(axis, panel)
        foot = axes[-1]
        foot.set_xlim(0.4, places + 0.6)
        foot.set_xlabel("place, as numbered in the table", color=FAINT)
        step = math.ceil(places / MOST_TICKS)
        foot.set_xticks(range(1, places + 1, step))
        height = figure.get_figheight()
        figure.subplots_adjust(
            left=0.1, right=0.985, top=1 - 0.06 / height, bottom=0.38 / height, hspace=0.2
        )
        return _element(figure_svg(figure))


def figure_svg(figure: object) -> str:
    """Write a matplotlib figure as SVG text without its date."""
    from matplotlib.figure import Figure

    assert isinstance(figure, Figure)
    written = io.StringIO()
    figure.savefig(written, format="svg", metadata={"Date": None, "Creator": None})
    return written.getvalue()


def _draw(axis: Axes, panel: Panel) -> None:
    _style(axis, panel)
    low, high = _span(panel)
    axis.set_ylim(low, high)
    if panel.accept_lower is not None or panel.accept_upper is not None:
        floor = low if panel.accept_lower is None else panel.accept_lower
        ceiling = high if panel.accept_upper is None else panel.accept_upper
        if ceiling > floor:
            axis.axhspan(floor, ceiling, color=INSIDE, lw=0, zorder=0)
    for limit in (panel.lower, panel.upper):
        if limit is not None:
            axis.axhline(limit, color=LIMIT, lw=1.1, zorder=1)
    if panel.declared is not None:
        axis.axhline(panel.declared, color=INK, lw=0.7, ls=(0, (6, 3)), zorder=1)
    if panel.mean is not None:
        reach = EXPANDED * (panel.mean_u or 0.0)
        axis.axhspan(panel.mean - reach, panel.mean + reach, color=FAINT, alpha=0.28, lw=0)
        axis.axhline(panel.mean, color=INK, lw=1.2, zorder=2)
    if panel.points:
        axis.errorbar(
            [point.number for point in panel.points],
            [point.value for point in panel.points],
            yerr=[EXPANDED * point.u for point in panel.points],
            fmt="o",
            ms=4,
            color=INK,
            mfc="white",
            elinewidth=0.9,
            capsize=2,
            zorder=3,
        )


def _style(axis: Axes, panel: Panel) -> None:
    axis.set_ylabel(f"{panel.title}, {panel.unit}", color=INK)
    axis.tick_params(colors=INK, length=2.5, width=0.6)
    axis.ticklabel_format(axis="y", useOffset=False)
    for side, spine in axis.spines.items():
        spine.set_visible(side in ("left", "bottom"))
        spine.set_linewidth(0.6)
        spine.set_color(FAINT)


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
