"""Where on the bed does the picture bend, once pitch and shear are taken out?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

SMOOTH_MM = 8.0
"""Reach of the smoother: less than a square of the field, so that a bend of 60 mm is kept."""
ROUNDS = 12
MAP_STEP_MM = 20.0


@dataclass(frozen=True, slots=True, eq=False)
class BedMap:
    """Local distortion of the bed: how far the picture shows a point from where it lies.

    Parameters
    ----------
    places : ndarray, shape (n, 2)
        x and y on the bed, mm from the file's first pixel.
    shifts : ndarray, shape (n, 2)
        Distortion there, mm, along x and y.
    rough : float
        Root mean square of what no smooth bed and no common sheet explain, mm.
    """

    places: NDArray[np.float64]
    shifts: NDArray[np.float64]
    rough: float

    @property
    def largest(self) -> float:
        """The largest distortion, mm."""
        return float(np.hypot(*self.shifts.T).max())

    def at(self, places: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the distortion at bed places, shape (m, 2), mm."""
        return _smooth(self.places, self.shifts, places)

    def local_pitch(self, length_mm: float) -> tuple[float, float]:
        """Return the relative standard deviation of x and y pitch over lengths of `length_mm`."""
        spreads = []
        for axis in (0, 1):
            half = np.zeros(2)
            half[axis] = length_mm / 2
            low, high = self.places.min(axis=0) + half, self.places.max(axis=0) - half
            inside = ((self.places >= low) & (self.places <= high)).all(axis=1)
            middles = self.places[inside]
            if len(middles) < 4:
                spreads.append(0.0)
                continue
            change = self.at(middles + half)[:, axis] - self.at(middles - half)[:, axis]
            spreads.append(float(np.std(change)) / length_mm)
        return spreads[0], spreads[1]

    def lattice(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return a coarse map: places on a 20 mm lattice within reach of corners, and shifts."""
        low = np.ceil(self.places.min(axis=0) / MAP_STEP_MM) * MAP_STEP_MM
        high = self.places.max(axis=0)
        xs, ys = (np.arange(low[i], high[i] + 1e-9, MAP_STEP_MM) for i in (0, 1))
        every = np.stack(np.meshgrid(xs, ys), axis=-1).reshape(-1, 2)
        near = np.array([np.hypot(*(self.places - each).T).min() < 12 for each in every], bool)
        return every[near], self.at(every[near])


def map_bed(
    places: Sequence[NDArray[np.float64]],
    drawn: Sequence[NDArray[np.float64]],
    missed: Sequence[NDArray[np.float64]],
    turns: Sequence[float],
) -> BedMap:
    """Part the bed's distortion from the sheet's own errors.

    Parameters
    ----------
    places : sequence of ndarray, shape (n, 2)
        Each scan's corners on the bed, mm.
    drawn : sequence of ndarray, shape (n, 2)
        The same corners on the sheet, mm: they tell which is which.
    missed : sequence of ndarray, shape (n, 2)
        What the scan's affine part leaves, mm along bed x and y.
    turns : sequence of float
        Turn of the sheet in each scan, rad.

    Returns
    -------
    BedMap

    Notes
    -----
    Backfitting: the bed is the smooth part of what the sheet does not explain, the sheet, corner
    by corner and turned with it, what the bed does not. What looks alike at every turn goes to
    the bed. With all scans at one turn everything does.
    """
    where, what = np.concatenate(list(places)), np.concatenate(list(missed))
    keys = np.concatenate([_keys(each) for each in drawn])
    turn = np.concatenate([np.full(len(p), t) for p, t in zip(places, turns, strict=True)])
    several = bool(np.ptp(np.abs(np.sin(np.array(turns)))) > 0.5)
    bed, sheet = np.zeros_like(what), np.zeros_like(what)
    weights = _kernel(where, where)
    for _ in range(ROUNDS):
        bed = bed + weights @ (what - sheet - bed)
        if several:
            sheet = _common(what - bed, keys, turn)
    # many rounds follow noise as well; how rough it is, one round tells
    own = what - sheet
    rest = own - weights @ own
    return BedMap(where, bed, float(np.sqrt((rest**2).mean())))


def _keys(drawn: NDArray[np.float64]) -> NDArray[np.int_]:
    """Number the sheet's corners: two scans of one corner get one number."""
    cell = np.round(drawn / 2.0).astype(int)
    return np.asarray(cell[:, 0] * 1000 + cell[:, 1])


def _common(
    rest: NDArray[np.float64], keys: NDArray[np.int_], turn: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return the part of the rest that turns with the sheet, corner by corner."""
    c, s = np.cos(turn), np.sin(turn)
    own = np.stack([c * rest[:, 0] + s * rest[:, 1], -s * rest[:, 0] + c * rest[:, 1]], axis=1)
    _, index, count = np.unique(keys, return_inverse=True, return_counts=True)
    mean = np.stack([np.bincount(index, own[:, i]) / count for i in (0, 1)], axis=1)[index]
    mean[count[index] < 2] = 0.0
    return np.stack([c * mean[:, 0] - s * mean[:, 1], s * mean[:, 0] + c * mean[:, 1]], axis=1)


def _kernel(known: NDArray[np.float64], wanted: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the weights of known places at wanted ones: Gaussian, local straight-line."""
    result = np.empty((len(wanted), len(known)))
    for row, place in enumerate(wanted):
        offset = known - place
        weight = np.exp(-0.5 * (offset**2).sum(axis=1) / SMOOTH_MM**2)
        design = np.column_stack([np.ones(len(known)), offset / SMOOTH_MM])
        weighted = design * weight[:, None]
        normal = design.T @ weighted + 1e-6 * weight.sum() * np.eye(3)
        result[row] = np.linalg.solve(normal, weighted.T)[0]
    return result


def _smooth(
    known: NDArray[np.float64], values: NDArray[np.float64], wanted: NDArray[np.float64]
) -> NDArray[np.float64]:
    return _kernel(known, wanted) @ values


__all__ = ["BedMap", "map_bed"]
