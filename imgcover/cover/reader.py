"""How much of the field is yarn? The road from backlit light to the cover."""

from __future__ import annotations

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.levels import Surface, open_pore_light, two_levels
from imgcover.cover.reading import (
    CoverReading,
    Histogram,
    Lattice,
    LightField,
    Lit,
    Pitch,
    Seen,
)
from imgcover.cover.windows import Sheet, Window, cell_sides, spread, whole_periods
from imgcover.findings import Flag, found
from imgcover.quantity import Measured

BLOCK_WITHOUT_LATTICE = 48
"""Side of a light block when no thread was found, px."""
FINER = 4
"""Sub-pixels a pixel for the half-level edge: the edge is then placed to a few hundredths px."""


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

    Returns
    -------
    CoverReading
        With `optical` None and a finding where the cover could not be measured.
    """
    if light is None:
        return CoverReading(findings=(found(Flag.LIGHT_NOT_STATED),))
    if light == "reflected":
        return CoverReading(findings=(found(Flag.COVER_NEEDS_BACKLIGHT),))
    picture = Sheet(source) if isinstance(source, np.ndarray) else source
    windows = spread(picture, field=field)
    block = BLOCK_WITHOUT_LATTICE if lattice is None else round(6 * max(cell_sides(lattice)))
    surface, scatter = open_pore_light(
        windows, rows=picture.rows, columns=picture.columns, block=block
    )
    return _measured(windows, surface, scatter, lattice)


def _measured(
    windows: list[Window], surface: Surface, scatter: float, lattice: Lattice | None
) -> CoverReading:
    shares = [window.light / surface.over(window) for window in windows]
    weights = [whole_periods(window.inside, lattice) for window in windows]
    values = np.concatenate([s[w > 0] for s, w in zip(shares, weights, strict=True)])
    open_level, yarn_level = two_levels(values)
    middle = (open_level + yarn_level) / 2
    open_maps = [_open_share(share, middle) for share in shares]
    threshold = 1 - _mean(open_maps, weights)
    two_level = (open_level - _mean(shares, weights)) / (open_level - yarn_level)
    u = float(np.hypot(0.006, abs(threshold - two_level) / 2))
    edges = np.linspace(0.0, 1.3, 131)
    return CoverReading(
        optical=Measured((threshold + two_level) / 2, u, "1"),
        threshold=Measured(threshold, u, "1"),
        two_level=Measured(two_level, u, "1"),
        yarn_transmittance=Measured(yarn_level / open_level, 0.01, "1"),
        light_field=LightField("open pores", _coarse(surface), scatter),
        open_level=open_level,
        yarn_level=yarn_level,
        threshold_level=middle,
        seen=tuple(
            Seen(window.row, window.column, open_map, window.inside)
            for window, open_map in zip(windows, open_maps, strict=True)
        ),
        histogram=Histogram(edges, np.histogram(values, edges)[0].astype(np.int64)),
    )


def _open_share(share: NDArray[np.float32], level: float) -> NDArray[np.float32]:
    """Share of each pixel above the level, by a finer grid."""
    rows, columns = share.shape
    finer = cv2.resize(share, (columns * FINER, rows * FINER), interpolation=cv2.INTER_CUBIC)
    above = (finer > level).astype(np.float32)
    return np.asarray(cv2.resize(above, (columns, rows), interpolation=cv2.INTER_AREA), np.float32)


def _mean(maps: list[NDArray[np.float32]], weights: list[NDArray[np.float32]]) -> float:
    total = sum(float(np.sum(m * w, dtype=np.float64)) for m, w in zip(maps, weights, strict=True))
    return total / sum(float(np.sum(w, dtype=np.float64)) for w in weights)


def _coarse(surface: Surface) -> NDArray[np.float32]:
    """The field at the nodes of a 17 x 17 grid."""
    rows = np.linspace(0, surface.rows - 1, 17)[:, None]
    columns = np.linspace(0, surface.columns - 1, 17)[None, :]
    return surface.at(rows, columns).astype(np.float32)


__all__ = ["read_cover"]
