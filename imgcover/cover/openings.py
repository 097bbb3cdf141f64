"""How does light fall through the openings? The picture that a set of edges would make."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.places import Places
from imgcover.cover.shadow import Yarn, cast

Floats = NDArray[np.float32]

LOCAL = 12
"""Of each pore: left, right, upper, lower edge (px from the patch's middle), then the lean of each
(px a px along it), then how much denser than usual the thread beyond each is (relative)."""
FAR = 4
"""Edges of the four pores next to it that bound the threads between: blur carries their light."""
TERMS = 6
"""Coefficients of the light field: of 1, x, y, x², xy, y²."""
SHARED = ("blur", "end depth", "pick depth", "roundness", "glare")
"""What all pores share beside the light field, in the order of the derivatives."""
ROWS = (
    "light",
    "first",
    "second",
    "far first",
    "far second",
    "blur",
    "first dense",
    "second dense",
    "roundness",
    "offset",
    "even",
)
"""The profiles across one system: the light itself; how it changes with the pore's own two edges,
with the far edges of the two threads beside it, and with blur, density and roundness; the light
times the distance from the pore's middle; and 1 everywhere."""
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
    """The light a set of openings lets through, and the profiles it is the product of.

    Parameters
    ----------
    light : ndarray, shape (n, height, width)
    across : ndarray, shape (n, 11, width)
        `ROWS` across the ends.
    down : ndarray, shape (n, 11, height)
        `ROWS` across the picks.
    bare : ndarray, shape (n,)
        Bare light at each pore.
    """

    light: Floats
    across: Floats
    down: Floats
    bare: Floats


@dataclass(frozen=True, slots=True, eq=False)
class _Profile:
    """Light across one system at each pore.

    Parameters
    ----------
    rows : ndarray, shape (n, 9, places)
        The first nine of `ROWS`, along the patch's middle line.
    lean, bend : ndarray, shape (n, places)
        First and second coefficient of the light's change along the threads.
    """

    rows: Floats
    lean: Floats
    bend: Floats


def expect(
    places: Places, edges: NDArray[np.float64], optics: Optics, terms: NDArray[np.float64]
) -> Expected:
    """Compute what the openings let through.

    Parameters
    ----------
    places : Places
    edges : ndarray, shape (n, 12)
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
    # Neighbours tell their edges at their own middles, a little further along the threads.
    beside = _shifts(places.column, places.beside, places.beside_lacks)[..., None]
    beside = beside - _shifts(places.row, places.beside)[..., None] * at[:, 4:6][places.beside]
    above = _shifts(places.row, places.above, places.above_lacks)[..., None]
    above = above - _shifts(places.column, places.above)[..., None] * at[:, 6:8][places.above]
    blur = optics.blur_px
    across = _profile(
        at[:, [0, 1, 4, 5, 8, 9]], height / 3, x, places.beside, beside, optics.ends, blur
    )
    down = _profile(
        at[:, [2, 3, 6, 7, 10, 11]], width / 3, y, places.above, above, optics.picks, blur
    )
    x_off = x - at[:, :2].mean(axis=1)[:, None]
    y_off = y - at[:, 2:4].mean(axis=1)[:, None]
    bare = np.exp(terms @ optics.light).astype(np.float32)
    ends = _led(across, y_off)
    picks = _led(down, x_off).transpose(0, 2, 1)
    return Expected(
        light=bare[:, None, None] * ends * picks + np.float32(optics.glare),
        across=_all_rows(across.rows, x_off),
        down=_all_rows(down.rows, y_off),
        bare=bare,
    )


def _led(profile: _Profile, along: Floats) -> Floats:
    """Lead a profile along its threads: shape (n, places along, places across)."""
    along = along[:, :, None]
    led = profile.rows[:, None, 0] + along * profile.lean[:, None]
    return np.asarray(led + along * along * profile.bend[:, None], np.float32)


def _all_rows(rows: Floats, offset: Floats) -> Floats:
    """Add the last two of `ROWS`."""
    last = np.stack([rows[:, 0] * offset, np.ones_like(offset)], axis=1)
    return np.concatenate([rows, last], axis=1)


def _shifts(
    middle: NDArray[np.float64],
    neighbours: NDArray[np.int64],
    lacks: NDArray[np.float64] | float = 0.0,
) -> Floats:
    """Px from each patch's middle to its neighbours' middles."""
    return (middle[neighbours] - middle[:, None] + lacks).astype(np.float32)


def _profile(
    own: Floats,
    reach: float,
    at: Floats,
    neighbours: NDArray[np.int64],
    shifts: Floats,
    yarn: Yarn,
    blur_px: float,
) -> _Profile:
    """Take the shadows of the four nearest threads from the light.

    Parameters
    ----------
    own : ndarray, shape (n, 6)
        Each pore's two edges across the threads, their leans, and the threads' densities.
    reach : float
        Px along the threads at which the leaning edges are looked at.
    at : ndarray, shape (places,)
        Px across the threads.
    neighbours, shifts : ndarray, shapes (n, 5) and (n, 5, 1)
        The pores whose threads are near, and px to their middles.
    """
    edges, leans, denser = own[:, :2], own[:, 2:4], own[:, 4:]
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
    lean = np.float32(reach) * leans
    # What the two threads farther off lean by does not reach the patch.
    close = near[..., 0].sum(axis=1)
    less, more = (
        shadow.dark(*(each[:, 1:3] for each in threads(edges + side * lean))).sum(axis=1) - close
        for side in (-1, 1)
    )
    # A thread's edge that moves by one moves its middle, and half its width, by a half.
    first, second = -(near[..., 4] + near[..., 5]) / 2, (near[..., 5] - near[..., 4]) / 2
    by_blur, by_roundness = near[..., 1].sum(axis=1), near[..., 3].sum(axis=1)
    dense = near[..., 2] * np.float32(yarn.depth)
    here = close + shadow.dark(offset[:, ::3], half[:, ::3]).sum(axis=1)
    light = 1 - here - np.einsum("nk,nkx->nx", denser, dense)
    rows = [light, -second[:, 0], -first[:, 1], -first[:, 0], -second[:, 1]]
    rows += [-by_blur, -dense[:, 0], -dense[:, 1], -by_roundness]
    return _Profile(
        rows=np.stack(rows, axis=1).astype(np.float32),
        lean=(less - more) / np.float32(2 * reach),
        bend=-(less + more) / np.float32(2 * reach**2),
    )


__all__ = ["FAR", "LOCAL", "SHARED", "TERMS", "Expected", "Optics", "expect"]
