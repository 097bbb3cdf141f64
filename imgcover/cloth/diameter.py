"""How wide is a yarn in the cloth?

References
----------
Peirce, The Geometry of Cloth Structure, J. Text. Inst. 28 (1937) T45: d = 1/(28 √Ne) in, the round
number for a cotton yarn of 1.1 cm³/g. Kemp, An Extension of Peirce's Cloth Geometry to the
Treatment of Non-circular Threads, J. Text. Inst. 49 (1958) T44: the race-track section.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from imgcover.cloth.constant import Constant
from imgcover.cloth.count_system import CountSystem
from imgcover.cloth.fibre import PACKING_U
from imgcover.cloth.sett import MM_PER_INCH
from imgcover.cloth.stated import StatementError, as_text, read_figure, surely_positive

PEIRCE = 28.0
"""Diameters an inch of a 1s cotton yarn (Peirce 1937); an inch-and-Ne number, never with tex."""

_TEX_NE = CountSystem.NE.to_tex(1.0)
PEIRCE_YARN_DENSITY = 4 * _TEX_NE * 1e-3 / (math.pi * (MM_PER_INCH / PEIRCE) ** 2)
"""g/cm³ that makes the general formula give exactly 1/(28 √Ne) in: 0.9137; 1/1.1 would be 0.25 %
off in the diameter."""
PEIRCE_PACKING = 0.60
"""What that density means for cotton fibre: 0.9137 of 1.52."""
MOST_FLATTENED = 5.0
"""Width over height past this is a tape, not a yarn."""
FLATTENING_U = 0.05
"""Relative, where a declared width over height says nothing better."""


def peirce_yarn_density() -> Constant:
    """Peirce's cotton yarn, as unsure as the packing of cotton yarns is."""
    u = PEIRCE_YARN_DENSITY * PACKING_U / PEIRCE_PACKING
    return Constant("Peirce's yarn density", PEIRCE_YARN_DENSITY, u, "Peirce 1937; packing ± 0.05")


def round_diameter(tex: float, yarn_density: float) -> float:
    """Diameter in mm of a round yarn.

    Parameters
    ----------
    tex : float
        Of the whole yarn.
    yarn_density : float
        Fibre density times packing, g/cm³.

    Examples
    --------
    >>> round(round_diameter(590.541 / 32, PEIRCE_YARN_DENSITY) / 25.4 * 28 * 32**0.5, 5)
    1.0
    """
    return math.sqrt(4 * tex * 1e-3 / (math.pi * yarn_density))


@dataclass(frozen=True, slots=True)
class Section:
    """A yarn's section in the cloth: width across, height through, in mm."""

    width: float
    height: float


def race_track(diameter: float, ratio: float) -> Section:
    """Flatten a round yarn into a race-track section of the same area (Kemp 1958).

    Parameters
    ----------
    diameter : float
        Of the round yarn, mm.
    ratio : float
        Width over height; 1 leaves it round.

    Examples
    --------
    >>> race_track(0.2, 1.0)
    Section(width=0.2, height=0.2)
    """
    quarter = math.pi / 4
    height = diameter * math.sqrt(quarter / (quarter + ratio - 1))
    return Section(ratio * height, height)


def read_flattening(value: object) -> Constant:
    """Read how the yarn is flattened: "round", or width over height as in "1.4" or "1.4 u 0.1".

    Raises
    ------
    StatementError
        When it is not a width over height between 1 and 5.
    """
    if isinstance(value, str) and value.strip().lower() == "round":
        return ROUND
    if isinstance(value, str):
        value = as_text(value, "race-track 1.4").lower().removeprefix("race-track").strip()
    stated = surely_positive(read_figure(value, units={"": 1.0}, example="1.4 u 0.1"))
    if not 1 <= stated.value <= MOST_FLATTENED:
        raise StatementError(
            f"expected width over height from 1 to {MOST_FLATTENED:g}, got {stated.text}",
            'write "round" or "race-track 1.4"',
        )
    u = stated.u if stated.u is not None else FLATTENING_U * stated.value * (stated.value > 1)
    return Constant(f"flattening {stated.value:g}", stated.value, u, "declared")


ROUND = Constant("flattening 1", 1.0, 0.0, "round yarn")

__all__ = [
    "FLATTENING_U",
    "MOST_FLATTENED",
    "PEIRCE",
    "PEIRCE_PACKING",
    "PEIRCE_YARN_DENSITY",
    "ROUND",
    "Section",
    "peirce_yarn_density",
    "race_track",
    "read_flattening",
    "round_diameter",
]
