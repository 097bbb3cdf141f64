"""What can be wrong with a delivery, its sheet or its picture: the causes that are weighed.

Each cause says how a cloth would then depart from its sheet, by how much it usually does, how
common it is beside the others, and which check would settle it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from imgcover.cloth.declaration import State
from imgcover.verdict.departure import Departure, Floats
from imgcover.verdict.sheet import Sheet

NODES = 81
"""Sizes tried of one deviation: steps of half a percent, finer than a sett naturally varies."""
NODES_A_SIDE = 23
"""The same where two sizes vary together: steps of 0.6 %."""


@dataclass(frozen=True, slots=True, eq=False)
class Cause:
    """One thing that may be wrong.

    Parameters
    ----------
    name : str
    prior : float
        How common it is beside the other causes, before anything is seen.
    departure : Departure
        Its effect, at every size tried.
    sizes, weights : ndarray, shape (nodes,), float64
        The sizes, and how likely each is; weights add up to 1.
    takes : str
        What it would take, with room for the size in percent; empty where it has no size.
    settle : str
        The check that would settle it.
    forks : tuple of str
        The sets of threads ("ends", "picks") whose forked reading speaks for it.
    other_weave : bool
        Whether it lets another weave repeat be seen than the declared one.
    """

    name: str
    prior: float
    departure: Departure
    sizes: Floats
    weights: Floats
    takes: str = ""
    settle: str = ""
    forks: tuple[str, ...] = ()
    other_weave: bool = False


def causes(sheet: Sheet) -> tuple[Cause, ...]:
    """List the causes that this sheet leaves possible."""
    return (
        *_setts(),
        *_yarns(sheet),
        *_finishing(sheet),
        *_paper(sheet),
        *_reading(sheet),
        _wrong_weave(),
    )


def _sized(
    name: str,
    prior: float,
    sizes: Floats,
    scale: float,
    build: Callable[[Floats], Departure],
    takes: str,
    settle: str,
) -> Cause:
    """A cause of one size, small sizes likelier: exponential with the given mean."""
    weights = np.exp(-(sizes - sizes.min()) / scale)
    return Cause(name, prior, build(sizes), sizes, weights / weights.sum(), takes, settle)


def _fixed(
    name: str,
    prior: float,
    departure: Departure,
    settle: str,
    *,
    weights: tuple[float, ...] = (1.0,),
    forks: tuple[str, ...] = (),
) -> Cause:
    """A cause whose sizes are known whole numbers or ratios."""
    given = np.array(weights)
    return Cause(name, prior, departure, np.zeros(len(given)), given, "", settle, forks)


def _setts() -> tuple[Cause, ...]:
    sizes, scale = np.linspace(0.01, 0.41, NODES), 0.08
    under_glass = "count 5 cm of {} under a glass at five places of the roll"
    ends, picks = under_glass.format("ends"), under_glass.format("picks")
    return (
        _sized(
            *("ends short", 1.0, sizes, scale, lambda s: Departure(ends=1 - s)),
            *("it takes {:.1f} % fewer ends than declared", ends),
        ),
        _sized(
            *("picks short", 1.0, sizes, scale, lambda s: Departure(picks=1 - s)),
            *("it takes {:.1f} % fewer picks than declared", picks),
        ),
        _sized(
            *("more ends than declared", 0.3, sizes, scale, lambda s: Departure(ends=1 + s)),
            *("it takes {:.1f} % more ends than declared", ends),
        ),
        _sized(
            *("more picks than declared", 0.3, sizes, scale, lambda s: Departure(picks=1 + s)),
            *("it takes {:.1f} % more picks than declared", picks),
        ),
    )


def _yarns(sheet: Sheet) -> tuple[Cause, ...]:
    finer, coarser = np.linspace(0.05, 0.45, NODES), np.linspace(0.05, 0.70, NODES)
    settle = "ravel {} and weigh a known length of it, conditioned"

    def changed(name: str, warp: bool, weft: bool, prior: float) -> tuple[Cause, Cause]:
        def by(sign: int) -> Callable[[Floats], Departure]:
            one = np.ones(1)
            return lambda s: Departure(
                warp_tex=1 + sign * s if warp else one, weft_tex=1 + sign * s if weft else one
            )

        check = settle.format(name.replace(" yarns", " yarn"))
        return (
            _sized(
                *(f"{name} finer than declared", prior, finer, 0.2, by(-1)),
                *("it takes {:.0f} % less tex than declared", check),
            ),
            _sized(
                *(f"{name} coarser than declared", 0.6 * prior, coarser, 0.2, by(1)),
                *("it takes {:.0f} % more tex than declared", check),
            ),
        )

    def folded(name: str, warp: bool, weft: bool, prior: float) -> Cause:
        factors, one = np.array([2.0, 3.0]), np.ones(1)
        departure = Departure(warp_tex=factors if warp else one, weft_tex=factors if weft else one)
        check = f"untwist the {name}: count the singles in it"
        title = f"folded {name} declared by its single count"
        return _fixed(title, prior, departure, check, weights=(0.8, 0.2))

    both_single = sheet.warp_plies == sheet.weft_plies == 1
    return (
        *changed("warp yarn", True, False, 0.7),
        *changed("weft yarn", False, True, 0.7),
        *changed("warp and weft yarns", True, True, 0.4),
        *((folded("warp yarn", True, False, 0.3),) if sheet.warp_plies == 1 else ()),
        *((folded("weft yarn", False, True, 0.3),) if sheet.weft_plies == 1 else ()),
        *((folded("yarn in both systems", True, True, 0.3),) if both_single else ()),
    )


def _finishing(sheet: Sheet) -> tuple[Cause, ...]:
    flatter = _sized(
        *("yarn flattened in finishing", 0.7, np.linspace(0.04, 0.64, NODES), 0.2),
        lambda s: Departure(width=1 + s),
        *(
            "it takes yarns {:.0f} % wider than round ones",
            "weigh a cut of known area (--gsm): "
            "flattening leaves the mass alone; or look at a cross-section",
        ),
    )
    swaps: list[Cause] = [flatter]
    if sheet.state is not State.FINISHED:
        swaps += _shrunk("grey declared, finished delivered", 1, 0.5 if sheet.state else 0.25)
    if sheet.state is not State.GREY:
        swaps += _shrunk("finished declared, grey delivered", -1, 0.5 if sheet.state else 0.25)
    return tuple(swaps)


def _shrunk(name: str, sign: int, prior: float) -> list[Cause]:
    """Shrinkage packs the other system closer and puts more yarn into a length of cloth."""
    settle = "wash a marked square, measure it again; test for size with iodine"
    along, across = (each.ravel() for each in np.meshgrid(*[np.linspace(0.01, 0.15, 23)] * 2))
    one_way, still = np.linspace(0.01, 0.16, NODES), np.zeros(1)

    def departure(length: Floats, width: Floats) -> Departure:
        in_length, in_width = (1 - length) ** -sign, (1 - width) ** -sign
        return Departure(
            ends=in_width,
            picks=in_length,
            warp_length=in_length,
            weft_length=in_width,
            width_u=TREATED_WIDTH_U,
            mass_u=TREATED_MASS_U,
        )

    verb = "shrinkage" if sign > 0 else "missing shrinkage"
    weights = np.exp(-(along + across) / 0.06)
    words = f"it takes {{:.1f}} % {verb}"
    return [
        _sized(
            *(f"{name}: {verb} in length", 0.6 * prior, one_way, 0.06),
            *(lambda s: departure(s, still), f"{words} in length", settle),
        ),
        _sized(
            *(f"{name}: {verb} in width", 0.6 * prior, one_way, 0.06),
            *(lambda s: departure(still, s), f"{words} in width", settle),
        ),
        Cause(
            *(f"{name}: {verb} both ways", prior, departure(along, across)),
            *((along + across) / 2, weights / weights.sum(), f"{words} each way on average"),
            settle,
        ),
    ]


TREATED_WIDTH_U = 0.03
"""Relative: washing and pressing change a yarn's width by a few percent either way."""
TREATED_MASS_U = 0.05
"""Relative: size goes, dye and softener come; several percent of the mass."""
INCH = 2.54


