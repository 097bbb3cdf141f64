"""The declared cloth in the numbers a diagnosis varies, and how unsure each of them is."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cloth.constant import Constant
from imgcover.cloth.construction import Construction, construction_of
from imgcover.cloth.declaration import Declaration, Reference, State
from imgcover.cloth.sett import Sett
from imgcover.cloth.tolerance import Tolerance
from imgcover.quantity import Measured
from imgcover.weave import weave

OWN_WIDTH_U = 0.02
"""Relative: yarns of one kind still differ in twist and in how the loom strained them, so warp
and weft do not share the whole error of a common packing."""
APPROVED_OWN_WIDTH_U = 0.01
"""The same between an approved swatch and later deliveries of the same yarn."""
SPLIT_U = 0.04
"""Relative, of the share of warp and weft in an approved cover that was not taken apart: what the
packing leaves open of each."""
NATURAL = 0.01
"""Room on either side of a declared sett without a tolerance: looms and relaxing cloth stray by
about that much without anybody calling it a deviation."""
LEAST_ROOM = 1e-3
"""Room where the tolerance leaves none: no two cloths are closer."""
OPEN_SIDE = 0.05
"""Room on a side that the tolerance leaves open: allowed, but not without end, since 30 % more
picks still wants an explanation."""

ENDS_WIDTH, PICKS_WIDTH, ENDS_MASS, PICKS_MASS = range(4)
"""Columns of `Sheet.effects`."""


@dataclass(frozen=True, slots=True, eq=False)
class Sheet:
    """What the declaration leads to, ready to be varied.

    Parameters
    ----------
    ends, picks : float
        Declared, 1/cm.
    warp_width, weft_width : float
        Yarn width over spacing, not capped.
    warp_mass, weft_mass : float
        g/m², finishing included.
    size : float or None
        On the warp, as a share of its mass; None where not declared.
    finish : float
        Mass after finishing over the mass before, as declared; 1 where nothing was.
    effects : ndarray, shape (constants, 4), float64
        What one u of each constant does to the logarithm of warp width, weft width, warp mass
        and weft mass.
    ends_room, picks_room : tuple of float
        Relative room below and above the declared sett within which a cloth is the declared one.
    warp_plies, weft_plies : int
        1 for a single yarn.
    ends_in_inch, picks_in_inch : bool
        Whether the sett was written by the inch.
    repeat : tuple of int or None
        (ends, picks) in the declared weave's repeat.
    state : State or None
        Grey or finished, where declared.
    approved : bool
        Whether the widths come from an approved swatch.
    """

    ends: float
    picks: float
    warp_width: float
    weft_width: float
    warp_mass: float
    weft_mass: float
    size: float | None
    finish: float
    effects: NDArray[np.float64]
    ends_room: tuple[float, float]
    picks_room: tuple[float, float]
    warp_plies: int
    weft_plies: int
    ends_in_inch: bool
    picks_in_inch: bool
    repeat: tuple[int, int] | None
    state: State | None
    approved: bool


def sheet_of(declaration: Declaration) -> Sheet:
    """Take the numbers off a declaration; covers from the approved swatch where there is one."""
    cloth = construction_of(declaration)
    widths, effects = _widths(cloth, declaration)
    finish = cloth.finish.value
    warp, weft = declaration.warp, declaration.weft
    return Sheet(
        ends=warp.threads.per_cm,
        picks=weft.threads.per_cm,
        warp_width=widths[0],
        weft_width=widths[1],
        warp_mass=cloth.warp.mass({}) * finish,
        weft_mass=cloth.weft.mass({}) * finish,
        size=None if warp.size is None else warp.size.value,
        finish=finish,
        effects=effects,
        ends_room=_room(declaration.tolerance.ends, warp.threads),
        picks_room=_room(declaration.tolerance.picks, weft.threads),
        warp_plies=warp.count.plies,
        weft_plies=weft.count.plies,
        ends_in_inch="in" in warp.threads.text,
        picks_in_inch="in" in weft.threads.text,
        repeat=_repeat(declaration.article.weave),
        state=declaration.article.state,
        approved=_is_approved(declaration.reference),
    )


def _is_approved(reference: Reference) -> bool:
    both = reference.warp_cover is not None and reference.weft_cover is not None
    return both or reference.optical_cover is not None


def _widths(
    cloth: Construction, declaration: Declaration
) -> tuple[tuple[float, float], NDArray[np.float64]]:
    """Widths over spacing and all effects: by the model, or by the approved swatch."""
    modelled = (
        cloth.warp.section({}).width * cloth.warp.sett.per_mm,
        cloth.weft.section({}).width * cloth.weft.sett.per_mm,
    )
    of_mass = _model_effects(cloth)
    of_mass[:, [ENDS_WIDTH, PICKS_WIDTH]] = 0.0
    approved = declaration.reference
    if approved.warp_cover is not None and approved.weft_cover is not None:
        widths = (approved.warp_cover.value, approved.weft_cover.value)
        u = [
            math.hypot(each.u / max(each.value, each.u), APPROVED_OWN_WIDTH_U)
            for each in (approved.warp_cover, approved.weft_cover)
        ]
        return widths, np.vstack([of_mass, _own(*u)])
    if approved.optical_cover is not None:
        widths, effects = _from_total(modelled, approved.optical_cover)
        own = _own(APPROVED_OWN_WIDTH_U, APPROVED_OWN_WIDTH_U)
        return widths, np.vstack([of_mass, effects, own])
    return modelled, np.vstack([_model_effects(cloth), _own(OWN_WIDTH_U, OWN_WIDTH_U)])


def _model_effects(cloth: Construction) -> NDArray[np.float64]:
    """Half the difference of each logarithm between a constant one u up and one u down."""
    results: tuple[Callable[[Mapping[str, float]], float], ...] = (
        lambda drawn: cloth.warp.section(drawn).width,
        lambda drawn: cloth.weft.section(drawn).width,
        lambda drawn: cloth.warp.mass(drawn) * cloth.finish.at(drawn),
        lambda drawn: cloth.weft.mass(drawn) * cloth.finish.at(drawn),
    )
    unsure = {each.name: each for each in cloth.constants if each.u > 0}
    rows = [[_log_effect(result, each) for result in results] for each in unsure.values()]
    return np.array(rows, dtype=np.float64).reshape(-1, 4)


def _log_effect(result: Callable[[Mapping[str, float]], float], constant: Constant) -> float:
    up = result({constant.name: constant.value + constant.u})
    down = result({constant.name: constant.value - constant.u})
    return 0.5 * math.log(up / down)


def _own(warp: float, weft: float) -> NDArray[np.float64]:
    effects = np.zeros((2, 4))
    effects[0, ENDS_WIDTH], effects[1, PICKS_WIDTH] = warp, weft
    return effects


def _from_total(
    modelled: tuple[float, float], approved: Measured
) -> tuple[tuple[float, float], NDArray[np.float64]]:
    """Scale the modelled widths to an approved cover of the whole cloth.

    1 − (1 − f k1)(1 − f k2) = cover is a quadratic in f; the smaller root is the one below 1.
    """
    first, second = min(modelled[0], 1.0), min(modelled[1], 1.0)
    total, product = first + second, first * second
    inside = max(total**2 - 4 * product * approved.value, 0.0)
    factor = (total - math.sqrt(inside)) / (2 * product)
    widths = (min(factor * first, 1.0), min(factor * second, 1.0))
    slopes = (widths[0] * (1 - widths[1]), widths[1] * (1 - widths[0]))
    effects = np.zeros((2, 4))
    effects[0, [ENDS_WIDTH, PICKS_WIDTH]] = approved.u / max(sum(slopes), approved.u)
    # the split turns round the total: what it gives the warp it takes from the weft
    effects[1, ENDS_WIDTH] = SPLIT_U
    effects[1, PICKS_WIDTH] = -SPLIT_U * min(slopes[0] / max(slopes[1], 1e-9), 1.0)
    return widths, effects


def _room(tolerance: Tolerance | None, sett: Sett) -> tuple[float, float]:
    if tolerance is None:
        return NATURAL, NATURAL
    lower, upper = tolerance.limits(sett.per_mm)
    below = OPEN_SIDE if lower is None else 1.0 - lower / sett.per_mm
    above = OPEN_SIDE if upper is None else upper / sett.per_mm - 1.0
    return max(below, LEAST_ROOM), max(above, LEAST_ROOM)


def _repeat(name: str | None) -> tuple[int, int] | None:
    if name is None:
        return None
    declared = weave(name)
    return declared.ends_repeat, declared.picks_repeat


__all__ = [
    "ENDS_MASS",
    "ENDS_WIDTH",
    "PICKS_MASS",
    "PICKS_WIDTH",
    "Sheet",
    "sheet_of",
]
