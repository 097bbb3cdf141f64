"""Which systems is a yarn's count told in, and what is each worth in tex?

References
----------
ASTM D2260, Standard Tables of Conversion Factors and Equivalent Yarn Numbers. Every factor follows
from the pound and the yard alone.
"""

from __future__ import annotations

from enum import Enum

GRAMS_PER_POUND = 453.59237
METRES_PER_YARD = 0.9144


def _indirect(yards: float) -> float:
    """Tex times count, for a count of hanks of that many yards in a pound."""
    return 1000 * GRAMS_PER_POUND / (yards * METRES_PER_YARD)


class CountSystem(Enum):
    """A count system: its label, what is shown after the number, its worth, its spellings.

    `worth` is tex × count in the indirect systems and tex / count in the direct ones.
    """

    NE = ("Ne", "s", _indirect(840), ("ne", "nec", "cotton count"))
    NM = ("Nm", " Nm", 1000.0, ("nm",))
    WORSTED = ("worsted", "s worsted", _indirect(560), ("worsted", "nek", "worsted count"))
    LEA = ("linen lea", " lea", _indirect(300), ("linen lea", "lea", "nel"))
    RUN = ("woollen run", " run", _indirect(1600), ("woollen run", "run"))
    SPUN_SILK = ("spun silk", "s spun silk", _indirect(840), ("spun silk",))
    TEX = ("tex", " tex", 1.0, ("tex",))
    DTEX = ("dtex", " dtex", 0.1, ("dtex",))
    KTEX = ("ktex", " ktex", 1000.0, ("ktex",))
    DEN = ("den", " den", 1 / 9, ("den", "denier"))
    JUTE = (
        "lb/spyndle",
        " lb/spyndle",
        1000 * GRAMS_PER_POUND / (14_400 * METRES_PER_YARD),
        ("lb/spyndle", "jute"),
    )

    def __init__(self, label: str, shown: str, worth: float, spellings: tuple[str, ...]) -> None:
        self.label = label
        self.shown = shown
        self.worth = worth
        self.spellings = spellings

    @property
    def is_direct(self) -> bool:
        """Whether a larger number is a coarser yarn."""
        direct = {"TEX", "DTEX", "KTEX", "DEN", "JUTE"}
        return self.name in direct

    def to_tex(self, count: float) -> float:
        """Convert a count of this system into tex."""
        return self.worth * count if self.is_direct else self.worth / count

    def from_tex(self, tex: float) -> float:
        """Convert tex into a count of this system."""
        return tex / self.worth if self.is_direct else self.worth / tex

    def show(self, count: float) -> str:
        """Write a count as the trade does."""
        return f"{count:.4g}{self.shown}"


__all__ = ["GRAMS_PER_POUND", "METRES_PER_YARD", "CountSystem"]
