"""The phase of ends and picks at every place of a field, from all the lines that carry it."""

from __future__ import annotations

import math
import warnings
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray
from skimage.restoration import unwrap_phase

from imgcover.repeat.phase import Grid, Transformed, demodulate

STRONG_ENOUGH = 0.3
"""A place is followed where its lines keep this share of their median amplitude. Lower, the phase
of what is left is that of the noise (a Gaussian smoothed amplitude falls to half at an edge)."""


LEAST = 1e-9
"""Added to the weights of a place: one that no line reaches stays where it is."""


@dataclass(frozen=True, slots=True)
class Line:
    """One spectral line, in thread units: h ends and v picks a period."""

    h: float
    v: float
    excess: float
    level: float


@dataclass(frozen=True, slots=True, eq=False)
class Followed:
    """Phases of both thread sets over a field, on a coarse grid.

    Parameters
    ----------
    ends, picks : ndarray, shape of the grid, float64
        Phase in cycles, over and above frequency · (x, y).
    valid : ndarray, shape of the grid, bool
        Where the lines are there and agree.
    x, y : ndarray, shapes (grid columns,) and (grid rows,), float64
        Centroids of the smoothing, pixels: at the field's edge it reaches inwards only.
    strength : ndarray, shape of the grid, float64
        Amplitude of the two leading lines over its usual value.
    loudest : float
        Usual amplitude of the strongest line.
    """

    ends: NDArray[np.float64]
    picks: NDArray[np.float64]
    valid: NDArray[np.bool_]
    x: NDArray[np.float64]
    y: NDArray[np.float64]
    strength: NDArray[np.float64]
    loudest: float


def follow(
    field: Transformed,
    ends: tuple[float, float],
    picks: tuple[float, float],
    *,
    lines: list[Line],
    sigma: float,
) -> Followed | None:
    """Follow ends and picks over the field.

    Parameters
    ----------
    field : Transformed
        Transform of the field, padded by at least 4 sigma.
    ends, picks : tuple of float
        Wave vectors of the threads, cycles per pixel, good to a tenth of a cycle per smoothing.
    lines : list of Line
        Strongest first; at least two that are not parallel.
    sigma : float
        Smoothing, pixels.

    Returns
    -------
    Followed or None
        None where no two lines together reach a grid large enough to unwrap.
    """
    if len(lines) < 2:
        return None
    vectors = np.array([ends, picks])
    demodulated = []
    for line in lines:
        frequency = np.array([line.h, line.v]) @ vectors
        values, grid = demodulate(field, (float(frequency[0]), float(frequency[1])), sigma=sigma)
        demodulated.append(values)
    smallest = (min(v.shape[0] for v in demodulated), min(v.shape[1] for v in demodulated))
    values = np.stack([each[: smallest[0], : smallest[1]] for each in demodulated])
    if min(smallest) < 3:
        return None
    x, y, share = _centroids(grid, field.shape, smallest, sigma)
    values = values / share
    amplitude = np.abs(values).astype(np.float64)
    # three quarters of the field may be bare bed or blurred; the clear rest sets the measure
    typical = np.quantile(amplitude, 0.75, axis=(1, 2), keepdims=True)
    relative = amplitude / np.maximum(typical, 1e-12)
    pair = _base_pair(lines)
    if pair is None:
        return None
    one, two = pair
    strength = np.sqrt(relative[one] * relative[two])
    solid = strength > STRONG_ENOUGH
    if solid.sum() < 9:
        return None
    phases = np.asarray(np.angle(values) / (2 * np.pi), np.float64)
    base = np.array([[lines[one].h, lines[one].v], [lines[two].h, lines[two].v]])
    unwrapped = np.stack([_unwrapped(phases[k], solid) for k in (one, two)])
    both = np.einsum("ij,jrc->irc", np.linalg.inv(base), unwrapped)
    both, agreement = _all_lines(both, phases, relative, lines, solid)
    valid = _largest(solid & agreement)
    return Followed(both[0], both[1], valid, x, y, strength, float(typical.max()))


