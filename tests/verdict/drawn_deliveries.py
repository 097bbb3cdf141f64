"""Deliveries drawn with one known deviation, for the tests of the verdict."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from imgcover.cloth.construction import Construction, Threads, construction_of
from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.quantity import Measured
from imgcover.verdict.observed import Observed

MOISTURE = 0.01
"""Relative scatter of a mass with the moisture of the room."""
CELLS = 0.005
"""What cells that vary move the cover of the whole against 1 − (1 − k1)(1 − k2)."""
LIMITS = np.array([0.02, 0.03])
"""Tolerances of ends and picks, relative, on every sheet drawn."""
OWN_WIDTH = 0.02
"""Relative scatter of a yarn's width about what its fibre and packing lead to."""
COVERS_U = (0.010, 0.010, 0.005)
"""Of warp cover, weft cover and the whole: what the cover room is held to, and a little more."""
PLAIN_WEAVE = ((2, 2), (1, 1), (1, 2))
"""Repeats that a picture of plain cloth may show: all of it, or only a part."""


@dataclass
class Cloth:
    """The cloth that was delivered, and how its picture was read."""

    construction: Construction
    cells: float = 0.0
    width: float = 1.0
    mass: float = 1.0
    read_ends: float = 1.0
    read_picks: float = 1.0
    turned: bool = False
    repeat: tuple[int, int] | None = None


@dataclass(frozen=True)
class Delivery:
    """A sheet, what was seen of the cloth that came with it, and what is wrong with it."""

    declaration: Declaration
    observed: Observed
    truth: str | None
    size: float


def sett(threads: Threads, factor: float) -> Threads:
    return replace(threads, sett=replace(threads.sett, per_mm=threads.sett.per_mm * factor))


def tex(threads: Threads, factor: float) -> Threads:
    return replace(threads, count=replace(threads.count, tex=threads.count.tex * factor))


def longer(threads: Threads, factor: float) -> Threads:
    """More yarn in the same length of cloth: the crimp grows."""
    crimp = replace(threads.crimp, value=(1 + threads.crimp.value) * factor - 1)
    return replace(threads, crimp=crimp)


def change(
    cloth: Cloth,
    *,
    warp: Callable[[Threads], Threads] | None = None,
    weft: Callable[[Threads], Threads] | None = None,
) -> Cloth:
    whole = cloth.construction
    return replace(
        cloth,
        construction=replace(
            whole,
            warp=warp(whole.warp) if warp else whole.warp,
            weft=weft(whole.weft) if weft else whole.weft,
        ),
    )


def sized_with(threads: Threads, share: float) -> Threads:
    return replace(threads, size=replace(threads.size, name="true size", value=share, u=0.0))


def treated(cloth: Cloth, length: float, width: float, rng: np.random.Generator) -> Cloth:
    """Finish the cloth, or (sizes below 0) leave it grey: setts, yarn, size, mass, width."""
    along, across = 1 / (1 - length), 1 / (1 - width)
    size = 0.0 if length + width > 0 else float(rng.uniform(0.05, 0.15))
    shrunk = change(
        cloth,
        warp=lambda t: sized_with(longer(sett(t, across), along), size),
        weft=lambda t: longer(sett(t, along), across),
    )
    whole = shrunk.construction
    untreated = replace(whole.finish, name="true finish", value=1.0, u=0.0)
    return replace(
        shrunk,
        construction=replace(whole, finish=untreated),
        width=rng.normal(1, 0.02),
        mass=rng.normal(1, 0.02),
    )


Deviate = Callable[[Cloth, np.random.Generator], tuple[Cloth, float]]


def _sized(low: float, high: float, apply: Callable[[Cloth, float], Cloth]) -> Deviate:
    def deviate(cloth: Cloth, rng: np.random.Generator) -> tuple[Cloth, float]:
        size = rng.uniform(low, high)
        return apply(cloth, size), size

    return deviate


def _shrinking(length: bool, width: bool, sign: int) -> Deviate:
    def deviate(cloth: Cloth, rng: np.random.Generator) -> tuple[Cloth, float]:
        sizes = sign * rng.uniform(0.05, 0.12, 2)
        in_length, in_width = float(sizes[0]) * length, float(sizes[1]) * width
        return treated(cloth, in_length, in_width, rng), float(sizes[0])

    return deviate


def _seen(repeat: tuple[int, int]) -> Deviate:
    return lambda cloth, rng: (replace(cloth, repeat=repeat), 0.0)


