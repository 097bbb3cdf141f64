"""What shadow does a yarn cast? Its blurred profile across the thread, tabulated."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

STEP_PX = 1 / 16
"""Step of the table across the yarn, px: straight lines between its points err below 0.001."""
ROWS = 24
"""Yarn widths tabulated: half as many leave errors of 0.0002 of the light, which is as much as a
wrong cross-section would (noise-free drawings)."""
FINER = 2
"""Parts of a step when the sharp shadow is laid down: its rim is steep."""
NUDGE = 1e-3
"""Step of the numerical derivative by the roundness: far above rounding, far below its own size."""
BLURS = 4.5
"""The table ends this many standard deviations of the blur beyond the edge: 3e-6 are left."""


@dataclass(frozen=True, slots=True)
class Yarn:
    """How the yarns of one system hold back light, before any blur.

    Parameters
    ----------
    half_px : float
        Half the usual width, px.
    depth : float
        −ln of the transmittance through the middle of a yarn of the usual width.
    roundness : float
        1 over the exponent of the superellipse that the cross-section follows: 0 a flat ribbon,
        0.5 round.
    """

    half_px: float
    depth: float
    roundness: float


@dataclass(frozen=True, slots=True, eq=False)
class Shadow:
    """1 − transmittance across a yarn, blurred, and how it changes with what made it.

    Parameters
    ----------
    table : ndarray, shape (widths × places, 4), float32
        The shadow and its derivatives by blur, depth and roundness, by the distance from the
        yarn's edge: from one width to the next the profile then moves along with the edge.
    places : int
        Columns of the table.
    half_step : float
        Step of the half width from row to row, px.
    """

    table: NDArray[np.float32]
    places: int
    half_step: float

    def dark(self, offset: NDArray[np.float32], half: NDArray[np.float32]) -> NDArray[np.float32]:
        """Shadow at a distance from the yarn's middle.

        Parameters
        ----------
        offset, half : ndarray, shapes that broadcast
            Distance and half width, px.
        """
        at, a, b = self._find(offset, half)
        only = np.ascontiguousarray(self.table[:, 0])
        low = only[at] + (only[at + 1] - only[at]) * a
        at = at + self.places
        high = only[at] + (only[at + 1] - only[at]) * a
        return np.asarray(low + (high - low) * b, np.float32)

    def change(self, offset: NDArray[np.float32], half: NDArray[np.float32]) -> NDArray[np.float32]:
        """Shadow and its derivatives by blur, depth, roundness, offset, half width: (..., 6)."""
        at, a, b = self._find(offset, half)
        a, b = a[..., None], b[..., None]
        # `take` copies whole rows, which plain indexing does ten times as slowly
        here, next_, wider, both = (
            np.take(self.table, at + step, axis=0, mode="clip")
            for step in (0, 1, self.places, self.places + 1)
        )
        low, high = here + (next_ - here) * a, wider + (both - wider) * a
        slope = (next_ - here)[..., :1] * (1 - b) + (both - wider)[..., :1] * b
        slope = slope / np.float32(STEP_PX)
        by_half = (high - low)[..., :1] / np.float32(self.half_step) - slope
        by_offset = slope * np.sign(offset)[..., None]
        return np.concatenate([low + (high - low) * b, by_offset, by_half], axis=-1)

    def _find(
        self, offset: NDArray[np.float32], half: NDArray[np.float32]
    ) -> tuple[NDArray[np.int32], NDArray[np.float32], NDArray[np.float32]]:
        """First of the four table entries around each place, and the shares of the others."""
        half = np.clip(half, 0, np.float32((ROWS - 1.001) * self.half_step))
        over = half * np.float32(1 / self.half_step)
        widest = np.float32((ROWS - 1) * self.half_step)
        along = (np.abs(offset) - half + widest) * np.float32(1 / STEP_PX)
        along = np.minimum(along, np.float32(self.places - 1.01))
        place, row = along.astype(np.int32), over.astype(np.int32)
        return row * self.places + place, along - place, over - row


def cast(yarn: Yarn, *, blur_px: float, widest_px: float) -> Shadow:
    """Tabulate the shadow of yarns up to a half width, blurred by lens and pixel.

    Parameters
    ----------
    yarn : Yarn
    blur_px : float
        Standard deviation of the lens's blur; the pixel's own aperture comes on top.
    widest_px : float
        Largest half width, px.
    """
    steps = max(1, round(widest_px / (ROWS - 1) / STEP_PX))
    half = np.asarray(np.arange(ROWS) * (steps * STEP_PX), np.float64)
    places = (ROWS - 1) * steps + int((BLURS * blur_px + 1) / STEP_PX) + 2
    part = STEP_PX / FINER
    frequency = np.fft.rfftfreq(2 * FINER * (places - 1), part)
    passes = np.sinc(frequency) * np.exp(-2 * (np.pi * frequency * blur_px) ** 2)
    # Row by row, the place whose distance from that row's edge is the column's.
    column = FINER * np.abs(np.arange(places) - (ROWS - 1 - np.arange(ROWS))[:, None] * steps)

    def spectrum(sharp: NDArray[np.float64]) -> NDArray[np.complex128]:
        # Even about the yarn's middle: the mirrored half stands at the end of the period.
        return np.fft.rfft(np.concatenate([sharp, sharp[:, -2:0:-1]], axis=1), axis=1)

    def tabulated(transform: NDArray[np.complex128]) -> NDArray[np.float64]:
        return np.take_along_axis(np.fft.irfft(transform, axis=1), column, axis=1)

    inside, thick = _body(half, places, yarn.roundness)
    _, rounder = _body(half, places, yarn.roundness + NUDGE)
    dense = (half / yarn.half_px)[:, None] * thick
    passed = inside * np.exp(-yarn.depth * dense)
    here = spectrum(inside - passed) * passes
    by_roundness = (
        passed * (yarn.depth / NUDGE) * (half / yarn.half_px)[:, None] * (rounder - thick)
    )
    layers = (
        here,
        here * (-4 * np.pi**2 * blur_px * frequency**2),
        spectrum(passed * dense) * passes,
        spectrum(by_roundness) * passes,
    )
    table = np.stack([tabulated(layer) for layer in layers], axis=-1)
    return Shadow(table.reshape(-1, 4).astype(np.float32), places, float(half[1]))


def _body(
    half: NDArray[np.float64], places: int, roundness: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Share of each part that the yarn covers, and its thickness there (1 in the middle)."""
    part = STEP_PX / FINER
    offset = np.arange(FINER * (places - 1) + 1) * part
    wide = np.maximum(half, 1e-6)[:, None]
    inside = np.clip((wide - offset) / part + 0.5, 0, 1)
    # Taken at the middle of what the yarn covers of each part.
    across = np.minimum(offset / wide, np.maximum(1 - inside * part / (2 * wide), 0))
    return inside, (1 - across ** (1 / roundness)) ** roundness


__all__ = ["Shadow", "Yarn", "cast"]
