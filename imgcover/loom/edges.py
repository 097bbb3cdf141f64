"""Where threads end, swell or are missing: cut edges, selvedge and local faults."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.loom.camera import Frame
from imgcover.loom.cloth import ClothSpec, Fault
from imgcover.loom.noise import Rng, along_rows
from imgcover.loom.sett import ABSENT, System

FRAY_PITCHES = 1.5
"""Sd of where threads stop at a cut edge, in pitches of the threads they cross."""
INSET_PITCHES = 4.0
"""Cloth this near to a cut edge is not counted as cloth: it frays."""


@dataclass(frozen=True, slots=True)
class Extent:
    """The swatch on the cloth's own axes, mm from the middle of the frame; ±inf: beyond it.

    `ends_from`, `ends_to` bound it across the ends, `picks_from`, `picks_to` across the picks.
    """

    ends_from: float
    ends_to: float
    picks_from: float
    picks_to: float

    def inset(self, cloth: ClothSpec, *, ends: bool = True, picks: bool = True) -> Extent:
        """Take off the selvedge, and the frayed rim across the ends, across the picks, or both."""
        by_ends = INSET_PITCHES / cloth.ends_per_mm if ends else 0.0
        beside_selvedge = INSET_PITCHES / cloth.ends_per_mm if cloth.selvedge_mm > 0 else by_ends
        by_picks = INSET_PITCHES / cloth.picks_per_mm if picks else 0.0
        return Extent(
            self.ends_from + beside_selvedge + cloth.selvedge_mm,
            self.ends_to - by_ends,
            self.picks_from + by_picks,
            self.picks_to - by_picks,
        )


def extent(frame: Frame, cloth: ClothSpec) -> Extent:
    """Find where the swatch stops, from the margins the camera is to see."""
    left, above, right, below = frame.camera.margin
    half_x, half_y = frame.width_mm / 2, frame.height_mm / 2
    from_left = -half_x if cloth.selvedge_mm > 0 else -np.inf
    return Extent(
        -half_x + 2 * half_x * left if left > 0 else from_left,
        half_x - 2 * half_x * right if right > 0 else np.inf,
        -half_y + 2 * half_y * above if above > 0 else -np.inf,
        half_y - 2 * half_y * below if below > 0 else np.inf,
    )


def cut(
    rng: Rng,
    system: System,
    *,
    sides: tuple[float, float],
    stops: tuple[float, float],
    crossing_mm: float,
    selvedge: bool,
) -> None:
    """Take away what lies outside the swatch, with threads of unequal length at its edge.

    Parameters
    ----------
    sides : tuple of float
        First and last place across the threads.
    stops : tuple of float
        First and last place along the threads.
    crossing_mm : float
        Pitch of the threads that are crossed.
    selvedge : bool
        The threads turn back at their first stop instead of fraying.
    """
    centre = system.place[:, system.place.shape[1] // 2, 0]
    count, nodes = system.place.shape[:2]
    along = system.start_mm + np.arange(nodes) * system.node_mm
    fray = FRAY_PITCHES * crossing_mm
    ragged = fray * (rng.standard_normal((2, count)) + along_rows(rng, (2, count), length=8.0))
    ragged[0] *= 0.15 if selvedge else 1.0
    gone = (along[None, :] < (stops[0] + ragged[0])[:, None]) | (
        along[None, :] > (stops[1] + ragged[1])[:, None]
    )
    gone |= ((centre < sides[0]) | (centre > sides[1]))[:, None]
    system.place[..., 1][gone] = ABSENT * system.half_mm


def harm(fault: Fault, frame: Frame, warp: System, weft: System) -> None:
    """Put a thread fault where it is told: of the nearest end or pick, in the tables."""
    x = np.array([(fault.x - 0.5) * frame.width_mm])
    y = np.array([(fault.y - 0.5) * frame.height_mm])
    u = float(frame.across_ends(x, y)[0, 0])
    v = float(frame.across_picks(x, y)[0, 0])
    match fault.kind:
        case "slub":
            _swell(weft, v, u, fault)
        case "thick end":
            _thread(warp, u)[:, 1] *= fault.strength
        case "missing end":
            _thread(warp, u)[:, 1] = ABSENT * warp.half_mm
        case "missing pick":
            _thread(weft, v)[:, 1] = ABSENT * weft.half_mm
        case "broken end":
            near = np.abs(_along(warp) - v) < fault.size_mm / 2
            _thread(warp, u)[near, 1] = ABSENT * warp.half_mm
        case "stain" | "crease":
            pass  # these are of the light, not of a thread: see `stained` and `creased`


def _thread(system: System, across_mm: float) -> NDArray[np.float32]:
    """Give the table of the thread nearest to a place: shape (nodes, 2)."""
    centre = system.place[:, system.place.shape[1] // 2, 0]
    table: NDArray[np.float32] = system.place[int(np.argmin(np.abs(centre - across_mm)))]
    return table


def _along(system: System) -> NDArray[np.float64]:
    """Give the nodes' places along the threads."""
    return np.asarray(system.start_mm + np.arange(system.place.shape[1]) * system.node_mm)


def _swell(system: System, across_mm: float, along_mm: float, fault: Fault) -> None:
    """Thicken a thread like a spindle."""
    bump = np.exp(-0.5 * ((_along(system) - along_mm) / (fault.size_mm / 2.5)) ** 2)
    _thread(system, across_mm)[:, 1] *= 1 + (fault.strength - 1) * bump.astype(np.float32)


def stained(
    faults: tuple[Fault, ...], frame: Frame, x_mm: NDArray[np.float64], y_mm: NDArray[np.float64]
) -> NDArray[np.float32] | float:
    """Give how much dirt lies at each point of the grid y × x, 0…1."""
    total: NDArray[np.float32] | float = 0.0
    for fault in faults:
        if fault.kind == "stain":
            across = (x_mm - (fault.x - 0.5) * frame.width_mm) / fault.size_mm
            down = (y_mm - (fault.y - 0.5) * frame.height_mm) / fault.size_mm
            blob = fault.strength * np.exp(-0.5 * down**4)[:, None] * np.exp(-0.5 * across**4)
            total = total + blob.astype(np.float32)
    return total


def creased(
    faults: tuple[Fault, ...],
    frame: Frame,
    x_mm: NDArray[np.float64],
    y_mm: NDArray[np.float64],
    *,
    backlit: bool,
) -> NDArray[np.float32] | float:
    """Give the factor by which creases change the light at each point of the grid y × x.

    Backlit cloth is darker where it stands up; in reflected light one flank is brighter.
    """
    total: NDArray[np.float32] | float = 1.0
    for fault in faults:
        if fault.kind == "crease":
            lean = 0.35  # a crease follows no thread exactly
            across = (x_mm - (fault.x - 0.5) * frame.width_mm).astype(np.float32)
            down = (y_mm - (fault.y - 0.5) * frame.height_mm).astype(np.float32)
            off = (across[None, :] + np.float32(lean) * down[:, None]) / np.float32(fault.size_mm)
            hill = np.exp(-(off**2))
            bend = -hill if backlit else 1.6 * off * hill
            total = np.asarray(total * (1 + fault.strength * bend), dtype=np.float32)
    return total


__all__ = ["Extent", "creased", "cut", "extent", "harm", "stained"]
