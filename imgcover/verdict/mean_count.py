"""How fine was the yarn that was used, by the balance and the counted threads?"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

from imgcover.cloth.constant import combined
from imgcover.cloth.construction import Construction, Threads, construction_of
from imgcover.cloth.count_system import CountSystem
from imgcover.cloth.declaration import Declaration
from imgcover.findings import Flag, has
from imgcover.quantity import Measured
from imgcover.verdict.observed import Observed

MOISTURE_U = 0.01
"""Relative u of a mass that was not conditioned: between a dry and a damp room cotton takes up 5 to
10 % of its mass, ± 2 % about the standard atmosphere's."""


@dataclass(frozen=True, slots=True)
class MeanCount:
    """The mean count of all yarn in the cloth: its mass over its length.

    Parameters
    ----------
    tex : Measured
        As it follows from the mass, "tex"; u holds the balance, both densities, crimp, size,
        finish and moisture.
    ne : Measured
        The same in English cotton count, "Ne".
    declared_tex : float
        As declared.
    only_indicates : bool
        Whether size or the change in finishing had to be taken, so that it proves nothing.
    """

    tex: Measured
    ne: Measured
    declared_tex: float
    only_indicates: bool

    def record(self) -> dict[str, Any]:
        """Lay it out as the record holds it."""
        return {
            "tex": {"value": self.tex.value, "u": self.tex.u, "unit": self.tex.unit},
            "ne": {"value": self.ne.value, "u": self.ne.u, "unit": self.ne.unit},
            "declared_tex": self.declared_tex,
            "only_indicates": self.only_indicates,
        }


def mean_count(declaration: Declaration, observed: Observed) -> MeanCount | None:
    """Work out the mean count from mass, ends and picks; None where one of them is missing.

    The share of warp and weft in it cannot be told from the mass: both counts are taken to be off
    by one factor, which leaves the mean right to second order.
    """
    ends, picks, gsm = observed.ends, observed.picks, observed.gsm
    if ends is None or picks is None or gsm is None:
        return None
    declared = construction_of(declaration)
    woven = _with_setts(declared, ends.value, picks.value)
    expected, _ = combined(woven.mass, woven.constants, unit="g/m2")
    ratio = gsm.value / expected.value
    u = math.sqrt(
        (gsm.u / gsm.value) ** 2
        + (expected.u / expected.value) ** 2
        + _setts_u(woven, ends, picks, observed.scale_u) ** 2
        + moisture_u(observed) ** 2
    )
    tex = ratio * _mean_tex(woven)
    ne = CountSystem.NE.from_tex(tex)
    return MeanCount(
        Measured(tex, tex * u, "tex"),
        Measured(ne, ne * u, "Ne"),
        _mean_tex(declared),
        has(declared.findings, Flag.MASS_ONLY_INDICATES),
    )


def moisture_u(observed: Observed) -> float:
    """Relative u that moisture adds to a weighing."""
    return 0.0 if observed.conditioned else MOISTURE_U


def _with_setts(cloth: Construction, ends: float, picks: float) -> Construction:
    """The declared cloth at other setts, 1/cm."""
    return replace(
        cloth,
        warp=replace(cloth.warp, sett=replace(cloth.warp.sett, per_mm=ends / 10)),
        weft=replace(cloth.weft, sett=replace(cloth.weft.sett, per_mm=picks / 10)),
    )


def _setts_u(cloth: Construction, ends: Measured, picks: Measured, scale_u: float) -> float:
    """Relative u of the mass from the densities; their scale errs alike in both."""
    total = cloth.warp.mass({}) + cloth.weft.mass({})
    own = [
        threads.mass({}) / total * math.sqrt(max((sett.u / sett.value) ** 2 - scale_u**2, 0.0))
        for threads, sett in ((cloth.warp, ends), (cloth.weft, picks))
    ]
    return math.hypot(scale_u, *own)


def _mean_tex(cloth: Construction) -> float:
    """Mass of the unsized yarn over its length."""

    def length(threads: Threads) -> float:
        return threads.sett.per_mm * (1 + threads.crimp.value)

    warp, weft = length(cloth.warp), length(cloth.weft)
    return (warp * cloth.warp.count.tex + weft * cloth.weft.count.tex) / (warp + weft)


__all__ = ["MeanCount", "mean_count", "moisture_u"]
