"""Can the declared cloth be woven at all?

References
----------
Peirce 1937: in a jammed plain cloth √(1 − (p1/D)²) + √(1 − (p2/D)²) = 1, D the two yarns' heights
together. Love, Graphical Relationships in Cloth Geometry for Plain, Twill, and Sateen Weaves,
Text. Res. J. 24 (1954) 1073: threads that float lie side by side, the others at the jam.
Ashenhurst: sett = diameters × threads / (threads + intersections). Brierley: T = F^m √(K Ne),
cotton K 200.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass

from imgcover.cloth.constant import combined
from imgcover.cloth.construction import Construction, Threads
from imgcover.cloth.count import Count
from imgcover.cloth.count_system import GRAMS_PER_POUND, METRES_PER_YARD
from imgcover.cloth.diameter import Section
from imgcover.cloth.sett import MM_PER_INCH
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.weave import weave

ASHENHURST_FIRM = 0.9
ASHENHURST_RANGE = (0.84, 0.95)
"""From Ashenhurst's 0.84 for soft yarns to Taylor's 0.95 for cotton."""
RULE_U = (ASHENHURST_RANGE[1] - ASHENHURST_RANGE[0]) / 12**0.5 / ASHENHURST_FIRM
"""Relative u of a sett rule; no spread is published for Brierley's, so it is given the same."""
BRIERLEY_COTTON = 200.0
BRIERLEY_POWERS = (
    ("plain|tabby", 0.0),
    ("twill", 0.39),
    ("satin|sateen", 0.42),
    ("hopsack", 0.45),
)
"""The power of the mean float by family of weaves; other families have none published."""
COVERAGE = 2.0
"""A sheet is only called impossible when it passes the limit by more than two u."""

HALVINGS = 48
"""Of six decades, in logarithms: the tightness is then found to 1 in 10¹³."""


@dataclass(frozen=True, slots=True)
class WeavingLimit:
    """How close a construction comes to what can be woven.

    Parameters
    ----------
    tightness : Measured
        Both setts as a share of the setts, in the same proportion, at which the cloth jams: 1 is
        jammed, above cannot be woven of yarns of that section.
    ashenhurst_ends, ashenhurst_picks : Measured
        Firm setts for a square cloth of that yarn, 1/cm.
    brierley_ends, brierley_picks : Measured or None
        The same by Brierley, for cotton in plain, twill, satin or hopsack; else None.
    """

    tightness: Measured
    ashenhurst_ends: Measured
    ashenhurst_picks: Measured
    brierley_ends: Measured | None
    brierley_picks: Measured | None


def weaving_limit(cloth: Construction) -> tuple[WeavingLimit | None, tuple[Finding, ...]]:
    """Hold a construction against the limits of weaving.

    Returns
    -------
    tuple of (WeavingLimit or None, tuple of Finding)
        None where no weave is declared; a finding where the cloth cannot be woven or is at the
        limit.
    """
    if cloth.weave is None:
        return None, ()
    floats = _mean_floats(cloth.weave)
    tightness, _ = combined(
        lambda drawn: _tightness(cloth, floats, drawn), cloth.constants, unit="1"
    )
    limit = WeavingLimit(
        tightness,
        ashenhurst_sett(cloth.warp.count, floats[0]),
        ashenhurst_sett(cloth.weft.count, floats[1]),
        brierley_sett(cloth.warp.count, floats[0], cloth.weave) if _cotton(cloth.warp) else None,
        brierley_sett(cloth.weft.count, floats[1], cloth.weave) if _cotton(cloth.weft) else None,
    )
    return limit, _judged(tightness)


