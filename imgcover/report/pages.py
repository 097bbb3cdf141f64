"""What all pages share: how a template is filled, and how a decision is said and coloured."""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING, Any

from imgcover.report.layout import near

if TYPE_CHECKING:
    from jinja2 import Environment

DECISIONS = {
    "conforms": ("✓ conforms", "good"),
    "does not conform": ("✗ does not conform", "bad"),
    "undecided": ("? undecided", "open"),
    None: ("not judged", "plain"),
}
"""Said with a sign as well as a colour: pages are photocopied, and not every eye tells red from
green."""


def page(template: str, /, **content: Any) -> str:
    """Fill one of the templates; every text in `content` is escaped."""
    return _environment().get_template(template).render(**content)


def said_decision(decision: str | None) -> str:
    """Write a decision with its sign."""
    return DECISIONS[decision][0]


def decision_class(decision: str | None) -> str:
    """The class that colours a decision."""
    return DECISIONS[decision][1]


def limits_text(lower: float | None, upper: float | None, factor: float, u: float | None) -> str:
    """Write limits with the digits that u deserves; a dash where there are none."""
    low, high = (None if each is None else near(each * factor, u) for each in (lower, upper))
    if low is None and high is None:
        return "–"
    if low is None:
        return f"up to {high}"
    return f"from {low}" if high is None else f"{low} to {high}"


@cache
def _environment() -> Environment:
    # imported here: commands that make no page must not pay for it
    from jinja2 import Environment, PackageLoader, StrictUndefined
    from markupsafe import Markup

    environment = Environment(
        loader=PackageLoader("imgcover.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    # the drawing is our own element with our own words in it, and the only thing let through
    environment.filters["drawn"] = Markup
    return environment


__all__ = ["decision_class", "limits_text", "page", "said_decision"]