GREY, FINISHED = "grey declared, finished delivered", "finished declared, grey delivered"
DEVIATIONS: dict[str, Deviate] = {
    "ends short": _sized(0.05, 0.15, lambda c, s: change(c, warp=lambda t: sett(t, 1 - s))),
    "picks short": _sized(0.06, 0.15, lambda c, s: change(c, weft=lambda t: sett(t, 1 - s))),
    "warp yarn finer than declared": _sized(
        0.20, 0.40, lambda c, s: change(c, warp=lambda t: tex(t, 1 - s))
    ),
    "weft yarn finer than declared": _sized(
        0.20, 0.40, lambda c, s: change(c, weft=lambda t: tex(t, 1 - s))
    ),
    "warp yarn coarser than declared": _sized(
        0.25, 0.60, lambda c, s: change(c, warp=lambda t: tex(t, 1 + s))
    ),
    "weft yarn coarser than declared": _sized(
        0.25, 0.60, lambda c, s: change(c, weft=lambda t: tex(t, 1 + s))
    ),
    "yarn flattened in finishing": _sized(0.18, 0.50, lambda c, s: replace(c, width=1 + s)),
    f"{GREY}: shrinkage in length": _shrinking(True, False, 1),
    f"{GREY}: shrinkage in width": _shrinking(False, True, 1),
    f"{GREY}: shrinkage both ways": _shrinking(True, True, 1),
    f"{FINISHED}: missing shrinkage in length": _shrinking(True, False, -1),
    f"{FINISHED}: missing shrinkage in width": _shrinking(False, True, -1),
    f"{FINISHED}: missing shrinkage both ways": _shrinking(True, True, -1),
    "swatch laid a quarter turn round": _sized(0, 0, lambda c, s: replace(c, turned=True)),
    "per-inch figure read as per-cm (ends and picks)": _sized(
        0,
        0,
        lambda c, s: change(c, warp=lambda t: sett(t, 1 / 2.54), weft=lambda t: sett(t, 1 / 2.54)),
    ),
    "per-inch figure read as per-cm (picks)": _sized(
        0, 0, lambda c, s: change(c, weft=lambda t: sett(t, 1 / 2.54))
    ),
    "folded warp yarn declared by its single count": _sized(
        0, 0, lambda c, s: change(c, warp=lambda t: tex(t, 2.0))
    ),
    "folded weft yarn declared by its single count": _sized(
        0, 0, lambda c, s: change(c, weft=lambda t: tex(t, 2.0))
    ),
    "folded warp and weft yarns declared by their single count": _sized(
        0, 0, lambda c, s: change(c, warp=lambda t: tex(t, 2.0), weft=lambda t: tex(t, 2.0))
    ),
    "plies counted as threads: ends": _sized(0, 0, lambda c, s: replace(c, read_ends=2.0)),
    "plies counted as threads: picks": _sized(0, 0, lambda c, s: replace(c, read_picks=2.0)),
    "picks inserted together declared as one": _sized(
        0, 0, lambda c, s: change(c, weft=lambda t: sett(t, 2.0))
    ),
    "threads in pairs: ends": _sized(0, 0, lambda c, s: replace(c, read_ends=0.5)),
    "both densities off by one factor (scale)": _sized(
        0.05, 0.10, lambda c, s: replace(c, read_ends=1 + s, read_picks=1 + s)
    ),
    "wrong weave": _seen((3, 3)),
}
"""What may be wrong, with sizes over which buyer and supplier quarrel."""
NEEDS_COVER = ("yarn", "inserted", "inch")
NEEDS_MASS = ("yarn flattened", "grey", "inserted")


def draw_delivery(
    truth: str | None, rng: np.random.Generator, *, at_limits: bool = False
) -> Delivery:
    """Draw one delivery with the named deviation, or with none; setts near or at their limits."""
    name = truth or ""
    by_cm = name.startswith("per-inch")
    plies = 2 if name.startswith("plies") else 1
    state = "grey" if name.startswith(GREY) else "finished"
    declaration = _article(rng, by_cm=by_cm, plies=plies, state=state)
    cloth = Cloth(construction_of(declaration), repeat=PLAIN_WEAVE[rng.integers(3)])
    approved = not by_cm and rng.random() < 0.4
    constants = {each.name: rng.normal(each.value, each.u) for each in cloth.construction.constants}
    own = rng.normal(1, OWN_WIDTH, 2)
    if approved:
        declaration = _approve(declaration, cloth, constants, own, rng)
        own = own * rng.normal(1, 0.01, 2)
    astray = rng.choice([-1, 1], 2) * LIMITS if at_limits else rng.uniform(-0.01, 0.01, 2)
    strayed = change(
        replace(cloth, cells=rng.normal(0, CELLS)),
        warp=lambda t: sett(t, 1 + astray[0]),
        weft=lambda t: sett(t, 1 + astray[1]),
    )
    delivered, size = DEVIATIONS[name](strayed, rng) if truth else (strayed, 0.0)
    backlit = any(each in name for each in NEEDS_COVER) or rng.random() < 0.7
    weighed = any(each in name for each in NEEDS_MASS) or rng.random() < 0.6
    observed = _look(delivered, constants, own, rng, backlit=backlit, weighed=weighed)
    return Delivery(declaration, observed, truth, size)


