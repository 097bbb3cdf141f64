"""Which edges, light, blur and yarns explain the picture? All together, by least squares."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.before import BLUR, DEPTH, FINEST, ROUNDNESS, Before
from imgcover.cover.limits import MOST, bounded, limits, stepped
from imgcover.cover.normal import Meets, Normal, by_terms, multiply
from imgcover.cover.openings import FAR, LOCAL, TERMS, Optics, expect
from imgcover.cover.places import Places
from imgcover.cover.reading import Lattice
from imgcover.cover.shadow import Yarn
from imgcover.cover.windows import cell_sides

Floats = NDArray[np.float64]

MOST_LEAN = 0.4
"""Neither leans nor densities can be followed further than this."""
CLEANEST = 5e-4
"""The least misfit that a pixel may be trusted to: no file of 8 bits is truer in linear light."""
OUTLYING = 6.0
"""Pores that fit this many times worse than the usual one (mean square) count less."""
STARTS = (1.4, 1.0)
"""Bare light over the brightest pores that the fit starts from: small pores never reach it."""
FAIR = 0.02
"""Misfit over the light of an explanation that is fair: no other start need be tried."""
FIRST_ROUNDS, HELD = 6, 0.1
"""At first edges keep together and the section is held: light, blur and depth come first."""
NEXT_ROUNDS = (math.sqrt(HELD), 1.0, 1.0)
"""How loosely edges and section are then held, step by step."""
EDGE_ROUNDS, ROUNDS = 2, 18
"""Steps of the edges of all pores towards light and yarns found in some; and then of all that is
sought at most: three to six settle."""
SETTLED = 3e-4
"""Change of the logarithm of light and blur below which the fit has settled. A change that does not
shrink goes to and fro, and is halved from then on."""
DAMPING = 1e-3
"""Share added to each pore's own curvature: an edge that nothing shows does not run away."""


@dataclass(frozen=True, slots=True, eq=False)
class Begun:
    """Where a fit may start.

    Parameters
    ----------
    optics : Optics
    edges : ndarray, shape (n, 12)
        Of the pores that were looked at.
    usual : float
        Their median misfit, linear light.
    """

    optics: Optics
    edges: Floats
    usual: float


@dataclass(frozen=True, slots=True, eq=False)
class Fitted:
    """The openings and what they share.

    Parameters
    ----------
    optics : Optics
    edges : ndarray, shape (n, 12)
        See `openings.LOCAL`.
    misfit : ndarray, shape (n,)
        Root mean square misfit of each pore's patch, linear light.
    usual : float
        The median misfit.
    covariance : ndarray, shape (11, 11)
        Of the light's coefficients and `openings.SHARED`.
    open_by_shared : ndarray, shape (11,)
        How the mean open area (px²) changes with them, edges following.
    light : ndarray, shape (n, height, width), float32
        The light the fit expects.
    """

    optics: Optics
    edges: Floats
    misfit: Floats
    usual: float
    covariance: Floats
    open_by_shared: Floats
    light: NDArray[np.float32]

    @property
    def width(self) -> Floats:
        """Open width of each pore, px."""
        return self.edges[:, 1] - self.edges[:, 0]

    @property
    def height(self) -> Floats:
        """Open height of each pore, px."""
        return self.edges[:, 3] - self.edges[:, 2]

    def u_open_share(self, lattice: Lattice) -> float:
        """Standard uncertainty of the open share from what all pores share."""
        across, down = cell_sides(lattice)
        by_shared = self.open_by_shared / (across * down)
        return math.sqrt(max(0.0, float(by_shared @ self.covariance @ by_shared)))