def jam(
    ends_spacing: float,
    picks_spacing: float,
    *,
    warp: Section,
    weft: Section,
    floats: tuple[float, float] = (1.0, 1.0),
) -> float:
    """Peirce's jam sum: 1 when jammed, less when it can be woven.

    Parameters
    ----------
    ends_spacing, picks_spacing : float
        Mean spacings in mm.
    warp, weft : Section
        The yarns in the cloth.
    floats : tuple of float
        Threads an intersection across the ends and along them; 1 in plain weave.

    Examples
    --------
    A square cloth of round yarns jams at a spacing of 0.866 of the two diameters.

    >>> yarn = Section(0.2, 0.2)
    >>> round(jam(0.4 * 0.75**0.5, 0.4 * 0.75**0.5, warp=yarn, weft=yarn), 12)
    1.0
    """
    both = warp.height + weft.height
    total = 0.0
    for spacing, yarn, mean_float in zip(
        (ends_spacing, picks_spacing), (warp, weft), floats, strict=True
    ):
        crossing = mean_float * spacing - (mean_float - 1) * yarn.width
        curved = crossing - (yarn.width - yarn.height)
        total += math.sqrt(1 - min(1.0, max(0.0, curved / both)) ** 2)
    return total


def tightness_of(cloth: Construction, drawn: Mapping[str, float]) -> float | None:
    """Both setts as a share of the jammed setts; None where no weave is declared."""
    if cloth.weave is None:
        return None
    return _tightness(cloth, _mean_floats(cloth.weave), drawn)


def _mean_floats(name: str) -> tuple[float, float]:
    """Threads an intersection: across the ends, and along them."""
    drafted = weave(name)
    across, down = drafted.intersections
    return drafted.ends_repeat / across, drafted.picks_repeat / down


def _tightness(
    cloth: Construction, floats: tuple[float, float], drawn: Mapping[str, float]
) -> float:
    """Bisect for the factor on both spacings that makes the cloth jam."""
    warp, weft = cloth.warp.section(drawn), cloth.weft.section(drawn)
    ends, picks = cloth.warp.sett.spacing_mm, cloth.weft.sett.spacing_mm
    low, high = 1e-3, 1e3
    for _ in range(HALVINGS):
        middle = math.sqrt(low * high)
        if jam(middle * ends, middle * picks, warp=warp, weft=weft, floats=floats) > 1:
            low = middle
        else:
            high = middle
    return math.sqrt(low * high)


def ashenhurst_sett(
    count: Count, mean_float: float, *, firmness: float = ASHENHURST_FIRM
) -> Measured:
    """Ashenhurst's sett in 1/cm: diameters an inch × threads / (threads + intersections)."""
    sett = ashenhurst_diameters(count, firmness=firmness) * mean_float / (mean_float + 1)
    return _per_cm(sett)


def ashenhurst_diameters(count: Count, *, firmness: float = ASHENHURST_FIRM) -> float:
    """How many yarns lie side by side in an inch: 0.9 √(yards a pound) for firm yarns."""
    yards_per_pound = 1000 * GRAMS_PER_POUND / METRES_PER_YARD / count.tex
    return firmness * math.sqrt(yards_per_pound)


def brierley_sett(count: Count, mean_float: float, weave_name: str) -> Measured | None:
    """Brierley's maximum sett of a square cotton cloth in 1/cm, None for other weaves."""
    for pattern, power in BRIERLEY_POWERS:
        if re.search(pattern, weave_name):
            return _per_cm(mean_float**power * math.sqrt(BRIERLEY_COTTON * count.ne))
    return None


def _per_cm(per_inch: float) -> Measured:
    value = per_inch / (MM_PER_INCH / 10)
    return Measured(value, RULE_U * value, "1/cm")


def _cotton(threads: Threads) -> bool:
    return threads.model == "peirce" or "cotton" in threads.fibre_density.name


def _judged(tightness: Measured) -> tuple[Finding, ...]:
    if tightness.value > 1 + COVERAGE * tightness.u:
        message = (
            f"the declared setts are {tightness.value:.0%} of those at which round yarns of these "
            "counts jam in this weave: it cannot be woven as declared"
        )
        return (found(Flag.CANNOT_BE_WOVEN, message),)
    if tightness.value > 1:
        return (found(Flag.AT_THE_WEAVING_LIMIT),)
    return ()


__all__ = [
    "WeavingLimit",
    "ashenhurst_diameters",
    "ashenhurst_sett",
    "brierley_sett",
    "jam",
    "tightness_of",
    "weaving_limit",
]
