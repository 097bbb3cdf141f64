"""What should be seen of the cloth that is declared?

References
----------
Peirce, The Geometry of Cloth Structure, J. Text. Inst. 28 (1937) T45. Uncertainty: JCGM 100:2008,
checked against JCGM 101 in tests/cloth/test_prediction_uncertainty.py.
"""

from __future__ import annotations

from dataclasses import dataclass

from imgcover.cloth.constant import Effect, combined
from imgcover.cloth.construction import Construction, Threads, construction_of
from imgcover.cloth.count import Count
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.factor import cloth_factor
from imgcover.cloth.sett import Sett
from imgcover.cloth.weaving_limit import WeavingLimit, weaving_limit
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured

COVERAGE = 2.0
"""A declared figure is only called unlike the prediction when it differs by more than two u."""
NOMINAL_MASS = 0.05
"""Relative: declared masses are nominal, and the widest tolerance usual in the trade is five
percent; within it a sheet is not called at odds with itself."""


@dataclass(frozen=True, slots=True)
class YarnPrediction:
    """One set of threads as it should be seen.

    Parameters
    ----------
    sett, count : Sett, Count
        What was declared.
    model : str
        "peirce" or "general".
    diameter, width, height : Measured
        Of the round yarn, and of its section in the cloth, mm.
    k : Measured or None
        K/28 where Peirce's model holds and the yarn is round; it may pass 1. None elsewhere.
    mass : Measured
        g/m2, before any change in finishing.
    """

    sett: Sett
    count: Count
    model: str
    diameter: Measured
    width: Measured
    height: Measured
    k: Measured | None
    mass: Measured


@dataclass(frozen=True, slots=True)
class Prediction:
    """What a declared construction implies.

    Parameters
    ----------
    code : str
        The article.
    model : str
        "peirce" where both diameters are 1/(28 √Ne) in, else "general".
    warp_factor, weft_factor, cloth_factor : Measured
        K1, K2 and K1 + K2 − K1 K2/28: threads per inch over √Ne. Exact for the declared figures.
    warp, weft, cover : Measured
        Fractions: width over spacing, at most 1, and 1 − (1 − k1)(1 − k2).
    mass : Measured
        g/m2.
    ends, picks : YarnPrediction
        The yarns.
    read_as : tuple of str
        How every figure was read and what was taken where none was declared.
    construction : Construction
        The numbers predicted from; its constants carry their sources.
    budget : dict of str to tuple of Effect
        For cover and mass: what each constant contributes, largest first.
    limit : WeavingLimit or None
        None where no weave is declared.
    findings : tuple of Finding
        What is weak, assumed or impossible.
    """

    code: str
    model: str
    warp_factor: Measured
    weft_factor: Measured
    cloth_factor: Measured
    warp: Measured
    weft: Measured
    cover: Measured
    mass: Measured
    ends: YarnPrediction
    picks: YarnPrediction
    read_as: tuple[str, ...]
    construction: Construction
    budget: dict[str, tuple[Effect, ...]]
    limit: WeavingLimit | None
    findings: tuple[Finding, ...]


def predict(declared: Declaration | Construction) -> Prediction:
    """Predict cover, mass and limits from what is declared.

    Parameters
    ----------
    declared : Declaration or Construction
        A sheet, or a construction made from one with some field replaced.
    """
    cloth = construction_of(declared) if isinstance(declared, Declaration) else declared
    warp, weft = cloth.warp, cloth.weft
    cover, cover_budget = combined(cloth.cover, cloth.constants, unit="1")
    mass, mass_budget = combined(cloth.mass, cloth.constants, unit="g/m2")
    limit, limit_findings = weaving_limit(cloth)
    return Prediction(
        code=cloth.code,
        model="peirce" if warp.model == weft.model == "peirce" else "general",
        warp_factor=_exact(warp.factor.value),
        weft_factor=_exact(weft.factor.value),
        cloth_factor=_exact(cloth_factor(warp.factor, weft.factor)),
        warp=combined(warp.fraction, warp.constants, unit="1")[0],
        weft=combined(weft.fraction, weft.constants, unit="1")[0],
        cover=cover,
        mass=mass,
        ends=_yarn(warp),
        picks=_yarn(weft),
        read_as=(*warp.said, *weft.said),
        construction=cloth,
        budget={"cover": cover_budget, "mass": mass_budget},
        limit=limit,
        findings=(
            *cloth.findings,
            *_overlapping(warp, weft),
            *limit_findings,
            *_unlike_declared(cloth, cover, mass),
        ),
    )


def _exact(value: float) -> Measured:
    """Arithmetic on declared figures alone: it rests on no constant."""
    return Measured(value, 0.0, "1")


def _yarn(threads: Threads) -> YarnPrediction:
    constants = threads.constants
    k = None
    if threads.peirce_k_holds:
        k, _ = combined(
            lambda drawn: threads.diameter(drawn) * threads.sett.per_mm, constants, unit="1"
        )
    return YarnPrediction(
        threads.sett,
        threads.count,
        threads.model,
        combined(threads.diameter, constants, unit="mm")[0],
        combined(lambda drawn: threads.section(drawn).width, constants, unit="mm")[0],
        combined(lambda drawn: threads.section(drawn).height, constants, unit="mm")[0],
        k,
        combined(threads.mass, constants, unit="g/m2")[0],
    )


def _overlapping(*systems: Threads) -> list[Finding]:
    full = [(threads.name, ratio) for threads in systems if (ratio := threads.closeness({})) > 1]
    return [
        found(
            Flag.FRACTION_CAPPED,
            f"the {name} yarns are {ratio:.2f} times as wide as their spacing: they overlap or lie "
            "pressed together, and their fraction was taken as 1",
        )
        for name, ratio in full
    ]


def _unlike_declared(cloth: Construction, cover: Measured, mass: Measured) -> list[Finding]:
    findings = []
    declared = cloth.declared_cover
    if declared is not None and abs(declared - cover.value) > COVERAGE * cover.u:
        message = (
            f"the declared cover of {declared:.1%} is not what the declared counts and setts "
            f"predict, {cover.value:.1%} ± {cover.u:.1%}"
        )
        findings.append(found(Flag.DECLARED_COVER_UNLIKELY, message))
    declared = cloth.declared_mass
    if declared is not None and abs(declared - mass.value) > max(
        COVERAGE * mass.u, NOMINAL_MASS * mass.value
    ):
        message = (
            f"the declared mass of {declared:.4g} g/m² is not what the declared counts and setts "
            f"predict, {mass.value:.4g} ± {mass.u:.2g} g/m²"
        )
        findings.append(found(Flag.DECLARED_MASS_UNLIKELY, message))
    return findings


__all__ = ["Prediction", "YarnPrediction", "predict"]
