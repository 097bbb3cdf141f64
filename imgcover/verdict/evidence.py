"""What was seen, as one vector with its covariance; and whether it agrees with the sheet."""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np

from imgcover.quantity import Measured
from imgcover.verdict.departure import SEEN, Departure, Floats, expected
from imgcover.verdict.mean_count import moisture_u
from imgcover.verdict.observed import Observed
from imgcover.verdict.sheet import Sheet
from imgcover.verdict.tail import chi_squared_above

ENDS, PICKS, MASS = (SEEN.index(name) for name in ("ends", "picks", "mass"))

SETTS_SHARE = 0.2
"""Share of the risk that goes to the setts: they stray far when they stray, and have their lines;
cover and mass need the more of it."""


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

    Two questions share the risk: does a sett lie beyond its room, and do cover and mass disagree
    with the cloth at the setts that it was found to have. A cloth that is as declared is then
    called different at most as often as `risk` says (Boole's inequality), wherever in its
    tolerances it lies.
    """
    of_setts = SETTS_SHARE * risk
    beyond = _sett_beyond(sheet, evidence, of_setts)
    return not beyond and _rest_fits(sheet, evidence, risk - of_setts)


def _sett_beyond(sheet: Sheet, evidence: Evidence, risk: float) -> bool:
    """Whether a sett lies beyond its room by more than chance; both setts share the risk."""
    declared = {ENDS: (sheet.ends, sheet.ends_room), PICKS: (sheet.picks, sheet.picks_room)}
    widest = NormalDist().inv_cdf(1 - risk / 2)
    for i, seen in enumerate(evidence.present):
        if seen not in declared:
            continue
        sett, (below, above) = declared[int(seen)]
        beyond = max(
            (1 - below) * sett - evidence.values[i], evidence.values[i] - (1 + above) * sett
        )
        if beyond > widest * math.sqrt(evidence.covariance[i, i]):
            return True
    return False


def _rest_fits(sheet: Sheet, evidence: Evidence, risk: float) -> bool:
    """Whether what is no sett fits a cloth that differs from the declared in its setts alone."""
    means, effects = expected(sheet, Departure())
    mean, effect = means[0, evidence.present], effects[0][:, evidence.present]
    # a sett that was counted is left free to explain the rest; one that was not may vary as usual
    free = [k for k, seen in ((-2, ENDS), (-1, PICKS)) if seen in evidence.present]
    bound = [k for k in range(-len(effect), 0) if k not in free]
    left = len(mean) - len(free)
    if left == 0:
        return True
    covariance = evidence.covariance + effect[bound].T @ effect[bound]
    lower = np.linalg.cholesky(covariance + _jitter(covariance))
    residual = np.linalg.solve(lower, evidence.values - mean)
    steps = np.linalg.solve(lower, effect[free].T)
    residual = residual - steps @ np.linalg.lstsq(steps, residual, rcond=None)[0]
    return chi_squared_above(float(residual @ residual), freedom=left) > risk


def _jitter(covariance: Floats) -> Floats:
    """Keep a covariance of exactly stated values invertible: a millionth of each value's own u."""
    diagonal = np.diagonal(covariance)
    return np.diag(1e-12 * diagonal + 1e-18)


__all__ = ["Evidence", "agrees", "evidence_of"]
