"""What a reading shows beside its figures: the light field, the classed pixels, the histogram."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import CoverReading, Histogram, LightField, Seen
from imgcover.cover.surface import Surface
from imgcover.cover.windows import Window

Floats = NDArray[np.float32]

NODES = 17
"""Nodes each way at which the light field is told: smooth between them."""
BIN = 0.01
"""Width of a bin of the histogram, as a share of the light field."""
BINS = 130
"""Up to a little above the open level: noise and specks lie there."""


def shown(
    windows: list[Window],
    shares: list[Floats],
    maps: list[Floats],
    surface: Surface,
    *,
    source: str,
    u_light: float,
) -> CoverReading:
    """Make a reading that holds what is shown and no figure yet.

    Parameters
    ----------
    windows : list of Window
    shares, maps : list of ndarray
        Light over the light field, and open share of each pixel.
    surface : Surface
    source : str
        Where the light field comes from.
    u_light : float
        Relative standard uncertainty of its level.
    """
    edges = np.asarray(np.arange(BINS + 1) * BIN, np.float64)
    counts = sum(
        np.histogram(share[window.inside], edges)[0]
        for share, window in zip(shares, windows, strict=True)
    )
    rows = np.linspace(0, surface.rows - 1, NODES)[:, None]
    columns = np.linspace(0, surface.columns - 1, NODES)[None, :]
    return CoverReading(
        light_field=LightField(source, surface.at(rows, columns).astype(np.float32), u_light),
        seen=tuple(
            Seen(window.row, window.column, open_map, window.inside)
            for window, open_map in zip(windows, maps, strict=True)
        ),
        histogram=Histogram(edges, np.asarray(counts, np.int64)),
    )


__all__ = ["shown"]
