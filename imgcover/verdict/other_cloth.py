"""Causes that lie in the cloth: it is not the cloth on the sheet."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from imgcover.cloth.declaration import State
from imgcover.verdict.cause import Cause, fixed, sized
from imgcover.verdict.departure import Departure, Floats
from imgcover.verdict.sheet import Sheet

SETT_BETWEEN, SETT_USUAL = (0.01, 0.41), 0.08
"""Deviations of a sett: most are of a few percent; beyond 40 % it is another article."""
YARN_BETWEEN, YARN_USUAL = (0.05, 0.45), 0.2
"""Of a count: the next count that is spun lies 5 to 25 % away."""
COARSER_BETWEEN = (0.05, 0.70)
FLATTER_BETWEEN = (0.04, 0.64)
"""Of the width over that of a round yarn: calendering goes no further."""
SHRINK_BETWEEN, SHRINK_USUAL = (0.01, 0.16), 0.06
"""Shrinkage of woven cloth in finishing: a few percent, seldom over ten."""
SHRINK_A_SIDE = 16
"""Sizes tried a side where both vary: steps of one percent."""
TREATED_WIDTH_U = 0.03
"""Relative: washing and pressing change a yarn's width by a few percent either way."""
TREATED_MASS_U = 0.03
"""Relative: what comes and goes beside a declared size."""
UNSAID_SIZE, UNSAID_SIZE_U = 0.08, 0.05
"""Where no size is declared: the middle of the usual 5 to 15 % on grey warps leans to the light."""
UNDER_GLASS = "count 5 cm of {} under a glass at five places of the roll"
RAVEL = "ravel out {} and weigh a known length of it, conditioned"


def causes_in_cloth(sheet: Sheet) -> tuple[Cause, ...]:
    """List what may be wrong with the cloth itself."""
    return (*_setts(), *_counts(), *_folding(sheet), _flattened(), *_treatments(sheet), _weave())


def _setts() -> tuple[Cause, ...]:
    def short(which: str) -> Cause:
        return sized(
            f"{which} short",
            lambda s: _with_sett(which, 1 - s),
            prior=1.0,
            between=SETT_BETWEEN,
            usual=SETT_USUAL,
            takes=f"it takes {{}} % fewer {which} than declared",
            settle=UNDER_GLASS.format(which),
            sett=which,
        )

    def more(which: str) -> Cause:
        # rarer than too few by far: threads cost the mill money
        return sized(
            f"more {which} than declared",
            lambda s: _with_sett(which, 1 + s),
            prior=0.15,
            between=SETT_BETWEEN,
            usual=SETT_USUAL,
            takes=f"it takes {{}} % more {which} than declared",
            settle=UNDER_GLASS.format(which),
            sett=which,
        )

    return short("ends"), short("picks"), more("ends"), more("picks")


def _with_sett(which: str, factor: Floats) -> Departure:
    return Departure(ends=factor) if which == "ends" else Departure(picks=factor)


@dataclass(frozen=True, slots=True)
class _Yarns:
    """Which yarns a cause changes, what they are called, and how common that is."""

    called: str
    warp: bool
    weft: bool
    prior: float

    def with_tex(self, factor: Floats) -> Departure:
        """Change their tex alone."""
        one = np.ones(1)
        return Departure(
            warp_tex=factor if self.warp else one, weft_tex=factor if self.weft else one
        )


WARP = _Yarns("warp yarn", True, False, 0.7)
WEFT = _Yarns("weft yarn", False, True, 0.7)
BOTH = _Yarns("warp and weft yarns", True, True, 0.4)


def _counts() -> tuple[Cause, ...]:
    def finer(yarns: _Yarns) -> Cause:
        return sized(
            f"{yarns.called} finer than declared",
            lambda s: yarns.with_tex(1 - s),
            prior=yarns.prior,
            between=YARN_BETWEEN,
            usual=YARN_USUAL,
            takes="it takes {} % less tex than declared",
            settle=RAVEL.format(yarns.called),
        )

    def coarser(yarns: _Yarns) -> Cause:
        # rarer than finer: it costs the spinner fibre
        return sized(
            f"{yarns.called} coarser than declared",
            lambda s: yarns.with_tex(1 + s),
            prior=0.6 * yarns.prior,
            between=COARSER_BETWEEN,
            usual=YARN_USUAL,
            takes="it takes {} % more tex than declared",
            settle=RAVEL.format(yarns.called),
        )

    return tuple(make(yarns) for yarns in (WARP, WEFT, BOTH) for make in (finer, coarser))