def _article(rng: np.random.Generator, *, by_cm: bool, plies: int, state: str) -> Declaration:
    """An ordinary cotton cloth, warp denser than weft by a tenth at least."""
    unit = "/cm" if by_cm else "/in"
    count = rng.integers(10, 60)
    # cover factors of ordinary cloth; a per-inch figure put down as per cm keeps its number
    warp_k, weft_k = rng.uniform(10, 14), rng.uniform(7, 9)
    ends, picks = (round(float(k * np.sqrt(count / plies)), 1) for k in (warp_k, weft_k))
    treated_key = 'size = "8 %"' if state == "grey" else ""
    finish = '[mass]\nfinish_change = "-4 %"' if state == "finished" else ""
    text = f"""
        [article]
        code = "D-{rng.integers(100, 999)}"
        weave = "plain"
        state = "{state}"
        [warp]
        threads = "{ends} {unit}"
        count = "{count} Ne"
        plies = {plies}
        fibre = "cotton"
        crimp = "{rng.integers(3, 10)} %"
        {treated_key}
        [weft]
        threads = "{picks} {unit}"
        count = "{count} Ne"
        plies = {plies}
        fibre = "cotton"
        crimp = "{rng.integers(3, 10)} %"
        [tolerance]
        ends = "2 %"
        picks = "3 %"
        {finish}
    """
    return read_declaration(text.encode(), name="article.toml")


def _covers(
    cloth: Cloth, constants: dict[str, float], own: np.ndarray
) -> tuple[float, float, float]:
    warp, weft = (
        min(1.0, t.section(constants).width * t.sett.per_mm * cloth.width * factor)
        for t, factor in zip((cloth.construction.warp, cloth.construction.weft), own, strict=True)
    )
    return warp, weft, 1 - (1 - warp) * (1 - weft) + cloth.cells


def _approve(
    declaration: Declaration,
    cloth: Cloth,
    constants: dict[str, float],
    own: np.ndarray,
    rng: np.random.Generator,
) -> Declaration:
    covers = _covers(cloth, constants, own)
    warp, weft, whole = (
        Measured(min(1.0, rng.normal(c, u)), u, "1") for c, u in zip(covers, COVERS_U, strict=True)
    )
    reference = declaration.reference.model_copy(
        update={"warp_cover": warp, "weft_cover": weft, "optical_cover": whole}
    )
    return replace(declaration, reference=reference)


def _look(
    cloth: Cloth,
    constants: dict[str, float],
    own: np.ndarray,
    rng: np.random.Generator,
    *,
    backlit: bool,
    weighed: bool,
) -> Observed:
    """Measure the cloth: every value is the true one plus normal noise of its stated u."""
    scale_u = rng.choice([0.001, 0.005])
    scale, count_u = rng.normal(1, scale_u), 0.0015
    whole = cloth.construction
    densities = [
        t.sett.per_cm * read * scale * rng.normal(1, count_u)
        for t, read in ((whole.warp, cloth.read_ends), (whole.weft, cloth.read_picks))
    ]
    ends, picks = (Measured(d, d * float(np.hypot(scale_u, count_u)), "1/cm") for d in densities)
    warp, weft, cover = (
        Measured(rng.normal(c, u), u, "1")
        for c, u in zip(_covers(cloth, constants, own), COVERS_U, strict=True)
    )
    # weighed as it came: the air of the room is in it
    mass = whole.mass(constants) * cloth.mass * rng.normal(1, MOISTURE)
    gsm = Measured(mass * rng.normal(1, 0.01), mass * 0.01, "g/m2")
    if cloth.turned:
        ends, picks, warp, weft = picks, ends, weft, warp
    return Observed(
        ends=ends,
        picks=picks,
        cover=cover if backlit else None,
        warp_cover=warp if backlit else None,
        weft_cover=weft if backlit else None,
        gsm=gsm if weighed else None,
        scale_u=float(scale_u),
        repeat=cloth.repeat,
    )
