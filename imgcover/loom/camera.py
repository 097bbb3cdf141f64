"""How the cloth is seen: where the frame lies on it, and what lens, light and file make of it."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.noise import Rng
from imgcover.tone import SRGB, Tone

Stored = NDArray[np.uint8] | NDArray[np.uint16]
Floats = NDArray[np.float32]

ROWS = 256
"""Rows of the picture that noise, tone and rounding are applied to at once."""


@dataclass(frozen=True, slots=True)
class CameraSpec:
    """A camera or scanner, and how the swatch lies before it.

    Parameters
    ----------
    px_per_mm : float
        Pixels per mm across the picture.
    px_per_mm_y : float or None
        The same down the picture, when it differs.
    light : {"backlit", "reflected"}
        Which side the light comes from.
    blur_px : float
        Standard deviation of the lens's Gaussian, in pixels.
    exposure : float
        Linear light of bare light table, or of a white surface, at the brightest place.
    falloff : float
        Share of the light lost in the corners.
    tilt : float
        Share of the light lost from the left edge to the right; negative the other way.
    hot_spot : float
        Share by which a quarter of the frame is brighter than the rest.
    glare : float
        Light added everywhere, in shares of the exposure.
    read_noise, shot_noise : float
        Sd of the noise in the dark, and sd at full light from counting photons, in full scales.
    rotation_deg : float
        Turn of the ends from the vertical, clockwise as shown.
    skew_deg : float
        Further clockwise turn of the picks, away from the right angle.
    bow : float
        How far the middle of a pick lies below its ends, in shares of the frame's width.
    tone, bits, jpeg : Tone, int, int or None
        Transfer curve, depth (8 or 16), and JPEG quality of an 8-bit picture.
    sharpening : float
        Strength of the unsharp mask put on the stored values.
    blurred_third, shadowed_third : float
        Blur of the left third, px; share of light lost in the right third.
    margin : tuple of four floats
        Bare bed or light left, above, right and below the swatch, in shares of the frame.
    bed : float
        Reflectance of what lies behind the swatch, in reflected light.
    colour : bool
        Three channels instead of one.
    """

    px_per_mm: float
    px_per_mm_y: float | None = None
    light: Literal["backlit", "reflected"] = "backlit"
    blur_px: float = 0.6
    exposure: float = 0.85
    falloff: float = 0.08
    tilt: float = 0.0
    hot_spot: float = 0.0
    glare: float = 0.0
    read_noise: float = 0.002
    shot_noise: float = 0.006
    rotation_deg: float = 0.0
    skew_deg: float = 0.0
    bow: float = 0.0
    tone: Tone = SRGB
    bits: int = 8
    jpeg: int | None = None
    sharpening: float = 0.0
    blurred_third: float = 0.0
    shadowed_third: float = 0.0
    margin: tuple[float, float, float, float] = (0.0, 0.0, 0.0, 0.0)
    bed: float = 0.15
    colour: bool = False

    def __post_init__(self) -> None:
        if self.bits not in (8, 16):
            raise ValueError(f"bits must be 8 or 16, got {self.bits}")
        if self.jpeg is not None and self.bits != 8:
            raise ValueError("a JPEG picture has 8 bits")
        if self.px_per_mm <= 0 or self.y_per_mm <= 0:
            raise ValueError("px_per_mm must be above zero")

    @property
    def y_per_mm(self) -> float:
        """Pixels per mm down the picture."""
        return self.px_per_mm if self.px_per_mm_y is None else self.px_per_mm_y


@dataclass(frozen=True, slots=True)
class Frame:
    """The picture's frame on the cloth: pixels to distances across the ends and the picks."""

    width: int
    height: int
    camera: CameraSpec

    def x_mm(self, column: NDArray[np.float64]) -> NDArray[np.float64]:
        """Distance from the middle of the frame across the picture."""
        return (column - (self.width - 1) / 2) / self.camera.px_per_mm

    def y_mm(self, row: NDArray[np.float64]) -> NDArray[np.float64]:
        """Distance from the middle of the frame down the picture."""
        return (row - (self.height - 1) / 2) / self.camera.y_per_mm

    @property
    def width_mm(self) -> float:
        """Width of the frame."""
        return self.width / self.camera.px_per_mm

    @property
    def height_mm(self) -> float:
        """Height of the frame."""
        return self.height / self.camera.y_per_mm

    def across_ends(
        self, x_mm: NDArray[np.float64], y_mm: NDArray[np.float64]
    ) -> NDArray[np.float32]:
        """Distance at right angles to the ends, on the grid y × x."""
        turn = math.radians(self.camera.rotation_deg)
        return _outer_sum(y_mm * math.sin(turn), x_mm * math.cos(turn))

    def across_picks(
        self, x_mm: NDArray[np.float64], y_mm: NDArray[np.float64]
    ) -> NDArray[np.float32]:
        """Distance at right angles to the picks, on the grid y × x; bowed picks bend the axis."""
        turn = math.radians(self.camera.rotation_deg + self.camera.skew_deg)
        straight = _outer_sum(y_mm * math.cos(turn), -x_mm * math.sin(turn))
        if self.camera.bow == 0:
            return straight
        share = self.across_ends(x_mm, y_mm) * np.float32(2 / self.width_mm)
        bend = np.float32(self.camera.bow * self.width_mm) * (1 - share * share)
        return np.asarray(straight - bend, dtype=np.float32)

    def reach_mm(self) -> tuple[float, float]:
        """Largest distance from the middle across the ends and across the picks."""
        x = np.array([-0.5, 0.5]) * self.width_mm
        y = np.array([-0.5, 0.5]) * self.height_mm
        bend = abs(self.camera.bow) * self.width_mm * 3
        return (
            float(np.abs(self.across_ends(x, y)).max()),
            float(np.abs(self.across_picks(x, y)).max()) + bend,
        )


