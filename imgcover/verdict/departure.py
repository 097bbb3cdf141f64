"""What would be seen of a cloth that departs from its sheet in a stated way?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, fields

import numpy as np
from numpy.typing import NDArray

from imgcover.verdict.sheet import ENDS_MASS, ENDS_WIDTH, PICKS_MASS, PICKS_WIDTH, Sheet

SEEN = ("ends", "picks", "warp cover", "weft cover", "cover", "mass")
"""What can be seen, in the order of every vector here."""
WIDEST_NATURAL = 0.015
"""Relative u of a sett that a cause leaves alone, at most: a wide tolerance does not mean that
every cloth strays that far."""
TURN = [1, 0, 3, 2, 4, 5]
"""Order of `SEEN` after a quarter turn."""
COMPOSITION = -3
"""Input that stands for how the cover is composed of the two systems' own."""
COMPOSED_U = 0.005
"""Covered fraction: 1 − (1 − k1)(1 − k2) of means is not quite the mean over cells that vary."""

Floats = NDArray[np.float64]


def _one() -> Floats:
    return np.ones(1)


def _none() -> Floats:
    return np.zeros(1)


@dataclass(frozen=True, slots=True, eq=False)
class Departure:
    """One way of departing, at several sizes; every field has one value a size, or one for all.

    Parameters
    ----------
    ends, picks : ndarray, shape (sizes,) or (1,), float64
        Density of the cloth over the declared.
    warp_tex, weft_tex : ndarray
        Tex over the declared: the width goes with its root, the mass with it.
    width : ndarray
        Width of both yarns over that of the declared section.
    warp_length, weft_length : ndarray
        Yarn in a given length of cloth over the declared: shrinking puts more in.
    warp_load, load : ndarray
        Mass of the warp, and of the whole, over the declared: size that came or went, finishing.
    read_ends, read_picks : ndarray
        Density as read over that of the cloth: a wrong scale, or threads taken for others.
    turned : ndarray
        1 where the swatch lay a quarter turn round, else 0.
    width_u, mass_u : ndarray
        Relative u that this departure adds to the widths and to the mass.
    """

    ends: Floats = field(default_factory=_one)
    picks: Floats = field(default_factory=_one)
    warp_tex: Floats = field(default_factory=_one)
    weft_tex: Floats = field(default_factory=_one)
    width: Floats = field(default_factory=_one)
    warp_length: Floats = field(default_factory=_one)
    weft_length: Floats = field(default_factory=_one)
    warp_load: Floats = field(default_factory=_one)
    load: Floats = field(default_factory=_one)
    read_ends: Floats = field(default_factory=_one)
    read_picks: Floats = field(default_factory=_one)
    turned: Floats = field(default_factory=_none)
    width_u: Floats = field(default_factory=_none)
    mass_u: Floats = field(default_factory=_none)


def joined(departures: Sequence[Departure], sizes: Sequence[int]) -> Departure:
    """Put several departures, of so many sizes each, one after the other."""
    pairs = list(zip(departures, sizes, strict=True))
    return Departure(
        **{
            each.name: np.concatenate(
                [np.broadcast_to(getattr(departure, each.name), n) for departure, n in pairs]
            )
            for each in fields(Departure)
        }
    )


def expected(sheet: Sheet, departure: Departure) -> tuple[Floats, Floats]:
    """Work out what would be seen, and what each unsure input does to it.

    Parameters
    ----------
    sheet : Sheet
    departure : Departure

    Returns
    -------
    tuple of ndarray
        Means, shape (sizes, 6), and effects of one u of each input, shape (sizes, inputs, 6), in
        the order of `SEEN`. The last two inputs are the natural variation of ends and of picks.
    """
    d = departure
    ends, picks, warp, weft, warp_mass, weft_mass, turned = np.broadcast_arrays(
        sheet.ends * d.ends * d.read_ends,
        sheet.picks * d.picks * d.read_picks,
        sheet.warp_width * d.ends * np.sqrt(d.warp_tex) * d.width,
        sheet.weft_width * d.picks * np.sqrt(d.weft_tex) * d.width,
        sheet.warp_mass * d.ends * d.warp_tex * d.warp_length * d.warp_load * d.load,
        sheet.weft_mass * d.picks * d.weft_tex * d.weft_length * d.load,
        d.turned,
    )
    open_warp, open_weft = np.maximum(1 - warp, 0.0), np.maximum(1 - weft, 0.0)
    cover, mass = 1 - open_warp * open_weft, warp_mass + weft_mass
    means = np.stack([ends, picks, 1 - open_warp, 1 - open_weft, cover, mass], axis=1)
    inputs = _inputs(sheet, d, len(ends))
    # past full cover a wider yarn shows nothing more
    by_warp = np.where(warp < 1, warp, 0.0)[:, None] * inputs[:, :, 2]
    by_weft = np.where(weft < 1, weft, 0.0)[:, None] * inputs[:, :, 3]
    by_cover = by_warp * open_weft[:, None] + by_weft * open_warp[:, None]
    by_cover[:, COMPOSITION] = COMPOSED_U
    by_ends, by_picks = ends[:, None] * inputs[:, :, 0], picks[:, None] * inputs[:, :, 1]
    by_mass = warp_mass[:, None] * inputs[:, :, 4] + weft_mass[:, None] * inputs[:, :, 5]
    effects = np.stack([by_ends, by_picks, by_warp, by_weft, by_cover, by_mass], axis=2)
    other_way = turned > 0
    means[other_way] = means[other_way][:, TURN]
    effects[other_way] = effects[other_way][:, :, TURN]
    return means, effects


def _inputs(sheet: Sheet, departure: Departure, sizes: int) -> Floats:
    """Effects of one u of every unsure input on the logarithms, shape (sizes, inputs, 6).

    Last axis: ends, picks, warp width over spacing, weft width over spacing, warp mass, weft mass.
    Inputs: the sheet's constants, what the departure adds to widths and mass, how the cover is
    composed (it acts on the cover alone and is empty here), natural variation of ends and picks.
    """
    constants = len(sheet.effects)
    inputs = np.zeros((sizes, constants + 5, 6))
    inputs[:, :constants, 2:] = sheet.effects[:, [ENDS_WIDTH, PICKS_WIDTH, ENDS_MASS, PICKS_MASS]]
    inputs[:, constants, 2:4] = departure.width_u[:, None]
    inputs[:, constants + 1, 4:6] = departure.mass_u[:, None]
    inputs[:, -2, [0, 2, 4]] = natural_u(sheet.ends_room)
    inputs[:, -1, [1, 3, 5]] = natural_u(sheet.picks_room)
    return inputs


def natural_u(room: tuple[float, float]) -> float:
    """Relative u of a sett that is as declared: half the room, so that two u fill it."""
    return min(0.25 * (room[0] + room[1]), WIDEST_NATURAL)


__all__ = ["SEEN", "Departure", "Floats", "expected", "joined", "natural_u"]
