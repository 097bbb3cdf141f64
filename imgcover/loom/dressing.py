"""Dresses the loom: everything random about one cloth, drawn once before any picture is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.loom.camera import Frame
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.crossing import Interlacing, interlace
from imgcover.loom.edges import Extent, cut, extent, harm
from imgcover.loom.hairs import grow
from imgcover.loom.noise import Rng, SlowField
from imgcover.loom.sett import Plan, System, lay
from imgcover.loom.shading import Fibres, spin
from imgcover.weave import weave

SLOW_PITCHES = 14.0
"""Threads over which the common straying changes: slower than any weave repeat."""
BEYOND_PITCHES = 6.0
"""Cloth laid beyond the frame, so that blur and straying never meet its end."""


@dataclass(frozen=True, slots=True)
class Loom:
    """A dressed loom: the cloth's tables, before a camera."""

    cloth: ClothSpec
    frame: Frame
    warp: System
    weft: System
    woven: Interlacing
    fibres: Fibres
    stray_ends: SlowField
    stray_picks: SlowField
    hairs: NDArray[np.float32]
    swatch: Extent


def dress(rng: Rng, cloth: ClothSpec, frame: Frame) -> Loom:
    """Lay the threads, interlace them, cut the swatch and put the faults in."""
    pattern = weave(cloth.weave)
    swatch = extent(frame, cloth)
    end_pitch, pick_pitch = 1 / cloth.ends_per_mm, 1 / cloth.picks_per_mm
    reach = frame.reach_mm()
    across = reach[0] + BEYOND_PITCHES * end_pitch
    down = reach[1] + BEYOND_PITCHES * pick_pitch
    dense = swatch.ends_from + cloth.selvedge_mm if cloth.selvedge_mm > 0 else None
    warp = lay(
        rng,
        Plan(
            cloth.ends_per_mm,
            cloth.end_diameter_mm,
            cloth.picks_per_mm,
            (-across, across),
            (-down, down),
            cloth.reed,
            cloth.reed_gap,
            cloth.spacing_cv,
            cloth.diameter_cv,
            0.3 * cloth.wander,
            cloth.waviness,
            pattern.picks_repeat,
            cloth.end_lightness,
            dense,
        ),
    )
    weft = lay(
        rng,
        Plan(
            cloth.picks_per_mm,
            cloth.pick_diameter_mm,
            cloth.ends_per_mm,
            (-down, down),
            (-across, across),
            cloth.paired_picks,
            cloth.pair_gap,
            cloth.spacing_cv,
            cloth.diameter_cv,
            0.3 * cloth.wander,
            cloth.waviness,
            pattern.ends_repeat,
            cloth.pick_lightness,
        ),
    )
    selvedge = cloth.selvedge_mm > 0
    sides, stops = (swatch.ends_from, swatch.ends_to), (swatch.picks_from, swatch.picks_to)
    cut(rng, warp, sides=sides, stops=stops, crossing_mm=pick_pitch, selvedge=False)
    cut(rng, weft, sides=stops, stops=sides, crossing_mm=end_pitch, selvedge=selvedge)
    for fault in cloth.faults:
        harm(fault, frame, warp, weft)
    return Loom(
        cloth=cloth,
        frame=frame,
        warp=warp,
        weft=weft,
        woven=interlace(
            rng,
            pattern,
            ends=warp.place.shape[0],
            picks=weft.place.shape[0],
            float_cv=cloth.float_cv,
        ),
        fibres=spin(rng),
        stray_ends=_straying(rng, cloth.wander * end_pitch, end_pitch, frame),
        stray_picks=_straying(rng, cloth.wander * pick_pitch, pick_pitch, frame),
        hairs=grow(rng, cloth, frame, warp, weft),
        swatch=swatch,
    )


def _straying(rng: Rng, rms_mm: float, pitch_mm: float, frame: Frame) -> SlowField:
    """Let all threads of a system stray together and slowly."""
    return SlowField(
        rng, frame.width_mm, frame.height_mm, length_mm=SLOW_PITCHES * pitch_mm, rms=rms_mm
    )


__all__ = ["Loom", "dress"]
