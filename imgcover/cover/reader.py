"""How much of the field is yarn? The road from backlit light to the cover."""

from __future__ import annotations

import math

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.cells import Cells, cells_of
from imgcover.cover.fitting import Fit, light_terms
from imgcover.cover.fold import mean_cell
from imgcover.cover.levels import Surface, open_pore_light, two_levels
from imgcover.cover.places import Places, pore_places
from imgcover.cover.pores import describe_pores
from imgcover.cover.reading import (
    CoverReading,
    Histogram,
    Lattice,
    LightField,
    Lit,
    Pitch,
    Seen,
)
from imgcover.cover.windows import (
    PART_CELLS,
    Sheet,
    Window,
    cell_sides,
    parts,
    spread,
    whole_periods,
)
from imgcover.cover.witnesses import edge_bias, open_share, weighted
from imgcover.findings import Flag, found
from imgcover.quantity import Measured

BLOCK_WITHOUT_LATTICE = 48
"""Side of a light block when no thread was found, px."""
FEWEST_PORES = 16
"""Fewer cannot tell light, blur and yarn apart."""
FLOOR = 0.0015
"""What drawn cloths of known cover are off by where nothing else speaks."""
MOST_BIAS = 0.25
"""Where blur makes the half-level edge miss more of the open area, the edge is no witness."""
ONE_WITNESS = 0.006
"""Pores that only the light tells of, not their edges, were measured no better than this."""
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
    if lattice is not None:
        places = pore_places(parts(windows, lattice), lattice)
        if len(places.row) >= FEWEST_PORES:
            return _by_openings(picture, windows, places, lattice, pitch)
    surface, scatter = open_pore_light(
        windows, rows=picture.rows, columns=picture.columns, block=BLOCK_WITHOUT_LATTICE
    )
    return _measured(windows, surface, scatter, lattice)


def _by_openings(
    picture: Lit, windows: list[Window], places: Places, lattice: Lattice, pitch: Pitch | None
) -> CoverReading:
    """Measure with the openings of the thread lattice fitted."""
    size = {"rows": picture.rows, "columns": picture.columns}
    fitted = Fit(places, lattice, **size).solve()
    cells = cells_of(places, fitted)
    surface = Surface(picture.rows, picture.columns, tuple(fitted.optics.light))
    bare = np.exp(light_terms(places.row, places.column, **size) @ fitted.optics.light)
    shares = [
        (window.light - np.float32(fitted.optics.glare)) / surface.over(window)
        for window in windows
    ]
    weights = [whole_periods(window.inside, lattice) for window in windows]
    yarn = cells.yarn_level
    middle = (1 + yarn) / 2
    open_maps = [open_share(share, middle) for share in shares]
    bias = edge_bias(places, fitted, bare, middle)
    threshold = None
    if abs(bias) < MOST_BIAS:
        threshold = 1 - weighted(open_maps, weights) / (1 + bias)
    two_level = (1 - weighted(shares, weights)) / (1 - yarn)
    area = float(np.prod(cell_sides(lattice)))
    by_shared = fitted.open_by_shared / area
    u_fit = math.sqrt(max(0.0, float(by_shared @ fitted.covariance @ by_shared)))
    optical = two_level if threshold is None else (threshold + two_level) / 2
    u = math.hypot(u_fit, FLOOR, ONE_WITNESS if threshold is None else optical - two_level)
    warp, weft = _systems(cells, lattice, optical, u)
    edges = np.linspace(0.0, 1.3, 131)
    values = np.concatenate([s[w > 0] for s, w in zip(shares, weights, strict=True)])
    return CoverReading(
        optical=Measured(optical, u, "1"),
        threshold=None if threshold is None else Measured(threshold, u, "1"),
        two_level=Measured(two_level, u, "1"),
        warp=warp,
        weft=weft,
        yarn_transmittance=Measured(yarn, FLOOR, "1"),
        pores=describe_pores(cells, lattice, pitch),
        light_field=LightField(
            "open pores", _coarse(surface), float(np.sqrt(fitted.covariance[0, 0]))
        ),
        open_level=1.0,
        yarn_level=yarn,
        threshold_level=middle,
        blur_px=fitted.optics.blur_px,
        mean_cell=mean_cell(places, fitted, bare, lattice),
        seen=tuple(
            Seen(window.row, window.column, open_map, window.inside)
            for window, open_map in zip(windows, open_maps, strict=True)
        ),
        histogram=Histogram(edges, np.histogram(values, edges)[0].astype(np.int64)),
    )


def _systems(cells: Cells, lattice: Lattice, optical: float, u: float) -> tuple[Measured, Measured]:
    """Each system's own share of the width, its threads' widths measured in parts of the field.

    The widths of all threads are brought to agree with the cover of the whole field.
    """
    systems = []
    for pitch, widths in zip(
        cell_sides(lattice), (cells.end_widths, cells.pick_widths), strict=True
    ):
        # The cells of one thread in one part share its width: they count as one.
        u_widths = float(widths.std()) / math.sqrt(widths.size / PART_CELLS)
        systems.append((1 - float(widths.mean()) / pitch, u_widths / pitch))
    (gap_x, u_x), (gap_y, u_y) = systems
    wider = math.sqrt(max(0.0, 1 - optical) / max(gap_x * gap_y, 1e-9))
    return (
        Measured(1 - gap_x * wider, math.hypot(u_x, u), "1"),
        Measured(1 - gap_y * wider, math.hypot(u_y, u), "1"),
    )


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
