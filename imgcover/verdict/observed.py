"""What was seen of one place of the cloth, as the verdict takes it: values with u, no pictures."""

from __future__ import annotations

import math
from dataclasses import dataclass

from imgcover.findings import Flag
from imgcover.quantity import Measured


@dataclass(frozen=True, slots=True)
class Spread:
    """How a density varies over the field it was counted in.

    Parameters
    ----------
    scatter : float
        Standard deviation of the local density between parts of the field, over its mean.
    parts : int
        How many parts across the threads were compared; parts that share the same threads are one.
    """

    scatter: float = 0.0
    parts: int = 1

    @property
    def u_relative(self) -> float:
        """Relative u of the field's mean as a sample of the cloth round it: scatter over √parts."""
        return self.scatter / math.sqrt(max(self.parts, 1))


@dataclass(frozen=True, slots=True)
class Observed:
    """One place of the cloth.

    Parameters
    ----------
    ends, picks : Measured or None
        Threads a centimetre ("1/cm"), u of this field's count and of the scale together.
    cover, warp_cover, weft_cover : Measured or None
        Optical cover, and each system's own share of the width, fractions ("1").
    gsm : Measured or None
        Mass per unit area from the balance ("g/m2").
    conditioned : bool
        Whether it was weighed conditioned (ISO 139); otherwise moisture adds to its u.
    ends_spread, picks_spread : Spread
        Variation of the density over the field.
    scale_u : float
        The part of the densities' relative u that is the same in every picture of one device and
        scale; what is left is this field's own.
    ends_length_mm, picks_length_mm : float or None
        The length the threads were counted over.
    repeat : tuple of int or None
        (ends, picks) in the smallest weave repeat the picture shows.
    ends_forks, picks_forks : tuple of float
        Where two readings stayed possible and the count was refused: the densities, 1/cm.
    flags : frozenset of Flag
        What was noticed on the way; some keep a line undecided (`imgcover.verdict.standing`).
    place : str
        Which place of the lot; pictures of one place are merged before places are counted.
    """

    ends: Measured | None = None
    picks: Measured | None = None
    cover: Measured | None = None
    warp_cover: Measured | None = None
    weft_cover: Measured | None = None
    gsm: Measured | None = None
    conditioned: bool = False
    ends_spread: Spread = Spread()
    picks_spread: Spread = Spread()
    scale_u: float = 0.0
    ends_length_mm: float | None = None
    picks_length_mm: float | None = None
    repeat: tuple[int, int] | None = None
    ends_forks: tuple[float, ...] = ()
    picks_forks: tuple[float, ...] = ()
    flags: frozenset[Flag] = frozenset()
    place: str = ""


__all__ = ["Observed", "Spread"]
