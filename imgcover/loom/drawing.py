"""Draws a cloth as a camera sees it, and counts what was drawn."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.camera import CameraSpec, Frame, Stored, expose
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.counting import Lines, Met, count
from imgcover.loom.crossing import cross, nearest
from imgcover.loom.dressing import Loom, dress
from imgcover.loom.edges import Extent, creased, stained
from imgcover.loom.hairs import comb
from imgcover.loom.noise import Rng
from imgcover.loom.shading import HAIR_PASSES, reflected, surface, through
from imgcover.loom.truth import Tally, Truth

Floats = NDArray[np.float32]

FINE_A_PITCH = 24
"""Fine points across a thread pitch, at least: edges fade over one point, and the covered share
is then true to 0.02 points (tests/loom/test_loom_truth.py)."""
BAND_POINTS = 4_000_000
"""Fine points drawn at once: about 0.5 GB with everything that is known of each."""
STRIP_POINTS = 200_000
"""Fine points worked on at once: their arrays stay in the processor's cache."""


@dataclass(frozen=True, slots=True, eq=False)
class Drawn:
    """A picture and what it really shows.

    Parameters
    ----------
    stored : ndarray, shape (rows, columns) or (rows, columns, 3) RGB, uint8 or uint16
        As a file would hold it.
    truth : Truth
        Counted from the fine drawing.
    lines : tuple of Lines
        The lines that counted the ends, and those that counted the picks.
    """

    stored: Stored
    truth: Truth
    lines: tuple[Lines, Lines]

    def within(self, mask: NDArray[np.bool_]) -> tuple[float, float]:
        """Count ends and picks per mm in a part of the picture.

        Parameters
        ----------
        mask : ndarray, shape (rows, columns), bool
            The part; threads are counted from the first to the last that a line meets in it.
        """
        ends, picks = (count(each.within(mask)) for each in self.lines)
        return ends.per_mm, picks.per_mm


@dataclass(frozen=True, slots=True)
class Grid:
    """Fine points of one band, a halo included: their places in pixels and mm."""

    column: NDArray[np.float64]
    row: NDArray[np.float64]
    x_mm: NDArray[np.float64]
    y_mm: NDArray[np.float64]


def draw(
    cloth: ClothSpec,
    camera: CameraSpec,
    width: int,
    height: int,
    rng: Rng,
    *,
    fineness: int | None = None,
) -> Drawn:
    """Draw a cloth before a camera.

    Parameters
    ----------
    width, height : int
        Pixels of the picture.
    rng : numpy.random.Generator
        All randomness comes from it: the same state gives the same picture.
    fineness : int or None
        Fine points a pixel in each direction; None chooses by the threads' size.

    Returns
    -------
    Drawn
        The stored picture and the counted truth.
    """
    frame = Frame(width, height, camera)
    loom = dress(rng, cloth, frame)
    s = fineness or _fineness(cloth, camera)
    tally, met = Tally(), Met(loom, s)
    light = np.empty((height, width, 3 if camera.colour else 1), dtype=np.float32)
    for first, last in _bands(frame, s):
        light[first:last] = _band(loom, s, first, last, tally, met)
    seen = light if camera.colour else light[..., 0]
    lines = met.lines(loom)
    return Drawn(expose(seen, camera, rng), _truth(loom, s, tally, lines), lines)


def _fineness(cloth: ClothSpec, camera: CameraSpec) -> int:
    """Choose how many fine points a pixel gets in each direction."""
    per_mm = min(camera.px_per_mm, camera.y_per_mm)
    pitch_px = per_mm / max(cloth.ends_per_mm, cloth.picks_per_mm)
    return min(max(math.ceil(FINE_A_PITCH / pitch_px), 2), 8)


def _halo(camera: CameraSpec) -> int:
    """Pixels drawn beyond a band, for the lens to blur."""
    return math.ceil(4 * camera.blur_px) + 1 if camera.blur_px > 0 else 0


