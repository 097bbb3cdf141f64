"""Where might a rule's graduations be? Spots where parallel lines stand at equal distances.

Cloth has such spots everywhere; a rule has them in a thin row. Nothing is decided here: spots are
only put in the order in which they deserve a closer look (`rule_band`, `rule_hierarchy`).
"""

from __future__ import annotations

from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

FINEST_PITCH = 3.6
"""Pixels: below, lines and gaps blur into one tone."""
WIDEST_PITCH = 14.0
"""Pixels: rules of wider pitch are looked for in a coarser copy of the picture."""
STRIDE = 6
WINDOW = 17
"""Pixels a side of the patch whose orientation is taken: the lines of a 1 mm scale at 5 px/mm are
15 px long."""
LEAST_COHERENCE = 0.4
REACH = 48
"""Pixels along the lines' normal, to each side, over which distances are compared."""
LEAST_PERIODIC = 0.45
"""Share of the variance along the normal that one pitch and its multiples must explain."""


@dataclass(frozen=True, slots=True)
class Seed:
    """A spot of parallel lines: pixel place, direction across the lines (rad), pitch (px)."""

    x: float
    y: float
    angle: float
    pitch: float
    weight: float


def find_seeds(light: NDArray[np.float32], *, most: int) -> list[Seed]:
    """List spots of equally spaced parallel lines, the thinnest rows of them first.

    Parameters
    ----------
    light : ndarray, shape (rows, columns), float32
        Evened picture (`even_out`), at a resolution where the pitch is 4 to 14 px.
    most : int
        Seeds wanted at most.
    """
    places, angles = _parallel_spots(light)
    if not len(places):
        return []
    pitches, scores = _periodic(light, places, angles)
    good = scores >= LEAST_PERIODIC
    places, angles, pitches, scores = places[good], angles[good], pitches[good], scores[good]
    if not len(places):
        return []
    weights = scores * _thinness(places, angles, pitches)
    return _spread(places, angles, pitches, weights, most)


def even_out(light: NDArray[np.float32]) -> NDArray[np.float32]:
    """Take the slow light out, so that worn and shaded lines weigh like fresh ones."""
    tone = np.sqrt(np.maximum(light, 0.0))
    slow = cv2.blur(tone, (41, 41), borderType=cv2.BORDER_REFLECT)
    square = cv2.blur(tone * tone, (41, 41), borderType=cv2.BORDER_REFLECT)
    spread = np.sqrt(np.maximum(square - slow * slow, 0.0))
    return np.asarray((tone - slow) / (spread + 0.02), dtype=np.float32)


