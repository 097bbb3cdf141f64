"""Is there a row of lines at this spot, where does it run, and how long is each line?

A seed grows along its row: the row is laid straight (lines upright), the lines are followed by
phase as far as they go, and each is compared with the gaps beside it at every height. What comes
out is a table, line by line, of how far each reaches.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import cv2
import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d, median_filter, uniform_filter1d

from imgcover.scale.rule_seeds import Seed

LONGEST_LINE = 30
"""Pitches: an inch line on a 1/64 inch rule reaches 25."""
FEWEST_LINES = 12
"""Below this no pattern of long and short lines is proof of anything."""
LEAST_SHARE = 0.22
"""Of the local variance that the pitch must carry for a line to be followed."""
CLEAR_GAP = 0.14
"""Pitches of full gap, halved: a line's ink may be broken by less, digits stand off by more."""
LEAST_LIKE = 0.35
"""Of the wave at the seed that a height must show, in phase, to belong to the same lines."""
ROUNDED = 0.15
"""Pitches of smoothing before the pitch is looked for: lines a tenth of a pitch wide spread over
many harmonics, and no single one of them would carry the variance."""
WIDEST_GAP = 8
"""Lines that may be missing in a row (dust, a finger, worn places) before it is taken to end."""


@dataclass(frozen=True, slots=True)
class Frame:
    """Where the straightened row lies in the picture: place of (0, 0) and both directions.

    `along` (rad) is the direction of the row, `upright` that of its lines, from foot to tip.
    """

    x: float
    y: float
    along: float
    upright: float

    def place(
        self, s: NDArray[np.float64], t: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return picture x and y of points s along the row and t along the lines, in pixels."""
        x = self.x + s * np.cos(self.along) + t * np.cos(self.upright)
        y = self.y + s * np.sin(self.along) + t * np.sin(self.upright)
        return x, y

    def sample(
        self, light: NDArray[np.float32], s: NDArray[np.float64], t: NDArray[np.float64]
    ) -> NDArray[np.float32]:
        """Return the picture at the grid of t (rows) and s (columns); 0 outside it."""
        x, y = self.place(s[None, :], t[:, None])
        return np.asarray(
            cv2.remap(light, x.astype(np.float32), y.astype(np.float32), cv2.INTER_LINEAR),
            dtype=np.float32,
        )

    def moved(self, s: float, t: float) -> Frame:
        """Return the frame with its origin at (s, t)."""
        x, y = self.place(np.array(s), np.array(t))
        return replace(self, x=float(x), y=float(y))


@dataclass(frozen=True, slots=True)
class Row:
    """A row of lines as it was followed.

    `numbers` and `positions` (px along the frame) of each line; `reach` how far each goes from
    the common foot at t = 0 up to its first clear gap, px, and `beyond` how far if gaps may be
    dust; `strength` its contrast over the usual; `pitch` in px; `light`
    whether the lines are lighter than their ground; `zone` the height up to which all lines go.
    """

    frame: Frame
    pitch: float
    numbers: NDArray[np.int_]
    positions: NDArray[np.float64]
    reach: NDArray[np.float64]
    beyond: NDArray[np.float64]
    strength: NDArray[np.float64]
    light: bool
    zone: float


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
    for way in (1.0, -1.0):
        row = _one_way(tone, frame, pitch, zone, way)
        if row is not None:
            rows.append(row)
    return rows


def _one_way(
    tone: NDArray[np.float32],
    frame: Frame,
    pitch: float,
    zone: tuple[float, float],
    way: float,
) -> Row | None:
    """Follow the row twice: the second time along the feet that the first has found."""
    if way < 0:
        frame = replace(frame, upright=frame.upright + np.pi)
        zone = (-zone[1], -zone[0])
    row = None
    for _ in range(2):
        followed = _follow(tone, frame, pitch, zone)
        if followed is None:
            return None
        row = _measure_lines(tone, frame, *followed, zone=zone)
        if row is None:
            return None
        frame, pitch, zone = row.frame, row.pitch, (0.0, row.zone)
    return row


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
        low, high = _run_around(strong, start)
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
    """Return each height's wave at the pitch, its share of the variance, and its turn over 4 pitches."""
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


def _run_around(strong: NDArray[np.bool_], start: int) -> tuple[int, int]:
    """Return the first and last index of the run of true values around `start`."""
    low = high = start
    while low > 0 and strong[low - 1]:
        low -= 1
    while high + 1 < len(strong) and strong[high + 1]:
        high += 1
    return low, high


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
    tone: NDArray[np.float32], frame: Frame, pitch: float, zone: tuple[float, float]
) -> tuple[NDArray[np.int_], NDArray[np.float64], bool] | None:
    """Number the lines along the row by phase, from the origin both ways, and place each."""
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
    wave, share = _demodulate(profile, s, pitch)
    held = share > LEAST_SHARE
    origin = int(np.argmin(np.abs(s)))
    first, last = _extent(held, origin, int(WIDEST_GAP * pitch))
    if last - first < FEWEST_LINES * pitch:
        return None
    phase = np.unwrap(np.angle(wave[first : last + 1])) + 2 * np.pi * s[first : last + 1] / pitch
    ripple = profile - gaussian_filter1d(profile, 1.2 * pitch, mode="nearest")
    light = bool(np.mean(ripple[first : last + 1] ** 3) > 0)
    cycles = phase / (2 * np.pi) - (0.0 if light else 0.5)
    if np.any(np.diff(cycles) <= 0):
        return None
    numbers = np.arange(int(np.ceil(cycles[0])), int(np.floor(cycles[-1])) + 1)
    if len(numbers) < FEWEST_LINES:
        return None
    return numbers, np.interp(numbers, cycles, s[first : last + 1]), light


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


