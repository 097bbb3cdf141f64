"""Pictures that are periodic or look like cloth and are not woven: none may be counted."""

from __future__ import annotations

import math
from collections.abc import Callable

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom import knits, surfaces
from imgcover.loom.camera import CameraSpec, Stored, expose
from imgcover.loom.noise import Rng

Floats = NDArray[np.float32]
Pattern = Callable[[Rng, Floats, Floats], Floats]

PATTERNS: dict[str, Pattern] = {
    "jersey knit": knits.jersey,
    "rib knit": knits.rib,
    "purl knit": knits.purl,
    "moss knit": knits.moss,
    "net": knits.net,
    "lace": knits.lace,
    "nonwoven": knits.nonwoven,
    "spunbond": knits.spunbond,
    "felt": knits.felt,
    "terry": knits.terry,
    "fleece": knits.fleece,
    "paper": surfaces.paper,
    "laid paper": surfaces.laid_paper,
    "gravel": surfaces.gravel,
    "leather": surfaces.leather,
    "brick": surfaces.brick,
    "tiles": surfaces.tiles,
    "text": surfaces.text,
    "stripes": surfaces.stripes,
    "corrugated": surfaces.corrugated,
    "white noise": surfaces.white_noise,
    "cloudy noise": surfaces.cloudy_noise,
    "blank": surfaces.blank,
    "gradient": surfaces.gradient,
    "screen": surfaces.screen,
    "dots": surfaces.dots,
    "perforated": surfaces.perforated,
    "halftone": surfaces.halftone,
    "checkerboard": surfaces.checkerboard,
    "wood": surfaces.wood,
    "bark": surfaces.bark,
    "pickets": surfaces.pickets,
    "foliage": surfaces.foliage,
    "scales": surfaces.scales,
    "water": surfaces.water,
}
"""Each takes a generator and the places of the pixels, turned, and gives linear light 0…1."""


def draw_pattern(name: str, rng: Rng, *, width: int = 600, height: int = 600) -> Stored:
    """Draw a picture that is not of woven cloth, as a camera would see it.

    Parameters
    ----------
    name : str
        A key of `PATTERNS`.

    Returns
    -------
    ndarray, shape (height, width), uint8
        Stored values, sRGB.

    Raises
    ------
    ValueError
        When no pattern is called so.
    """
    if name not in PATTERNS:
        raise ValueError(f"name must be one of {', '.join(PATTERNS)}, got {name!r}")
    turn = float(rng.normal(0, math.radians(2)))
    across, down = np.meshgrid(
        np.arange(width, dtype=np.float32), np.arange(height, dtype=np.float32)
    )
    x = across * np.float32(math.cos(turn)) + down * np.float32(math.sin(turn))
    y = down * np.float32(math.cos(turn)) - across * np.float32(math.sin(turn))
    light = PATTERNS[name](rng, x, y)
    camera = CameraSpec(
        px_per_mm=10.0,
        light="reflected",
        blur_px=float(rng.uniform(0.4, 1.2)),
        exposure=float(rng.uniform(0.7, 1.0)),
        falloff=float(rng.uniform(0, 0.25)),
        tilt=float(rng.uniform(-0.2, 0.2)),
        read_noise=float(rng.uniform(0.001, 0.008)),
        sharpening=float(rng.choice([0.0, 0.0, 1.0])),
        jpeg=[None, None, 85, 60][int(rng.integers(4))],
    )
    return expose(_through_lens(light, camera), camera, rng)


def _through_lens(light: Floats, camera: CameraSpec) -> Floats:
    """Blur as the lens does."""
    return np.asarray(cv2.GaussianBlur(light, (0, 0), camera.blur_px), dtype=np.float32)


__all__ = ["PATTERNS", "draw_pattern"]
