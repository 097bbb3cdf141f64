"""What lies at each fine point: which end, which pick, which of them on top."""

from __future__ import annotations

from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.noise import Rng
from imgcover.loom.sett import System
from imgcover.weave import Weave

Floats = NDArray[np.float32]
Ints = NDArray[np.int32]


@dataclass(frozen=True, slots=True)
class Nearest:
    """The thread of one system at each fine point; all arrays of one shape.

    Parameters
    ----------
    thread : int32
        Its number.
    left, share : int32, float32
        Thread to the left, and how far the point lies towards the next one: left + share counts
        threads from centre line to centre line.
    across : float32
        Signed distance from its centre line in half widths.
    half : float32
        Its half width there, mm.
    covered : float32
        Share of the fine point that the system covers, 0…1.
    """

    thread: Ints
    left: Ints
    share: Floats
    across: Floats
    half: Floats
    covered: Floats


def nearest(system: System, across: Floats, along: Floats, *, fine_mm: float) -> Nearest:
    """Find the thread of a system at each point.

    Parameters
    ----------
    across, along : ndarray, float32
        Place of each point across and along the threads, mm.
    fine_mm : float
        Width of a point: over it the edge of a thread fades.
    """
    bins = ((across - np.float32(system.first_mm)) * np.float32(system.bins_per_mm)).astype(
        np.int32
    )
    left = np.take(system.left, bins, mode="clip")
    step = (along - np.float32(system.start_mm)) * np.float32(1 / system.node_mm)
    a = _candidate(system, left, step, across)
    b = _candidate(system, left + 1, step, across)
    second = np.abs(b[0]) * a[1] < np.abs(a[0]) * b[1]
    offset = np.where(second, b[0], a[0])
    half = np.where(second, b[1], a[1])
    solid = np.maximum(half, np.float32(fine_mm))
    # the covered part of a point on the rim lies inside it: there the yarn is not infinitely thin
    inmost = 1 - np.float32(fine_mm / 4) / solid
    covered = np.minimum(_edge(*a, fine_mm) + _edge(*b, fine_mm), np.float32(1))
    return Nearest(
        thread=left + second,
        left=left,
        share=np.clip(a[0] / np.maximum(a[0] - b[0], np.float32(1e-6)), 0, 1),
        across=np.clip(offset / solid, -inmost, inmost),
        half=half,
        covered=covered,
    )


def _candidate(system: System, thread: Ints, step: Floats, across: Floats) -> tuple[Floats, Floats]:
    """Give the signed distance from a thread's centre line and its half width, mm."""
    place = cv2.remap(
        system.place,
        step,
        thread.astype(np.float32),
        cv2.INTER_LINEAR,
        borderMode=cv2.BORDER_REPLICATE,
    )
    offset: Floats = np.asarray(across - place[..., 0], dtype=np.float32)
    return offset, np.asarray(place[..., 1], dtype=np.float32)


def _edge(offset: Floats, half: Floats, fine_mm: float) -> Floats:
    """Cover a point by how far it lies inside the thread, over one point's width."""
    inside = (half - np.abs(offset)) * np.float32(1 / fine_mm) + np.float32(0.5)
    return np.asarray(np.clip(inside, 0, 1))


@dataclass(frozen=True, slots=True)
class Interlacing:
    """How high each end stands where it meets each pick: −1 … 1, jittered.

    Parameters
    ----------
    height : ndarray, shape (picks × ends,), float32
        Flat, picks outermost.
    ends : int
        Ends in a row of it.
    """

    height: Floats
    ends: int


def interlace(rng: Rng, pattern: Weave, *, ends: int, picks: int, float_cv: float) -> Interlacing:
    """Repeat the weave over all threads, each float a little higher or lower than it should be."""
    over = pattern.matrix[
        np.arange(picks)[:, None] % pattern.picks_repeat,
        np.arange(ends)[None, :] % pattern.ends_repeat,
    ]
    jitter = 1 + float_cv * rng.standard_normal((picks, ends), dtype=np.float32)
    height = np.where(over, np.float32(1), np.float32(-1)) * np.clip(jitter, 0.3, 2)
    return Interlacing(np.ascontiguousarray(height.ravel(), dtype=np.float32), ends)


@dataclass(frozen=True, slots=True)
class Crossing:
    """Ends and picks at each fine point, with their heights and slopes.

    Parameters
    ----------
    end, pick : Nearest
        What lies there.
    end_height, pick_height : float32
        Height of each centre line, −1 … 1.
    end_slope, pick_slope : float32
        Change of that height along the thread, per gap between crossing threads.
    """

    end: Nearest
    pick: Nearest
    end_height: Floats
    end_slope: Floats
    pick_height: Floats
    pick_slope: Floats


def cross(end: Nearest, pick: Nearest, woven: Interlacing) -> Crossing:
    """Lead each thread smoothly from crossing to crossing."""
    at_end = pick.left * np.int32(woven.ends) + end.thread
    high = np.take(woven.height, at_end, mode="clip")
    low = np.take(woven.height, at_end + np.int32(woven.ends), mode="clip")
    end_height, end_slope = _ease(high, low, pick.share)
    at_pick = pick.thread * np.int32(woven.ends) + end.left
    here = np.take(woven.height, at_pick, mode="clip")
    there = np.take(woven.height, at_pick + np.int32(1), mode="clip")
    pick_height, pick_slope = _ease(-here, -there, end.share)
    return Crossing(end, pick, end_height, end_slope, pick_height, pick_slope)


def _ease(a: Floats, b: Floats, share: Floats) -> tuple[Floats, Floats]:
    """Go from a to b with level ends; height and slope."""
    rise = b - a
    smooth = share * share * (3 - 2 * share)
    return a + rise * smooth, rise * (6 * share * (1 - share))


__all__ = ["Crossing", "Interlacing", "Nearest", "cross", "interlace", "nearest"]
