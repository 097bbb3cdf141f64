"""How much does each system cover alone? The fitted widths, held against the whole field."""

from __future__ import annotations

import math

from imgcover.cover.cells import Cells, Floats
from imgcover.cover.reading import Lattice
from imgcover.cover.windows import cell_sides
from imgcover.quantity import Measured

ALIKE = 3.0
"""So many cells along a thread tell as much of its usual width as one: of the six in a fitted part,
neighbours share their clump of fibres, and all six the thread (tests/cover/sweep_cover.py)."""


def each_system(
    cells: Cells, lattice: Lattice, *, cover: float, u: float
) -> tuple[Measured, Measured]:
    """Give each system's own share of the width: of the threads across, and of those down.

    Parameters
    ----------
    cells : Cells
        From parts of the field.
    lattice : Lattice
    cover, u : float
        Cover of the whole field, and its standard uncertainty.

    Notes
    -----
    The open shares of the two systems multiply to the open share of the field. Where the parts
    say otherwise, the system whose threads were the less surely sampled gives way: least squares
    in the logarithms of the open shares.
    """
    (gap_x, u_x), (gap_y, u_y) = (
        _gap(widths, pitch)
        for widths, pitch in zip(
            (cells.end_widths, cells.pick_widths), cell_sides(lattice), strict=True
        )
    )
    open_share = max(1 - cover, 1e-6)
    wide, high = cells.open_width, cells.open_height
    # Wide gaps of one system may meet wide ones of the other.
    together = float((wide * high).mean() / max(float(wide.mean() * high.mean()), 1e-9))
    lacking = math.log(open_share / (gap_x * gap_y * together))
    square_x, square_y, square = (u_x / gap_x) ** 2, (u_y / gap_y) ** 2, (u / open_share) ** 2
    # Light, blur and section err alike in both; sampling errs in each by itself.
    share_x = square_x / max(square_x + square_y, 1e-12)
    sampled = square_x * (1 - share_x)
    systems = []
    for gap, share in ((gap_x, share_x), (gap_y, 1 - share_x)):
        relative = math.sqrt(sampled + max(share, 1 - share) ** 2 * square)
        here = gap * math.exp(share * lacking)
        systems.append(Measured(1 - here, here * relative, "1"))
    return systems[0], systems[1]


def _gap(widths: Floats, pitch: float) -> tuple[float, float]:
    """Open share of the width, and its standard uncertainty from so many threads."""
    u = float(widths.std()) / math.sqrt(widths.size / ALIKE) / pitch
    return max(1 - float(widths.mean()) / pitch, 1e-3), u


__all__ = ["each_system"]