def _folding(sheet: Sheet) -> tuple[Cause, ...]:
    """A single count on the sheet, a folded yarn in the cloth: twofold mostly, or threefold."""
    single = {WARP: sheet.warp_plies == 1, WEFT: sheet.weft_plies == 1}
    single[BOTH] = all(single.values())
    return tuple(
        fixed(
            f"folded {yarns.called} declared by {'its' if yarns is not BOTH else 'their'} "
            "single count",
            yarns.with_tex(np.array([2.0, 3.0])),
            prior=0.15,
            settle=f"untwist the {yarns.called} and count the singles",
            shares=(0.8, 0.2),
        )
        for yarns, possible in single.items()
        if possible
    )


def _flattened() -> Cause:
    return sized(
        "yarn flattened in finishing",
        lambda s: Departure(width=1 + s),
        prior=0.7,
        between=FLATTER_BETWEEN,
        usual=0.2,
        takes="it takes yarns {} % wider than the declared section",
        settle="weigh a cut of known area (--gsm), which flattening leaves alone, or look at a "
        "cross-section",
    )


def _treatments(sheet: Sheet) -> tuple[Cause, ...]:
    """Grey for finished or the reverse; either may be met where the sheet does not say."""
    listed: list[Cause] = []
    if sheet.state is not State.FINISHED:
        size = 0.0 if sheet.size is None else sheet.size
        washed = Departure(
            warp_load=np.array([1 / (1 + size)]),
            width_u=np.array([TREATED_WIDTH_U]),
            mass_u=np.array([TREATED_MASS_U if sheet.size is not None else UNSAID_SIZE_U]),
        )
        listed += _shrunk("grey declared, finished delivered: shrinkage", 1, washed, sheet)
    if sheet.state is not State.GREY:
        size = UNSAID_SIZE if sheet.size is None else sheet.size
        loaded = Departure(
            warp_load=np.array([1 + size]),
            load=np.array([1 / sheet.finish]),
            width_u=np.array([TREATED_WIDTH_U]),
            mass_u=np.array([TREATED_MASS_U if sheet.size is not None else UNSAID_SIZE_U]),
        )
        listed += _shrunk("finished declared, grey delivered: missing shrinkage", -1, loaded, sheet)
    return tuple(listed)


def _shrunk(name: str, sign: int, treated: Departure, sheet: Sheet) -> list[Cause]:
    """Shrinkage packs the other system closer and puts more yarn into a length of cloth."""
    settle = "wash a marked square and measure it again; test for size with iodine"
    prior = 0.8 if sheet.state is not None else 0.3
    verb = "shrinkage" if sign > 0 else "shrinkage still to come"
    still = np.zeros(1)

    def shrunk(in_length: Floats, in_width: Floats) -> Departure:
        along, across = (1 - in_length) ** -sign, (1 - in_width) ** -sign
        return replace(treated, ends=across, picks=along, warp_length=along, weft_length=across)

    def one_way(where: str, prior: float) -> Cause:
        return sized(
            f"{name} in {where}",
            (lambda s: shrunk(s, still)) if where == "length" else (lambda s: shrunk(still, s)),
            prior=prior,
            between=SHRINK_BETWEEN,
            usual=SHRINK_USUAL,
            takes=f"it takes {{}} % {verb} in {where}",
            settle=settle,
        )

    side = np.linspace(*SHRINK_BETWEEN, SHRINK_A_SIDE)
    length, width = (each.ravel() for each in np.meshgrid(side, side))
    weights = np.exp(-(length + width) / SHRINK_USUAL)
    both = Cause(
        f"{name} both ways",
        prior,
        shrunk(length, width),
        (length + width) / 2,
        weights / weights.sum(),
        settle,
        f"it takes {{}} % {verb} each way on average",
    )
    return [one_way("length", 0.6 * prior), one_way("width", 0.6 * prior), both]


def _weave() -> Cause:
    return Cause(
        "wrong weave",
        0.5,
        Departure(width_u=np.array([TREATED_WIDTH_U])),
        np.zeros(1),
        np.ones(1),
        "draft one repeat under a glass and compare it with the declared weave",
        other_weave=True,
    )


__all__ = ["causes_in_cloth"]