def _paper(sheet: Sheet) -> tuple[Cause, ...]:
    """Slips on the sheet itself."""
    ends = np.array([INCH if sheet.ends_in_inch else 1 / INCH])
    picks = np.array([INCH if sheet.picks_in_inch else 1 / INCH])
    one = np.ones(1)
    settle = "ask for the sheet's unit; count 5 cm under a glass"

    def title(in_inch: bool, which: str) -> str:
        slip = "per-cm figure read as per-inch" if in_inch else "per-inch figure read as per-cm"
        return f"{slip} ({which})"

    listed = [
        _fixed(title(sheet.ends_in_inch, "ends"), 0.15, Departure(ends=ends), settle),
        _fixed(title(sheet.picks_in_inch, "picks"), 0.15, Departure(picks=picks), settle),
    ]
    if sheet.ends_in_inch == sheet.picks_in_inch:
        both = Departure(ends=ends, picks=picks)
        listed.append(_fixed(title(sheet.ends_in_inch, "ends and picks"), 0.5, both, settle))
    together = Departure(ends=one, picks=np.array([2.0, 3.0]))
    shed = "open a shed under a glass: see how many picks lie in it"
    title_shed = "picks inserted together declared as one"
    return (*listed, _fixed(title_shed, 0.3, together, shed, weights=(0.8, 0.2)))


