"""How much of the field is yarn? The road from backlit light to the cover."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.lattice_cover import by_openings
from imgcover.cover.masking import cloth_only
from imgcover.cover.places import pore_places
from imgcover.cover.plain_cover import by_levels
from imgcover.cover.reading import CoverReading, Lattice, Lit, Pitch
from imgcover.cover.windows import Sheet, cell_sides, exposed, parts, spread
from imgcover.findings import Flag, found

AROUND = 8.0
"""So many cells around the field are looked at: bare light beyond a frayed rim lies within them."""
FEWEST_PORES = 16
"""Fewer cannot tell light, blur and yarn apart."""


def read_cover(
    source: Lit | NDArray[np.float32],
    *,
    light: str | None,
    field: NDArray[np.bool_] | None = None,
    lattice: Lattice | None = None,
    pitch: Pitch | None = None,
    backing: str | None = None,
    blank: Lit | NDArray[np.float32] | None = None,
    dark: Lit | NDArray[np.float32] | None = None,
    loss_step: float = 0.0,
) -> CoverReading:
    """Measure the covered share of the field.

    Parameters
    ----------
    source : Lit or ndarray, shape (rows, columns), float32, linear light 0…1
    light : {"backlit", "reflected"} or None
        None (not stated) is refused.
    field : ndarray, shape (rows, columns), bool, or None
        True where the cloth is; None means everywhere.
    lattice : Lattice or None
        The threads found; None: no whole periods, no mean cell, no warp and weft apart.
    pitch : Pitch or None
        px/mm; None: no pores a square centimetre.
    backing : {"light", "dark"} or None
        The card the cloth lies on in reflected light.
    blank, dark : Lit or ndarray, or None
        The same light without cloth, and the same exposure without light.
    loss_step : float
        Grey levels to which the picture was rounded in blocks when it was stored with losses, as
        JPEG (`imgcover.picture.losses`); 0 for none.

    Returns
    -------
    CoverReading
        With `optical` None and a finding where the cover could not be measured.
    """
    if light is None:
        return CoverReading(findings=(found(Flag.LIGHT_NOT_STATED),))
    if light == "reflected" and backing is None:
        return CoverReading(findings=(found(Flag.COVER_NEEDS_BACKLIGHT),))
    picture, bare, without = (_lit(each) for each in (source, blank, dark))
    assert picture is not None
    around = 0 if lattice is None else math.ceil(AROUND * max(cell_sides(lattice)))
    windows = exposed(spread(picture, field=field, around=around), blank=bare, dark=without)
    if not windows:
        return CoverReading(findings=(found(Flag.NO_CLOTH_TO_COVER),))
    size = (picture.rows, picture.columns)
    known = bare is not None
    if light == "backlit" and lattice is not None:
        windows = cloth_only(windows, lattice, size=size)
        if not windows:
            return CoverReading(findings=(found(Flag.NO_CLOTH_TO_COVER),))
        places = pore_places(parts(windows, lattice), lattice)
        if len(places.row) >= FEWEST_PORES:
            return by_openings(
                windows, places, lattice, pitch, size=size, light_known=known, loss_step=loss_step
            )
    return by_levels(windows, lattice, size=size, light_known=known, backing=backing)


def _lit(source: Lit | NDArray[np.float32] | None) -> Lit | None:
    return Sheet(source) if isinstance(source, np.ndarray) else source


__all__ = ["read_cover"]