def _parallel_spots(
    light: NDArray[np.float32],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return places (n, 2) as x, y and the direction across the lines, by structure tensor."""
    gx = cv2.Scharr(light, cv2.CV_32F, 1, 0)
    gy = cv2.Scharr(light, cv2.CV_32F, 0, 1)
    size = (WINDOW, WINDOW)
    xx = cv2.blur(gx * gx, size)[::STRIDE, ::STRIDE].astype(np.float64)
    yy = cv2.blur(gy * gy, size)[::STRIDE, ::STRIDE].astype(np.float64)
    xy = cv2.blur(gx * gy, size)[::STRIDE, ::STRIDE].astype(np.float64)
    coherence = np.hypot(xx - yy, 2 * xy) / (xx + yy + 1e-6)
    row, column = np.nonzero(coherence >= LEAST_COHERENCE)
    angle = 0.5 * np.arctan2(2 * xy, xx - yy)[row, column]
    places = np.stack([column, row], axis=1).astype(np.float64) * STRIDE
    return places, np.asarray(angle, dtype=np.float64)


def _periodic(
    light: NDArray[np.float32], places: NDArray[np.float64], angles: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the pitch at each place and the share of the variance that it explains."""
    along = np.arange(-REACH, REACH + 1)
    across = np.arange(-4, 5)
    pitches, scores = np.zeros(len(places)), np.zeros(len(places))
    for start in range(0, len(places), 1000):
        part = slice(start, start + 1000)
        c, s = np.cos(angles[part])[:, None, None], np.sin(angles[part])[:, None, None]
        x = places[part, 0][:, None, None] + c * along - s * across[:, None]
        y = places[part, 1][:, None, None] + s * along + c * across[:, None]
        shape = (x.shape[0] * x.shape[1], x.shape[2])
        patch = cv2.remap(
            light,
            x.reshape(shape).astype(np.float32),
            y.reshape(shape).astype(np.float32),
            cv2.INTER_LINEAR,
            borderMode=cv2.BORDER_REFLECT,
        )
        profile = patch.reshape(x.shape).mean(axis=1)
        pitches[part], scores[part] = _strongest_pitch(profile)
    return pitches, scores


def _strongest_pitch(
    profiles: NDArray[np.float32],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the pitch of each profile (n, length) whose harmonics carry most of its variance."""
    length = profiles.shape[1]
    size = 512
    ramp = np.linspace(-1, 1, length)
    basis = np.linalg.qr(np.stack([np.ones(length), ramp, ramp**2], axis=1))[0]
    flat = profiles - (profiles @ basis) @ basis.T
    power = np.abs(np.fft.rfft(flat * np.hanning(length), size, axis=1)) ** 2
    total = power[:, size // 24 :].sum(axis=1) + 1e-9
    reach = round(2 * size / length)
    summed = np.cumsum(np.pad(power, ((0, 0), (1, 4 * reach))), axis=1)
    first, last = int(np.ceil(size / WIDEST_PITCH)), int(size / FINEST_PITCH)
    bins = np.arange(first, last + 1)
    share = np.zeros((len(profiles), len(bins)))
    for harmonic in (1, 2, 3):
        centre = bins * harmonic
        inside = centre + reach < power.shape[1]
        low = np.clip(centre - reach, 0, summed.shape[1] - 1)
        high = np.minimum(centre + reach + 1, summed.shape[1] - 1)
        band = summed[:, high] - summed[:, low]
        share += np.where(inside, band, 0.0)
    share *= power[:, bins] > 0.05 * power[:, first : last + 1].max(axis=1, keepdims=True)
    best = np.argmax(share, axis=1)
    return size / bins[best].astype(np.float64), share[np.arange(len(best)), best] / total


def _thinness(
    places: NDArray[np.float64], angles: NDArray[np.float64], pitches: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return how many like spots lie along the row, over how many lie beside it."""
    grid = np.round(places / STRIDE).astype(int)
    size = grid.max(axis=0) + 1
    number = np.full((size[1], size[0]), -1)
    number[grid[:, 1], grid[:, 0]] = np.arange(len(places))
    along = np.concatenate([np.arange(-15, -2), np.arange(3, 16)])
    row = _like(number, grid, angles, pitches, along, np.zeros(len(along)))
    aside = np.concatenate([np.arange(-16, -7), np.arange(8, 17)])
    beside = _like(number, grid, angles, pitches, np.zeros(len(aside)), aside)
    return np.asarray((1.0 + row) / (3.0 + beside))


def _like(
    number: NDArray[np.int_],
    grid: NDArray[np.int_],
    angles: NDArray[np.float64],
    pitches: NDArray[np.float64],
    along: NDArray[np.float64],
    across: NDArray[np.float64],
) -> NDArray[np.int_]:
    """Count, for each spot, the spots of its kind at the given strides from it."""
    c, s = np.cos(angles)[:, None], np.sin(angles)[:, None]
    column = np.round(grid[:, :1] + c * along - s * across).astype(int)
    row = np.round(grid[:, 1:] + s * along + c * across).astype(int)
    inside = (column >= 0) & (row >= 0) & (column < number.shape[1]) & (row < number.shape[0])
    other = np.where(inside, number[np.where(inside, row, 0), np.where(inside, column, 0)], -1)
    turn = np.abs((angles[other] - angles[:, None] + np.pi / 2) % np.pi - np.pi / 2)
    near = np.abs(np.log(pitches[other] / pitches[:, None])) < 0.15
    return np.asarray(((other >= 0) & (turn < 0.12) & near).sum(axis=1))


def _spread(
    places: NDArray[np.float64],
    angles: NDArray[np.float64],
    pitches: NDArray[np.float64],
    weights: NDArray[np.float64],
    most: int,
) -> list[Seed]:
    """Take the heaviest spots, leaving out those near one already taken."""
    tree = cKDTree(places)
    free = np.ones(len(places), dtype=bool)
    seeds = []
    for index in np.argsort(-weights, kind="stable"):
        if not free[index]:
            continue
        x, y = places[index]
        seeds.append(Seed(x, y, float(angles[index]), float(pitches[index]), float(weights[index])))
        if len(seeds) >= most:
            break
        near = np.array(tree.query_ball_point(places[index], 150.0))
        turn = np.abs((angles[near] - angles[index] + np.pi / 2) % np.pi - np.pi / 2)
        offset = places[near] - places[index]
        across = np.abs(
            -np.sin(angles[index]) * offset[:, 0] + np.cos(angles[index]) * offset[:, 1]
        )
        free[near[(turn < 0.2) & (across < 12)]] = False
    return seeds


__all__ = ["Seed", "even_out", "find_seeds"]