def _measure_lines(
    tone: NDArray[np.float32],
    frame: Frame,
    numbers: NDArray[np.int_],
    positions: NDArray[np.float64],
    light: bool,
    *,
    zone: tuple[float, float],
) -> Row | None:
    """Measure how far each line goes from the common foot."""
    pitch = float(np.median(np.diff(positions)))
    for _ in range(2):
        t = np.arange(np.floor(zone[0] - 3 * pitch), zone[0] + LONGEST_LINE * pitch)
        contrast = _contrast(tone, frame, positions, t, pitch) * (1.0 if light else -1.0)
        usual = _usual(contrast, t, zone)
        if usual is None:
            return None
        strength, foot, top = usual
        reach, beyond = _reach(
            contrast, strength, t, foot=foot, top=top, clear=max(1.2, CLEAR_GAP * pitch)
        )
        lean = _lean(positions, contrast, strength, t, foot, top)
        turned = frame.along + np.arctan(lean) * np.sin(frame.upright - frame.along)
        positions = positions * (
            np.sin(frame.upright - frame.along) / np.sin(frame.upright - turned)
        )
        frame = replace(frame, along=turned)
        zone = (foot, top)
    local = median_filter(strength, 15, mode="nearest")
    return Row(
        frame=frame.moved(0.0, foot),
        pitch=pitch,
        numbers=numbers,
        positions=positions,
        reach=reach - foot,
        beyond=beyond - foot,
        strength=strength / np.maximum(local, 1e-6),
        light=light,
        zone=top - foot,
    )


def _contrast(
    tone: NDArray[np.float32],
    frame: Frame,
    positions: NDArray[np.float64],
    t: NDArray[np.float64],
    pitch: float,
) -> NDArray[np.float64]:
    """Return line minus gap, shape (lines, heights)."""
    line = [frame.sample(tone, positions + d * pitch, t) for d in (-0.08, 0.0, 0.08)]
    gap = [frame.sample(tone, positions + d * pitch, t) for d in (-0.55, -0.45, 0.45, 0.55)]
    return np.asarray((sum(line) / 3 - sum(gap) / 4).T, dtype=np.float64)  # type: ignore[union-attr]


def _usual(
    contrast: NDArray[np.float64], t: NDArray[np.float64], zone: tuple[float, float]
) -> tuple[NDArray[np.float64], float, float] | None:
    """Return each line's contrast where all lines stand, and the foot and top of that zone."""
    middle = np.median(contrast, axis=0)
    inside = (t >= zone[0]) & (t <= zone[1])
    if not inside.any():
        return None
    peak = np.quantile(middle[inside], 0.75)
    start = int(np.flatnonzero(inside)[np.argmax(middle[inside])])
    if peak <= 0 or middle[start] <= 0:
        return None
    low, high = _run_around(middle > peak / 2, start)
    foot = float(t[low]) - _part(middle, low, low - 1, peak / 2)
    top = float(t[high]) + _part(middle, high, high + 1, peak / 2)
    strength = np.median(contrast[:, low : high + 1], axis=1)
    return strength, foot, top


def _part(values: NDArray[np.float64], inner: int, outer: int, level: float) -> float:
    """Return how far from `inner` towards `outer`, 0…1, the values cross the level."""
    if not 0 <= outer < len(values) or values[inner] <= values[outer]:
        return 0.5
    return float((values[inner] - level) / (values[inner] - values[outer]))


def _reach(
    contrast: NDArray[np.float64],
    strength: NDArray[np.float64],
    t: NDArray[np.float64],
    *,
    foot: float,
    top: float,
    clear: float,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return where each line ends: where the sum of contrast over half is largest.

    First with lines ended by their first clear gap, then with gaps bridged.
    """
    # its own contrast, for wear goes line by line; but noise must not become a line
    usual = np.maximum(strength, 0.3 * median_filter(strength, 9, mode="nearest"))[:, None]
    usual = np.maximum(usual, 0.2 * np.median(strength))
    start = int(np.searchsorted(t, (foot + top) / 2))
    above = np.cumsum(np.clip(contrast[:, start:] / usual, -0.5, 1.5) - 0.5, axis=1)
    # a digit over a line's end must not lengthen it, dust on a line not shorten it: which of the
    # two a gap is, the pattern of all lines decides
    fallen = np.maximum.accumulate(above, axis=1) - above > clear
    ended = np.maximum.accumulate(fallen, axis=1)
    first = np.argmax(np.where(ended, -np.inf, above), axis=1)
    return t[start] + first + 0.5, t[start] + np.argmax(above, axis=1) + 0.5


def _lean(
    positions: NDArray[np.float64],
    contrast: NDArray[np.float64],
    strength: NDArray[np.float64],
    t: NDArray[np.float64],
    foot: float,
    top: float,
) -> float:
    """Return the slope of the line that joins the feet, against the frame, px per px."""
    local = np.maximum(strength, 0.3 * np.median(strength))
    start = int(np.searchsorted(t, (foot + top) / 2))
    below = np.clip(contrast[:, start::-1] / local[:, None], -0.5, 1.5) - 0.5
    feet = t[start] - np.argmax(np.cumsum(below, axis=1), axis=1)
    slope = np.subtract.outer(feet, feet)[np.triu_indices(len(feet), len(feet) // 2)]
    length = np.subtract.outer(positions, positions)[np.triu_indices(len(feet), len(feet) // 2)]
    return float(np.median(slope / length)) if len(slope) else 0.0


__all__ = ["FEWEST_LINES", "Frame", "Row", "follow_row"]
