"""What is known of openings, light and yarns before looking, and how surely."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.openings import LOCAL, SHARED, TERMS, Optics
from imgcover.cover.places import Places

Floats = NDArray[np.float64]

ROUNDNESS, ROUNDNESS_U = 0.30, 0.10
"""Cross-section expected where the picture cannot tell: a round yarn (0.5) and a flat ribbon (0.1)
are both within two standard uncertainties."""
BLUR, BLUR_U = 0.8, 0.8
"""Blur expected where the picture cannot tell, px, and the standard uncertainty of its logarithm:
a weak hint, from sharp to badly out of focus."""
DEPTH, DEPTH_U = 2.8, 0.6
"""Yarns let through 6 % in the middle; the uncertainty is that of the logarithm of the depth: from
40 % to nothing at all within two."""
ALIKE_U = 0.25
"""Ends and picks of one cloth are seldom more unlike than this."""
EXCESS = 1.5
"""What the fit takes for noise is mostly uneven yarn, blurred: it errs alike over about as many
pixels as the blur covers, and in every pore. What the picture says of the shared unknowns counts
so many times less again (tests/cover/sweep_cover.py)."""
FINEST = 0.0008
"""Share of the light that the fit's idea of a yarn is true to: an error that all pores share."""
GLARE_U = 0.02
"""Glare, a share of the light, is seldom more: a dark room and a clean glass give less."""
FIELD_U = 0.5
"""Logarithm by which the light may change over the picture: a tilt of 2 : 1 is within it."""
GAP_U = 0.10
"""A gap differs from those next to it along the threads by about this share of the pitch."""
PLACE_U = 0.3
"""A gap's middle may lie this share of the pitch from where the phase of the repeat puts it."""
LEAN_U = 0.05
"""An edge leans by about this much against the lattice: yarns wave in step with the weave."""
DENSE_U = 0.15
"""Yarns are denser and less dense from place to place by about so much of the usual."""


@dataclass(frozen=True, slots=True, eq=False)
class Before:
    """What a fit expects before it looks.

    Every expectation is a measurement more: it adds to the normal equations what a reading of
    that value with that uncertainty would.

    Parameters
    ----------
    places : Places
    pitch : tuple of float
        Px from end to end and from pick to pick.
    leans : tuple of float
        How the lattice's ends and picks lean, px a px along them.
    known_light_u : float or None
        Relative uncertainty of light that is known to be 1 everywhere; None when it is not known.
    finest : float
        Share of the light that the picture and the idea of a yarn are true to, alike in all pores.
    """

    places: Places
    pitch: tuple[float, float]
    leans: tuple[float, float]
    known_light_u: float | None
    finest: float

    def edges(self, edges: Floats, usual: float, loose: float) -> tuple[Floats, Floats]:
        """Expect each pore to be like its neighbours along the threads.

        Parameters
        ----------
        edges : ndarray, shape (n, 12)
        usual : float
            Mean square misfit of a pixel.
        loose : float
            Factor on all uncertainties.

        Returns
        -------
        matrix, toward : ndarray, shapes (n, 12, 12) and (n, 12)
        """
        own, toward = np.zeros((len(edges), LOCAL, LOCAL)), np.zeros((len(edges), LOCAL))
        places = self.places
        for k, along, place in ((0, places.above, places.x), (2, places.beside, places.y)):
            first, second = k, k + 1
            gap = edges[:, second] - edges[:, first]
            alike = usual / (loose * GAP_U * self.pitch[k // 2]) ** 2
            held = usual / (loose * PLACE_U * self.pitch[k // 2]) ** 2
            wider = alike * (gap[along].mean(axis=1) - gap)
            over = held * (place - (edges[:, first] + edges[:, second]) / 2)
            for edge, sign in ((first, -1), (second, 1)):
                own[:, edge, edge] += alike + held
                toward[:, edge] += sign * wider + over
            own[:, first, second] -= alike
            own[:, second, first] -= alike
            for number, u, value in (
                (4 + k, LEAN_U, self.leans[k // 2]),
                (5 + k, LEAN_U, self.leans[k // 2]),
                (8 + k, DENSE_U, 0.0),
                (9 + k, DENSE_U, 0.0),
            ):
                stiff = usual / (loose * u) ** 2
                own[:, number, number] += stiff
                toward[:, number] += stiff * (value - edges[:, number])
        return own, toward

    def shared(self, optics: Optics, usual: float, loose: float) -> tuple[Floats, Floats]:
        """Expect ordinary light, blur and yarns.

        Returns
        -------
        matrix, toward : ndarray, shapes (11, 11) and (11,)
        """
        size = TERMS + len(SHARED)
        matrix, toward = np.zeros((size, size)), np.zeros(size)
        square = self.common(optics, usual)
        end, pick = optics.ends.depth, optics.picks.depth
        field_u = FIELD_U if self.known_light_u is None else self.known_light_u
        expected = [
            *((k, field_u, -optics.light[k]) for k in range(1, TERMS)),
            (TERMS, BLUR_U * optics.blur_px, -optics.blur_px * math.log(optics.blur_px / BLUR)),
            (TERMS + 1, DEPTH_U, math.log(DEPTH / end)),
            (TERMS + 2, DEPTH_U, math.log(DEPTH / pick)),
            (TERMS + 3, loose * ROUNDNESS_U, ROUNDNESS - optics.ends.roundness),
            (TERMS + 4, GLARE_U * math.exp(float(optics.light[0])), -optics.glare),
        ]
        if self.known_light_u is not None:
            expected.append((0, self.known_light_u, -optics.light[0]))
        for k, u, off in expected:
            matrix[k, k] += square / u**2
            toward[k] += square / u**2 * off
        alike, apart = square / ALIKE_U**2, math.log(end / pick)
        both = slice(TERMS + 1, TERMS + 3)
        matrix[both, both] += alike * np.array([[1, -1], [-1, 1]])
        toward[both] += alike * apart * np.array([-1, 1])
        return matrix, toward

    def common(self, optics: Optics, usual: float) -> float:
        """Mean square misfit that counts for what is shared: it does not average out."""
        alike = EXCESS * (1 + 4 * math.pi * optics.blur_px**2)
        own = (self.finest * math.exp(float(optics.light[0]))) ** 2
        return alike * usual + len(self.places.row) * own


__all__ = ["BLUR", "DEPTH", "FINEST", "ROUNDNESS", "Before"]
