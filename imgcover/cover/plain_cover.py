"""Cover without a thread lattice, and of cloth on a card: two levels of light alone."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from imgcover.cover.bound import most_open
from imgcover.cover.plain import Floats, Levels, two_levels
from imgcover.cover.reading import CoverReading, Lattice
from imgcover.cover.shown import shown
from imgcover.cover.surface import Surface, open_pore_light
from imgcover.cover.windows import Window, whole_periods
from imgcover.cover.witnesses import between_windows
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured

BLOCK = 48
"""Side of a light block, px: a few threads of most cloths."""
EVEN = 0.08
"""Relative scatter of the open level beyond which it is no common level of light."""
RIM, THIN = 0.15, 0.5
"""Yarns thin out towards their rim, and two levels cannot tell that from blur and light: cover is
too small by up to twice these shares of the edges' breadth and of the light that yarns let
through (drawn cloths of the sweep, seed 40417, without their lattice: 2 u holds all 40)."""
LEAST_SURE = 0.02
"""A cover less sure than this is refused."""
SURE = 0.0015
"""What sharp two-level figures of known area are off by."""
UNLIKE = 0.04
"""Cover that depends this much on the level of the edge is refused: there are no two levels."""
NO_TWO_LEVELS = (
    "optical cover was not measured: yarns and gaps are not two levels of light, and where one "
    "ends and the other begins depends on where the line is drawn"
)
THREADS_UNKNOWN = (
    "optical cover was not measured: without the threads known it rests on two levels of light, "
    "and its uncertainty would be {:.1f} points"
)
CARD_U = 0.02
"""Shadows on the card and light from it through the yarn move the edge of a gap by this much."""


def by_levels(
    windows: list[Window],
    lattice: Lattice | None,
    *,
    size: tuple[int, int],
    light_known: bool,
    backing: str | None,
) -> CoverReading:
    """Measure the cover by two levels and the edge between them.

    Parameters
    ----------
    windows : list of Window
    lattice : Lattice or None
        For whole periods only.
    size : tuple of int
        Rows and columns of the picture.
    light_known : bool
        Whether light is given as a share of a blank exposure.
    backing : {"light", "dark"} or None
        The card behind a cloth in reflected light; None: backlit.
    """
    rows, columns = size
    surface = Surface(rows, columns, (0.0,) * 6)
    if not light_known:
        surface, _ = open_pore_light(windows, rows=rows, columns=columns, block=BLOCK)
    shares = [window.light / surface.over(window) for window in windows]
    if backing == "dark":
        shares = [np.asarray(1 - share, np.float32) for share in shares]
    weights = [whole_periods(window.inside, lattice) for window in windows]
    levels = two_levels(windows, shares, weights)
    source = "blank" if light_known else "open pores"
    maps = [np.zeros_like(share) for share in shares] if levels is None else levels.maps
    reading = shown(windows, shares, maps, surface, source=source, u_light=SURE)
    if levels is None:
        bound = None if backing else most_open(windows, light_known=light_known)
        return replace(reading, upper_bound_open=bound, findings=(found(Flag.COVER_NOT_RESOLVED),))
    if backing is None and levels.scatter > EVEN:
        return replace(reading, findings=(found(Flag.COVER_NOT_BACKLIT),))
    if levels.unlike > UNLIKE:
        why = Flag.COVER_NOT_RESOLVED if backing is None else Flag.COVER_NEEDS_BACKLIGHT
        return replace(reading, findings=(found(why, NO_TWO_LEVELS),))
    u = _u(levels, shares, weights, backing)
    if backing is None and u > LEAST_SURE:
        bound = most_open(windows, light_known=light_known)
        message = THREADS_UNKNOWN.format(100 * u)
        return replace(
            reading, upper_bound_open=bound, findings=(found(Flag.COVER_NOT_RESOLVED, message),)
        )
    return _answered(reading, levels, u, lattice, backing)


def _u(levels: Levels, shares: list[Floats], weights: list[Floats], backing: str | None) -> float:
    """One standard uncertainty of the cover."""
    contrast = levels.open_level - levels.yarn_level
    parts = [
        SURE,
        (levels.threshold - levels.two_level) / 2,
        between_windows(shares, weights) / contrast,
        RIM * levels.rim,
    ]
    if backing is None:
        parts.append(THIN * levels.yarn_level / levels.open_level * levels.two_level)
    else:
        parts += [CARD_U, levels.unlike / 2]
    return math.hypot(*parts)


def _answered(
    reading: CoverReading, levels: Levels, u: float, lattice: Lattice | None, backing: str | None
) -> CoverReading:
    # Both levels are seen here, and light needs no edge: the edge only bears witness.
    cover = levels.two_level
    findings: list[Finding] = []
    if backing is not None:
        findings.append(found(Flag.COVER_ON_A_CARD))
    elif lattice is None:
        findings.append(found(Flag.COVER_BY_LEVELS_ONLY))
    return replace(
        reading,
        optical=Measured(cover, u, "1"),
        threshold=Measured(levels.threshold, u, "1"),
        two_level=Measured(levels.two_level, u, "1"),
        yarn_transmittance=None
        if backing
        else Measured(levels.yarn_level / levels.open_level, u, "1"),
        open_level=levels.open_level,
        yarn_level=levels.yarn_level,
        threshold_level=(levels.open_level + levels.yarn_level) / 2,
        blur_px=levels.blur_px,
        findings=tuple(findings),
    )


__all__ = ["by_levels"]
