"""What scale does a printed sheet in the picture give?

Unlike on a scanner's bed the camera may look aslant: the corners fit a homography, and the scale
is taken at the picture's middle. Corners and cloth must lie in one plane.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.scale import Scale, ScaleSource
from imgcover.scale.sheet import BAR_A_MM, BAR_B_MM, PAGE_MM, Bars
from imgcover.scale.sheet_scan import Lit, find_corners

FEWEST_CORNERS = 16
LEAST_SPAN = 0.1
"""Of the field, in its narrower direction: two squares and more."""
LARGEST_CHANGE = 0.03
"""Relative change of scale over the frame that is corrected; beyond, refused."""
ROUGHEST_PX = 1.0
ROUGHEST_MM = 0.15
"""How far, root mean square, corners may miss a flat sheet."""


@dataclass(frozen=True, slots=True, eq=False)
class SheetScale:
    """The scale by sheet, or None; where the page lies; what was noticed."""

    scale: Scale | None
    areas: tuple[NDArray[np.float64], ...]
    findings: tuple[Finding, ...]


def measure_sheet(picture: Lit, bars: Bars | None) -> SheetScale:
    """Find the printed sheet in a picture and make a scale of it.

    Parameters
    ----------
    picture : Lit
    bars : Bars or None
        The sheet's bars as measured; without them the sheet says nothing of millimetres.

    Returns
    -------
    SheetScale
        `scale` is None where no sheet shows, or it cannot be trusted; a finding says why.
    """
    corners = find_corners(picture)
    if len(corners.seen) < FEWEST_CORNERS or corners.span < LEAST_SPAN:
        count = len(corners.seen)
        message = f"no scale sheet was found in the picture ({count} of its corners show)"
        return SheetScale(None, (), (found(Flag.NO_SHEET_FOUND, message),))
    nominal = bars or Bars(BAR_A_MM, BAR_B_MM, 1.0)
    mm = corners.drawn * np.array(nominal.stretch)
    matrix, missed = _homography(mm, corners.seen)
    page = np.array([[0, 0], [PAGE_MM[0], 0], PAGE_MM, [0, PAGE_MM[1]]]) * nominal.stretch
    areas = (cv2.perspectiveTransform(page[None], matrix)[0],)
    if bars is None:
        return SheetScale(None, areas, (found(Flag.SHEET_NOT_MEASURED),))
    middle = np.array([picture.columns, picture.rows]) / 2
    here = _pitches(matrix, middle)
    edges = [_pitches(matrix, middle * np.array(w)) for w in ((0, 1), (2, 1), (1, 0), (1, 2))]
    change = max(float(np.abs(np.array(each) / here - 1).max()) for each in edges)
    if change > LARGEST_CHANGE / 2:
        return _refused(areas, f"it lies too much aslant: the scale changes by {2 * change:.1%}")
    if missed > min(ROUGHEST_PX, ROUGHEST_MM * min(here)):
        return _refused(areas, f"its corners miss a flat sheet by {missed:.2g} px: it is not flat")
    return SheetScale(_scale(here, missed, mm, bars), areas, ())


def _homography(
    mm: NDArray[np.float64], seen: NDArray[np.float64]
) -> tuple[NDArray[np.float64], float]:
    """Fit picture places to sheet places; return the matrix and the root mean square missed."""
    matrix, kept = cv2.findHomography(mm, seen, cv2.RANSAC, 1.5)
    inside = np.asarray(kept).ravel() > 0
    matrix, _ = cv2.findHomography(mm[inside], seen[inside], 0)
    off = cv2.perspectiveTransform(mm[inside][None], matrix)[0] - seen[inside]
    return np.asarray(matrix, dtype=np.float64), float(np.sqrt((off**2).sum(axis=1).mean() / 2))


def _pitches(matrix: NDArray[np.float64], place: NDArray[np.float64]) -> tuple[float, float]:
    """Return pixels a millimetre along x and y at a place of the picture."""
    back = np.linalg.inv(matrix)
    steps = place + np.array([[0.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
    on_sheet = cv2.perspectiveTransform(steps[None], back)[0]
    x, y = (1 / float(np.hypot(*(on_sheet[i] - on_sheet[0]))) for i in (1, 2))
    return x, y


def _scale(here: tuple[float, float], missed: float, mm: NDArray[np.float64], bars: Bars) -> Scale:
    """Put the uncertainties together: of each bar, and of the corners that were placed."""
    spread = float(np.sqrt(((mm - mm.mean(axis=0)) ** 2).sum(axis=0).min()))
    reach = math.hypot(*PAGE_MM) / (float(np.ptp(mm, axis=0).min()) + 1e-9)
    u_corners = missed / min(here) / spread * max(1.0, reach)
    # which bar lies along x depends on the sheet's turn: the larger u serves both
    u = math.hypot(max(bars.u_stretch), u_corners)
    ratio_u = math.hypot(*bars.u_stretch, u_corners)
    return Scale(
        Measured(here[0], here[0] * u, "px/mm"),
        Measured(here[1], here[1] * u, "px/mm"),
        ratio_u,
        ScaleSource.SHEET,
    )


def _refused(areas: tuple[NDArray[np.float64], ...], why: str) -> SheetScale:
    return SheetScale(
        None, areas, (found(Flag.SHEET_REFUSED, f"the scale sheet shows, but {why}"),)
    )


__all__ = ["SheetScale", "measure_sheet"]
