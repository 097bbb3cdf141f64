"""How finely does a device show the threads, and what resolution would they need?"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum

from imgcover.scale.pitch import INCH_MM
from imgcover.threads.telling import FEW_PIXELS, FEWEST_PIXELS

COMFORTABLE_PIXELS = 8.0
"""Pixels a thread: from here on drawn covers are read no worse than with half as many again
(tests/test_plan.py)."""
FLATBED_DETAIL_MM = 0.05
"""Flatbeds show nothing smaller, however high their stated resolution."""
FEWEST_DETAILS = 2.0
"""Details a thread: one for the thread and one for the gap beside it; with fewer both run together
whatever the resolution."""
USUAL_DPI = (150, 200, 300, 400, 600, 800, 1200, 1600, 2400, 3200, 4800)
"""What flatbeds offer."""


class Standing(StrEnum):
    """What so many pixels a thread allow."""

    REFUSED = "refused"
    FLAGGED = "flagged"
    ENOUGH = "enough"
    COMFORTABLE = "comfortable"


@dataclass(frozen=True, slots=True)
class Sight:
    """One set of threads as a device shows it.

    Parameters
    ----------
    pixels : float
        Pixels from thread to thread.
    details : float
        Smallest details that the device shows, from thread to thread; never more than pixels.
    """

    pixels: float
    details: float

    @property
    def standing(self) -> Standing:
        """Whether such threads are counted, and with which reservation."""
        if self.pixels < FEWEST_PIXELS or self.details < FEWEST_DETAILS:
            return Standing.REFUSED
        if self.pixels < FEW_PIXELS:
            return Standing.FLAGGED
        return Standing.COMFORTABLE if self.pixels >= COMFORTABLE_PIXELS else Standing.ENOUGH

    @property
    def counted(self) -> bool:
        """Whether such threads are counted at all."""
        return self.standing is not Standing.REFUSED


@dataclass(frozen=True, slots=True)
class Resolution:
    """The resolution that threads need, dots an inch.

    Parameters
    ----------
    least, unflagged, comfortable : float
        Where the finest threads have three, five and eight pixels.
    usual : int or None
        The lowest that flatbeds offer and that is comfortable; None where no detail so small is
        shown, or none is so fine.
    """

    least: float
    unflagged: float
    comfortable: float
    usual: int | None


def sight(per_mm: float, px_per_mm: float, *, detail_mm: float) -> Sight:
    """See one set of threads through a device.

    Parameters
    ----------
    per_mm : float
        Threads a millimetre.
    px_per_mm : float
        Pixels a millimetre.
    detail_mm : float
        Smallest detail that the device's optics show.

    Examples
    --------
    >>> seen = sight(2.5, 20.0, detail_mm=0.1)
    >>> seen.pixels, seen.details, seen.standing.value
    (8.0, 4.0, 'comfortable')
    """
    return Sight(px_per_mm / per_mm, 1 / (per_mm * max(detail_mm, 1 / px_per_mm)))


def resolution_for(finest_per_mm: float, *, detail_mm: float) -> Resolution:
    """Work out which resolution the finest threads need.

    Parameters
    ----------
    finest_per_mm : float
        Threads a millimetre of the finer system.
    detail_mm : float
        As in `sight`.

    Examples
    --------
    >>> resolution_for(68 / 25.4, detail_mm=0.05)
    Resolution(least=204.0, unflagged=340.0, comfortable=544.0, usual=600)
    """
    least, unflagged, comfortable = (
        round(pixels * finest_per_mm * INCH_MM, 6)
        for pixels in (FEWEST_PIXELS, FEW_PIXELS, COMFORTABLE_PIXELS)
    )
    shown = 1 / (finest_per_mm * detail_mm) >= FEWEST_DETAILS
    usual = next((dpi for dpi in USUAL_DPI if shown and dpi >= comfortable), None)
    return Resolution(least, unflagged, comfortable, usual)


def detail_dpi(detail_mm: float) -> float:
    """Resolution beyond which a device only draws the same details larger."""
    return INCH_MM / detail_mm if detail_mm > 0 else math.inf


__all__ = [
    *("COMFORTABLE_PIXELS", "FLATBED_DETAIL_MM", "Resolution", "Sight", "Standing"),
    *("detail_dpi", "resolution_for", "sight"),
]
