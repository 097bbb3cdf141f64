"""Is there a row of lines at this spot, and where does it run?

A seed grows along its row: the row is laid straight (lines upright) and its lines are followed and
numbered by phase as far as they go.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d, uniform_filter1d

from imgcover.scale.rule_frame import Frame, run_around
from imgcover.scale.rule_lines import LONGEST_LINE, Row, lay_lines, measure_lines
from imgcover.scale.rule_seeds import Seed

FEWEST_LINES = 12
"""Below this no pattern of long and short lines is proof of anything."""
LEAST_SHARE = 0.22
"""Of the local variance that the pitch must carry for a line to be followed."""
LEAST_LIKE = 0.35
"""Of the wave at the seed that a height must show, in phase, to belong to the same lines."""
ROUNDED = 0.15
"""Pitches of smoothing before the pitch is looked for: lines a tenth of a pitch wide spread over
many harmonics, and no single one of them would carry the variance."""
NEAR = 12
"""Pitches to each side of the seed over which lines are told from gaps."""
UNDECIDED = 0.3
"""Skewness of the light along the row below which lines cannot be told from gaps: lines that fill
a third of the pitch or less have more than twice that."""
WIDEST_GAP = 8
"""Lines that may be missing in a row (dust, a finger, worn places) before it is taken to end."""


def follow_row(tone: NDArray[np.float32], seed: Seed) -> list[Row]:
    """Follow the row of lines at a seed.

    Parameters
    ----------
    tone : ndarray, shape (rows, columns), float32
        Square root of linear light, at the resolution of the seed.
    seed : Seed
        Where to start.

    Returns
    -------
    list of Row
        Both ways of reading it, lines growing to either side; empty when no row is there.
    """
    frame = Frame(seed.x, seed.y, seed.angle, seed.angle + np.pi / 2)
    straight = _straighten(tone, frame, seed.pitch)
    if straight is None:
        return []
    frame, pitch, zone = straight
    rows = []
    for light in _tones_of_lines(tone, frame, pitch, zone):
        for way in (1.0, -1.0):
            row = _one_way(tone, frame, pitch, zone, way, light=light)
            if row is not None:
                rows.append(row)
    return rows


def _tones_of_lines(
    tone: NDArray[np.float32], frame: Frame, pitch: float, zone: tuple[float, float]
) -> tuple[bool, ...]:
    """Tell whether the lines are lighter than the gaps, the narrower of the two being lines.

    Where both are about as wide, cloth or grain shows between them, or the row as a whole says
    otherwise than the seed's surroundings, it can be either.
    """
    profiled = _profile(tone, frame, pitch, zone)
    if profiled is None:
        return ()
    s, profile = profiled
    ripple = profile - gaussian_filter1d(profile, 1.2 * pitch, mode="nearest")
    _, first, last = _held(profile, s, pitch)
    whole, near = (
        float(np.mean(part**3) / (np.mean(part**2) ** 1.5 + 1e-12)) if len(part) else 0.0
        for part in (ripple[first : last + 1], ripple[np.abs(s) < NEAR * pitch])
    )
    light = whole > 0
    sure = whole * near > 0 and min(abs(whole), abs(near)) >= UNDECIDED
    return (light,) if sure else (light, not light)


def _one_way(
    tone: NDArray[np.float32],
    frame: Frame,
    pitch: float,
    zone: tuple[float, float],
    way: float,
    *,
    light: bool,
) -> Row | None:
    """Follow the row twice: the second time along the feet that the first has found."""
    if way < 0:
        frame = replace(frame, upright=frame.upright + np.pi)
        zone = (-zone[1], -zone[0])
    followed = _follow(tone, frame, pitch, zone, light=light)
    if followed is None:
        return None
    laid = lay_lines(tone, frame, followed[1], light, zone=zone)
    if laid is None:
        return None
    frame, positions, (foot, top) = laid
    pitch = float(np.median(np.diff(positions)))
    frame, zone = frame.moved(0.0, foot), (0.0, top - foot)
    tones = _tones_of_lines(tone, frame, pitch, zone)
    if len(tones) == 1:
        # told better now that the lines stand upright
        light = tones[0]
    followed = _follow(tone, frame, pitch, zone, light=light)
    if followed is None:
        return None
    return measure_lines(tone, frame, *followed, light, zone=zone)


def _straighten(
    tone: NDArray[np.float32], frame: Frame, pitch: float
) -> tuple[Frame, float, tuple[float, float]] | None:
    """Turn the frame until the lines near its origin stand upright; find how high they all go."""
    zone = (0.0, 0.0)
    for _ in range(2):
        s = np.arange(-9 * pitch, 9 * pitch)
        t = np.arange(-LONGEST_LINE * pitch / 2, LONGEST_LINE * pitch / 2 + 1)
        band = gaussian_filter1d(frame.sample(tone, s, t), ROUNDED * pitch, axis=1)
        wave, share, growth = _middle_wave(band, s, pitch)
        strong = uniform_filter1d(share, 3) > LEAST_SHARE
        origin = int(np.argmin(np.abs(t)))
        near = np.flatnonzero(strong[max(0, origin - 4) : origin + 5])
        if not len(near):
            return None
        start = max(0, origin - 4) + int(near[np.argmin(np.abs(near - 4))])
        # cloth beside the lines may share their pitch, but not their phase and strength
        own = wave[max(0, start - 2) : start + 3].mean()
        strong &= (wave * np.conj(own)).real > LEAST_LIKE * abs(own) ** 2
        strong[start] = True
        low, high = run_around(strong, start)
        if high - low < 3 or (low == 0 and high == len(t) - 1):
            return None
        zone = (float(t[low]), float(t[high]))
        part = wave[low : high + 1]
        turned = np.angle(np.sum(part[1:] * np.conj(part[:-1])))
        pitch = 1.0 / (1.0 / pitch + np.angle(np.sum(growth[low : high + 1])) / (8 * np.pi * pitch))
        lean = np.arctan(turned * pitch / (2 * np.pi))
        if not 2.5 < pitch < 40 or abs(lean) > 0.3:
            return None
        frame = replace(frame, along=frame.along + lean, upright=frame.along + lean + np.pi / 2)
    return frame, pitch, zone


def _middle_wave(
    band: NDArray[np.float32], s: NDArray[np.float64], pitch: float
) -> tuple[NDArray[np.complex128], NDArray[np.float64], NDArray[np.complex128]]:
    """Return each height's wave at the pitch, its share of the variance, its turn in 4 pitches."""
    reach = 7 * pitch
    window = np.where(np.abs(s) < reach, np.cos(np.pi * s / (2 * reach)) ** 2, 0.0)
    window /= window.sum()
    slow = np.linalg.qr(np.stack([s**0, s, s**2, s**3], axis=1))[0]
    flat = band - (band @ slow) @ slow.T
    variance = (flat * flat) @ window
    shifted = [
        np.interp(s, s + shift, window, left=0.0, right=0.0) * np.exp(-2j * np.pi * s / pitch)
        for shift in (-2 * pitch, 0.0, 2 * pitch)
    ]
    before, wave, after = (flat @ each for each in shifted)
    return wave, 2 * np.abs(wave) ** 2 / (variance + 1e-7), after * np.conj(before)


