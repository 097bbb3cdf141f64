"""How many threads lie between the edges of a field: phases, read from edge to edge."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.threads.follow import Followed

A_BREAK = 0.15
"""Threads' worth of doubt each place adds where a thread begins or ends inside the field: found on
drawn cloth with broken ends and on a canvas of 138 ends in some rows and 139 in others."""


@dataclass(frozen=True, slots=True)
class Counted:
    """One thread set's count over a field.

    Parameters
    ----------
    frequency : tuple of float
        Mean wave vector, cycles per pixel.
    counted, length_px : float
        Threads, and the distance at right angles to them over which they were counted.
    noise, irregular, broken : float
        Parts of the relative standard uncertainty: disagreement of the phase between lines of
        sight; the unknown place of the outermost threads in an uneven set; threads that begin or
        end inside the field.
    doubted : float
        Share of the lines of sight in which a thread was added or dropped to agree with the lines
        beside them, and of the ways from edge to edge that are gaps.
    """

    frequency: tuple[float, float]
    counted: float
    length_px: float
    noise: float
    irregular: float
    broken: float
    doubted: float


def count(
    phase: NDArray[np.float64], followed: Followed, frequency: tuple[float, float]
) -> Counted | None:
    """Count one set from edge to edge.

    Parameters
    ----------
    phase : ndarray, shape of the grid, float64
        Phase over and above frequency · (x, y), cycles.
    followed : Followed
        Where the phase is valid, and where its values stand.
    frequency : tuple of float
        The wave vector the phase refers to, cycles per pixel.

    Returns
    -------
    Counted or None
        None where no row or no column of the grid is followed over three places.

    Notes
    -----
    A slope fitted to the phase weighs the middle of the field most, a spectral peak the places of
    high contrast. The difference between the edges is the number of threads between them, whatever
    their spacing does on the way.
    """
    across_x = _edge_to_edge(phase, followed.valid, followed.x)
    across_y = _edge_to_edge(phase.T, followed.valid.T, followed.y)
    if across_x is None or across_y is None:
        return None
    slope_x, reach_x, error_x, walk_x, doubted_x = across_x
    slope_y, reach_y, error_y, walk_y, doubted_y = across_y
    fx, fy = frequency[0] + slope_x, frequency[1] + slope_y
    density = math.hypot(fx, fy)
    cos, sin = abs(fx) / density, abs(fy) / density
    # the longest straight walk at right angles to the threads inside the followed field
    length = min(
        reach_x / cos if cos > 1e-6 else math.inf, reach_y / sin if sin > 1e-6 else math.inf
    )
    noise = math.hypot(cos * error_x, sin * error_y) / density
    irregular = math.hypot(cos * walk_x, sin * walk_y) / density
    counted = density * length
    broken = A_BREAK * math.sqrt(breaks(phase, followed.valid)) / counted
    doubted = math.hypot(cos * doubted_x, sin * doubted_y)
    return Counted((fx, fy), counted, length, noise, irregular, broken, doubted)


def _edge_to_edge(
    phase: NDArray[np.float64], valid: NDArray[np.bool_], places: NDArray[np.float64]
) -> tuple[float, float, float, float, float] | None:
    """Mean slope along the rows: summed phase differences over summed distances.

    Returns
    -------
    slope : float
        Cycles per pixel.
    reach : float
        Median distance between a row's first and last followed place, pixels.
    error : float
        Standard error of the slope from the scatter between rows.
    walk : float
        How unevenly the threads lie from place to place, as a slope over the reach.
    doubted : float
        Share of the rows in which a thread was added or dropped, and of all that lies in gaps.
    """
    rows = np.flatnonzero(valid.sum(axis=1) >= 3)
    if rows.size == 0:
        return None
    first = valid[rows].argmax(axis=1)
    last = valid.shape[1] - 1 - valid[rows, ::-1].argmax(axis=1)
    gained = phase[rows, last] - phase[rows, first]
    distance = places[last] - places[first]
    slope = float(gained.sum() / distance.sum())
    reach = float(np.median(distance))
    rest = gained - slope * distance
    # neighbouring rows share half their smoothing, and a steady turn (bow) is not noise
    if rows.size >= 4:
        steps = np.diff(rest)
        error = float(np.sqrt((steps**2).mean() / 2) * math.sqrt(2 / rows.size)) / reach
    else:
        error = float(np.abs(rest).max()) / reach
    known = np.ma.masked_array(phase, ~valid)[rows]
    both = valid[rows, 1:] & valid[rows, :-1]
    leaps = np.round(np.diff(phase[rows], axis=1)) * both
    gaps = 1 - float(valid[rows].sum()) / float((last - first + 1).sum())
    doubted = min(1.0, float((leaps.sum(axis=1) != 0).mean()) + gaps)
    profile = known.mean(axis=0)
    gains = np.diff(np.ma.filled(profile, np.nan))
    gains = gains[np.isfinite(gains)]
    walk = float(gains.std()) * math.sqrt(2.0) / reach if gains.size > 1 else 0.0
    return slope, reach, error, walk, doubted


def breaks(phase: NDArray[np.float64], valid: NDArray[np.bool_]) -> int:
    """Places round which the phase gains a whole thread: a thread begins or ends there.

    Parameters
    ----------
    phase : ndarray, shape (rows, columns), float64
        Cycles; whole cycles do not matter.
    valid : ndarray, same shape, bool
        Where the phase is known.
    """
    wrapped = [np.diff(phase, axis=axis) for axis in (0, 1)]
    down, across = (each - np.round(each) for each in wrapped)
    turn = across[:-1] + down[:, 1:] - across[1:] - down[:, :-1]
    known = valid[:-1, :-1] & valid[1:, :-1] & valid[:-1, 1:] & valid[1:, 1:]
    return int((np.abs(np.round(turn)) > 0)[known].sum())


__all__ = ["Counted", "breaks", "count"]
