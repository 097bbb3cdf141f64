"""Draws lots: which even, honest cloth under which camera comes up next."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import Drawn, draw
from imgcover.loom.noise import Rng
from imgcover.tone import LINEAR, SRGB, Tone

Light = Literal["backlit", "reflected"]

WEAVES = (
    "plain",
    "plain",
    "plain",
    "2/1 twill",
    "1/2 twill",
    "3/1 twill",
    "2/2 twill",
    "2/2 twill s",
    "5-end satin",
    "8-end satin",
    "2/2 herringbone",
    "2/2 hopsack",
    "2/2 warp rib",
    "2/2 weft rib",
)
"""Plain weave thrice: about as often as it is met against the others."""


@dataclass(frozen=True, slots=True)
class Reach:
    """How far the lots reach.

    Parameters
    ----------
    px : tuple of float
        Pixels a thread, of the finer system.
    light : {"backlit", "reflected"} or None
        Either when None.
    turn_deg : float
        Largest turn of the swatch to either side.
    weaves : tuple of str
        Weaves to draw from.
    threads : tuple of float
        Threads of the finer system across the frame.
    frame_px : tuple of int
        Smallest and largest side of the frame.
    tau, blur_px, falloff, glare : tuple of float
        Ranges of the cloth's and camera's own words.
    """

    px: tuple[float, float] = (8.0, 20.0)
    light: Light | None = None
    turn_deg: float = 3.0
    weaves: tuple[str, ...] = WEAVES
    threads: tuple[float, float] = (45.0, 85.0)
    frame_px: tuple[int, int] = (320, 900)
    tau: tuple[float, float] = (0.01, 0.25)
    blur_px: tuple[float, float] = (0.3, 1.2)
    falloff: tuple[float, float] = (0.0, 0.3)
    glare: tuple[float, float] = (0.0, 0.02)


COVER = Reach(px=(5.0, 25.0), light="backlit", blur_px=(0.3, 1.4), glare=(0.0, 0.03))
"""The cloths on which optical cover is held to its tolerance."""


@dataclass(frozen=True, slots=True)
class Case:
    """One lot drawn: its family, the cloth, the camera and the frame in pixels."""

    family: str
    cloth: ClothSpec
    camera: CameraSpec
    width: int
    height: int

    def draw(self, rng: Rng) -> Drawn:
        """Draw the picture."""
        return draw(self.cloth, self.camera, self.width, self.height, rng)


def ordinary(rng: Rng, *, family: str = "ordinary", reach: Reach | None = None) -> Case:
    """Draw even, honest cloth, well seen, to be called by the family's name."""
    reach = reach or Reach()
    light = reach.light or ("backlit" if rng.random() < 0.5 else "reflected")
    ends = float(_evenly_in_log(rng, 1.2, 4.5))
    picks = ends * float(rng.uniform(0.62, 1.12))
    share = (0.32, 0.88) if light == "backlit" else (0.55, 1.0)
    px = float(_evenly_in_log(rng, *reach.px))
    per_mm = px * max(ends, picks)
    side = rng.uniform(*reach.threads) * px
    width = round(min(max(side, reach.frame_px[0]), reach.frame_px[1]))
    height = round(width * rng.uniform(0.75, 1.25))
    tone, bits = _file(rng)
    shade = float(rng.uniform(0.35, 0.85))
    cloth = ClothSpec(
        weave=str(rng.choice(reach.weaves)),
        ends_per_mm=ends,
        picks_per_mm=picks,
        end_diameter_mm=float(rng.uniform(*share)) / ends,
        pick_diameter_mm=float(rng.uniform(*share)) / picks,
        diameter_cv=float(rng.uniform(0.02, 0.16)),
        spacing_cv=float(rng.uniform(0.0, 0.06)),
        wander=float(rng.uniform(0.0, 0.25)),
        waviness=float(rng.uniform(0.0, 0.06)),
        hairs_per_mm=float(rng.uniform(0.0, 1.2)),
        end_lightness=(shade,),
        pick_lightness=(shade * float(rng.uniform(0.85, 1.1)),),
        tau=float(_evenly_in_log(rng, *reach.tau)),
        section=float(rng.uniform(2.0, 5.0)),
        twist=float(rng.uniform(0.1, 0.6)),
        float_cv=float(rng.uniform(0.03, 0.25)),
    )
    camera = CameraSpec(
        px_per_mm=per_mm,
        px_per_mm_y=per_mm * float(1 + rng.uniform(-0.01, 0.01)),
        light=light,
        blur_px=float(rng.uniform(*reach.blur_px)),
        exposure=float(rng.uniform(0.6, 0.95)),
        falloff=float(rng.uniform(*reach.falloff)),
        tilt=float(rng.uniform(-0.2, 0.2)),
        glare=float(rng.uniform(*reach.glare)),
        read_noise=float(rng.uniform(0.0005, 0.004)),
        shot_noise=float(rng.uniform(0.002, 0.012)),
        rotation_deg=float(rng.uniform(-reach.turn_deg, reach.turn_deg)),
        skew_deg=float(rng.uniform(-1.0, 1.0)),
        tone=tone,
        bits=bits,
        bed=float(rng.choice([0.05, 0.15, 0.9])),
    )
    return Case(family, cloth, camera, width, height)


def _evenly_in_log(rng: Rng, low: float, high: float) -> float:
    """Draw evenly in the logarithm."""
    return float(low * (high / low) ** rng.random())


def _file(rng: Rng) -> tuple[Tone, int]:
    """Choose curve and depth as scanners and cameras write them."""
    return [(SRGB, 8), (SRGB, 8), (SRGB, 16), (LINEAR, 16), (Tone("gamma", 2.2), 8)][
        int(rng.integers(5))
    ]


__all__ = ["COVER", "WEAVES", "Case", "Reach", "ordinary"]
