"""What is the cover factor K of a set of threads, and of a cloth?

K = threads an inch over √Ne (Peirce 1937). The same idea in tex and centimetres gives other
numbers, whose full cover is 26.8 and not 28; so a `CoverFactor` can only be made from a sett and
a count, which know their own units, and the 28 meets nothing but a `CoverFactor`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from imgcover.cloth.count import Count
from imgcover.cloth.diameter import PEIRCE
from imgcover.cloth.sett import Sett


@dataclass(frozen=True, slots=True)
class CoverFactor:
    """K of one set of threads; made from what was declared, never from a bare number.

    Parameters
    ----------
    sett : Sett
        Threads a length.
    count : Count
        The yarn's count, folded as declared.

    Examples
    --------
    >>> from imgcover.cloth.count import read_count
    >>> from imgcover.cloth.sett import read_sett
    >>> round(CoverFactor(read_sett("133 /in"), read_count("40 Ne")).value, 2)
    21.03
    """

    sett: Sett
    count: Count

    def __post_init__(self) -> None:
        if not isinstance(self.sett, Sett) or not isinstance(self.count, Count):
            raise ValueError("sett and count must be a Sett and a Count, which know their units")

    @property
    def value(self) -> float:
        """K = threads an inch over √Ne."""
        return self.sett.per_inch / math.sqrt(self.count.ne)

    @property
    def fraction(self) -> float:
        """k = K/28, Peirce's fractional cover of a round cotton yarn; may pass 1."""
        return self.value / PEIRCE


def cloth_factor(warp: CoverFactor, weft: CoverFactor) -> float:
    """Peirce's cloth factor K1 + K2 − K1 K2/28; a system past 28 covers no more than 28.

    Examples
    --------
    >>> from imgcover.cloth.count import read_count
    >>> from imgcover.cloth.sett import read_sett
    >>> square = CoverFactor(read_sett("84 /in"), read_count("36 Ne"))
    >>> cloth_factor(square, square)
    21.0
    """
    first, second = min(warp.value, PEIRCE), min(weft.value, PEIRCE)
    return first + second - first * second / PEIRCE


__all__ = ["CoverFactor", "cloth_factor"]
