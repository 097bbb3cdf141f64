"""How far may light, blur and yarns move in a step of the fit, and in all?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.openings import TERMS, Optics

Floats = NDArray[np.float64]

FLATTEST, ROUNDEST = 0.05, 0.5
"""Limits of the roundness: a ribbon with steep edges, and a round yarn; what fades more slowly than
that towards its rim is hairs, which are not counted as cover."""
THINNEST, DENSEST = 0.2, 9.0
"""Limits of a yarn's depth: one lets 82 % of the light through, the other nothing."""
SHARPEST = 0.05
"""The least blur, px: below it the pixel's own aperture is all that is seen."""
MOST = np.array([0.2] * TERMS + [0.25, 0.15, 0.15, 0.1, 0.01])
"""Largest step of what is shared: beyond it the derivatives no longer hold."""


def bounded(matrix: Floats, toward: Floats, low: Floats, high: Floats) -> Floats:
    """Solve for steps between limits; what would leave them is held there, and the rest follows."""
    change, held = np.zeros(len(toward)), np.zeros(len(toward), np.bool_)
    while not held.all():
        free = ~held
        rest = toward - matrix[:, held] @ change[held]
        change[free] = np.linalg.solve(matrix[np.ix_(free, free)], rest[free])
        beyond = (change < low) | (change > high)
        if not beyond.any():
            break
        change = np.clip(change, low, high)
        held |= beyond
    return change


def limits(optics: Optics) -> tuple[Floats, Floats]:
    """Say how far what is shared may move down and up."""
    free = np.full(TERMS, np.inf)
    depths = np.array([optics.ends.depth, optics.picks.depth])
    here = np.array([optics.blur_px, optics.ends.roundness, optics.glare])
    low, high = np.array([SHARPEST, FLATTEST, 0.0]) - here, np.array([np.inf, ROUNDEST, np.inf])
    thinner, denser = THINNEST / depths - 1, DENSEST / depths - 1
    return (
        np.concatenate([-free, low[:1], thinner, low[1:]]),
        np.concatenate([free, high[:1], denser, high[1:] - here[1:]]),
    )


def stepped(optics: Optics, change: Floats) -> Optics:
    """Step what is shared."""
    blur, ends, picks, rounder, glare = (float(each) for each in change[TERMS:])
    yarns = [
        replace(yarn, depth=yarn.depth * (1 + deeper), roundness=yarn.roundness + rounder)
        for yarn, deeper in ((optics.ends, ends), (optics.picks, picks))
    ]
    return Optics(
        light=optics.light + change[:TERMS],
        blur_px=optics.blur_px + blur,
        ends=yarns[0],
        picks=yarns[1],
        glare=max(0.0, optics.glare + glare),
    )


__all__ = ["MOST", "bounded", "limits", "stepped"]
