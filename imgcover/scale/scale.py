"""How many pixels make a millimetre, along x and y of the picture as shown."""

from __future__ import annotations

import math
from dataclasses import asdict, dataclass
from enum import StrEnum

from imgcover.findings import Finding
from imgcover.quantity import Measured

COVERAGE = 2.0
"""Two values that differ by more than twice their combined uncertainty disagree (JCGM 106)."""
ROUNDING = 1e-9
"""Two exact values written in different units may differ by this much and be the same."""


class ScaleSource(StrEnum):
    """Where a scale comes from; the first given in this order counts."""

    CERTIFICATE = "certificate"
    """A device that was measured with a printed sheet before."""
    RULE = "rule"
    """A rule in the picture."""
    SHEET = "sheet"
    """A printed scale sheet in the picture."""
    STATED = "stated pitch"
    """What the user says."""
    METADATA = "metadata"
    """What the file says of itself."""


@dataclass(frozen=True, slots=True)
class ComparedScale:
    """Another way of finding the scale, and whether it agrees with the one used.

    Parameters
    ----------
    source : str
        A `ScaleSource`.
    x, y : Measured
        Pixels a millimetre along the shown axes.
    agrees : bool
        Whether both axes lie within twice the combined uncertainty.
    """

    source: str
    x: Measured
    y: Measured
    agrees: bool

    def record(self) -> dict[str, object]:
        """Lay it out as the record's `scale.compared` holds it."""
        return asdict(self)


@dataclass(frozen=True, slots=True)
class Scale:
    """Pixels a millimetre along x and y of the shown picture.

    Parameters
    ----------
    x, y : Measured
        In px/mm.
    ratio_u : float
        Relative standard uncertainty of y/x: what angles and skew feel. Smaller than the two
        axes' own where an error is common to both, as a rule's class is.
    source : str
        A `ScaleSource`.
    compared : tuple of ComparedScale
        Other ways of finding it that were at hand.
    findings : tuple of Finding
        What was noticed.
    """

    x: Measured
    y: Measured
    ratio_u: float
    source: str
    compared: tuple[ComparedScale, ...] = ()
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        if not (self.x.value > 0 and self.y.value > 0):
            raise ValueError(f"x and y must be positive, got {self.x.value} and {self.y.value}")
        if not (math.isfinite(self.ratio_u) and self.ratio_u >= 0):
            raise ValueError(f"ratio_u must not be negative, got {self.ratio_u}")

    def turned(self, *, swapped: bool) -> Scale:
        """Exchange x and y when the stored axes were exchanged to show the picture."""
        if not swapped:
            return self
        compared = tuple(
            ComparedScale(each.source, each.y, each.x, each.agrees) for each in self.compared
        )
        return Scale(self.y, self.x, self.ratio_u, self.source, compared, self.findings)

    def agrees_with(self, other: Scale) -> bool:
        """Whether both axes lie within twice the combined uncertainty of the other's."""
        return all(
            abs(one.value - two.value) <= COVERAGE * math.hypot(one.u, two.u) + ROUNDING * one.value
            for one, two in ((self.x, other.x), (self.y, other.y))
        )


__all__ = ["ComparedScale", "Scale", "ScaleSource"]
