"""Where do the pores lie? One place for every crossing of a gap of ends and a gap of picks."""

from __future__ import annotations

from dataclasses import dataclass, fields

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.cover.reading import Lattice
from imgcover.cover.windows import Window, cell_sides
from imgcover.repeat.between import between

ALONE = 0.3
"""Share of the pitch that is still seen on a side where the next pore is not known."""
TURNS, CLOSE_PX = 10, 0.002
"""Steps towards a pore's place at most, and the step that ends them: the fit starts there."""
NEIGHBOURS = (-2, -1, 0, 1, 2)
"""Gaps on either side whose threads can blur into a pore's patch."""


@dataclass(frozen=True, slots=True, eq=False)
class Places:
    """The pores of one or more windows, each with the pixels around it.

    Parameters
    ----------
    patch : ndarray, shape (n, height, width), float32
        Linear light around each pore, reaching half a pitch from it.
    sound : ndarray, shape (n, height, width), bool
        False beyond a thread whose next pore is not known: light leaks from there.
    clipped : ndarray, shape (n, height, width), bool
        True where the light is at least as much as the patch says.
    row, column : ndarray, shape (n,), float64
        Of the patch's middle pixel, in the picture.
    x, y : ndarray, shape (n,), float64
        Expected middle of the pore, in px from the patch's middle.
    beside, above : ndarray, shape (n, 5), int64
        The pores 2 and 1 before, itself, and 1 and 2 after, along the row and down the column;
        the nearest one where there is none.
    window : ndarray, shape (n,), int64
        The number of the window it lies in; so do all its neighbours.
    beside_lacks, above_lacks : ndarray, shape (n, 5), float64
        How many px to add to that pore's own edges to stand for the one that is lacking, beyond
        what its place tells: pitches off the end of the grid.
    """

    patch: NDArray[np.float32]
    sound: NDArray[np.bool_]
    clipped: NDArray[np.bool_]
    row: NDArray[np.float64]
    column: NDArray[np.float64]
    x: NDArray[np.float64]
    y: NDArray[np.float64]
    beside: NDArray[np.int64]
    above: NDArray[np.int64]
    window: NDArray[np.int64]
    beside_lacks: NDArray[np.float64]
    above_lacks: NDArray[np.float64]

    def thinned(self, windows: int) -> Places:
        """Keep so many windows or more, evenly spread; all where there are not twice as many."""
        there, number = np.unique(self.window, return_inverse=True)
        kept = number % max(1, len(there) // windows) == 0
        told = {each.name: getattr(self, each.name)[kept] for each in fields(self)}
        renumbered = np.cumsum(kept) - 1
        told |= {name: renumbered[told[name]] for name in ("beside", "above")}
        return Places(**told)

    @property
    def whole(self) -> NDArray[np.bool_]:
        """Pores all of whose edges are seen: the four next to each are known; all if few are."""
        whole = np.all(self.beside_lacks[:, 1::2] == 0, axis=1)
        whole &= np.all(self.above_lacks[:, 1::2] == 0, axis=1)
        return whole if whole.sum() >= len(whole) / 8 else np.ones(len(whole), np.bool_)


def pore_places(windows: list[Window], lattice: Lattice) -> Places:
    """Find the pores of every window by following the phase of both thread repeats.

    Parameters
    ----------
    windows : list of Window
    lattice : Lattice

    Returns
    -------
    Places
        Pores whose patch leaves the window or the field are left out.
    """
    across, down = cell_sides(lattice)
    reach = (round(down / 2), round(across / 2))
    parts: list[Places] = []
    first = 0
    for number, window in enumerate(windows):
        part = _in_window(window, lattice, reach, first, number)
        if part is not None:
            parts.append(part)
            first += len(part.row)
    if not parts:
        empty, none = np.zeros(0), np.zeros((0, 5))
        patch = np.zeros((0, 2 * reach[0] + 1, 2 * reach[1] + 1), np.float32)
        index, which = np.zeros((0, 5), np.int64), np.zeros(0, np.int64)
        return Places(
            *(patch, patch > 0, patch > 0, empty, empty, empty, empty),
            *(index, index, which, none, none),
        )
    names = [each.name for each in fields(Places)]
    return Places(*(np.concatenate([getattr(part, name) for part in parts]) for name in names))


def _in_window(
    window: Window, lattice: Lattice, reach: tuple[int, int], first: int, which: int
) -> Places | None:
    """The pores of one window, its number `which`; their numbers start at `first`."""
    x, y = _grid(window.light, lattice)
    rows, columns = window.light.shape
    row, column = np.rint(y).astype(int), np.rint(x).astype(int)
    fits = (row >= reach[0]) & (row < rows - reach[0])
    fits &= (column >= reach[1]) & (column < columns - reach[1])
    if not fits.any():
        return None
    outside = cv2.boxFilter(
        (~window.inside).astype(np.float32), -1, (2 * reach[1] + 1, 2 * reach[0] + 1)
    )
    fits[fits] = outside[row[fits], column[fits]] < 1e-6
    if not fits.any():
        return None
    number = np.full(fits.shape, -1)
    number[fits] = np.arange(np.count_nonzero(fits)) + first
    across, down = cell_sides(lattice)
    beside, beside_lacks = _neighbours(number, 1, across)
    above, above_lacks = _neighbours(number, 0, down)
    down_px = np.arange(-reach[0], reach[0] + 1)[:, None]
    across_px = np.arange(-reach[1], reach[1] + 1)[None, :]
    r, c = row[fits][:, None, None], column[fits][:, None, None]
    patch = window.light[r + down_px, c + across_px]
    return Places(
        patch=patch,
        sound=np.ones(patch.shape, np.bool_)
        & _known(across_px, beside_lacks, across)
        & _known(down_px, above_lacks, down),
        clipped=window.clipped[r + down_px, c + across_px],
        row=row[fits].astype(float) + window.row,
        column=column[fits].astype(float) + window.column,
        x=x[fits] - column[fits],
        y=y[fits] - row[fits],
        beside=beside,
        above=above,
        window=np.full(len(patch), which),
        beside_lacks=beside_lacks,
        above_lacks=above_lacks,
    )


def _known(at: NDArray[np.int64], lacks: NDArray[np.float64], pitch: float) -> NDArray[np.bool_]:
    """Leave out the far side of a thread beyond which no pore is known: light leaks from there."""
    before, after = (lacks[:, k, None, None] != 0 for k in (1, 3))
    far = ALONE * pitch
    return np.asarray(~((before & (at < -far)) | (after & (at > far))), np.bool_)


def _neighbours(
    number: NDArray[np.int64], axis: int, pitch: float
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """Number of each pore's neighbours along an axis, and the px that stand for missing ones."""
    padded = np.pad(number, [(2, 2) if a == axis else (0, 0) for a in (0, 1)], constant_values=-1)
    size = number.shape[axis]
    there = number >= 0
    own = number[there]
    at = {k: np.take(padded, np.arange(size) + 2 + k, axis=axis)[there] for k in NEIGHBOURS}
    lacks = {0: np.zeros(len(own))}
    index = {0: own}
    for sign in (-1, 1):
        for k in (sign, 2 * sign):
            nearer = k - sign
            lacking = at[k] < 0
            index[k] = np.where(lacking, index[nearer], at[k])
            lacks[k] = np.where(lacking, lacks[nearer] + sign * pitch, 0.0)
    return (
        np.stack([index[k] for k in NEIGHBOURS], axis=1),
        np.stack([lacks[k] for k in NEIGHBOURS], axis=1),
    )


def _grid(
    light: NDArray[np.float32], lattice: Lattice
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Places (x, y) where both repeats are at their brightest, as a grid of picks × ends."""
    step = max(1, int(min(cell_sides(lattice)) / 2))
    ends = _turns(light, lattice.ends, lattice, step, across=True)
    picks = _turns(light, lattice.picks, lattice, step, across=False)
    end = np.arange(np.ceil(ends.min()), np.floor(ends.max()) + 1)
    pick = np.arange(np.ceil(picks.min()), np.floor(picks.max()) + 1)
    wanted_end, wanted_pick = np.meshgrid(end, pick)
    back = np.linalg.inv(np.array([lattice.ends, lattice.picks]))
    middle = (ends.shape[0] // 2, ends.shape[1] // 2)
    x = np.full(wanted_end.shape, float(step * middle[1]))
    y = np.full(wanted_end.shape, float(step * middle[0]))
    at_end = np.full(x.shape, ends[middle])
    at_pick = np.full(x.shape, picks[middle])
    for _ in range(TURNS):
        off = np.stack([wanted_end - at_end, wanted_pick - at_pick], axis=-1) @ back.T
        x, y = x + off[..., 0], y + off[..., 1]
        at_end, at_pick = (
            _look(turns, x, y, frequency, step)
            for turns, frequency in ((ends, lattice.ends), (picks, lattice.picks))
        )
        if float(np.abs(off).max()) < CLOSE_PX:
            break
    return x, y


def _turns(
    light: NDArray[np.float32],
    frequency: tuple[float, float],
    lattice: Lattice,
    step: int,
    *,
    across: bool,
) -> NDArray[np.float64]:
    """Count a repeat from gap to gap over the window, at every `step` pixels."""
    wide, high = cell_sides(lattice)
    flat = light - cv2.blur(light, (2 * int(1.5 * wide) + 1, 2 * int(1.5 * high) + 1))
    rows, columns = light.shape
    x, y = np.arange(columns, dtype=np.float32), np.arange(rows, dtype=np.float32)[:, None]
    carrier = (2 * np.pi) * (frequency[0] * x + frequency[1] * y)
    # Narrow across the threads, to follow single gaps; longer along them, for the noise.
    spread = (0.8 * wide, 1.0 * high) if across else (1.0 * wide, 0.8 * high)
    cosine, sine = (
        cv2.GaussianBlur(flat * wave(carrier), (0, 0), spread[0], sigmaY=spread[1])[::step, ::step]
        for wave in (np.cos, np.sin)
    )
    phase = np.arctan2(-sine, cosine).astype(np.float64)
    phase = np.unwrap(np.unwrap(phase, axis=1), axis=0)
    return np.asarray((phase + carrier[::step, ::step]) / (2 * np.pi), np.float64)


def _look(
    turns: NDArray[np.float64],
    x: NDArray[np.float64],
    y: NDArray[np.float64],
    frequency: tuple[float, float],
    step: int,
) -> NDArray[np.float64]:
    """Turns at a place; beyond the window they run on with the lattice."""
    column = np.clip(x / step, 0, turns.shape[1] - 1)
    row = np.clip(y / step, 0, turns.shape[0] - 1)
    inside = between(turns, row, column)
    beyond = frequency[0] * (x - column * step) + frequency[1] * (y - row * step)
    return np.asarray(inside + beyond, np.float64)


__all__ = ["Places", "pore_places"]
