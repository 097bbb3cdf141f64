"""The field in pieces: which could be followed, and how the density varies between them."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.quantity import Measured
from imgcover.threads.follow import STRONG_ENOUGH, Followed
from imgcover.threads.reading import Tile

THREADS_A_TILE = 8
"""Threads a side of a tile: fewer, and one uneven thread is taken for a change of density."""

MOST_TILES = 12
"""Tiles a side: what a person can take in at a glance."""

FOLLOWED_SHARE = 0.6
"""Share of a tile's places that must be followed for it to count."""


FEWEST_PLACES = 6
"""Places a plane is fitted to; three would fit any."""

SMOOTH = 0.3
"""Share of the cloth's local contrast below which a place may be bare bed."""

UNCLEAR = ("threads not clear", "unlike the rest")
"""Why a tile with threads in it is left out."""

STRAY = 0.12
"""Relative distance from the median density at which a tile is left out: tiles of cloth with 6 %
uneven spacing scatter by 0.03."""


@dataclass(frozen=True, slots=True, eq=False)
class Pieces:
    """A field's tiles, and what the grid looks like without those left out.

    Parameters
    ----------
    tiles : tuple of Tile
        In field pixels.
    valid : ndarray, shape of the grid, bool
        The followed places inside tiles that count.
    blocks : list of (slice, slice)
        Grid rows and columns of the tiles that count.
    """

    tiles: tuple[Tile, ...]
    valid: NDArray[np.bool_]
    blocks: list[tuple[slice, slice]]


def divide(followed: Followed, period: float, shape: tuple[int, int]) -> Pieces:
    """Cut the grid into tiles and leave out those that could not be followed.

    Parameters
    ----------
    period : float
        The longer thread period, field pixels.
    shape : tuple of int
        (rows, columns) of the field.
    """
    valid = np.zeros_like(followed.valid)
    tiles: list[Tile] = []
    blocks = []
    for high, top, bottom in _cuts(followed.y, shape[0], period):
        for wide, left, right in _cuts(followed.x, shape[1], period):
            share = float(followed.valid[high, wide].mean())
            there = float((followed.strength[high, wide] > STRONG_ENOUGH).mean())
            used = share >= FOLLOWED_SHARE
            reason = "" if used else "no threads here" if there < FOLLOWED_SHARE else UNCLEAR[0]
            tiles.append(Tile(left, top, right - left, bottom - top, used, reason))
            if used:
                valid[high, wide] = followed.valid[high, wide]
                blocks.append((high, wide))
    return Pieces(tuple(tiles), valid, blocks)