class Fit:
    """One least-squares problem: the pores, and what is expected of them before looking.

    Parameters
    ----------
    places : Places
    lattice : Lattice
    rows, columns : int
        Size of the picture, px.
    known_light_u : float or None
        Relative standard uncertainty of the bare light when the patches are given as shares of
        it; None when the light is to be found.
    finest : float
        See `before.Before`.
    """

    def __init__(
        self,
        places: Places,
        lattice: Lattice,
        *,
        rows: int,
        columns: int,
        known_light_u: float | None = None,
        finest: float = FINEST,
    ) -> None:
        self._places = places
        self._terms = light_terms(places.row, places.column, rows, columns)
        self._pitch = cell_sides(lattice)
        self._meets = Meets(places)
        self._light_known = known_light_u is not None
        self._leans = (-lattice.ends[1] / lattice.ends[0], -lattice.picks[0] / lattice.picks[1])
        self._before = Before(places, self._pitch, self._leans, known_light_u, finest)

    def begin(self) -> Begun:
        """Find light, blur and yarns roughly, from as many lights as explain the picture fairly."""
        tried: list[Begun] = []
        for brighter in STARTS[:1] if self._light_known else STARTS:
            edges, optics = self._start(brighter)
            for _ in range(FIRST_ROUNDS):
                edges, optics, _ = self._step(edges, optics, HELD)
            optics = self._told_by_usual(edges, optics)
            for loose in NEXT_ROUNDS:
                edges, optics, _ = self._step(edges, optics, loose)
            usual = math.sqrt(self._normal(edges, optics).usual)
            tried.append(Begun(optics, edges, usual))
            if usual < FAIR * float(np.exp(optics.light[0])):
                break
        return min(tried, key=lambda each: each.usual)

    def solve(self, begun: Begun) -> Fitted:
        """Move edges, light, blur and yarns until they have settled."""
        edges, optics = begun.edges, begun.optics
        if len(edges) != len(self._places.row):
            gaps = np.median(edges[:, [1, 3]] - edges[:, [0, 2]], axis=0)
            edges = self._alike(float(gaps[0]), float(gaps[1]))
            for _ in range(EDGE_ROUNDS):
                edges = self._shifted(edges, self._normal(edges, optics).alone(DAMPING))
        relaxed, last = 1.0, math.inf
        for k in range(ROUNDS):
            edges, optics, change = self._step(edges, optics, relaxed=relaxed)
            if k > 1 and change < SETTLED:
                break
            relaxed, last = relaxed if change < last else relaxed / 2, change
        return self._fitted(edges, optics)

    def _start(self, brighter: float) -> tuple[Floats, Optics]:
        """Guess light and yarn from the extremes, edges from the half level."""
        patch = self._places.patch
        high = float(np.quantile(patch, 0.98))
        low = max(float(np.quantile(patch, 0.05)), 1e-3 * high)
        middle = patch.shape[1] // 2, patch.shape[2] // 2
        seen = patch > (high + low) / 2
        across, down = self._pitch
        width = np.clip(np.median(seen[:, middle[0], :].sum(axis=1)), 0.15 * across, 0.8 * across)
        height = np.clip(np.median(seen[:, :, middle[1]].sum(axis=1)), 0.15 * down, 0.8 * down)
        # What comes through stays the same: pores that are brighter than they look are smaller.
        width, height = width / np.sqrt(brighter), height / np.sqrt(brighter)
        light = np.zeros(TERMS)
        bare = 1.0 if self._light_known else high * brighter
        light[0] = np.log(bare)
        depth = 0.7 * float(np.log(bare / low)) if bare > low else DEPTH
        ends = Yarn(float(across - width) / 2, depth, ROUNDNESS)
        picks = Yarn(float(down - height) / 2, depth, ROUNDNESS)
        optics = Optics(light, BLUR, ends, picks, 0.1 * low)
        return self._alike(float(width), float(height)), optics

    def _alike(self, width: float, height: float) -> Floats:
        """Edges of gaps that are all alike, where the repeats put them."""
        edges = np.zeros((len(self._places.row), LOCAL))
        for k, place, gap in ((0, self._places.x, width), (2, self._places.y, height)):
            edges[:, k], edges[:, k + 1] = place - gap / 2, place + gap / 2
            edges[:, 4 + k : 6 + k] = self._leans[k // 2]
        return edges

    def _normal(self, edges: Floats, optics: Optics, loose: float = 1.0) -> Normal:
        expected = expect(self._places, edges, optics, self._terms)
        off = (self._places.patch - expected.light) * self._places.sound
        # A clipped pixel only tells that there was at least so much light.
        counts = self._places.sound & ~(self._places.clipped & (off < 0))
        off = off * counts
        square = np.sum(off**2, axis=(1, 2), dtype=np.float64)
        square = square / np.maximum(1, counts.sum(axis=(1, 2)))
        usual = max(float(np.median(square)), CLEANEST**2)
        weight = 1 / np.maximum(square / (OUTLYING * usual), 1)
        products = multiply(expected, off, counts)
        gram, toward = products.gram * weight[:, None, None], products.toward * weight[:, None]
        edge = slice(0, LOCAL + FAR)
        common = by_terms(gram[:, LOCAL + FAR :, LOCAL + FAR :], self._terms)
        shared = by_terms(common.transpose(0, 2, 1), self._terms).sum(axis=0)
        toward_shared = by_terms(toward[:, None, LOCAL + FAR :], self._terms)[:, 0].sum(axis=0)
        toward_own = self._meets.gather(toward[:, edge, None])[..., 0]
        cross = self._meets.gather(by_terms(gram[:, edge, LOCAL + FAR :], self._terms))
        prior, toward_prior = self._before.edges(edges, usual, loose)
        prior_shared, toward_prior_shared = self._before.shared(optics, usual, loose)
        return Normal(
            gram[:, edge, edge],
            prior,
            cross,
            shared + prior_shared,
            toward_own + toward_prior,
            toward_shared + toward_prior_shared,
            self._meets,
            square,
            usual,
            expected.light,
        )

    def _step(
        self, edges: Floats, optics: Optics, loose: float = 1.0, relaxed: float = 1.0
    ) -> tuple[Floats, Optics, float]:
        """Move everything once; the third value says how far light and blur have moved."""
        normal = self._normal(edges, optics, loose)
        alone, carried, matrix, toward = normal.solved(DAMPING)
        stiff = matrix + 1e-7 * np.diag(np.diag(matrix))
        change = bounded(stiff, toward, *limits(optics))
        change = change * min(relaxed, 1 / float(np.max(np.abs(change) / MOST)))
        edges = self._shifted(edges, alone - carried @ change)
        moved_by = max(abs(float(change[0])), abs(float(change[TERMS])) / optics.blur_px)
        return edges, stepped(optics, change), moved_by

    def _shifted(self, edges: Floats, change: Floats) -> Floats:
        """Step the edges; none passes another."""
        reach = 0.12 * min(self._pitch)
        edges = edges + np.clip(change, -reach, reach)
        edges[:, 4:] = np.clip(edges[:, 4:], -MOST_LEAN, MOST_LEAN)
        for k in (0, 2):
            crossed = edges[:, k] > edges[:, k + 1]
            edges[crossed, k : k + 2] = edges[crossed, k : k + 2].mean(axis=1)[:, None]
        return edges

    def _told_by_usual(self, edges: Floats, optics: Optics) -> Optics:
        """Tell the yarns' depth for the width that is usual now; their shadows stay the same."""
        yarns = []
        for yarn, k in ((optics.ends, 0), (optics.picks, 2)):
            pitch = self._pitch[k // 2]
            half = max(float(pitch - np.median(edges[:, k + 1] - edges[:, k])) / 2, 0.1 * pitch)
            yarns.append(replace(yarn, half_px=half, depth=yarn.depth * half / yarn.half_px))
        return replace(optics, ends=yarns[0], picks=yarns[1])

    def _fitted(self, edges: Floats, optics: Optics) -> Fitted:
        normal = self._normal(edges, optics)
        _, carried, matrix, _ = normal.solved(0.0)
        before, _ = self._before.shared(optics, normal.usual, 1.0)
        matrix = _at_least(matrix, before)
        width, height = edges[:, 1] - edges[:, 0], edges[:, 3] - edges[:, 2]
        by_edge = np.stack([-height, height, -width, width], axis=1)
        return Fitted(
            optics=optics,
            edges=edges,
            misfit=np.sqrt(normal.square),
            usual=float(np.sqrt(normal.usual)),
            covariance=np.asarray(
                np.linalg.inv(matrix) * self._before.common(optics, normal.usual)
            ),
            open_by_shared=-np.einsum("na,nak->k", by_edge, carried[:, :4]) / len(edges),
            light=normal.light,
        )


def _at_least(matrix: Floats, before: Floats) -> Floats:
    """Keep what is known no less than what was known before looking: rounding may say otherwise."""
    scale = np.sqrt(np.diag(matrix))
    told = (matrix - before) / np.outer(scale, scale)
    values, vectors = np.linalg.eigh((told + told.T) / 2)
    kept = (vectors * np.maximum(values, 0)) @ vectors.T
    return np.asarray(kept * np.outer(scale, scale) + before)


def light_terms(row: Floats, column: Floats, rows: int, columns: int) -> Floats:
    """Terms 1, x, y, x², xy, y² of the light field, with x and y from −1 to 1 over the picture."""
    y, x = np.broadcast_arrays(2 * row / max(1, rows - 1) - 1, 2 * column / max(1, columns - 1) - 1)
    return np.stack([np.ones_like(x), x, y, x * x, x * y, y * y], axis=-1)


__all__ = ["Fit", "Fitted", "light_terms"]
