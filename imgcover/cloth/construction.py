"""What does a declaration say in numbers, and what was taken where it says nothing?"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from imgcover.cloth.constant import Constant
from imgcover.cloth.count import Count
from imgcover.cloth.declaration import Declaration, State, WarpThreads, WeftThreads
from imgcover.cloth.diameter import (
    PEIRCE_PACKING,
    ROUND,
    Section,
    peirce_yarn_density,
    race_track,
    round_diameter,
)
from imgcover.cloth.factor import CoverFactor
from imgcover.cloth.fibre import DENSITY_SPREAD, PACKING_U, packing_of
from imgcover.cloth.mass import mass_of
from imgcover.cloth.sett import Sett
from imgcover.cloth.stated import Stated
from imgcover.findings import Finding, Flag, found

ANY_CRIMP = (0.01, 0.14)
"""Crimps met in ordinary cloth (1 to 14 %): taken as equally likely where none is declared."""
UNSAID_TREATMENT_U = 0.05
"""Relative: size not declared, or the change in finishing, moves a mass by several percent."""
EXACT = Constant("exact", 1.0, 0.0, "")


@dataclass(frozen=True, slots=True)
class Threads:
    """One set of threads, ready to be predicted from.

    Parameters
    ----------
    name : str
        "warp" or "weft".
    sett : Sett
        Threads a length.
    count : Count
        Folded as declared.
    fibre_density, packing : Constant
        g/cm³ and a fraction; their product is the yarn's own density.
    flattening : Constant
        Width over height in the cloth.
    crimp, size : Constant
        Fractions.
    model : str
        "peirce" where the diameter is 1/(28 √Ne) in, else "general".
    said : tuple of str
        How everything was read, and what was taken where nothing was declared.
    """

    name: str
    sett: Sett
    count: Count
    fibre_density: Constant
    packing: Constant
    flattening: Constant
    crimp: Constant
    size: Constant
    model: str
    said: tuple[str, ...]

    @property
    def constants(self) -> tuple[Constant, ...]:
        """Everything uncertain that a prediction from these threads rests on."""
        return (self.fibre_density, self.packing, self.flattening, self.crimp, self.size)

    @property
    def factor(self) -> CoverFactor:
        """Their cover factor K."""
        return CoverFactor(self.sett, self.count)

    @property
    def peirce_k_holds(self) -> bool:
        """Whether k = K/28 is their fraction d/p: a round yarn of Peirce's diameter."""
        return self.model == "peirce" and self.flattening.value == 1.0

    def diameter(self, drawn: Mapping[str, float]) -> float:
        """Diameter in mm of the round yarn, with some constants drawn anew."""
        return round_diameter(self.count.tex, self.fibre_density.at(drawn) * self.packing.at(drawn))

    def section(self, drawn: Mapping[str, float]) -> Section:
        """Width and height in the cloth, mm."""
        return race_track(self.diameter(drawn), self.flattening.at(drawn))

    def closeness(self, drawn: Mapping[str, float]) -> float:
        """Width over spacing; past 1 where the yarns overlap or lie pressed together."""
        return self.section(drawn).width * self.sett.per_mm

    def fraction(self, drawn: Mapping[str, float]) -> float:
        """Width over spacing, at most 1: what the threads cover."""
        return min(1.0, self.closeness(drawn))

    def mass(self, drawn: Mapping[str, float]) -> float:
        """Mass in g/m²."""
        return mass_of(
            self.sett.per_mm, self.count.tex, crimp=self.crimp.at(drawn), added=self.size.at(drawn)
        )


@dataclass(frozen=True, slots=True)
class Construction:
    """A whole cloth, ready to be predicted from; a hypothesis is one with a field replaced.

    Parameters
    ----------
    code : str
        The article.
    weave : str or None
        Its weave's name.
    warp, weft : Threads
        Its two sets of threads.
    finish : Constant
        Mass after finishing over the mass of the threads; 1 in the grey.
    declared_cover, declared_mass : float or None
        What the sheet says, to hold the prediction against.
    findings : tuple of Finding
        What had to be taken, said once.
    """

    code: str
    weave: str | None
    warp: Threads
    weft: Threads
    finish: Constant
    declared_cover: float | None
    declared_mass: float | None
    findings: tuple[Finding, ...]

    @property
    def constants(self) -> tuple[Constant, ...]:
        """What a prediction rests on, each once, with its source."""
        every = (*self.warp.constants, *self.weft.constants, self.finish)
        return tuple(dict.fromkeys(each for each in every if each.source))

    def cover(self, drawn: Mapping[str, float]) -> float:
        """Covered fraction 1 − (1 − k1)(1 − k2)."""
        return 1 - (1 - self.warp.fraction(drawn)) * (1 - self.weft.fraction(drawn))

    def mass(self, drawn: Mapping[str, float]) -> float:
        """Mass in g/m²."""
        return (self.warp.mass(drawn) + self.weft.mass(drawn)) * self.finish.at(drawn)


def construction_of(declaration: Declaration) -> Construction:
    """Turn a declaration into numbers, taking what is not declared from where it says so."""
    finish, treated = _finish(declaration)
    findings: list[Finding] = list(treated)
    warp = _threads("warp", declaration.warp, declaration.article.state, findings)
    weft = _threads("weft", declaration.weft, declaration.article.state, findings)
    return Construction(
        declaration.article.code,
        declaration.article.weave,
        warp,
        weft,
        finish,
        declaration.cover.declared,
        declaration.mass.declared,
        tuple(findings),
    )


