"""Where the threads of one system lie and how thick they are: the loom's own cloth plan."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.loom.noise import Rng, along_rows

NODES_A_PITCH = 3.0
"""Nodes along a thread for each thread it crosses: the shortest wave drawn has two."""
RELAXATION = 0.9
"""How much of a thread's straying its neighbour inherits: reed and beat-up hold the mean sett."""
CLOSEST = 0.8
"""Threads yield under pressure, but their centres stay this share of a diameter apart."""
BINS_A_PITCH = 16
"""Fineness of the table that finds the neighbours of a place."""
ABSENT = -0.5
"""Half width, in mean half widths, where a thread is not there: it tapers through zero."""


@dataclass(frozen=True, slots=True)
class System:
    """The threads of one system, tabulated.

    Parameters
    ----------
    place : ndarray, shape (threads, nodes, 2), float32
        Centre line across the threads, and half width, both mm, at each node along them.
    start_mm, node_mm : float
        First node, and distance from node to node, along the threads.
    left : ndarray, shape (bins,), int32
        Thread to the left of each bin across the threads.
    first_mm, bins_per_mm : float
        First bin, and bins per mm.
    half_mm : float
        Mean half width.
    lightness : ndarray, shape (threads,), float32
        Reflectance of each thread.
    pattern : int
        Threads after which the plan of gaps repeats.
    """

    place: NDArray[np.float32]
    start_mm: float
    node_mm: float
    left: NDArray[np.int32]
    first_mm: float
    bins_per_mm: float
    half_mm: float
    lightness: NDArray[np.float32]
    pattern: int


@dataclass(frozen=True, slots=True)
class Plan:
    """What `lay` needs to know of one system, lengths in mm."""

    per_mm: float
    diameter_mm: float
    crossing_per_mm: float
    across: tuple[float, float]
    along: tuple[float, float]
    group: int
    gap: float
    spacing_cv: float
    diameter_cv: float
    straying: float
    waviness: float
    weave_repeat: int
    lightness: tuple[float, ...]
    dense_until_mm: float | None = None


def centres(rng: Rng, plan: Plan) -> NDArray[np.float64]:
    """Lay the centre lines across the system, in mm, ascending.

    A group's threads close up by what the gap between groups opens, so the mean sett is the
    plan's own; irregular gaps are drawn so that each thread's straying fades with distance.
    """
    pitch = 1 / plan.per_mm
    first = int(np.floor(plan.across[0] / pitch)) - 2
    last = int(np.ceil(plan.across[1] / pitch)) + 2
    number = np.arange(first, last + 1)
    within = number % plan.group
    grouped = -(within - (plan.group - 1) / 2) * plan.gap / plan.group
    kick = rng.standard_normal(number.size) * plan.spacing_cv
    stray = np.zeros(number.size)
    for k in range(1, number.size):
        stray[k] = RELAXATION * stray[k - 1] + kick[k]
    offset = rng.random()
    regular = (number + offset + grouped + stray) * pitch
    gaps = np.maximum(np.diff(regular), min(CLOSEST * plan.diameter_mm, 0.7 * pitch))
    gaps *= (regular[-1] - regular[0]) / gaps.sum()
    laid = regular[0] + np.concatenate([[0.0], np.cumsum(gaps)])
    return _with_selvedge(laid, plan)


def _with_selvedge(laid: NDArray[np.float64], plan: Plan) -> NDArray[np.float64]:
    """Put a second thread between every two of the selvedge band."""
    if plan.dense_until_mm is None:
        return laid
    inside = laid[:-1] < plan.dense_until_mm
    between = (0.5 * (laid[:-1] + laid[1:]))[inside]
    return np.sort(np.concatenate([laid, between]))


def lay(rng: Rng, plan: Plan) -> System:
    """Lay all threads of a system and tabulate them."""
    centre = centres(rng, plan)
    pitch = 1 / plan.per_mm
    node_mm = 1 / (plan.crossing_per_mm * NODES_A_PITCH)
    nodes = int(np.ceil((plan.along[1] - plan.along[0]) / node_mm)) + 3
    shape = (centre.size, nodes)
    half = plan.diameter_mm / 2
    place = np.empty((*shape, 2), dtype=np.float32)
    place[..., 0] = centre[:, None] + pitch * _sideways(rng, plan, shape, node_mm)
    place[..., 1] = half * np.clip(1 + plan.diameter_cv * _evenness(rng, shape, node_mm), 0.3, 3)
    edges = np.arange(centre[0], centre[-1], pitch / BINS_A_PITCH) + pitch / BINS_A_PITCH / 2
    left = np.clip(np.searchsorted(centre, edges) - 1, 0, centre.size - 2).astype(np.int32)
    shades = np.asarray(plan.lightness, dtype=np.float32)
    return System(
        place=place,
        start_mm=plan.along[0] - node_mm,
        node_mm=node_mm,
        left=left,
        first_mm=float(centre[0]),
        bins_per_mm=BINS_A_PITCH / pitch,
        half_mm=half,
        lightness=shades[np.arange(centre.size) % shades.size],
        pattern=plan.group,
    )


def _sideways(rng: Rng, plan: Plan, shape: tuple[int, int], node_mm: float) -> NDArray[np.float32]:
    """Let each thread stray by itself and wave with the weave, in pitches."""
    slow = along_rows(rng, shape, length=max(2.0, 8 * NODES_A_PITCH))
    step = np.arange(shape[1]) * node_mm * plan.crossing_per_mm
    phase = rng.random((shape[0], 1)) * 2 * np.pi
    wave = np.sin(2 * np.pi * step / max(2, plan.weave_repeat) + phase)
    return np.asarray(plan.straying * slow + plan.waviness * wave, dtype=np.float32)


def _evenness(rng: Rng, shape: tuple[int, int], node_mm: float) -> NDArray[np.float32]:
    """Vary the diameter: short thick-and-thin, long drafting waves, and yarn from yarn.

    The lengths, 0.7 and 6 mm, are those of fibre clumps and of drafting rollers; the three
    parts carry half, a third and a sixth of the variance.
    """
    short = along_rows(rng, shape, length=max(0.8, 0.7 / node_mm))
    long = along_rows(rng, shape, length=max(0.8, 6.0 / node_mm))
    own = rng.standard_normal((shape[0], 1)).astype(np.float32)
    return np.asarray(np.sqrt(1 / 2) * short + np.sqrt(1 / 3) * long + np.sqrt(1 / 6) * own)


__all__ = ["ABSENT", "Plan", "System", "centres", "lay"]
