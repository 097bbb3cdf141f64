"""What do scans of one measured sheet say about the device: pitch, shear, local distortion?

A scan shows the product of the sheet's errors and the bed's. Turned by a quarter the sheet's
errors turn, the bed's do not: two scans part them. With one scan all is put down to the bed, and
the uncertainties of both bars stay in full.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.quantity import Measured
from imgcover.scale.sheet import Bars
from imgcover.scale.sheet_bed import BedMap, map_bed
from imgcover.scale.sheet_scan import SheetCorners

FEWEST_CORNERS = 60
LEAST_SPAN = 0.5
"""Of the field, in both directions: less says too little about the bed."""
ROUGHEST_MM = 0.10
"""Root mean square by which corners may miss a smooth bed: a poor print or copy misses by more."""
LARGEST_MM = 1.5
"""No flatbed bends the picture further; a photograph or a crumpled sheet does."""
U_PRINT_SKEW = 1e-3
"""Standard uncertainty, rad, of the printed field's right angle (half a millimetre over its side,
taken as the half-width of a rectangle, and more)."""
REPEAT = 5e-5
"""Relative scatter of a carriage's pitch from scan to scan that is allowed for in any case."""
FIELD_MM = 50.0
"""Length over which a pitch is used: the local variation of the bed is averaged over it."""


class SheetRefused(Exception):  # noqa: N818 - an outcome with a reason, caught at the room's edge
    """The scans cannot give a device's pitch; the message says why."""


@dataclass(frozen=True, slots=True, eq=False)
class DeviceReading:
    """What the scans say.

    Parameters
    ----------
    x, y : Measured
        Pixels a millimetre along the file's columns and rows; u holds bars, fit, repeats and how
        much the pitch varies over the bed.
    ratio_u : float
        Relative standard uncertainty of y over x.
    shear : Measured
        Departure of the axes from a right angle, rad.
    bed : BedMap
        Local distortion, mm.
    apart : bool
        Whether the sheet's own errors were parted from the bed's by turned scans.
    corners : int
        Used in all.
    sheet_errors : (float, float, float)
        The sheet's own relative errors across and down beyond its bars' readings, and half its
        skew, rad: what turned scans of it agree on.
    u_own : (float, float)
        Relative standard uncertainties of x and y but for what is common to all scans of this
        sheet: for comparing two days' scans of it.
    """

    x: Measured
    y: Measured
    ratio_u: float
    shear: Measured
    bed: BedMap
    apart: bool
    corners: int
    sheet_errors: tuple[float, float, float]
    u_own: tuple[float, float]


@dataclass(frozen=True, slots=True, eq=False)
class _Scan:
    """One scan: its affine part (ln of both pitches, shear; turn), its corners and their misses."""

    logs: NDArray[np.float64]
    turn: float
    device: NDArray[np.float64]
    seen: NDArray[np.float64]
    drawn: NDArray[np.float64]
    missed: NDArray[np.float64]


def read_device(
    scans: Sequence[SheetCorners],
    bars: Bars,
    *,
    known: tuple[float, float, float] | None = None,
) -> DeviceReading:
    """Read a device from scans of one sheet.

    Parameters
    ----------
    scans : sequence of SheetCorners
        One or more, at one resolution.
    bars : Bars
        The sheet's bars as measured.
    known : (float, float, float), optional
        The sheet's own errors from earlier, turned scans of it.

    Returns
    -------
    DeviceReading

    Raises
    ------
    SheetRefused
        When a scan shows too little of the sheet, or one that no flatbed and no honest print
        explain.
    """
    read = [_affine(each, bars) for each in scans]
    u_sheet = (*bars.u_stretch, U_PRINT_SKEW) if known is None else (REPEAT,) * 3
    terms, covariance = _axes(read, known or (0.0, 0.0, 0.0), u_sheet)
    bed = map_bed(
        [each.seen @ np.linalg.inv(each.device).T for each in read],
        [each.drawn for each in read],
        [each.missed for each in read],
        [each.turn for each in read],
    )
    if bed.largest > LARGEST_MM:
        raise SheetRefused(
            f"corners lie up to {bed.largest:.2g} mm off: not a flat sheet on a flatbed"
        )
    if bed.rough > ROUGHEST_MM:
        raise SheetRefused(f"corners scatter by {bed.rough:.2g} mm: a poor print or a copy")
    local = bed.local_pitch(FIELD_MM)
    us = np.sqrt(np.diag(covariance)[:2] + np.array(local) ** 2)
    x, y = np.exp(terms[:2])
    spread = covariance[0, 0] + covariance[1, 1] - 2 * covariance[0, 1]
    return DeviceReading(
        Measured(float(x), float(x * us[0]), "px/mm"),
        Measured(float(y), float(y * us[1]), "px/mm"),
        math.sqrt(spread + local[0] ** 2 + local[1] ** 2),
        Measured(float(terms[2]), float(np.sqrt(covariance[2, 2])), "rad"),
        bed,
        _turned(read),
        sum(len(each.seen) for each in read),
        (float(terms[3]), float(terms[4]), float(terms[5])),
        (
            math.hypot(REPEAT / math.sqrt(len(read)), local[0]),
            math.hypot(REPEAT / math.sqrt(len(read)), local[1]),
        ),
    )


