"""Whether each thread is an individual all along its length.

A thread is a little thicker, lighter or farther from its neighbour than they are, and stays so as
it runs on under and over the other set. A printed dot, a brick or the link of a net says nothing of
the next one in its row. The field is laid out straight along the followed threads, every thread is
cut into pieces, and the pieces of one thread are held against each other.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.threads.candidates import Candidate
from imgcover.threads.field import Field, flattened
from imgcover.threads.follow import Followed

PLACES = 6
"""Places read across a thread: enough for its width and its shift."""

MOST_THREADS = 60
"""Threads of each set looked at: what they have in common is then known to 0.02."""

FEWEST_THREADS, FEWEST_PIECES = 10, 3
"""With fewer nothing can be said: chance alone makes them alike."""

GLARE = 0.1
"""Light that may be added to what crossed bars let through, as a share of the cell's range."""

STEPS = 4
"""Rounds until a place is found whose phase is wanted: each shrinks the miss tenfold and more."""

Pictured = NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class Individuality:
    """How threads differ from their neighbours, and how much of that stays along them.

    Parameters
    ----------
    ends, picks : float
        Intraclass correlation of pieces within threads: 0 where threads are told by nothing but
        their place, 1 where each differs from its neighbours and stays the same; not a number where
        too few threads are in sight.
    rough : float
        How much a piece differs from its neighbours, of the rougher set, in standard deviations of
        the flattened light.
    not_crossed : float
        How far the mean cell is from the product of two stripes, 0…1: what bars let through one
        after the other, or the same turned over.
    """

    ends: float
    picks: float
    rough: float
    not_crossed: float

    @property
    def least(self) -> float:
        """The smaller of both correlations; 0 where one is not known."""
        return 0.0 if math.isnan(self.ends + self.picks) else min(self.ends, self.picks)


