"""What are the pores like? Their number, size and shape, from the fitted openings."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.cells import Cells
from imgcover.cover.reading import Lattice, Pitch, Pores
from imgcover.cover.windows import cell_sides
from imgcover.quantity import Measured

SHUT = 0.10
"""A pore open less than this share of the usual one is blocked: it lets no thread be seen."""
PERCENTILES = (5, 25, 50, 75, 95)
"""How the distribution of the areas is told."""
MERGED = 1.6
"""An opening this many cells wide or high spans two places of the lattice: a thread is missing."""


def describe_pores(cells: Cells, lattice: Lattice, pitch: Pitch | None) -> Pores | None:
    """Describe the pores of the fitted cells.

    Parameters
    ----------
    cells : Cells
    lattice : Lattice
    pitch : Pitch or None

    Returns
    -------
    Pores or None
        None where fewer than 9 cells were fitted.
    """
    area = cells.open_width * cells.open_height
    if area.size < 9:
        return None
    usual = float(np.median(area))
    shut = area < SHUT * usual
    across, down = cell_sides(lattice)
    wide = (cells.open_width > MERGED * across) | (cells.open_height > MERGED * down)
    there = ~shut
    square = 1.0 if pitch is None else 1 / (pitch.x.value * pitch.y.value)
    return Pores(
        counted=int(there.sum()),
        per_cm2=_density(shut, lattice, pitch),
        width=_mean(cells.open_width[there], None if pitch is None else pitch.x),
        height=_mean(cells.open_height[there], None if pitch is None else pitch.y),
        width_px=float(cells.open_width[there].mean()),
        height_px=float(cells.open_height[there].mean()),
        areas=tuple(float(q) * square for q in np.percentile(area[there], PERCENTILES)),  # type: ignore[arg-type]
        largest=float(area.max()) * square,
        unit="px2" if pitch is None else "mm2",
        blocked=float(shut.mean()),
        merged=float(wide.mean()),
    )


def _density(shut: NDArray[np.bool_], lattice: Lattice, pitch: Pitch | None) -> Measured | None:
    """Pores a square centimetre: one a cell of the lattice, but for those that are blocked."""
    if pitch is None:
        return None
    (ax, ay), (bx, by) = lattice.ends, lattice.picks
    cells = abs(ax * by - ay * bx) * pitch.x.value * pitch.y.value * 100
    share = 1 - float(shut.mean())
    u_share = math.sqrt(max(share * (1 - share), 0.25 / shut.size) / shut.size)
    u_scale = math.hypot(pitch.x.u / pitch.x.value, pitch.y.u / pitch.y.value)
    return Measured(cells * share, cells * math.hypot(u_share, share * u_scale), "1/cm2")


def _mean(lengths: NDArray[np.float64], pitch: Measured | None) -> Measured | None:
    """Mean length in mm, with the scatter of the mean and of the scale."""
    if pitch is None:
        return None
    value = float(lengths.mean()) / pitch.value
    u = float(lengths.std()) / math.sqrt(lengths.size) / pitch.value
    return Measured(value, math.hypot(u, value * pitch.u / pitch.value), "mm")


__all__ = ["PERCENTILES", "describe_pores"]