def _threads(
    name: str, declared: WeftThreads, state: State | None, findings: list[Finding]
) -> Threads:
    said = [f"{name}: {declared.count.said}", f"{name}: {declared.threads.said}"]
    fibre_density, packing, model = _body(name, declared, said, findings)
    flattening = declared.flattening or ROUND
    if declared.flattening is None:
        said.append(f"{name}: flattening not declared, yarn taken as round")
    else:
        said.append(f"{name}: flattened to {flattening.value:g} times as wide as high")
    crimp = _crimp(name, declared.crimp, findings)
    size = _size(name, declared, state, said)
    return Threads(
        name,
        declared.threads,
        declared.count,
        fibre_density,
        packing,
        flattening,
        crimp,
        size,
        model,
        tuple(said),
    )


def _body(
    name: str, declared: WeftThreads, said: list[str], findings: list[Finding]
) -> tuple[Constant, Constant, str]:
    if declared.yarn_density is not None:
        density = _declared(
            "yarn density", declared.yarn_density, declared.yarn_density.value * _PACKING_SHARE
        )
        said.append(f"{name}: yarn density {density.value:g} g/cm³ as declared")
        return density, EXACT, "general"
    is_cotton = declared.fibre is None or declared.fibre.name == "cotton"
    if is_cotton and declared.packing is None and declared.spinning is None:
        said.append(f"{name}: diameter by Peirce, 1/(28 √Ne) in")
        if declared.count.filaments is not None:
            findings.append(_filament_as_cotton(name))
        return peirce_yarn_density(), EXACT, "peirce"
    density = declared.fibre.density if declared.fibre else _COTTON
    packing = _packing(name, declared, findings)
    said.append(
        f"{name}: diameter from {density.value:.4g} g/cm³ ({density.name}) and "
        f"{packing.value:.4g} ({packing.name})"
    )
    return density, packing, "general"


_PACKING_SHARE = PACKING_U / PEIRCE_PACKING
"""Relative u of a yarn's own density, as that of a spun yarn's packing."""
_COTTON = Constant(
    "fibre density of cotton", 1.52, DENSITY_SPREAD * 1.52, "Morton & Hearle, table 5.1, 65 % r.h."
)


def _filament_as_cotton(name: str) -> Finding:
    return found(
        Flag.PACKING_ASSUMED,
        f"the {name} is a filament yarn of no declared fibre; Peirce's cotton yarn was taken",
        f"write fibre in [{name}]",
    )


def _packing(name: str, declared: WeftThreads, findings: list[Finding]) -> Constant:
    if declared.packing is not None:
        return _declared("packing", declared.packing, PACKING_U)
    if declared.spinning is not None:
        return packing_of(declared.spinning)
    filaments = declared.count.filaments
    taken = "ring" if filaments is None else "filament" if filaments > 1 else "monofilament"
    if taken != "monofilament":
        findings.append(
            found(
                Flag.PACKING_ASSUMED,
                f"the {name}'s yarn was taken as {taken} yarn, its packing "
                f"{packing_of(taken).value:.3g}",
                f"write spinning or packing in [{name}]",
            )
        )
    return packing_of(taken)


def _declared(what: str, stated: Stated, otherwise: float) -> Constant:
    u = otherwise if stated.u is None else stated.u
    return Constant(f"{what} {stated.value:g}", stated.value, u, "declared")


def _crimp(name: str, stated: Stated | None, findings: list[Finding]) -> Constant:
    if stated is not None:
        return Constant(f"{name} crimp", stated.value, stated.u_of_writing, "declared, as rounded")
    low, high = ANY_CRIMP
    findings.append(
        found(
            Flag.CRIMP_ASSUMED,
            f"the {name}'s crimp is not declared; {low:.0%} to {high:.0%} was taken for the mass",
            f"write crimp in [{name}]",
        )
    )
    u = (high - low) / 12**0.5
    return Constant(f"{name} crimp", (low + high) / 2, u, "not declared: 1 to 14 %")


def _size(name: str, declared: WeftThreads, state: State | None, said: list[str]) -> Constant:
    stated = declared.size if isinstance(declared, WarpThreads) else None
    if stated is None:
        return Constant(f"{name} size", 0.0, 0.0, "")
    if state is State.FINISHED:
        said.append("warp: size is washed out of a finished cloth and was not counted")
        return Constant(f"{name} size", 0.0, 0.0, "washed out")
    return Constant(f"{name} size", stated.value, stated.u_of_writing, "declared, as rounded")


def _finish(declaration: Declaration) -> tuple[Constant, tuple[Finding, ...]]:
    state, change = declaration.article.state, declaration.mass.finish_change
    if state is State.GREY and declaration.warp.size is not None:
        return EXACT, ()
    if state is State.FINISHED and change is not None:
        source = "declared, as rounded"
        return Constant("finish change", 1 + change.value, change.u_of_writing, source), ()
    key = {State.GREY: "size in [warp]", State.FINISHED: "finish_change in [mass]"}
    unsaid = Constant("size or finish not declared", 1.0, UNSAID_TREATMENT_U, "several percent")
    remedy = f"write {key[state]}" if state else "write state in [article], and size or finish"
    return unsaid, (found(Flag.MASS_ONLY_INDICATES, remedy=remedy),)


__all__ = ["ANY_CRIMP", "Construction", "Threads", "construction_of"]