def _outer_sum(down: NDArray[np.float64], across: NDArray[np.float64]) -> NDArray[np.float32]:
    """Add a column to a row."""
    return down.astype(np.float32)[:, None] + across.astype(np.float32)[None, :]


def expose(light: NDArray[np.float32], camera: CameraSpec, rng: Rng) -> Stored:
    """Turn what reaches the lens into the stored picture.

    Parameters
    ----------
    light : ndarray, shape (rows, columns) or (rows, columns, 3), float32
        1 is bare light, or a white surface.

    Returns
    -------
    ndarray of the same shape, uint8 or uint16
        The stored values.
    """
    across = np.linspace(-1, 1, light.shape[1], dtype=np.float32)
    down = np.linspace(-1, 1, light.shape[0], dtype=np.float32)
    field = _light_field(camera, down, across)
    field = field if light.ndim == 2 else field[..., None]
    seen = light * field + np.float32(camera.glare * camera.exposure)
    if camera.blurred_third > 0:
        soft = cv2.GaussianBlur(seen, (0, 0), camera.blurred_third)
        share = _third(-across) if light.ndim == 2 else _third(-across)[:, None]
        seen = seen + share * (soft - seen)
    for part in _parts(seen):
        part += _noise(part, camera, rng)
        part[:] = camera.tone.from_linear(np.clip(part, 0, 1))
    if camera.sharpening > 0:
        seen += camera.sharpening * (seen - cv2.GaussianBlur(seen, (0, 0), 1.0))
    if camera.bits == 16:
        deep = np.empty(seen.shape, dtype=np.uint16)
        _count(seen, deep)
        return deep
    eight = np.empty(seen.shape, dtype=np.uint8)
    _count(seen, eight)
    return eight if camera.jpeg is None else _through_jpeg(eight, camera.jpeg)


def bare(camera: CameraSpec, width: int, height: int, rng: Rng, *, lit: bool = True) -> Stored:
    """Expose the light table without cloth: a blank frame; or a dark one, with the light off.

    Glare is light of the room, so it is in the dark frame too.

    Returns
    -------
    ndarray, shape (height, width) or (height, width, 3), uint8 or uint16
        The stored values.
    """
    shape = (height, width, 3) if camera.colour else (height, width)
    return expose(np.full(shape, 1.0 if lit else 0.0, dtype=np.float32), camera, rng)


def _parts(whole: Floats) -> Iterator[Floats]:
    """Go through a picture by some rows at a time: whole scans do not fit in memory many times."""
    for first in range(0, whole.shape[0], ROWS):
        yield whole[first : first + ROWS]


def _count(stored: Floats, counts: Stored) -> None:
    """Round stored values 0…1 to the levels of the file."""
    top = np.iinfo(counts.dtype).max
    for first, part in enumerate(_parts(stored)):
        counts[first * ROWS : (first + 1) * ROWS] = np.rint(np.clip(part, 0, 1) * top)


def _light_field(
    camera: CameraSpec, down: NDArray[np.float32], across: NDArray[np.float32]
) -> NDArray[np.float32]:
    """Spread the light over the frame, brightest place at the exposure; −1…1 both ways."""
    radius = 0.5 * (down[:, None] ** 2 + across[None, :] ** 2)
    field = 1 - np.float32(camera.falloff) * radius
    towards = across if camera.tilt > 0 else -across
    field *= 1 - np.float32(abs(camera.tilt) / 2) * (1 + towards[None, :])
    spot = np.exp(-((down[:, None] + 0.3) ** 2 + (across[None, :] - 0.35) ** 2) / 0.18)
    field *= 1 + np.float32(camera.hot_spot) * spot
    field *= np.float32(camera.exposure / field.max())
    if camera.shadowed_third > 0:
        field *= 1 - np.float32(camera.shadowed_third) * _third(across)
    return field.astype(np.float32)


def _third(across: NDArray[np.float32]) -> NDArray[np.float32]:
    """Rise from 0 to 1 where the right third begins."""
    risen = 1 / (1 + np.exp(-(across - np.float32(1 / 3)) * 30))
    return np.asarray(risen, dtype=np.float32)


def _noise(seen: NDArray[np.float32], camera: CameraSpec, rng: Rng) -> NDArray[np.float32]:
    """Draw read and photon noise for each pixel and channel."""
    spread = np.sqrt(camera.read_noise**2 + camera.shot_noise**2 * np.maximum(seen, 0))
    return np.asarray(rng.standard_normal(seen.shape, dtype=np.float32) * spread, dtype=np.float32)


def _through_jpeg(counts: NDArray[np.uint8], quality: int) -> NDArray[np.uint8]:
    """Store as JPEG and read back: the picture with the file's own losses."""
    shown: NDArray[np.uint8] = np.ascontiguousarray(
        counts if counts.ndim == 2 else counts[..., ::-1]
    )
    _, data = cv2.imencode(".jpg", shown, [cv2.IMWRITE_JPEG_QUALITY, quality])
    back = np.asarray(cv2.imdecode(data, cv2.IMREAD_UNCHANGED), dtype=np.uint8)
    return back if counts.ndim == 2 else np.ascontiguousarray(back[..., ::-1])


__all__ = ["CameraSpec", "Frame", "Stored", "bare", "expose"]
