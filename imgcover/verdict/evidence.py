"""What was seen, as one vector with its covariance; and whether it agrees with the sheet."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.optimize import lsq_linear
from scipy.special import chdtrc

from imgcover.quantity import Measured
from imgcover.verdict.departure import SEEN, Departure, Floats, expected, natural_u
from imgcover.verdict.mean_count import moisture_u
from imgcover.verdict.observed import Observed
from imgcover.verdict.sheet import Sheet

MASS = SEEN.index("mass")


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
    ends_forks, picks_forks : tuple of float
        Where two readings of the density stayed possible, 1/cm.
    """

    present: np.typing.NDArray[np.intp]
    values: Floats
    covariance: Floats
    repeat: tuple[int, int] | None
    ends_forks: tuple[float, ...]
    picks_forks: tuple[float, ...]


def evidence_of(observed: Observed) -> Evidence:
    """Gather what was seen of a place or of a lot's mean.

    The densities share the error of the scale. The three covers come from one picture, but how far
    they err together is not known; taking them as independent is the cautious side where they
    contradict one another, and where they shift together the model's own u outweighs theirs.
    """
    listed: tuple[Measured | None, ...] = (
        *(observed.ends, observed.picks),
        *(observed.warp_cover, observed.weft_cover, observed.cover, observed.gsm),
    )
    values = np.array([math.nan if each is None else each.value for each in listed])
    u = np.array([0.0 if each is None else each.u for each in listed])
    spread = (observed.ends_spread.u_relative, observed.picks_spread.u_relative)
    covariance = np.diag(u**2)
    covariance[[0, 1], [0, 1]] += (values[:2] * spread) ** 2
    covariance[MASS, MASS] += (values[MASS] * moisture_u(observed)) ** 2
    shared = min(observed.scale_u, *(u[:2] / np.abs(values[:2])))
    covariance[[0, 1], [1, 0]] = shared**2 * values[0] * values[1]
    present = np.flatnonzero(np.isfinite(values))
    return Evidence(
        present,
        values[present],
        covariance[np.ix_(present, present)],
        observed.repeat,
        observed.ends_forks,
        observed.picks_forks,
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
    if not len(evidence.values):
        return True
    distance = 2.0 * float(lsq_linear(steps, residual, bounds).cost)
    setts = int(np.sum(evidence.present < 2))
    return _tail(distance, len(evidence.values), setts) > risk


def _tail(distance: float, n: int, setts: int) -> float:
    """Probability of such a distance or more, for a cloth at the very limits of its tolerances.

    Each sett at its limit is half the time pulled back into the tolerance, which takes one degree
    of freedom: a mixture of chi-squares (Kudô 1963). Inside the limits it is smaller still.
    """
    shares = [math.comb(setts, k) / 2**setts for k in range(setts + 1)]
    tails = [float(chdtrc(n - k, distance)) if n > k else 0.0 for k in range(setts + 1)]
    return math.fsum(share * tail for share, tail in zip(shares, tails, strict=True))


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
