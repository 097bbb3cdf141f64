"""How probable does each cause make what was seen?

Every cause predicts, at each of its sizes, what would be seen and how unsure that is. Its evidence
is the probability of what was seen, averaged over its sizes: a cause that could explain anything
is thereby weaker than one that predicted just this (the Occam factor that comes from averaging).
Its weight is its evidence times how common it is.

References
----------
Jeffreys, Theory of Probability (1961), chapter V and appendix B.
"""

from __future__ import annotations

import math
import sys
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from imgcover.verdict.cause import Cause, fixed
from imgcover.verdict.departure import Departure, Floats, expected, joined
from imgcover.verdict.evidence import Evidence
from imgcover.verdict.sheet import Sheet
from imgcover.verdict.tail import chi_squared_above

NOTHING_FITS = "nothing fits: more than one figure may be off"
NOTHING_PRIOR = 0.1
"""Beside 1 for a common cause: two things wrong at once is rarer than any one."""
NOTHING_U = 0.15
"""Relative u of everything seen when no cause is supposed: any common deviation lies within it."""
POOR_FIT = 0.002
"""A cause that at its best size leaves a disagreement rarer than this does not fit; it is trusted
less in the same proportion, so that nothing fits where nothing does."""
FORKED = 20.0
"""How much a reading that could not choose between pairs and threads favours pairs."""
REPEAT_MISREAD = 0.05
"""Probability that the picture shows another repeat than the cloth has."""


@dataclass(frozen=True, slots=True, eq=False)
class Weighed:
    """A cause with its weight, and what it leads one to see, in the order of the evidence.

    Parameters
    ----------
    cause : Cause
    log_evidence : float
        Logarithm of the probability density of what was seen.
    log_weight : float
        The same with the prior.
    mean, u : ndarray, shape (n,), float64
        What would be seen at its best size, and the standard uncertainty of that and of the
        measurement together.
    size, size_u : float
        Mean and standard deviation of its size, given what was seen.
    """

    cause: Cause
    log_evidence: float
    log_weight: float
    mean: Floats
    u: Floats
    size: float
    size_u: float


def weigh(causes: Sequence[Cause], sheet: Sheet, evidence: Evidence) -> list[Weighed]:
    """Weigh causes, all at once: their sizes lie one after the other in every array."""
    counts = [len(cause.sizes) for cause in causes]
    means, effects = expected(sheet, joined([cause.departure for cause in causes], counts))
    mean, effect = means[:, evidence.present], effects[:, :, evidence.present]
    covariance = np.matmul(effect.transpose(0, 2, 1), effect) + evidence.covariance
    residual = evidence.values - mean
    log_density = _log_normal(residual, covariance)
    ends = np.cumsum(counts)
    return [
        _weighed(
            cause,
            _context(cause, sheet, evidence),
            log_density[end - count : end],
            residual[end - count : end],
            mean[end - count : end],
            covariance[end - count : end],
        )
        for cause, count, end in zip(causes, counts, ends, strict=True)
    ]


def _weighed(
    cause: Cause,
    context: float,
    log_density: Floats,
    residual: Floats,
    mean: Floats,
    covariance: Floats,
) -> Weighed:
    """Average over the sizes of one cause."""
    joint = log_density + np.log(cause.weights)
    log_evidence = log_sum(joint)
    share = np.exp(joint - log_evidence)
    best = int(np.argmax(joint))
    size = float(share @ cause.sizes)
    log_evidence += math.log(context) + _log_penalty(residual[best], covariance[best])
    return Weighed(
        cause,
        log_evidence,
        log_evidence + math.log(cause.prior),
        mean[best],
        np.sqrt(np.diagonal(covariance[best])),
        size,
        math.sqrt(max(float(share @ (cause.sizes - size) ** 2), 0.0)),
    )


def weigh_declared(sheet: Sheet, evidence: Evidence) -> Weighed:
    """Weigh the declared cloth itself, to say what disagrees with it."""
    return weigh([fixed("as declared", Departure(), prior=1.0, settle="")], sheet, evidence)[0]


def weigh_nothing(sheet: Sheet, evidence: Evidence) -> Weighed:
    """Weigh that no single cause fits: everything may lie anywhere round the declared."""
    means, effects = expected(sheet, Departure())
    mean, effect = means[0, evidence.present], effects[0][:, evidence.present]
    covariance = effect.T @ effect + evidence.covariance + np.diag((NOTHING_U * mean) ** 2)
    cause = fixed(
        NOTHING_FITS,
        Departure(),
        prior=NOTHING_PRIOR,
        settle="have the swatch dissected (ISO 7211-2 method A) and its yarns weighed",
    )
    log_density = float(_log_normal((evidence.values - mean)[None], covariance[None])[0])
    log_evidence = log_density + math.log(_context(cause, sheet, evidence))
    log_weight = log_evidence + math.log(NOTHING_PRIOR)
    u = np.sqrt(np.diagonal(covariance))
    return Weighed(cause, log_evidence, log_weight, mean, u, 0.0, 0.0)


def shows_other_weave(sheet: Sheet, evidence: Evidence) -> bool:
    """Whether the repeat seen cannot belong to the declared weave.

    A part of the repeat may be all that shows, and colours may make it several times as long;
    only a repeat that is neither a part nor a multiple belongs to another weave.
    """
    if sheet.repeat is None or evidence.repeat is None:
        return False
    pairs = zip(sheet.repeat, evidence.repeat, strict=True)
    return any(declared % seen and seen % declared for declared, seen in pairs)


def log_sum(logs: Floats | Iterable[float]) -> float:
    """Logarithm of the sum of exponentials."""
    listed = np.asarray(logs if isinstance(logs, np.ndarray) else list(logs))
    largest = float(np.max(listed))
    return largest + math.log(float(np.sum(np.exp(listed - largest))))


def _context(cause: Cause, sheet: Sheet, evidence: Evidence) -> float:
    """What the weave's repeat and forked readings say of a cause: a factor on its evidence."""
    factor = 1.0
    if shows_other_weave(sheet, evidence) != cause.other_weave:
        factor *= REPEAT_MISREAD
    for which, forks in (("ends", evidence.ends_forks), ("picks", evidence.picks_forks)):
        if forks and cause.forks == which:
            factor *= FORKED
    return factor


def _log_penalty(residual: Floats, covariance: Floats) -> float:
    """How much less a cause is trusted for what it leaves unexplained; 0 where that is chance."""
    if not len(residual):
        return 0.0
    squared = float(residual @ np.linalg.solve(covariance, residual))
    tail = max(chi_squared_above(squared, freedom=len(residual)), sys.float_info.min)
    return min(0.0, math.log(tail / POOR_FIT))


def _log_normal(residuals: Floats, covariances: Floats) -> Floats:
    """Log density of the multivariate normal, node by node: shapes (nodes, n), (nodes, n, n)."""
    _, determinants = np.linalg.slogdet(covariances)
    solved = np.linalg.solve(covariances, residuals[..., None])[..., 0]
    squared = np.sum(residuals * solved, axis=-1)
    n = residuals.shape[-1]
    return np.asarray(-0.5 * (squared + determinants + n * math.log(2 * math.pi)))


__all__ = [
    "NOTHING_FITS",
    "Weighed",
    "log_sum",
    "shows_other_weave",
    "weigh",
    "weigh_declared",
    "weigh_nothing",
]