def _reading(sheet: Sheet) -> tuple[Cause, ...]:
    """Slips in how the picture was taken or read: the cloth itself is as declared."""
    one, halves = np.ones(1), np.array([0.5, 2.0])
    glass = "count one centimetre under a glass and compare with the overlay"
    turned = "turn the swatch, or find the selvedge: the warp runs along it"
    listed = [
        _fixed("swatch laid a quarter turn round", 1.0, Departure(turned=True), turned),
        _fixed(
            *("threads in pairs: ends", 0.3, Departure(read_ends=halves), glass),
            weights=(0.7, 0.3),
            forks=("ends",),
        ),
        _fixed(
            *("threads in pairs: picks", 0.3, Departure(read_picks=halves), glass),
            weights=(0.7, 0.3),
            forks=("picks",),
        ),
    ]
    for name, plies in (("ends", sheet.warp_plies), ("picks", sheet.weft_plies)):
        if plies > 1:
            times = np.array([float(plies)])
            read = (times, one) if name == "ends" else (one, times)
            departure = Departure(read_ends=read[0], read_picks=read[1])
            title, check = f"plies counted as threads: {name}", "untwist one thread under a glass"
            listed.append(_fixed(title, 0.3, departure, check))
    return (*listed, *_scale())


def _scale() -> tuple[Cause, ...]:
    settle = "lay a rule in the picture and measure again (--rule auto)"
    name = "both densities off by one factor (scale)"
    small = np.linspace(-0.15, 0.15, NODES)
    small = small[np.abs(small) > 0.005]
    gross = np.array([0.5, 2.0, INCH, 1 / INCH])
    sizes = np.concatenate([small, gross - 1])
    weights = np.exp(-np.abs(small) / 0.03)
    weights = np.concatenate([0.9 * weights / weights.sum(), np.full(4, 0.1 / 4)])
    departure = Departure(read_ends=1 + sizes, read_picks=1 + sizes)
    takes = "it takes a scale that makes densities {:+.1f} % of themselves too many"
    return (Cause(name, 0.7, departure, sizes, weights, takes, settle),)


def _wrong_weave() -> Cause:
    return Cause(
        *("wrong weave", 0.5, Departure(width_u=0.03), np.zeros(1), np.ones(1)),
        settle="draft one repeat under a glass and compare it with the declared weave",
        other_weave=True,
    )


__all__ = ["Cause", "causes"]