def _centroids(
    grid: Grid, shape: tuple[int, int], size: tuple[int, int], sigma: float
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Centre and share of the Gaussian that lies inside the field, for each grid place."""
    out = []
    for places, length in (
        (grid.columns()[: size[1]], shape[1]),
        (grid.rows()[: size[0]], shape[0]),
    ):
        low, high = (-0.5 - places) / sigma, (length - 0.5 - places) / sigma
        share = _below(high) - _below(low)
        moved = (np.exp(-(low**2) / 2) - np.exp(-(high**2) / 2)) / np.sqrt(2 * np.pi) / share
        out.append((places + sigma * moved, share))
    (x, share_x), (y, share_y) = out
    return x, y, np.outer(share_y, share_x)


def _below(at: NDArray[np.float64]) -> NDArray[np.float64]:
    """Share of a standard Gaussian that lies below each place."""
    return np.array([math.erfc(-each / math.sqrt(2)) / 2 for each in at.tolist()])


def _largest(mask: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """The largest connected part: between parts nothing says how many threads were passed."""
    count, labels = cv2.connectedComponents(mask.astype(np.uint8), connectivity=4)
    if count < 3:  # the first is what lies outside the mask
        return mask
    return np.asarray(labels == np.bincount(labels[mask]).argmax())


def _base_pair(lines: list[Line]) -> tuple[int, int] | None:
    """The two lines that together fix both phases best."""
    best, chosen = 0.0, None
    for i in range(len(lines)):
        for j in range(i):
            one, two = lines[i], lines[j]
            across = abs(one.h * two.v - one.v * two.h)
            longest = np.hypot(one.h, one.v) * np.hypot(two.h, two.v)
            if across < 0.2 * longest:
                continue
            # a high multiple wraps early and a weak line is noisy
            worth = np.exp(0.5 * min(one.level, two.level)) * across / longest**1.5
            if worth > best:
                best, chosen = worth, (j, i)
    return chosen


def _unwrapped(phase: NDArray[np.float64], solid: NDArray[np.bool_]) -> NDArray[np.float64]:
    """Unwrap in two dimensions, cycles; the strongest connected region decides the branch."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        masked = np.ma.masked_array((phase - np.round(phase)) * 2 * np.pi, mask=~solid)
        plain = unwrap_phase(masked, rng=0)  # type: ignore[no-untyped-call]
    return np.asarray(np.ma.filled(plain, 0.0), np.float64) / (2 * np.pi)


def _all_lines(
    both: NDArray[np.float64],
    phases: NDArray[np.float64],
    relative: NDArray[np.float64],
    lines: list[Line],
    solid: NDArray[np.bool_],
) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Improve both phases by every line; tell where the lines agree.

    Each line's own constant phase is unknown, and is its mean residual over the field. Residuals
    are small, so they need no unwrapping.
    """
    # normal equations of every place, two by two; their diagonal is never quite zero
    hh, vv = (np.full(solid.shape, LEAST) for _ in range(2))
    hv, h, v, spread, total = (np.zeros(solid.shape) for _ in range(5))
    for k, line in enumerate(lines):
        residual = phases[k] - line.h * both[0] - line.v * both[1]
        turned = np.exp(2j * np.pi * residual)
        constant = np.angle((turned * relative[k] * solid).sum())
        rest = np.angle(turned * np.exp(-1j * constant)) / (2 * np.pi)
        weight = np.minimum(relative[k], 2.0) ** 2 * np.exp(line.excess)
        hh += line.h * line.h * weight
        hv += line.h * line.v * weight
        vv += line.v * line.v * weight
        weighed = weight * rest
        h += line.h * weighed
        v += line.v * weighed
        spread += weight * np.abs(rest)
        total += weight
    area = np.maximum(hh * vv - hv * hv, LEAST * (hh + vv - LEAST))
    step = np.stack([vv * h - hv * v, hh * v - hv * h]) / area
    return both + step, spread / np.maximum(total, 1e-12) < 0.2


__all__ = ["STRONG_ENOUGH", "Followed", "Line", "follow"]
