"""A measured number: it never travels without its uncertainty and its unit."""

from __future__ import annotations

import math
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Measured:
    """A value with one standard uncertainty, both in `unit`.

    Parameters
    ----------
    value : float
        The best estimate.
    u : float
        One standard uncertainty, in the same unit; never negative.
    unit : str
        As the record writes it: "1/cm", "mm", "g/m2", "px/mm", "rad", "deg", or "1" for fractions.

    Raises
    ------
    ValueError
        When value or u is not finite, or u is negative: what could not be measured is `None`.
    """

    value: float
    u: float
    unit: str

    def __post_init__(self) -> None:
        if not (math.isfinite(self.value) and math.isfinite(self.u)):
            raise ValueError(f"value and u must be finite, got {self.value} and {self.u}")
        if self.u < 0:
            raise ValueError(f"u must not be negative, got {self.u}")

    def times(self, factor: float, unit: str) -> Measured:
        """Convert by an exact factor into another unit."""
        return Measured(self.value * factor, abs(self.u * factor), unit)

    def __str__(self) -> str:
        value, u = rounded(self.value, self.u)
        return f"{value} ± {u} {self.unit}".replace(" 1/", " /")


def rounded(value: float, u: float) -> tuple[str, str]:
    """Write a value and its uncertainty to two digits of the uncertainty.

    Examples
    --------
    >>> rounded(26.7716, 0.0534)
    ('26.772', '0.053')
    >>> rounded(0.8214, 0.0)
    ('0.8214', '0')
    """
    if u == 0:
        return f"{value:.6g}", "0"
    digits = max(0, 1 - math.floor(math.log10(u)))
    return f"{value:.{digits}f}", f"{u:.{digits}f}"


__all__ = ["Measured", "rounded"]
