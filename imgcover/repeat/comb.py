"""How far apart do numbered marks along a line stand, and how sure is that?

Used for the graduations of a rule and whatever else is counted by whole numbers: mark k stands at
origin + pitch · k, or, seen aslant, at (origin + pitch · k) / (1 + tilt · k).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

STRAY = 3.5
"""Robust standard deviations beyond which a mark is dropped: one good mark in 2000."""
FEWEST_MARKS = 6
LARGEST_SCATTER = 0.2
"""Pitches: a mark that strays by half a pitch might have another number."""


@dataclass(frozen=True, slots=True)
class LineFit:
    """A straight line fitted by least squares, with the standard uncertainties of its terms."""

    intercept: float
    slope: float
    u_intercept: float
    u_slope: float
    covariance: float
    scatter: float

    def at(self, x: float) -> tuple[float, float]:
        """Return the line's value at x and its standard uncertainty."""
        variance = self.u_intercept**2 + (x * self.u_slope) ** 2 + 2 * x * self.covariance
        return self.intercept + self.slope * x, float(np.sqrt(max(variance, 0.0)))


def fit_line(x: ArrayLike, y: ArrayLike) -> LineFit:
    """Fit y = intercept + slope · x, every point weighing alike.

    Parameters
    ----------
    x, y : array_like, shape (n,)
        At least three points at two different x.

    Returns
    -------
    LineFit

    Raises
    ------
    ValueError
        When fewer than three points or only one x come.

    References
    ----------
    JCGM 100:2008, H.3.2, equations (H.13a) to (H.13f).
    """
    xs, ys = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    n = len(xs)
    if n < 3 or len(ys) != n:
        raise ValueError(f"a line needs three points or more, x and y alike; got {n}, {len(ys)}")
    middle = xs.mean()
    spread = float(((xs - middle) ** 2).sum())
    if spread == 0:
        raise ValueError("a line needs points at two different x")
    slope = float(((xs - middle) * ys).sum() / spread)
    intercept = float(ys.mean() - slope * middle)
    rest = ys - intercept - slope * xs
    variance = float((rest**2).sum() / (n - 2))
    return LineFit(
        intercept,
        slope,
        float(np.sqrt(variance * (1 / n + middle**2 / spread))),
        float(np.sqrt(variance / spread)),
        float(-variance * middle / spread),
        float(np.sqrt(variance)),
    )


@dataclass(frozen=True, slots=True)
class Comb:
    """Numbered marks at equal distances, as fitted.

    Parameters
    ----------
    middle : float
        The number, not always whole, at the middle of the fitted marks.
    origin : float
        Position of that number, in the unit of the positions.
    pitch, u_pitch : float
        Distance of neighbouring marks at `middle`.
    tilt, u_tilt : float
        Relative change of that distance from one mark to the next, over −2; 0 where the marks do
        not prove it.
    scatter : float
        One standard deviation of the kept marks about the fit.
    kept : ndarray, shape (n,), bool
        The marks that were not dropped as strays.
    """

    middle: float
    origin: float
    pitch: float
    u_pitch: float
    tilt: float
    u_tilt: float
    scatter: float
    kept: NDArray[np.bool_]

    def position(self, number: ArrayLike) -> NDArray[np.float64]:
        """Return where the fit puts mark `number`."""
        k = np.asarray(number, dtype=float) - self.middle
        return (self.origin + (self.pitch + self.tilt * self.origin) * k) / (1 + self.tilt * k)

    def pitch_at(self, number: float) -> float:
        """Return the distance of neighbouring marks at `number`."""
        return self.pitch / (1 + self.tilt * (number - self.middle)) ** 2