def _affine(corners: SheetCorners, bars: Bars) -> _Scan:
    """Fit one scan's affine part, dropping corners under dust or folds."""
    if len(corners.seen) < FEWEST_CORNERS or corners.span < LEAST_SPAN:
        raise SheetRefused(
            f"only {len(corners.seen)} of 256 corners show, over {100 * corners.span:.0f} % of "
            "the field: it is cropped, mirrored, too coarse or not this sheet"
        )
    mm = corners.drawn * np.array(bars.stretch)
    kept = np.ones(len(mm), dtype=bool)
    for _ in range(5):
        design = np.column_stack([mm - mm[kept].mean(axis=0), np.ones(len(mm))])
        terms, *_ = np.linalg.lstsq(design[kept], corners.seen[kept], rcond=None)
        off = corners.seen - design @ terms
        distance = np.hypot(*off.T)
        new = distance < 6 * np.median(distance[kept]) + 0.05
        if np.array_equal(new, kept):
            break
        kept = new
    linear = terms[:2].T
    if np.linalg.det(linear) < 0:
        raise SheetRefused("the sheet shows mirrored")
    gram = linear @ linear.T
    sy = math.sqrt(gram[1, 1])
    shear_x = gram[0, 1] / sy
    sx = math.sqrt(gram[0, 0] - shear_x**2)
    device = np.array([[sx, shear_x], [0.0, sy]])
    rotation = np.linalg.solve(device, linear)
    turn = math.atan2(rotation[1, 0], rotation[0, 0])
    missed = off[kept] @ np.linalg.inv(device).T
    logs = np.array([math.log(sx), math.log(sy), shear_x / sx])
    return _Scan(logs, turn, device, corners.seen[kept], mm[kept], missed)


def _axes(
    read: list[_Scan], sheet: tuple[float, float, float], u_sheet: tuple[float, ...]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Solve for ln x, ln y and shear of the device beside the sheet's own linear errors.

    Notes
    -----
    With E the sheet's small symmetric error (a, b on the diagonal, g off it) and R the scan's
    turn, F = R E Rᵀ shifts ln x by F₁₁, ln y by F₂₂ and the shear by 2 F₁₂. The bars' readings
    hold a and b at zero within their uncertainties, and `U_PRINT_SKEW` holds g, unless all three
    are known from before.
    """
    rows, values, weights = [], [], []
    for each in read:
        c, s = math.cos(each.turn), math.sin(each.turn)
        rows += [
            [1, 0, 0, c * c, s * s, -2 * c * s],
            [0, 1, 0, s * s, c * c, 2 * c * s],
            [0, 0, 1, 2 * c * s, -2 * c * s, 2 * (c * c - s * s)],
        ]
        values += each.logs.tolist()
        weights += [1 / max(REPEAT, _u_fit(each))] * 3
    for index, (value, u) in enumerate(zip(sheet, u_sheet, strict=True)):
        rows.append([1.0 if column == 3 + index else 0.0 for column in range(6)])
        values.append(value)
        weights.append(1 / u)
    matrix = np.array(rows) * np.array(weights)[:, None]
    target = np.array(values) * np.array(weights)
    covariance = np.linalg.inv(matrix.T @ matrix)
    terms = covariance @ matrix.T @ target
    misfit = float(((matrix @ terms - target) ** 2).sum())
    freedom = 3 * len(read) - 3
    if freedom:
        covariance = covariance * max(1.0, misfit / freedom)
    return terms, covariance


def _u_fit(scan: _Scan) -> float:
    """Return the relative standard uncertainty that the corners' scatter leaves on a pitch."""
    spread = ((scan.drawn - scan.drawn.mean(axis=0)) ** 2).sum(axis=0).min()
    return float(np.sqrt((scan.missed**2).mean() / spread))


def _turned(read: list[_Scan]) -> bool:
    """Whether two scans lie a quarter turn apart, within 20°."""
    turns = np.array([each.turn for each in read])
    apart = np.abs(np.sin(turns[:, None] - turns[None, :]))
    return bool(apart.max() > math.cos(math.radians(20)))


__all__ = ["DeviceReading", "SheetRefused", "read_device"]
