"""What cloth is to be drawn: its construction and everything that is uneven about it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from imgcover.weave import weave

FaultKind = Literal[
    "slub", "stain", "missing end", "broken end", "missing pick", "crease", "thick end"
]


@dataclass(frozen=True, slots=True)
class Fault:
    """One local fault.

    Parameters
    ----------
    kind : str
        What happened to the cloth.
    x, y : float
        Where its middle lies, in shares of the frame from its left and upper edge.
    size_mm : float
        How far it reaches: length of a slub or break, radius of a stain, width of a crease.
    strength : float
        Slub and thick end: diameter over the usual one. Stain, crease: 0 (unseen) … 1 (black).
    """

    kind: FaultKind
    x: float
    y: float
    size_mm: float = 3.0
    strength: float = 0.5


@dataclass(frozen=True, slots=True)
class ClothSpec:
    """A cloth, as the loom is told to draw it.

    Parameters
    ----------
    ends_per_mm, picks_per_mm : float
        Threads per mm at right angles to themselves, before anything irregular.
    end_diameter_mm, pick_diameter_mm : float
        Mean width of the yarn as seen from the face.
    weave : str
        A name that `imgcover.weave.weave` knows.
    diameter_cv : float
        Relative sd of the diameter: a third of it between yarns, the rest along them.
    spacing_cv : float
        Relative sd of the gap from one thread to the next.
    wander : float
        Slow straying of all threads together, rms in shares of a pitch.
    waviness : float
        Sideways wave of each thread in step with the weave, amplitude in shares of a pitch.
    hairs_per_mm : float
        Fibre ends sticking out, per mm of yarn.
    reed, reed_gap : int, float
        Ends in a dent, and how much wider the gap between dents is, in shares of a pitch.
    paired_picks, pair_gap : int, float
        The same for picks that lie together.
    end_lightness, pick_lightness : tuple of float
        Reflectance 0…1 of successive threads; the pattern repeats for ever.
    end_tint, pick_tint : tuple of three floats
        Red, green and blue shares of that reflectance, for colour pictures.
    tau : float
        Transmittance of a yarn of mean diameter at its thickest, 0…1.
    section : float
        Exponent of the superellipse that the yarn's cross-section follows: 2 round, larger flatter.
    twist : float
        Contrast of the slanting fibres on the yarn, 0…1.
    float_cv : float
        Relative sd of how high each float stands and how bright it is.
    selvedge_mm : float
        Width of a band of twice as many ends at the left edge of the swatch.
    faults : tuple of Fault
        Local faults.
    """

    ends_per_mm: float
    picks_per_mm: float
    end_diameter_mm: float
    pick_diameter_mm: float
    weave: str = "plain"
    diameter_cv: float = 0.06
    spacing_cv: float = 0.03
    wander: float = 0.1
    waviness: float = 0.03
    hairs_per_mm: float = 0.0
    reed: int = 1
    reed_gap: float = 0.0
    paired_picks: int = 1
    pair_gap: float = 0.0
    end_lightness: tuple[float, ...] = (0.75,)
    pick_lightness: tuple[float, ...] = (0.75,)
    end_tint: tuple[float, float, float] = (1.0, 1.0, 1.0)
    pick_tint: tuple[float, float, float] = (1.0, 1.0, 1.0)
    tau: float = 0.08
    section: float = 3.0
    twist: float = 0.35
    float_cv: float = 0.1
    selvedge_mm: float = 0.0
    faults: tuple[Fault, ...] = ()

    def __post_init__(self) -> None:
        weave(self.weave)
        for name in ("ends_per_mm", "picks_per_mm", "end_diameter_mm", "pick_diameter_mm"):
            if not getattr(self, name) > 0:
                raise ValueError(f"{name} must be above zero, got {getattr(self, name)}")
        if not 0 < self.tau < 1:
            raise ValueError(f"tau must lie between 0 and 1, got {self.tau}")
        if self.reed < 1 or self.paired_picks < 1:
            raise ValueError("reed and paired_picks count threads: at least 1")
        if self.section < 1:
            raise ValueError(f"section must be at least 1, got {self.section}")


__all__ = ["ClothSpec", "Fault"]