def _bands(frame: Frame, s: int) -> Iterator[tuple[int, int]]:
    """Split the picture into bands of rows that fit the memory."""
    rows = max(16, BAND_POINTS // (s * s * frame.width))
    for first in range(0, frame.height, rows):
        yield first, min(frame.height, first + rows)


def _band(loom: Loom, s: int, first: int, last: int, tally: Tally, met: Met) -> Floats:
    """Draw the rows first … last of the picture: (rows, columns, channels) of light."""
    frame, camera = loom.frame, loom.frame.camera
    halo = _halo(camera)
    column = (np.arange(-halo * s, (frame.width + halo) * s) + 0.5) / s - 0.5
    row = (np.arange((first - halo) * s, (last + halo) * s) + 0.5) / s - 0.5
    strip = max(1, STRIP_POINTS // column.size)
    fine = np.concatenate(
        [
            _strip(
                loom,
                s,
                Grid(column, part, frame.x_mm(column), frame.y_mm(part)),
                first,
                last,
                tally,
                met,
            )
            for part in (row[k : k + strip] for k in range(0, row.size, strip))
        ]
    )
    if halo:
        sigma = camera.blur_px * s
        fine = cv2.GaussianBlur(fine, (0, 0), sigma, borderType=cv2.BORDER_REPLICATE)
        fine = fine.reshape(row.size, column.size, -1)[halo * s : -halo * s, halo * s : -halo * s]
    blocks = fine.reshape(last - first, s, frame.width, s, -1)
    return np.asarray(blocks.mean(axis=(1, 3)), dtype=np.float32)


def _strip(loom: Loom, s: int, grid: Grid, first: int, last: int, tally: Tally, met: Met) -> Floats:
    """Draw some fine rows, and count those that belong to the band itself."""
    frame, cloth, camera = loom.frame, loom.cloth, loom.frame.camera
    u = frame.across_ends(grid.x_mm, grid.y_mm) + loom.stray_ends.on(grid.x_mm, grid.y_mm)
    v = frame.across_picks(grid.x_mm, grid.y_mm) + loom.stray_picks.on(grid.x_mm, grid.y_mm)
    fine_mm = 1 / (s * math.sqrt(camera.px_per_mm * camera.y_per_mm))
    end = nearest(loom.warp, u, v, fine_mm=fine_mm)
    pick = nearest(loom.weft, v, u, fine_mm=fine_mm)
    point_mm = (1 / (s * camera.px_per_mm), 1 / (s * camera.y_per_mm))
    hidden = comb(loom.hairs, grid.x_mm, grid.y_mm, point_mm=point_mm)
    halo = (grid.column.size // s - frame.width) // 2
    own = (grid.row > first - 0.5) & (grid.row < last - 0.5)
    if own.any():
        keep = np.s_[own, halo * s : grid.column.size - halo * s]
        inside = _inside(loom.swatch.inset(cloth), u[keep], v[keep])
        shown = hidden if isinstance(hidden, float) else hidden[keep]
        tally.add(end.covered[keep], pick.covered[keep], shown, inside)
        # threads lie side by side up to the cut edge; only their tips fray
        beside = (loom.swatch.inset(cloth, ends=False), loom.swatch.inset(cloth, picks=False))
        with_ends, with_picks = (_inside(each, u[keep], v[keep]) for each in beside)
        met.add((end, with_ends), (pick, with_picks), own, halo * s)
    textures = (
        surface(loom.fibres, end, v, cloth.end_diameter_mm),
        surface(loom.fibres, pick, u, cloth.pick_diameter_mm),
    )
    dirt = stained(cloth.faults, frame, grid.x_mm, grid.y_mm)
    backlit = camera.light == "backlit"
    fold = creased(cloth.faults, frame, grid.x_mm, grid.y_mm, backlit=backlit)
    if backlit:
        passed = through(cloth, (end, pick), (loom.warp, loom.weft), textures, dirt)
        light = _tinted(loom, passed * (1 - (1 - HAIR_PASSES) * hidden), passed)
        bare = (1 - end.covered) * (1 - pick.covered)
        return light * np.asarray(bare + (1 - bare) * fold, dtype=np.float32)[..., None]
    at = cross(end, pick, loom.woven)
    parts = reflected(cloth, at, loom.warp, loom.weft, textures, dirt, bed=camera.bed)
    return _mixed(loom, parts, hidden) * np.asarray(fold, dtype=np.float32)[..., None]


def _tinted(loom: Loom, light: Floats, passed: Floats) -> Floats:
    """Colour what came through the yarn by the mean of both tints; bare light stays white."""
    if not loom.frame.camera.colour:
        return light[..., None]
    tint = 0.5 * (np.asarray(loom.cloth.end_tint) + np.asarray(loom.cloth.pick_tint))
    through_yarn = (1 - passed)[..., None] * (1 - tint.astype(np.float32))
    return np.asarray(light[..., None] * (1 - 0.5 * through_yarn), dtype=np.float32)


def _mixed(loom: Loom, parts: tuple[Floats, Floats, Floats], hidden: Floats | float) -> Floats:
    """Add up what ends, picks and bed send back; a hair is as light as its cloth."""
    cloth = loom.cloth
    hair = 0.5 * (float(np.mean(cloth.end_lightness)) + float(np.mean(cloth.pick_lightness)))
    end, pick, bed = parts
    if not loom.frame.camera.colour:
        light = end + pick + bed
        return np.asarray(light + hidden * (np.float32(hair) - light))[..., None]
    warm, cold = (np.asarray(each, dtype=np.float32) for each in (cloth.end_tint, cloth.pick_tint))
    light = end[..., None] * warm + pick[..., None] * cold + bed[..., None]
    veil = hidden if isinstance(hidden, float) else hidden[..., None]
    return np.asarray(light + veil * (np.float32(hair) * 0.5 * (warm + cold) - light))


def _inside(rim: Extent, u: Floats, v: Floats) -> Floats:
    """Say which points lie inside a rim: 1 there, else 0."""
    good = (u > rim.ends_from) & (u < rim.ends_to) & (v > rim.picks_from) & (v < rim.picks_to)
    return good.astype(np.float32)


def _truth(loom: Loom, s: int, tally: Tally, lines: tuple[Lines, Lines]) -> Truth:
    """Count what was drawn."""
    camera = loom.frame.camera
    ends, picks = (count(each) for each in lines)
    area = max(tally.area, 1.0)
    warp, weft = tally.warp / area, tally.weft / area
    point_mm2 = 1 / (s * s * camera.px_per_mm * camera.y_per_mm)
    number, pore, largest = tally.pores(point_mm2)
    turn = _half_turn(math.degrees(ends.direction) - 90)
    return Truth(
        ends=ends.per_mm,
        picks=picks.per_mm,
        ends_counted=ends.gaps,
        picks_counted=picks.gaps,
        pixels_per_end=ends.pixels,
        pixels_per_pick=picks.pixels,
        angle=turn,
        skew=_half_turn(math.degrees(picks.direction) - turn),
        bow=picks.bow,
        cover=tally.covered / area,
        cover_with_hairs=tally.with_hairs / area,
        warp_cover=warp,
        weft_cover=weft,
        open_width=(1 - warp) / ends.per_mm,
        open_height=(1 - weft) / picks.per_mm,
        pores_per_cm2=number,
        pore_area=pore,
        largest_pore=largest,
        corners=_corners(loom),
    )


def _half_turn(degrees: float) -> float:
    """Bring the direction of a line into −90 … 90 degrees, 90 included."""
    return 90 - (90 - degrees) % 180


def _corners(loom: Loom) -> tuple[tuple[float, float], ...]:
    """Give the counted cloth's corners in pixels, clockwise; the frame's where it goes on."""
    frame, camera = loom.frame, loom.frame.camera
    rim = loom.swatch.inset(loom.cloth)
    reach = frame.reach_mm()
    turn, skewed = (
        math.radians(camera.rotation_deg),
        math.radians(camera.rotation_deg + camera.skew_deg),
    )
    axes = np.array([[math.cos(turn), math.sin(turn)], [-math.sin(skewed), math.cos(skewed)]])
    u = np.clip([rim.ends_from, rim.ends_to], -reach[0], reach[0])
    v = np.clip([rim.picks_from, rim.picks_to], -reach[1], reach[1])
    on_cloth = np.array([[u[0], v[0]], [u[1], v[0]], [u[1], v[1]], [u[0], v[1]]])
    shown = on_cloth @ np.linalg.inv(axes).T * [camera.px_per_mm, camera.y_per_mm]
    middle = np.array([(frame.width - 1) / 2, (frame.height - 1) / 2])
    return tuple((float(x), float(y)) for x, y in shown + middle)


__all__ = ["Drawn", "draw"]