def _demodulate(
    band: NDArray[np.float32], s: NDArray[np.float64], pitch: float
) -> tuple[NDArray[np.complex128], NDArray[np.float64]]:
    """Return, along the last axis, the wave of the pitch and its share of the local variance."""
    high = band - gaussian_filter1d(band, 1.2 * pitch, axis=-1, mode="nearest")
    turn = np.exp(-2j * np.pi * s / pitch)
    sigma = 2.5 * pitch
    wave = gaussian_filter1d((high * turn).real, sigma, axis=-1, mode="constant") + 1j * (
        gaussian_filter1d((high * turn).imag, sigma, axis=-1, mode="constant")
    )
    variance = gaussian_filter1d(high * high, sigma, axis=-1, mode="constant")
    return wave, 2 * np.abs(wave) ** 2 / (variance + 1e-7)


def _follow(
    tone: NDArray[np.float32],
    frame: Frame,
    pitch: float,
    zone: tuple[float, float],
    *,
    light: bool,
) -> tuple[NDArray[np.int_], NDArray[np.float64]] | None:
    """Number the lines along the row by phase, from the origin both ways, and place each."""
    profiled = _profile(tone, frame, pitch, zone)
    if profiled is None:
        return None
    s, profile = profiled
    wave, first, last = _held(profile, s, pitch)
    if last - first < FEWEST_LINES * pitch:
        return None
    phase = np.unwrap(np.angle(wave[first : last + 1])) + 2 * np.pi * s[first : last + 1] / pitch
    cycles = phase / (2 * np.pi) - (0.0 if light else 0.5)
    if np.any(np.diff(cycles) <= 0):
        return None
    numbers = np.arange(int(np.ceil(cycles[0])), int(np.floor(cycles[-1])) + 1)
    if len(numbers) < FEWEST_LINES:
        return None
    return numbers, np.interp(numbers, cycles, s[first : last + 1])


def _held(
    profile: NDArray[np.float32], s: NDArray[np.float64], pitch: float
) -> tuple[NDArray[np.complex128], int, int]:
    """Return the wave of the pitch along a row, and the ends of where it carries the light."""
    wave, share = _demodulate(profile, s, pitch)
    origin = int(np.argmin(np.abs(s)))
    return wave, *_extent(share > LEAST_SHARE, origin, int(WIDEST_GAP * pitch))


def _profile(
    tone: NDArray[np.float32], frame: Frame, pitch: float, zone: tuple[float, float]
) -> tuple[NDArray[np.float64], NDArray[np.float32]] | None:
    """Return the mean along the lines at each place of the row, as far as the picture goes."""
    extent = float(np.hypot(*tone.shape))
    s = np.arange(-extent, extent)
    x, y = frame.place(s, np.array(0.0))
    inside = (x >= 0) & (y >= 0) & (x < tone.shape[1]) & (y < tone.shape[0])
    s = s[inside]
    if len(s) < FEWEST_LINES * pitch:
        return None
    low, high = zone
    middle, half = (low + high) / 2, max(1.5, min((high - low) * 0.4, 2.5 * pitch))
    heights = np.arange(middle - half, middle + half + 0.5)
    profile = gaussian_filter1d(frame.sample(tone, s, heights).mean(axis=0), ROUNDED * pitch)
    return s, profile


def _extent(held: NDArray[np.bool_], origin: int, gap: int) -> tuple[int, int]:
    """Return the ends of the stretch around the origin whose gaps are no wider than `gap`."""
    good = np.flatnonzero(held)
    if not len(good):
        return origin, origin
    nearest = int(np.argmin(np.abs(good - origin)))
    breaks = np.flatnonzero(np.diff(good) > gap)
    before, after = breaks[breaks < nearest], breaks[breaks >= nearest]
    first = good[before[-1] + 1] if len(before) else good[0]
    last = good[after[0]] if len(after) else good[-1]
    return int(first), int(last)


__all__ = ["FEWEST_LINES", "follow_row"]
