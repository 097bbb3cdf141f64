"""What light leaves each fine point: through the cloth, or back from its face."""

from __future__ import annotations

from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.cloth import ClothSpec
from imgcover.loom.crossing import Crossing, Nearest
from imgcover.loom.noise import Rng, over_field
from imgcover.loom.sett import System

Floats = NDArray[np.float32]

TILE = 256
"""Side of the fibre pattern that wraps, in samples."""
FIBRES_A_DIAMETER = 7.0
"""Fibres that one sees side by side on a yarn: enough to slant, few enough to be resolved."""
SLANT = 0.45
"""Tangent of the angle of the surface fibres to the yarn: about 24°, an ordinary twist."""
LIGHT_FROM = (-0.35, -0.45, 0.82)
"""Direction of the lamp: across the ends, across the picks, towards the camera."""
AMBIENT = 0.45
"""Share of the light that comes from everywhere: cloth scatters light into its own hollows."""
DEEPEST = 0.5
"""Brightness of the lowest thread next to the highest: the threads above shade it."""
HAIR_PASSES = 0.55
"""Transmittance of a single fibre in front of the light."""


@dataclass(frozen=True, slots=True)
class Fibres:
    """A pattern of fibres that wraps, laid slanting on every yarn: mean 0, sd 1."""

    tile: Floats


def spin(rng: Rng) -> Fibres:
    """Make the fibre pattern: long one way, fine the other, with a few coarse ones."""
    white = rng.standard_normal((TILE, TILE), dtype=np.float32)
    fine = cv2.GaussianBlur(white, (0, 0), sigmaX=14.0, sigmaY=1.6, borderType=cv2.BORDER_REFLECT)
    broad = over_field(rng, (TILE, TILE), length=6.0)
    return Fibres(np.asarray(fine / fine.std() * 0.85 + broad * 0.5, dtype=np.float32))


def surface(fibres: Fibres, thread: Nearest, along: Floats, diameter_mm: float) -> Floats:
    """Look the fibre pattern up on each yarn, turned by the twist, never the same twice."""
    samples = np.float32(4 * FIBRES_A_DIAMETER)
    run = along * np.float32(samples / diameter_mm)
    side = thread.across * (samples / 2)
    own = thread.thread.astype(np.float32)
    x = run + side * np.float32(SLANT) + own * np.float32(97.3)
    y = side - run * np.float32(SLANT) + own * np.float32(41.7)
    for each in (x, y):
        each -= np.float32(TILE) * np.floor(each * np.float32(1 / TILE))
    seen = cv2.remap(fibres.tile, x, y, cv2.INTER_LINEAR, borderMode=cv2.BORDER_WRAP)
    return np.asarray(seen, dtype=np.float32)


def through(
    cloth: ClothSpec,
    threads: tuple[Nearest, Nearest],
    systems: tuple[System, System],
    textures: tuple[Floats, Floats],
    stain: Floats | float,
) -> Floats:
    """Let light through: each yarn passes tau ** (its thickness), a crossing the product.

    Returns
    -------
    ndarray, float32
        Transmittance 0…1.
    """
    section = _section(cloth.section)
    passed = np.float32(1)
    darker = np.float32(np.log(cloth.tau)) * (1 + stain)
    for thread, system, texture in zip(threads, systems, textures, strict=True):
        depth = np.take(section, (np.abs(thread.across) * (section.size - 1)).astype(np.int32))
        depth *= thread.half * np.float32(1 / system.half_mm)
        depth *= 1 + np.float32(0.4 * cloth.twist) * texture
        passed = passed * (1 - thread.covered * (1 - np.exp(darker * np.maximum(depth, 0))))
    return np.asarray(passed, dtype=np.float32)


def _section(exponent: float) -> Floats:
    """Tabulate the thickness of a superellipse from its middle to its edge."""
    across = np.linspace(0, 1, 2049)
    return np.asarray((1 - across**exponent) ** (1 / exponent), dtype=np.float32)


def reflected(
    cloth: ClothSpec,
    at: Crossing,
    warp: System,
    weft: System,
    textures: tuple[Floats, Floats],
    stain: Floats | float,
    *,
    bed: float,
) -> tuple[Floats, Floats, Floats]:
    """Send light back from the upper thread, shaded by its roundness, slope and depth.

    Returns
    -------
    tuple of three ndarrays, float32
        Light 0…1 from the ends, from the picks, and from the bed behind.
    """
    crimp = 0.5 * (warp.half_mm + weft.half_mm)
    end = _face(at.end, at.end_height, at.end_slope * np.float32(crimp * cloth.picks_per_mm), crimp)
    pick = _face(
        at.pick, at.pick_height, at.pick_slope * np.float32(crimp * cloth.ends_per_mm), crimp
    )
    top = crimp * 2.5
    end_light = _shade(end, (0, 1), top) * _own(cloth, at.end, warp, textures[0], at.end_height)
    pick_light = _shade(pick, (1, 0), top) * _own(cloth, at.pick, weft, textures[1], at.pick_height)
    end_above = (end.z > pick.z).astype(np.float32)
    end_share = at.end.covered * (1 - at.pick.covered * (1 - end_above))
    pick_share = at.pick.covered * (1 - at.end.covered * end_above)
    open_share = (1 - at.end.covered) * (1 - at.pick.covered)
    clean = 1 - np.minimum(stain, 1) * np.float32(0.8)
    return (
        end_share * end_light * clean,
        pick_share * pick_light * clean,
        open_share * np.float32(bed * 0.8),
    )


@dataclass(frozen=True, slots=True)
class Face:
    """The visible side of a thread: height of the surface, and its normal."""

    z: Floats
    sideways: Floats
    upward: Floats
    slope: Floats


def _face(thread: Nearest, height: Floats, slope: Floats, crimp_mm: float) -> Face:
    """Round the yarn over its centre line."""
    upward = np.sqrt(np.maximum(1 - thread.across * thread.across, 0))
    there = thread.covered > 0
    z = np.where(there, height * np.float32(crimp_mm) + thread.half * upward, np.float32(-9))
    return Face(z, thread.across, upward, slope)


def _shade(face: Face, axes: tuple[int, int], top_mm: float) -> Floats:
    """Light a face by the lamp and the surroundings, dimmer the deeper it lies."""
    lamp_side, lamp_along, lamp_up = LIGHT_FROM[axes[0]], LIGHT_FROM[axes[1]], LIGHT_FROM[2]
    facing = (
        face.upward * (np.float32(lamp_up) - np.float32(lamp_along) * face.slope)
        + face.sideways * np.float32(lamp_side)
    ) / np.sqrt(1 + (face.upward * face.slope) ** 2)
    lit = AMBIENT + (1 - AMBIENT) * np.maximum(facing, 0)
    depth = np.clip((face.z + np.float32(top_mm)) * np.float32(0.5 / top_mm), 0, 1)
    return np.asarray(lit * (DEEPEST + (1 - DEEPEST) * depth), dtype=np.float32)


def _own(
    cloth: ClothSpec, thread: Nearest, system: System, texture: Floats, height: Floats
) -> Floats:
    """Give each thread its own reflectance, with fibres, brighter on a float that stands out."""
    shade = np.take(system.lightness, thread.thread, mode="clip")
    fibre = np.maximum(1 + np.float32(0.5 * cloth.twist) * texture, np.float32(0.1))
    return np.asarray(shade * fibre * (1 + np.float32(0.25) * (np.abs(height) - 1)))


__all__ = ["HAIR_PASSES", "Fibres", "reflected", "spin", "surface", "through"]