def fit_comb(numbers: ArrayLike, positions: ArrayLike) -> Comb | None:
    """Fit a comb to numbered marks, dropping strays.

    The tilt is kept only where it stands out from its own uncertainty by four times; the pitch's
    uncertainty is the larger of that from the marks' scatter and that from how far four quarters
    of the row disagree, since a row's errors need not be independent from mark to mark.

    Parameters
    ----------
    numbers : array_like of int, shape (n,)
        The marks' numbers; some may be missing.
    positions : array_like, shape (n,)
        Where each was found.

    Returns
    -------
    Comb or None
        None when fewer than `FEWEST_MARKS` or fewer than half of the marks agree, or when they
        stray so far that their numbers are in doubt.
    """
    k, x = np.asarray(numbers, dtype=float), np.asarray(positions, dtype=float)
    if len(k) < FEWEST_MARKS or np.ptp(k) == 0:
        return None
    kept = _agreeing(k, x)
    if kept.sum() < max(FEWEST_MARKS, len(k) / 2):
        return None
    middle = float(k[kept].mean())
    line = fit_line(k[kept] - middle, x[kept])
    tilt, u_tilt, origin, pitch, rest = _tilted(k[kept] - middle, x[kept], line)
    freedom = kept.sum() - 3
    scatter = float(np.sqrt((rest**2).sum() / freedom))
    if abs(tilt) < 4 * u_tilt:
        tilt, origin, pitch, scatter = 0.0, line.intercept, line.slope, line.scatter
    if scatter > LARGEST_SCATTER * abs(pitch):
        return None
    u_pitch = scatter / float(np.sqrt(((k[kept] - middle) ** 2).sum()))
    comb = Comb(middle, origin, pitch, u_pitch, tilt, u_tilt, scatter, kept)
    u_quarters = _quarters(k[kept], x[kept] - comb.position(k[kept]))
    return Comb(middle, origin, pitch, max(u_pitch, u_quarters), tilt, u_tilt, scatter, kept)


def _agreeing(k: NDArray[np.float64], x: NDArray[np.float64]) -> NDArray[np.bool_]:
    """Find the marks that one smooth row explains, starting from the median slope."""
    apart = max(1, len(k) // 3)
    slope = float(np.median((x[apart:] - x[:-apart]) / (k[apart:] - k[:-apart])))
    rest = x - slope * k
    rest = rest - np.median(rest)
    spread = _spread(rest)
    weight = (np.abs(rest) < 0.4 * abs(slope) + 3 * spread).astype(float)
    for _ in range(20):
        if (weight > 0).sum() < FEWEST_MARKS:
            break
        # a parabola lets a tilted row through; what a tilt cannot do is judged afterwards
        bend = np.polynomial.Polynomial.fit(k, x, 2, w=weight)
        rest = x - bend(k)
        spread = max(_spread(rest[weight > 0]), 1e-6 * abs(slope))
        # Tukey's biweight: a stray loses its pull step by step, not all marks at once
        weight = np.clip(1 - (rest / (2 * STRAY * spread)) ** 2, 0, 1)
    return np.asarray(np.abs(rest) <= STRAY * spread)


def _spread(values: NDArray[np.float64]) -> float:
    return 1.4826 * float(np.median(np.abs(values - np.median(values))))


def _tilted(
    k: NDArray[np.float64], x: NDArray[np.float64], line: LineFit
) -> tuple[float, float, float, float, NDArray[np.float64]]:
    """Fit x (1 + tilt k) = a + b k about k = 0; return tilt, its u, x(0), pitch(0) and the rest."""
    matrix = np.stack([np.ones_like(k), k, -k * x], axis=1)
    scale = np.abs(matrix).max(axis=0) + 1e-300
    solved, *_ = np.linalg.lstsq(matrix / scale, x, rcond=None)
    a, b, tilt = solved / scale
    rest = x - (a + b * k) / (1 + tilt * k)
    # the parabola's term carries the tilt: x ≈ a + p k − p tilt k²
    square = k**2 - (k**2).mean() - k * (k**3).sum() / (k**2).sum()
    scatter = float(np.sqrt((rest**2).sum() / (len(k) - 3)))
    u_tilt = scatter / float(np.sqrt((square**2).sum())) / abs(line.slope)
    return float(tilt), u_tilt, float(a), float(b - a * tilt), rest


def _quarters(k: NDArray[np.float64], rest: NDArray[np.float64]) -> float:
    """Return the slope's uncertainty from how far the means of a row's quarters stray."""
    parts = np.array_split(np.argsort(k), 4)
    if min(len(part) for part in parts) < 3:
        return 0.0
    places = np.array([k[part].mean() for part in parts])
    means = np.array([rest[part].mean() for part in parts])
    spread = float(((places - places.mean()) ** 2).sum())
    return float(np.sqrt((means**2).sum() / 2 / spread))


__all__ = ["FEWEST_MARKS", "Comb", "LineFit", "fit_comb", "fit_line"]