def individuality(field: Field, one: Candidate, followed: Followed) -> Individuality:
    """How alike the pieces of one thread are, beyond what threads have in common.

    Parameters
    ----------
    field : Field
        What was read.
    one : Candidate
        Wave vectors, cycles per field pixel.
    followed : Followed
        Phases of both sets.

    Notes
    -----
    Intraclass correlation: R. A. Fisher, Statistical Methods for Research Workers (1925), ch. VII.
    A picture drawn on a raster repeats its own rounding: a column of dots that falls between two
    pixels looks the same all the way down. What a thread's place on the pixels explains is
    therefore taken out first.
    """
    laid = _laid_out(field, one, followed)
    if laid is None:
        return Individuality(math.nan, math.nan, math.nan, math.nan)
    light, seen, x, y, cell = laid
    whole = max(1, one.index)
    of_ends, of_picks = (
        _alike(each, there, at, parts, max(1, whole // parts))
        for each, there, at, parts in (
            (light, seen, x, one.parts[0]),
            (light.T, seen.T, y.T, one.parts[1]),
        )
    )
    rough = max(of_ends[1], of_picks[1])
    return Individuality(of_ends[0], of_picks[0], rough, _not_crossed(cell))


def _laid_out(
    field: Field, one: Candidate, followed: Followed
) -> tuple[Pictured, NDArray[np.bool_], Pictured, Pictured, NDArray[np.float64]] | None:
    """The field with its threads straight.

    Returns
    -------
    tuple or None
        Flattened light, what was followed, each crossing's place, and the mean cell of plain light.
    """
    basis = np.array([one.ends, one.picks])
    rows, columns = np.nonzero(followed.valid)
    phases = basis @ np.stack([followed.x[columns], followed.y[rows]])
    phases += np.stack([followed.ends[rows, columns], followed.picks[rows, columns]])
    (left, right), (top, bottom) = (_span(phase) for phase in phases)
    if min(right - left, bottom - top) < FEWEST_THREADS:
        return None
    across, down = np.meshgrid(_places(left, right), _places(top, bottom))
    back = np.linalg.inv(basis)
    moved = [np.zeros_like(across), np.zeros_like(down)]
    for _ in range(STEPS):
        wanted = (across - moved[0], down - moved[1])
        x = back[0, 0] * wanted[0] + back[0, 1] * wanted[1]
        y = back[1, 0] * wanted[0] + back[1, 1] * wanted[1]
        grid = [
            np.interp(place, at, np.arange(at.size)).astype(np.float32)
            for place, at in ((x, followed.x), (y, followed.y))
        ]
        moved = [
            np.asarray(_read(each.astype(np.float32), grid[0], grid[1]), np.float64)
            for each in (followed.ends, followed.picks)
        ]
    known = _read(followed.valid.astype(np.float32), grid[0], grid[1]) > 0.99
    cell = _mean_cell(field.light, x, y, known)
    light, x, y = _cut(field, one, x, y)
    high, wide = light.shape
    inside = (x > 1) & (x < wide - 2) & (y > 1) & (y < high - 2)
    middle = slice(PLACES // 2, None, PLACES)
    zoom = field.zoom
    return (
        _read(light, x, y),
        known & inside,
        x[middle, middle] * zoom,
        y[middle, middle] * zoom,
        cell,
    )


def _mean_cell(
    light: Pictured, x: NDArray[np.float64], y: NDArray[np.float64], known: NDArray[np.bool_]
) -> NDArray[np.float64]:
    """All crossings folded into one, at twice as many places; NaN where none was followed."""
    finer = [cv2.resize(each, None, fx=2, fy=2).astype(np.float32) for each in (x, y)]
    read = _read(light, *finer)
    whole = known.reshape(known.shape[0] // PLACES, PLACES, -1, PLACES).all(axis=(1, 3))
    shape = (whole.shape[0], 2 * PLACES, whole.shape[1], 2 * PLACES)
    cells = read.reshape(shape).transpose(0, 2, 1, 3)[whole]
    if not cells.size:
        return np.full(shape[1::2], math.nan)
    return np.asarray(cells.mean(axis=0), np.float64)


def _not_crossed(cell: NDArray[np.float64]) -> float:
    """Second singular value over the first, of the cell or its negative, with any glare."""
    range_ = float(np.ptp(cell))
    if not range_ > 0:
        return math.nan
    best = 1.0
    for shown in (cell - cell.min(), cell.max() - cell):
        for glare in np.linspace(-GLARE, GLARE, 21) * range_:
            first, second = np.linalg.svd(shown + glare, compute_uv=False)[:2]
            best = min(best, float(second / first))
    return best


def _span(phase: NDArray[np.float64]) -> tuple[int, int]:
    """Whole threads from first to last, at most MOST_THREADS about the middle."""
    first, last = math.ceil(float(phase.min())), math.floor(float(phase.max()))
    if last - first > MOST_THREADS:
        first = round(float(np.median(phase))) - MOST_THREADS // 2
        last = first + MOST_THREADS
    return first, last


def _places(first: int, last: int) -> NDArray[np.float64]:
    return first + (np.arange((last - first) * PLACES) + 0.5) / PLACES


def _read(picture: Pictured, x: Pictured, y: Pictured) -> Pictured:
    return np.asarray(
        cv2.remap(picture, x, y, cv2.INTER_LINEAR, borderMode=cv2.BORDER_REPLICATE), np.float32
    )


def _cut(
    field: Field, one: Candidate, x: NDArray[np.float64], y: NDArray[np.float64]
) -> tuple[Pictured, Pictured, Pictured]:
    """The flattened light about the places that are read, and the places in it."""
    period = max(one.pixels)
    margin = 3 * period
    low = [max(0, int(each.min() - margin)) for each in (y, x)]
    high = [int(each.max() + margin) + 1 for each in (y, x)]
    light = flattened(field.light[low[0] : high[0], low[1] : high[1]], period)
    side = max(1, round(min(one.pixels) / PLACES))
    smooth = np.asarray(cv2.blur(light, (side, side)), np.float32)
    return smooth, (x - low[1]).astype(np.float32), (y - low[0]).astype(np.float32)


def _alike(
    light: Pictured, seen: NDArray[np.bool_], places: Pictured, parts: int, repeat: int
) -> tuple[float, float]:
    """Correlation and roughness of the pieces of the threads that run down the picture."""
    threads, pieces = light.shape[1] // PLACES, light.shape[0] // PLACES // repeat
    if threads < FEWEST_THREADS + 2 * parts or pieces < FEWEST_PIECES:
        return math.nan, math.nan
    used = pieces * repeat * PLACES
    shape = (pieces, repeat * PLACES, threads, PLACES)
    # over a whole repeat of the other set all threads weave alike
    profile = light[:used].reshape(shape).mean(axis=1).transpose(1, 0, 2)
    whole = (seen[:used].reshape(shape).mean(axis=(1, 3)) > 0.9).T
    at = places[: pieces * repeat].reshape(pieces, repeat, threads).mean(axis=1).T
    before, here, after = slice(None, -2 * parts), slice(parts, -parts), slice(2 * parts, None)
    differs = profile[here] - 0.5 * (profile[before] + profile[after])
    whole = whole[here] & whole[before] & whole[after]
    kept = whole.sum(axis=1) >= FEWEST_PIECES
    if kept.sum() < FEWEST_THREADS:
        return math.nan, math.nan
    differs, whole = differs[kept], whole[kept]
    own = _off_the_raster(differs, whole, at[here][kept])
    return _intraclass(own, whole), float(np.sqrt((differs[whole] ** 2).mean()))


def _off_the_raster(differs: Pictured, whole: NDArray[np.bool_], at: Pictured) -> Pictured:
    """Take out what the threads' places on the pixels explain: two waves of one pixel."""
    turns = 2 * np.pi * at[whole]
    waves = np.column_stack([f(k * turns) for k in (1, 2) for f in (np.cos, np.sin)])
    waves -= waves.mean(axis=0)
    found, *_ = np.linalg.lstsq(waves, differs[whole], rcond=None)
    out = differs.copy()
    out[whole] -= waves @ found
    return out


def _intraclass(differs: Pictured, whole: NDArray[np.bool_]) -> float:
    """Correlation between pieces of one thread; threads × pieces × places."""
    counted = whole[..., None]
    differs = differs * counted
    differs = (differs - differs.sum(axis=0) / np.maximum(counted.sum(axis=0), 1)) * counted
    # a stained or striped piece must not drown the rest
    size = np.sqrt((differs**2).sum(axis=(0, 2)) / np.maximum(whole.sum(axis=0), 1))
    differs = differs / np.maximum(size, 1e-9)[None, :, None]
    alone = (differs**2).sum(axis=(1, 2))
    together = (differs.sum(axis=1) ** 2).sum(axis=1)
    pairs = ((whole.sum(axis=1) - 1) * alone).sum()
    return float((together - alone).sum() / max(float(pairs), 1e-12))


__all__ = ["Individuality", "individuality"]
