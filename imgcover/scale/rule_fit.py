"""Where exactly does each graduation stand, and what do they say together?

Every line is placed by laying the mean line of its row over it (least squares in position,
contrast and ground); a comb fitted to the places gives the pitch, the strays and the tilt.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.repeat.comb import Comb, fit_comb
from imgcover.scale.rule_frame import Frame
from imgcover.scale.rule_lines import Row

SOFTENED = 0.8
"""Pixels (one standard deviation) by which the picture is softened before lines are placed: a
sharp edge's place among the pixels moves its apparent place by up to a tenth of a pixel."""
U_PIXEL = 0.05
"""Pixels by which lines at one end of a row may be misplaced against those at the other, softened
as above: it does not average out where the pitch is nearly a whole number of pixels."""
U_PIXEL_APART = U_PIXEL / 2
"""The same for a line's foot against its tip, which one column of pixels misplaces alike: on 45
upright rows the two halves agreed to a tenth of `U_PIXEL`, at worst to four tenths of it."""
LIKENESS = 0.6
"""Correlation with the mean line below which a line is taken for dust, a digit or cloth."""


@dataclass(frozen=True, slots=True)
class FittedRow:
    """A row's comb, in pixels of the finest level along its frame.

    `height` is how far up from their foot the lines were placed. `across` is the relative change
    of the pitch for one pixel up the lines, with its u: what the row says about a tilt around its
    own direction.
    """

    frame: Frame
    numbers: NDArray[np.int_]
    comb: Comb
    height: float
    across: float
    u_across: float


def fit_row(tone: NDArray[np.float32], row: Row, ratio: float) -> FittedRow | None:
    """Fit a row's lines at the finest level.

    Parameters
    ----------
    tone : ndarray, shape (rows, columns), float32
        Square root of linear light at the finest level.
    row : Row
        As followed, on a level `ratio` times coarser.
    ratio : float
        How many finest pixels make one of the row's.

    Returns
    -------
    FittedRow or None
        None when too few lines agree on one pitch.
    """
    tone = np.asarray(cv2.GaussianBlur(tone, (0, 0), SOFTENED), dtype=np.float32)
    shift = (ratio - 1) / 2
    frame = Frame(
        row.frame.x * ratio + shift,
        row.frame.y * ratio + shift,
        row.frame.along,
        row.frame.upright,
    )
    pitch, zone = row.pitch * ratio, row.zone * ratio
    start = row.positions * ratio
    low, high = 0.12 * zone, 0.88 * zone
    places, good = _place_lines(tone, frame, start, pitch, (low, high), light=row.light)
    if good.sum() < 6:
        return None
    comb = fit_comb(row.numbers[good], places[good])
    if comb is None:
        return None
    across, u_across = _across(tone, frame, row, places, pitch, (low, high))
    length = abs(float(np.ptp(comb.position(row.numbers))))
    u_pixel = math.sqrt(2) * U_PIXEL / length
    comb = replace(
        comb,
        u_pitch=math.hypot(comb.u_pitch, u_pixel * comb.pitch),
        # a sag of that much in the row's middle looks like a tilt
        u_tilt=math.hypot(comb.u_tilt, 4 * U_PIXEL * comb.pitch / length**2),
    )
    u_apart = math.sqrt(2) * U_PIXEL_APART / length / (0.5 * (high - low))
    u_across = math.hypot(u_across, u_apart)
    return FittedRow(frame, row.numbers[good], comb, (low + high) / 2, across, u_across)


def _place_lines(
    tone: NDArray[np.float32],
    frame: Frame,
    start: NDArray[np.float64],
    pitch: float,
    heights: tuple[float, float],
    *,
    light: bool,
) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
    """Place each line along the row; tell which look like the row's lines."""
    count = int(min(40, max(3, heights[1] - heights[0])))
    t = np.linspace(*heights, count)
    half = math.ceil(12 * max(1.0, pitch / 24))
    offsets = np.linspace(-0.5, 0.5, 2 * half + 1) * pitch
    places = start.copy()
    good = np.ones(len(start), dtype=bool)
    for _ in range(4):
        s = (places[:, None] + offsets).ravel()
        profile = frame.sample(tone, s, t).mean(axis=0, dtype=np.float64)
        profile = profile.reshape(len(start), len(offsets))
        mean = np.median(_normal(profile), axis=0)
        mean = mean - mean.mean()
        if (mean[half] > 0) != light or not mean.any():
            return places, np.zeros(len(start), dtype=bool)
        shift, likeness = _shift(profile, mean, offsets)
        good = likeness > LIKENESS
        places = places + np.where(good, np.clip(shift, -0.2 * pitch, 0.2 * pitch), 0.0)
        if good.any() and np.abs(shift[good]).max() < 1e-3:
            break
    return places, good


def _normal(profile: NDArray[np.float64]) -> NDArray[np.float64]:
    """Bring each line's profile to the mean 0 and the root mean square 1."""
    flat = profile - profile.mean(axis=1, keepdims=True)
    return np.asarray(flat / (np.sqrt((flat**2).mean(axis=1, keepdims=True)) + 1e-9))


def _shift(
    profile: NDArray[np.float64], mean: NDArray[np.float64], offsets: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return how far each profile lies from the mean line, and how like it is."""
    window = np.cos(np.pi * offsets / (offsets[-1] - offsets[0])) ** 2
    step = offsets[1] - offsets[0]
    slope = np.gradient(mean, step)
    basis = np.stack([mean, slope, np.ones_like(mean), offsets / offsets[-1]], axis=1)
    weighted = basis * window[:, None]
    terms = np.linalg.solve(basis.T @ weighted, weighted.T @ profile.T)
    contrast = terms[0]
    shift = -terms[1] / np.where(np.abs(contrast) > 1e-9, contrast, np.inf)
    fitted = (basis @ terms).T
    rest = ((profile - fitted) ** 2 * window).sum(axis=1)
    whole = ((profile - (profile @ window / window.sum())[:, None]) ** 2 * window).sum(axis=1)
    likeness = np.sqrt(np.clip(1 - rest / (whole + 1e-12), 0, 1)) * np.sign(contrast)
    return shift, likeness


def _across(
    tone: NDArray[np.float32],
    frame: Frame,
    row: Row,
    places: NDArray[np.float64],
    pitch: float,
    heights: tuple[float, float],
) -> tuple[float, float]:
    """Compare the pitch at the lines' foot with that at their top."""
    middle = (heights[0] + heights[1]) / 2
    parts = [
        _place_lines(tone, frame, places, pitch, part, light=row.light)
        for part in ((heights[0], middle), (middle, heights[1]))
    ]
    both = parts[0][1] & parts[1][1]
    distance = middle - heights[0]
    if both.sum() < 6 or distance < 2:
        return 0.0, math.inf
    numbers = row.numbers[both]
    # the comb drops strays; the row's own pitch is laid under so that it has one to look for
    spread = fit_comb(numbers, numbers * pitch + parts[1][0][both] - parts[0][0][both])
    if spread is None:
        return 0.0, math.inf
    return (spread.pitch - pitch) / pitch / distance, spread.u_pitch / pitch / distance


__all__ = ["FittedRow", "fit_row"]
