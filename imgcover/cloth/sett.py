"""How many threads a length: "68 /in", "26.8 /cm", "268 /10cm"."""

from __future__ import annotations

from dataclasses import dataclass

from imgcover.cloth.stated import StatementError, read_figure, without_u

MM_PER_INCH = 25.4

PER_MM = {
    "/in": 1 / MM_PER_INCH,
    "/cm": 1 / 10,
    "/10cm": 1 / 100,
    "/dm": 1 / 100,
    "/m": 1 / 1000,
    "/mm": 1.0,
}
"""What one thread a length is worth in threads a millimetre."""

FEWEST_PER_MM = 0.05
"""Half a thread a centimetre: more open than any scrim that is still sold as cloth."""
MOST_PER_MM = 25.0
"""250 a centimetre: the finest monofilament meshes end near 200; 680 /in is a slip of the pen."""


@dataclass(frozen=True, slots=True)
class Sett:
    """Threads a length, counted at right angles to the threads.

    Parameters
    ----------
    per_mm : float
        Threads a millimetre.
    text : str
        What was declared.
    """

    per_mm: float
    text: str

    @property
    def per_inch(self) -> float:
        """Threads an inch."""
        return self.per_mm * MM_PER_INCH

    @property
    def per_cm(self) -> float:
        """Threads a centimetre."""
        return self.per_mm * 10

    @property
    def spacing_mm(self) -> float:
        """From one thread to the next, in mm."""
        return 1 / self.per_mm

    def times(self, factor: float) -> Sett:
        """The same sett made closer by a factor: a hypothesis, no longer the declared one."""
        return Sett(self.per_mm * factor, f"{self.text} × {factor:.4g}")

    @property
    def said(self) -> str:
        """How it was read."""
        return f"read as {self.per_inch:.4g} /in = {self.per_cm:.4g} /cm"


def read_sett(value: object) -> Sett:
    """Read a sett.

    Raises
    ------
    StatementError
        When the unit is missing or unknown, or no cloth has that many threads.

    Examples
    --------
    >>> read_sett("68 /in").said
    'read as 68 /in = 26.77 /cm'
    """
    stated = without_u(read_figure(value, units=PER_MM, example="68 /in"))
    if not FEWEST_PER_MM <= stated.value <= MOST_PER_MM:
        low, high = 10 * FEWEST_PER_MM, 10 * MOST_PER_MM
        raise StatementError(
            f'expected {low:g} to {high:g} threads /cm, got "{stated.text}" = '
            f"{10 * stated.value:.4g} /cm, which no cloth has",
            "check the number and its unit",
        )
    return Sett(stated.value, stated.text)


__all__ = ["FEWEST_PER_MM", "MM_PER_INCH", "MOST_PER_MM", "PER_MM", "Sett", "read_sett"]