def _cuts(places: NDArray[np.float64], length: int, period: float) -> list[tuple[slice, int, int]]:
    """Cut an axis into equal parts, as grid slices and as pixels."""
    parts = int(np.clip(length / (THREADS_A_TILE * period), 1, min(MOST_TILES, places.size // 3)))
    edges = np.linspace(0, length, parts + 1)
    at = np.searchsorted(places, edges[1:-1])
    bounds = [0, *at.tolist(), places.size]
    return [
        (slice(bounds[k], bounds[k + 1]), round(edges[k]), round(edges[k + 1]))
        for k in range(parts)
    ]


def away_from_bare(followed: Followed, light: NDArray[np.float32], period: float) -> Followed:
    """Follow no threads where there is no cloth, nor right beside it.

    Parameters
    ----------
    light : ndarray, shape (rows, columns), float32
        The field.
    period : float
        The longer thread period, field pixels.

    Returns
    -------
    Followed
        Neither valid nor strong where the bed is bare.

    Notes
    -----
    The step from cloth to bare bed is a wave of every length, and seems to carry the threads on
    for two or three more. Bare bed is smooth: from where no thread is followed it is traced up to
    the cloth, and a margin is left out beside it.
    """
    around = np.ones((3, 3), np.uint8)
    lost = (followed.strength <= STRONG_ENOUGH).astype(np.uint8)
    core = cv2.morphologyEx(lost, cv2.MORPH_OPEN, around)
    if not core.any():
        return followed
    side = 2 * round(0.75 * period) + 1
    root = np.sqrt(np.maximum(light, 0.0))
    mean = cv2.blur(root, (side, side), borderType=cv2.BORDER_REFLECT)
    square = cv2.blur(root * root, (side, side), borderType=cv2.BORDER_REFLECT)
    rows, columns = (np.rint(each).astype(int) for each in (followed.y, followed.x))
    texture = np.sqrt(np.maximum(square - mean * mean, 0.0))[np.ix_(rows, columns)]
    usual = float(np.median(texture[followed.valid])) if followed.valid.any() else 0.0
    smooth = (texture < SMOOTH * usual).astype(np.uint8)
    _, labels = cv2.connectedComponents(smooth | core, connectivity=4)
    bare = np.isin(labels, np.unique(labels[core > 0])).astype(np.uint8)
    beside = cv2.dilate(bare, around) > 0
    return replace(
        followed,
        valid=followed.valid & ~beside,
        strength=np.where(beside, 0.0, followed.strength),
    )


@dataclass(frozen=True, slots=True)
class LocalDensity:
    """How one set's density varies between tiles, relative to its mean."""

    scatter: float
    low: float
    high: float
    parts: int


def densities(
    phase: NDArray[np.float64],
    followed: Followed,
    pieces: Pieces,
    frequency: tuple[float, float],
) -> NDArray[np.float64]:
    """Density of one set in each tile that counts, over the median tile's.

    Returns
    -------
    ndarray, shape (blocks,), float64
        From a plane fitted to the tile's phase; NaN where too little was followed for one.
    """
    tile = np.full(phase.shape, -1)
    for k, block in enumerate(pieces.blocks):
        tile[block] = k
    row, column = np.nonzero(pieces.valid & (tile >= 0))
    at = tile[row, column]
    places = np.bincount(at, minlength=len(pieces.blocks))

    def summed(each: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(np.bincount(at, each, minlength=len(pieces.blocks)), np.float64)

    def from_middle(each: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(each - (summed(each) / np.maximum(places, 1))[at], np.float64)

    x, y = from_middle(followed.x[column]), from_middle(followed.y[row])
    turns = phase[row, column]
    xx, xy, yy = summed(x * x), summed(x * y), summed(y * y)
    area = xx * yy - xy * xy
    flat = (places >= FEWEST_PLACES) & (area > 0)
    area = np.where(flat, area, np.nan)
    along_x, along_y = summed(x * turns), summed(y * turns)
    slope_x, slope_y = (yy * along_x - xy * along_y) / area, (xx * along_y - xy * along_x) / area
    values = np.hypot(frequency[0] + slope_x, frequency[1] + slope_y)
    known = values[flat]
    return values / np.median(known) if known.size else values


def without_strays(
    followed: Followed,
    pieces: Pieces,
    ends: tuple[float, float],
    picks: tuple[float, float],
) -> Pieces:
    """Leave out tiles whose density is far from the rest: a burl, a hole, a lost thread."""
    far = np.zeros(len(pieces.blocks), bool)
    for phase, frequency in ((followed.ends, ends), (followed.picks, picks)):
        values = densities(phase, followed, pieces, frequency)
        far |= np.abs(values - 1) > STRAY
    valid = pieces.valid.copy()
    for (high, wide), out in zip(pieces.blocks, far, strict=True):
        if out:
            valid[high, wide] = False
    left = iter(far)
    tiles = tuple(
        replace(tile, used=False, reason=UNCLEAR[1]) if tile.used and next(left) else tile
        for tile in pieces.tiles
    )
    return Pieces(
        tiles, valid, [block for block, out in zip(pieces.blocks, far, strict=True) if not out]
    )


def local_density(
    phase: NDArray[np.float64],
    followed: Followed,
    pieces: Pieces,
    frequency: tuple[float, float],
) -> LocalDensity:
    """Scatter and extremes of one set's density between tiles.

    Notes
    -----
    Tiles that lie along the threads share them, so `parts` counts only those side by side.
    """
    values = densities(phase, followed, pieces, frequency)
    known = values[np.isfinite(values)]
    if known.size < 2:
        return LocalDensity(0.0, 1.0, 1.0, max(1, int(known.size)))
    across_x = abs(frequency[0]) >= abs(frequency[1])
    starts = {(wide.start if across_x else high.start) for high, wide in pieces.blocks}
    relative = known / known.mean()
    return LocalDensity(
        float(relative.std(ddof=1)), float(relative.min()), float(relative.max()), len(starts)
    )


def bow_of(
    phase: NDArray[np.float64],
    followed: Followed,
    valid: NDArray[np.bool_],
    frequency: tuple[float, float],
) -> Measured | None:
    """Arc height over chord of one set's threads in this field.

    Returns
    -------
    Measured or None
        + where the middle lies beyond the ends along the wave vector; None where the threads
        cannot be followed over eight places. u from the scatter about the arc.
    """
    along_x = abs(frequency[0]) < abs(frequency[1])
    turned, mask = (phase, valid) if along_x else (phase.T, valid.T)
    places = followed.x if along_x else followed.y
    whole = mask.sum(axis=1) > 0.8 * mask.shape[1]
    if whole.sum() < 3:
        return None
    profile = np.ma.masked_array(turned, ~mask)[whole]
    profile = (profile - profile.mean(axis=1, keepdims=True)).mean(axis=0)
    keep = ~np.ma.getmaskarray(profile)
    if keep.sum() < 8:
        return None
    width = float(np.ptp(places[keep]))
    unit = (places[keep] - places[keep].mean()) / width
    fit, covariance = np.polyfit(unit, np.asarray(profile[keep]), 2, cov=True)
    scale = 1 / (4 * math.hypot(*frequency) * width)
    # neighbouring places share half their smoothing
    u = math.sqrt(2 * covariance[0, 0])
    return Measured(float(fit[0]) * scale, u * scale, "1")


__all__ = [
    "UNCLEAR",
    "LocalDensity",
    "Pieces",
    "away_from_bare",
    "bow_of",
    "divide",
    "local_density",
    "without_strays",
]
