"""Causes that lie in the paper or the picture: the cloth may be right."""

from __future__ import annotations

import numpy as np

from imgcover.verdict.cause import NODES, Cause, fixed
from imgcover.verdict.departure import Departure, Floats
from imgcover.verdict.sheet import Sheet

INCH = 2.54
"""Centimetres."""
TOGETHER = np.array([2.0, 3.0])
"""Picks laid in one shed: two mostly, or three."""
PAIRED = np.array([0.5, 2.0])
"""Pairs taken for threads, or threads for pairs."""
SCALE_USUAL = 0.03
"""Relative: a device that was never checked is off by a percent or a few."""
SCALE_WIDEST = 0.15
GROSS = np.array([0.5, 2.0, INCH, 1 / INCH])
"""A scan at half or twice the stated resolution, or dots a centimetre taken for dots an inch."""
GROSS_SHARE = 0.1


def slips(sheet: Sheet) -> tuple[Cause, ...]:
    """List what may be wrong on the sheet or in the reading."""
    return (
        *_units(sheet),
        _inserted_together(),
        _quarter_turn(),
        *_pairs(),
        *_plies(sheet),
        _scale(),
    )


def _units(sheet: Sheet) -> tuple[Cause, ...]:
    """A figure copied under the other unit: only the unit that is written can be the wrong one."""
    ends = np.array([INCH if sheet.ends_in_inch else 1 / INCH])
    picks = np.array([INCH if sheet.picks_in_inch else 1 / INCH])

    def slip(which: str, in_inch: bool, departure: Departure, prior: float) -> Cause:
        was, read = ("per-cm", "per-inch") if in_inch else ("per-inch", "per-cm")
        return fixed(
            f"{was} figure read as {read} ({which})",
            departure,
            prior=prior,
            settle="ask which unit the supplier's sheet means, and count 5 cm under a glass",
        )

    listed = [
        slip("ends", sheet.ends_in_inch, Departure(ends=ends), 0.15),
        slip("picks", sheet.picks_in_inch, Departure(picks=picks), 0.15),
    ]
    if sheet.ends_in_inch == sheet.picks_in_inch:
        both = Departure(ends=ends, picks=picks)
        listed.append(slip("ends and picks", sheet.ends_in_inch, both, 0.5))
    return tuple(listed)


def _inserted_together() -> Cause:
    return fixed(
        "picks inserted together declared as one",
        Departure(picks=TOGETHER),
        prior=0.3,
        settle="open the cloth at an edge and see how many picks lie in one shed",
        shares=(0.8, 0.2),
    )


def _quarter_turn() -> Cause:
    return fixed(
        "swatch laid a quarter turn round",
        Departure(turned=np.ones(1)),
        prior=1.0,
        settle="turn the swatch, or find the selvedge: the warp runs along it",
    )


def _pairs() -> tuple[Cause, ...]:
    def pairs(which: str, departure: Departure) -> Cause:
        return fixed(
            f"threads in pairs: {which}",
            departure,
            prior=0.3,
            settle="count one centimetre under a glass and compare it with the overlay",
            shares=(0.7, 0.3),
            forks=which,
        )

    return (
        pairs("ends", Departure(read_ends=PAIRED)),
        pairs("picks", Departure(read_picks=PAIRED)),
    )


def _plies(sheet: Sheet) -> tuple[Cause, ...]:
    def plies(which: str, departure: Departure) -> Cause:
        return fixed(
            f"plies counted as threads: {which}",
            departure,
            prior=0.3,
            settle="untwist one thread under a glass",
        )

    warp, weft = np.array([float(sheet.warp_plies)]), np.array([float(sheet.weft_plies)])
    listed = []
    if sheet.warp_plies > 1:
        listed.append(plies("ends", Departure(read_ends=warp)))
    if sheet.weft_plies > 1:
        listed.append(plies("picks", Departure(read_picks=weft)))
    return tuple(listed)


def _scale() -> Cause:
    small = np.linspace(-SCALE_WIDEST, SCALE_WIDEST, NODES)
    law = np.exp(-np.abs(small) / SCALE_USUAL)
    factors: Floats = np.concatenate([1 + small, GROSS])
    gross = np.full(len(GROSS), GROSS_SHARE / len(GROSS))
    return Cause(
        "both densities off by one factor (scale)",
        0.4,
        Departure(read_ends=factors, read_picks=factors),
        factors - 1,
        np.concatenate([(1 - GROSS_SHARE) * law / law.sum(), gross]),
        "lay a rule in the picture and measure again (--rule auto)",
        "it takes densities read off by {} % of themselves",
    )


__all__ = ["slips"]
