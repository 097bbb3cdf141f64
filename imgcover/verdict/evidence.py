"""What was seen, as one vector with its covariance; and whether it agrees with the sheet."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.optimize import lsq_linear
from scipy.stats import chi2

from imgcover.quantity import Measured
from imgcover.verdict.departure import SEEN, Departure, Floats, expected, natural_u
from imgcover.verdict.observed import Observed
from imgcover.verdict.sheet import Sheet

COVER_CORRELATION = 0.5
"""Between the whole cover and each system's own: both rest on the same levels and edges of one
picture, but take them from different pixels."""


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """What was seen.

    Parameters
    ----------
    present : ndarray, shape (n,), int
        Which of `SEEN` were seen.
    values : ndarray, shape (n,), float64
    covariance : ndarray, shape (n, n), float64
    repeat : tuple of int or None
        (ends, picks) in the weave repeat that was seen.
    ends_forked, picks_forked : bool
        Whether two readings of the density stayed possible.
    """

    present: np.typing.NDArray[np.intp]
    values: Floats
    covariance: Floats
    repeat: tuple[int, int] | None
    ends_forked: bool
    picks_forked: bool


def evidence_of(observed: Observed) -> Evidence:
    """Gather what was seen of a place or of a lot's mean.

    The densities share the error of the scale, the covers that of the picture's levels.
    """
    listed: tuple[Measured | None, ...] = (
        *(observed.ends, observed.picks),
        *(observed.warp_cover, observed.weft_cover, observed.cover, observed.gsm),
    )
    values = np.array([math.nan if each is None else each.value for each in listed])
    u = np.array([0.0 if each is None else each.u for each in listed])
    spread = (observed.ends_spread.u_relative, observed.picks_spread.u_relative)
    correlation = np.eye(len(SEEN))
    correlation[[2, 3, 4, 4], [4, 4, 2, 3]] = COVER_CORRELATION
    covariance = correlation * np.outer(u, u)
    covariance[[0, 1], [0, 1]] += (values[:2] * spread) ** 2
    shared = min(observed.scale_u, *(u[:2] / np.abs(values[:2])))
    covariance[[0, 1], [1, 0]] = shared**2 * values[0] * values[1]
    present = np.flatnonzero(np.isfinite(values))
    return Evidence(
        present,
        values[present],
        covariance[np.ix_(present, present)],
        observed.repeat,
        bool(observed.ends_forks),
        bool(observed.picks_forks),
    )


def agrees(sheet: Sheet, evidence: Evidence, *, risk: float) -> bool:
    """Whether all that was seen can be the declared cloth, within its tolerances.

    Setts may lie anywhere in their tolerance; the remaining disagreement, in units of its own
    uncertainty, is held against chi-square. A cloth that is as declared is then called different
    at most as often as `risk` says.
    """
    means, effects = expected(sheet, Departure())
    mean, effect = means[0, evidence.present], effects[0][:, evidence.present]
    covariance = evidence.covariance + effect[:-2].T @ effect[:-2]
    lower = np.linalg.cholesky(covariance + _jitter(covariance))
    residual = np.linalg.solve(lower, evidence.values - mean)
    steps, bounds = _steps(sheet, effect[-2:], lower)
    least = lsq_linear(steps, residual, bounds) if len(evidence.values) else None
    distance = 0.0 if least is None else 2.0 * float(least.cost)
    return distance <= float(chi2.ppf(1.0 - risk, max(len(evidence.values), 1)))


def _steps(sheet: Sheet, natural: Floats, lower: Floats) -> tuple[Floats, tuple[Floats, Floats]]:
    """Whitened effect of one u of natural variation, and how many u the tolerances leave room."""
    one_u = [natural_u(sheet.ends_room), natural_u(sheet.picks_room)]
    rooms = np.array([sheet.ends_room, sheet.picks_room]) / np.array(one_u)[:, None]
    steps: Floats = np.linalg.solve(lower, natural.T).astype(np.float64)
    return steps, (-rooms[:, 0], rooms[:, 1])


def _jitter(covariance: Floats) -> Floats:
    """Keep a covariance of exactly stated values invertible: a millionth of each value's own u."""
    diagonal = np.diagonal(covariance)
    return np.diag(1e-12 * diagonal + 1e-18)


__all__ = ["Evidence", "agrees", "evidence_of"]
