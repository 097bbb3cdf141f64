"""What do the measured bars of a sheet say, and how surely?"""

from __future__ import annotations

import math

from imgcover.errors import ScaleError
from imgcover.scale.rule_class import RuleClass, largest_error_mm
from imgcover.scale.sheet import BAR_B_MM, Bars


def parse_bars(text: str, *, u: float, rule_class: RuleClass) -> Bars:
    """Read `A,B` in mm, as `--bars` takes it.

    Parameters
    ----------
    text : str
        Two lengths with decimal points and a comma between.
    u : float
        Standard uncertainty of reading one bar, mm.
    rule_class : RuleClass
        Of the rule it was read with; its limit of error is added as a rectangle.

    Returns
    -------
    Bars

    Raises
    ------
    ScaleError
        When it is not two plausible lengths.

    Examples
    --------
    >>> parse_bars("180.2,259.7", u=0.1, rule_class=RuleClass.I).a
    180.2
    """
    remedy = "give both lengths in mm, bar A first: --bars 180.2,259.7"
    parts = text.split(",")
    try:
        a, b = (float(part) for part in parts)
    except ValueError:
        raise ScaleError("--bars", f"takes two lengths in mm, got {text!r}", remedy) from None
    whole = math.hypot(u, largest_error_mm(BAR_B_MM, rule_class) / math.sqrt(3))
    try:
        return Bars(a, b, whole)
    except ValueError as fault:
        raise ScaleError("--bars", str(fault), remedy) from None


__all__ = ["parse_bars"]
