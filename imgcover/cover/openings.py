"""How does light fall through the openings? The picture that a set of edges would make."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.places import Places
from imgcover.cover.shadow import Yarn, cast

Floats = NDArray[np.float32]

LOCAL = 8
"""Of each pore: left, right, upper, lower edge (px from the patch's middle), then the lean of each
(px a px along it)."""
FAR = 4
"""Edges of the four pores next to it that bound the threads between: blur carries their light."""
TERMS = 6
"""Coefficients of the light field: of 1, x, y, x², xy, y²."""
SHARED = ("blur", "end depth", "pick depth", "section", "glare")
"""What all pores share beside the light field, in the order of the derivatives."""
WIDEST = 1.7
"""Half widths are tabulated to this many times the usual one; thick places seldom go beyond."""


@dataclass(frozen=True, slots=True)
class Optics:
    """What all pores share.

    Parameters
    ----------
    light : ndarray, shape (6,)
        Logarithm of the bare light: coefficients of 1, x, y, x², xy, y² with x, y in −1…1.
    blur_px : float
        Standard deviation of the lens's blur.
    ends, picks : Yarn
    glare : float
        Light added everywhere, linear.
    """

    light: NDArray[np.float64]
    blur_px: float
    ends: Yarn
    picks: Yarn
    glare: float


@dataclass(frozen=True, slots=True, eq=False)
class Expected:
    """The light a set of openings lets through, and how it changes.

    Parameters
    ----------
    light : ndarray, shape (n, height, width)
    by_edge : ndarray, shape (n, height, width, 8 + 4)
        Derivatives by the pore's own edges and their leans, then by those edges of the pores to
        the left, right, above and below that bound the threads between.
    by_shared : ndarray, shape (n, height, width, 6 + 5)
        Derivatives by the light's coefficients and by `SHARED`.
    """

    light: Floats
    by_edge: Floats
    by_shared: Floats


@dataclass(frozen=True, slots=True, eq=False)
class _Profile:
    """Light across one system at each pore.

    Parameters
    ----------
    light : ndarray, shape (n, places)
        Where the patch's middle line crosses the pore.
    lean, bend : ndarray, shape (n, places)
        First and second coefficient of its change along the threads.
    by_yarn : ndarray, shape (n, places, 3)
        Derivatives by blur, depth, section.
    by_edge : ndarray, shape (n, places, 4)
        By the pore's own two edges, then by the far edges of the two threads beside it.
    """

    light: Floats
    lean: Floats
    bend: Floats
    by_yarn: Floats
    by_edge: Floats


def expect(
    places: Places, edges: NDArray[np.float64], optics: Optics, terms: NDArray[np.float64]
) -> Expected:
    """Compute what the openings let through.

    Parameters
    ----------
    places : Places
    edges : ndarray, shape (n, 8)
        As `LOCAL` says.
    optics : Optics
    terms : ndarray, shape (n, 6)
        Terms of the light field at each pore.

    Notes
    -----
    A yarn passes light by the exponential of its thickness, so what passes two crossing yarns is
    the product of what passes each, whatever the weave. Straight threads then make every patch
    the product of a profile across and a profile down, and a Gaussian blur keeps it so. Where
    edges lean, each profile changes along its threads, to second order.
    """
    height, width = places.patch.shape[1:]
    at = edges.astype(np.float32)
    x = np.arange(width, dtype=np.float32) - np.float32((width - 1) / 2)
    y = np.arange(height, dtype=np.float32) - np.float32((height - 1) / 2)
    beside = _shifts(places.column, places.beside, places.beside_lacks)[..., None]
    above = _shifts(places.row, places.above, places.above_lacks)[..., None]
    # Neighbours tell their edges at their own middles, a little further along the threads.
    beside = beside - _shifts(places.row, places.beside)[..., None] * at[:, 4:6][places.beside]
    above = above - _shifts(places.column, places.above)[..., None] * at[:, 6:8][places.above]
    across = _profile(
        at[:, :2], at[:, 4:6], height / 3, x, places.beside, beside, optics.ends, optics.blur_px
    )
    down = _profile(
        at[:, 2:4], at[:, 6:8], width / 3, y, places.above, above, optics.picks, optics.blur_px
    )
    bare = np.exp(terms @ optics.light).astype(np.float32)[:, None, None]
    y_off = (y - at[:, 2:4].mean(axis=1)[:, None])[:, :, None]
    x_off = (x - at[:, :2].mean(axis=1)[:, None])[:, None, :]
    ends = across.light[:, None, :] + y_off * across.lean[:, None] + y_off**2 * across.bend[:, None]
    picks = down.light[:, :, None] + x_off * down.lean[..., None] + x_off**2 * down.bend[..., None]
    return _assembled(bare, ends, picks, across, down, (x_off, y_off), optics.glare, terms)


def _assembled(
    bare: Floats,
    ends: Floats,
    picks: Floats,
    across: _Profile,
    down: _Profile,
    offsets: tuple[Floats, Floats],
    glare: float,
    terms: NDArray[np.float64],
) -> Expected:
    """Multiply the two profiles, and lay their derivatives into one array."""
    light = bare * ends * picks
    n, height, width = light.shape
    by_edge = np.empty((n, height, width, LOCAL + FAR), np.float32)
    ends, picks = (bare * ends)[..., None], (bare * picks)[..., None]
    by_end, by_pick = picks * across.by_edge[:, None], ends * down.by_edge[:, :, None]
    by_edge[..., 0:2], by_edge[..., 2:4] = by_end[..., :2], by_pick[..., :2]
    np.multiply(by_edge[..., 0:2], offsets[1][..., None], out=by_edge[..., 4:6])
    np.multiply(by_edge[..., 2:4], offsets[0][..., None], out=by_edge[..., 6:8])
    by_edge[..., 8:10], by_edge[..., 10:12] = by_end[..., 2:], by_pick[..., 2:]
    by_shared = np.empty((n, height, width, TERMS + len(SHARED)), np.float32)
    np.multiply(
        light[..., None], terms.astype(np.float32)[:, None, None, :], out=by_shared[..., :TERMS]
    )
    a, d = across.by_yarn[:, None], down.by_yarn[:, :, None]
    by_shared[..., TERMS : TERMS + 1] = picks * a[..., :1] + ends * d[..., :1]
    by_shared[..., TERMS + 1 : TERMS + 2] = picks * a[..., 1:2]
    by_shared[..., TERMS + 2 : TERMS + 3] = ends * d[..., 1:2]
    by_shared[..., TERMS + 3 : TERMS + 4] = picks * a[..., 2:] + ends * d[..., 2:]
    by_shared[..., TERMS + 4] = 1
    return Expected(light + np.float32(glare), by_edge, by_shared)


def _shifts(
    middle: NDArray[np.float64],
    neighbours: NDArray[np.int64],
    lacks: NDArray[np.float64] | float = 0.0,
) -> Floats:
    """Px from each patch's middle to its neighbours' middles."""
    return (middle[neighbours] - middle[:, None] + lacks).astype(np.float32)


def _profile(
    edges: Floats,
    leans: Floats,
    reach: float,
    at: Floats,
    neighbours: NDArray[np.int64],
    shifts: Floats,
    yarn: Yarn,
    blur_px: float,
) -> _Profile:
    """Take the shadows of the four nearest threads from the light."""
    shadow = cast(yarn, blur_px=blur_px, widest_px=WIDEST * yarn.half_px)

    def threads(here: Floats) -> tuple[Floats, Floats]:
        """Offsets (n, 4, places) from the four threads' middles, and their half widths."""
        gaps = here[neighbours] + shifts
        # Thread k lies between the gaps k and k + 1 of the five.
        left, right = gaps[:, :-1, 1], gaps[:, 1:, 0]
        half = np.maximum((right - left) / 2, 0)
        offset = at - ((left + right) / 2)[..., None]
        return offset.astype(np.float32), half[..., None].astype(np.float32)

    offset, half = threads(edges)
    near = shadow.change(offset[:, 1:3], half[:, 1:3])
    here = near[..., 0].sum(axis=1) + shadow.dark(offset[:, ::3], half[:, ::3]).sum(axis=1)
    lean = np.float32(reach) * leans
    less, more = (shadow.dark(*threads(edges + side * lean)).sum(axis=1) for side in (-1, 1))
    # A thread's edge that moves by one moves its middle, and half its width, by a half.
    first, second = -(near[..., 4] + near[..., 5]) / 2, (near[..., 5] - near[..., 4]) / 2
    by_edge = np.stack([-second[:, 0], -first[:, 1], -first[:, 0], -second[:, 1]], axis=-1)
    return _Profile(
        light=1 - here,
        lean=(less - more) / np.float32(2 * reach),
        bend=(2 * here - less - more) / np.float32(2 * reach**2),
        by_yarn=-near[..., 1:4].sum(axis=1),
        by_edge=by_edge.astype(np.float32),
    )


__all__ = ["FAR", "LOCAL", "SHARED", "TERMS", "Expected", "Optics", "expect"]
