"""Fibre ends that stick out of the yarns."""

from __future__ import annotations

import math

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.camera import Frame
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.noise import Rng
from imgcover.loom.sett import System

FIBRE_MM = 0.015
"""Width of a cotton fibre; other staple fibres lie within a factor of two."""
JOINTS = 7
"""Points of the polyline that stands for a bent fibre."""
SUBPIXEL = 4
"""Binary digits of a fine point that a joint is placed to."""

RIM = 16
"""Points drawn beyond the grid: a line cut at the rim of a picture is drawn a little otherwise."""


def grow(
    rng: Rng, cloth: ClothSpec, frame: Frame, warp: System, weft: System
) -> NDArray[np.float32]:
    """Let hairs grow from the edges of the yarns.

    Returns
    -------
    ndarray, shape (hairs, joints, 2), float32
        x and y of each joint, mm from the middle of the frame; sorted down the frame.
    """
    area = frame.width_mm * frame.height_mm
    runs = [
        _from_system(rng, warp, round(cloth.hairs_per_mm * cloth.ends_per_mm * area), frame),
        _from_system(rng, weft, round(cloth.hairs_per_mm * cloth.picks_per_mm * area), frame),
    ]
    turn, skewed = (
        math.radians(frame.camera.rotation_deg),
        math.radians(frame.camera.rotation_deg + frame.camera.skew_deg),
    )
    axes = np.array([[math.cos(turn), math.sin(turn)], [-math.sin(skewed), math.cos(skewed)]])
    on_cloth = np.concatenate([runs[0], runs[1][..., ::-1]])
    shown = on_cloth @ np.linalg.inv(axes).T
    return np.asarray(shown[np.argsort(shown[:, 0, 1])], dtype=np.float32)


def _from_system(rng: Rng, system: System, count: int, frame: Frame) -> NDArray[np.float64]:
    """Grow hairs from one system: (hairs, joints, 2), across and along its threads."""
    reach = 0.5 * math.hypot(frame.width_mm, frame.height_mm)
    inside = np.abs(system.place[:, 0, 0]) < reach
    thread = rng.choice(np.flatnonzero(inside), count)
    node = rng.integers(0, system.place.shape[1], count)
    place = system.place[thread, node].astype(np.float64)
    side = rng.choice([-1.0, 1.0], count)
    root = np.stack(
        [place[:, 0] + side * place[:, 1] * 0.8, system.start_mm + node * system.node_mm], axis=1
    )
    length = rng.gamma(2.0, 0.18, count) * (place[:, 1] > 0)
    heading = np.arctan2(rng.normal(0, 1.0, count), side * rng.uniform(0.15, 1.0, count))
    bend = rng.normal(0, 1.2, count)
    run = np.linspace(0, 1, JOINTS)
    angle = heading[:, None] + bend[:, None] * run[None, :] ** 2
    step = (length / (JOINTS - 1))[:, None]
    across = root[:, :1] + np.cumsum(np.cos(angle) * step, axis=1)
    along = root[:, 1:] + np.cumsum(np.sin(angle) * step, axis=1)
    return np.stack([across, along], axis=2)


def comb(
    hairs: NDArray[np.float32],
    x_mm: NDArray[np.float64],
    y_mm: NDArray[np.float64],
    *,
    point_mm: tuple[float, float],
) -> NDArray[np.float32] | float:
    """Draw the hairs on a regular grid y × x.

    Parameters
    ----------
    point_mm : tuple of float
        Width and height of a point of the grid.

    Returns
    -------
    ndarray, shape (rows, columns), float32, or 0.0 where there are none
        Share of each point that a hair hides, 0…1.
    """
    margin = 2.0  # mm: longer than nearly every hair
    first, last = np.searchsorted(hairs[:, 0, 1], [y_mm[0] - margin, y_mm[-1] + margin])
    if first == last:
        return 0.0
    fine_mm = np.array(point_mm)
    width = max(1, round(FIBRE_MM / float(fine_mm.mean())))
    shown = np.zeros((y_mm.size + 2 * RIM, x_mm.size + 2 * RIM), dtype=np.uint8)
    joints = (hairs[first:last] - np.array([x_mm[0], y_mm[0]])) / fine_mm + RIM
    fixed = np.rint(joints * (1 << SUBPIXEL)).astype(np.int32)
    cv2.polylines(shown, list(fixed), False, 255, width, cv2.LINE_AA, SUBPIXEL)
    hidden = min(1.0, FIBRE_MM / (width * float(fine_mm.mean())))
    return shown[RIM:-RIM, RIM:-RIM].astype(np.float32) * np.float32(hidden / 255)


__all__ = ["comb", "grow"]
