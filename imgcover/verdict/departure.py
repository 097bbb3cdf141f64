"""What would be seen of a cloth that departs from its sheet in a stated way?"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from imgcover.verdict.sheet import ENDS_MASS, ENDS_WIDTH, PICKS_MASS, PICKS_WIDTH, Sheet

SEEN = ("ends", "picks", "warp cover", "weft cover", "cover", "mass")
"""What can be seen, in the order of every vector here."""
WIDEST_NATURAL = 0.015
"""Relative u of a sett that a cause leaves alone, at most: a wide tolerance does not mean that
every cloth strays that far."""

Floats = NDArray[np.float64]


def _one() -> Floats:
    return np.ones(1)


@dataclass(frozen=True, slots=True, eq=False)
class Departure:
    """One way of departing, at several sizes (nodes); arrays broadcast over the nodes.

    Parameters
    ----------
    ends, picks : ndarray
        Density of the cloth over the declared.
    warp_tex, weft_tex : ndarray
        Tex over the declared: the width goes with its root, the mass with it.
    width : ndarray
        Width of both yarns over that of the declared section.
    warp_length, weft_length : ndarray
        Yarn in a given length of cloth over the declared: shrinking puts more in.
    read_ends, read_picks : ndarray
        Density as read over that of the cloth: a wrong scale, or threads taken for others.
    turned : bool
        The swatch lay a quarter turn round.
    width_u, mass_u : float
        Relative u that this departure adds to the widths and to the mass.
    """

    ends: Floats = field(default_factory=_one)
    picks: Floats = field(default_factory=_one)
    warp_tex: Floats = field(default_factory=_one)
    weft_tex: Floats = field(default_factory=_one)
    width: Floats = field(default_factory=_one)
    warp_length: Floats = field(default_factory=_one)
    weft_length: Floats = field(default_factory=_one)
    read_ends: Floats = field(default_factory=_one)
    read_picks: Floats = field(default_factory=_one)
    turned: bool = False
    width_u: float = 0.0
    mass_u: float = 0.0


def expected(sheet: Sheet, departure: Departure) -> tuple[Floats, Floats]:
    """Work out what would be seen, and what each unsure input does to it.

    Parameters
    ----------
    sheet : Sheet
    departure : Departure

    Returns
    -------
    tuple of ndarray
        Means, shape (nodes, 6), and effects of one u of each input, shape (nodes, inputs, 6), in
        the order of `SEEN`. The last two inputs are the natural variation of ends and of picks.
    """
    d = departure
    warp = sheet.warp_width * d.ends * np.sqrt(d.warp_tex) * d.width
    weft = sheet.weft_width * d.picks * np.sqrt(d.weft_tex) * d.width
    ends = sheet.ends * d.ends * d.read_ends
    picks = sheet.picks * d.picks * d.read_picks
    warp_mass = sheet.warp_mass * d.ends * d.warp_tex * d.warp_length
    weft_mass = sheet.weft_mass * d.picks * d.weft_tex * d.weft_length
    ends, picks, warp, weft, warp_mass, weft_mass = np.broadcast_arrays(
        ends, picks, warp, weft, warp_mass, weft_mass
    )
    inputs = _inputs(sheet, departure)
    open_warp, open_weft = np.maximum(1 - warp, 0.0), np.maximum(1 - weft, 0.0)
    # past full cover a wider yarn shows nothing more
    moves_warp, moves_weft = np.where(warp < 1, warp, 0.0), np.where(weft < 1, weft, 0.0)
    means = np.stack(
        [
            *(ends, picks, 1 - open_warp, 1 - open_weft),
            *(1 - open_warp * open_weft, warp_mass + weft_mass),
        ],
        axis=1,
    )
    by_warp, by_weft = np.outer(moves_warp, inputs[:, 2]), np.outer(moves_weft, inputs[:, 3])
    effects = np.stack(
        [
            *(np.outer(ends, inputs[:, 0]), np.outer(picks, inputs[:, 1]), by_warp, by_weft),
            by_warp * open_weft[:, None] + by_weft * open_warp[:, None],
            np.outer(warp_mass, inputs[:, 4]) + np.outer(weft_mass, inputs[:, 5]),
        ],
        axis=2,
    )
    if departure.turned:
        turn = [1, 0, 3, 2, 4, 5]
        return means[:, turn], effects[:, :, turn]
    return means, effects


def _inputs(sheet: Sheet, departure: Departure) -> Floats:
    """Effects of one u of every unsure input on the logarithms, shape (inputs, 6).

    Columns: ends, picks, warp width over spacing, weft width over spacing, warp mass, weft mass.
    """
    constants = np.zeros((len(sheet.effects), 6))
    constants[:, 2:] = sheet.effects[:, [ENDS_WIDTH, PICKS_WIDTH, ENDS_MASS, PICKS_MASS]]
    added = np.zeros((2, 6))
    added[0, [2, 3]] = departure.width_u
    added[1, [4, 5]] = departure.mass_u
    natural = np.zeros((2, 6))
    natural[0, [0, 2, 4]] = natural_u(sheet.ends_room)
    natural[1, [1, 3, 5]] = natural_u(sheet.picks_room)
    return np.vstack([constants, added, natural])


def natural_u(room: tuple[float, float]) -> float:
    """Relative u of a sett that is as declared: half the room, so that two u fill it."""
    return min(0.25 * (room[0] + room[1]), WIDEST_NATURAL)


__all__ = ["SEEN", "Departure", "Floats", "expected", "natural_u"]
