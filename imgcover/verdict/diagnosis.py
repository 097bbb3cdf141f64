"""What must be wrong? Weighs every cause against all that was seen. It indicates, it never proves.

Every cause predicts, at each of its sizes, what would be seen and how unsure that is. Its weight
is its prior times the probability of what was seen, averaged over its sizes: a cause that could
explain anything is thereby weaker than one that predicted just this (Jeffreys' Bayes factor, with
the Occam factor that comes from averaging).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from imgcover.quantity import rounded
from imgcover.verdict.causes import Cause, causes
from imgcover.verdict.decision import DEFAULT_RISK
from imgcover.verdict.departure import SEEN, Departure, Floats, expected
from imgcover.verdict.evidence import Evidence, agrees
from imgcover.verdict.sheet import Sheet
from imgcover.verdict.verdict import Suspect

NOTHING_FITS = "nothing fits: more than one figure may be off"
NOTHING_PRIOR = 0.05
"""Beside 1 for a common cause: two things wrong at once is rarer than any one."""
NOTHING_U = 0.25
"""Relative u of everything seen when no cause is supposed: any common deviation lies within it."""
TIED = 3.0
"""A weight within this factor of the best is a tie: a Bayes factor below 3 is "not worth more than
a bare mention" (Jeffreys, Theory of Probability, appendix B)."""
LEAST_WEIGHT = 0.02
"""Causes below this are left out of the list."""
MOST_LISTED = 6
TELLING = 2.0
"""Standard uncertainties beyond which a number speaks for or against."""
FORKED = 20.0
"""How much a reading that could not choose between pairs and threads favours pairs."""
REPEAT_MISREAD = 0.05
"""Probability that the picture shows another repeat than the cloth has."""


@dataclass(frozen=True, slots=True, eq=False)
class _Weighed:
    """A cause with its evidence, and what it leads one to see, in the order of the evidence."""

    cause: Cause
    log_weight: float
    mean: Floats
    u: Floats
    size: float
    size_u: float


def diagnose(
    sheet: Sheet, evidence: Evidence, *, risk: float | None = None, failed: bool = False
) -> tuple[Suspect, ...]:
    """Say what would explain a disagreement, best first.

    Parameters
    ----------
    sheet : Sheet
    evidence : Evidence
    risk : float, optional
        The share of deliveries that are as declared for which a cause may yet be named.
    failed : bool
        Whether a line does not conform; a cause is then wanted whatever the whole looks like.

    Returns
    -------
    tuple of Suspect
        Empty where everything can be the declared cloth.
    """
    shows_other = _other_weave(sheet.repeat, evidence.repeat)
    forked = evidence.ends_forked or evidence.picks_forked
    asked = failed or shows_other or forked
    if not asked and agrees(sheet, evidence, risk=DEFAULT_RISK if risk is None else risk):
        return ()
    if not len(evidence.values) and not asked:
        return ()
    weighed = [_weigh(cause, sheet, evidence, shows_other) for cause in causes(sheet)]
    weighed.append(_weigh_nothing(sheet, evidence))
    weighed.sort(key=lambda each: -each.log_weight)
    total = _log_sum(np.array([each.log_weight for each in weighed]))
    weights = [math.exp(each.log_weight - total) for each in weighed]
    tied = [
        each.cause.name
        for each, weight in zip(weighed, weights, strict=True)
        if weight * TIED >= weights[0]
    ]
    plain = _weigh_plain(sheet, evidence)
    listed = list(zip(weighed, weights, strict=True))[:MOST_LISTED]
    return tuple(
        _suspect(each, weight, plain, evidence, tied)
        for each, weight in listed
        if weight >= LEAST_WEIGHT or each is weighed[0]
    )


def _weigh(cause: Cause, sheet: Sheet, evidence: Evidence, shows_other: bool) -> _Weighed:
    means, effects = expected(sheet, cause.departure)
    mean, effect = means[:, evidence.present], effects[:, :, evidence.present]
    covariance = np.einsum("nki,nkj->nij", effect, effect) + evidence.covariance
    log_likelihood = _log_normal(evidence.values - mean, covariance)
    with np.errstate(divide="ignore"):
        joint = log_likelihood + np.log(cause.weights)
    log_evidence = _log_sum(joint)
    share = np.exp(joint - log_evidence)
    best = int(np.argmax(joint))
    size = float(share @ cause.sizes)
    spread = math.sqrt(max(float(share @ (cause.sizes - size) ** 2), 0.0))
    prior = math.log(cause.prior * _context(cause, evidence, shows_other))
    u = np.sqrt(np.diagonal(covariance[best]))
    return _Weighed(cause, log_evidence + prior, mean[best], u, size, spread)


def _weigh_plain(sheet: Sheet, evidence: Evidence) -> _Weighed:
    """The declared cloth itself, to say what disagrees with it."""
    as_declared = Cause("as declared", 1.0, Departure(), np.zeros(1), np.ones(1))
    return _weigh(as_declared, sheet, evidence, False)


def _weigh_nothing(sheet: Sheet, evidence: Evidence) -> _Weighed:
    """No cause: everything may lie anywhere round the declared."""
    plain = _weigh_plain(sheet, evidence)
    _, effects = expected(sheet, Departure())
    effect = effects[0][:, evidence.present]
    wide = np.diag((NOTHING_U * plain.mean) ** 2)
    covariance = effect.T @ effect + evidence.covariance + wide
    residual = (evidence.values - plain.mean)[None, :]
    log_evidence = float(_log_normal(residual, covariance[None])[0])
    cause = Cause(
        NOTHING_FITS,
        NOTHING_PRIOR,
        Departure(),
        np.zeros(1),
        np.ones(1),
        settle="have the swatch dissected (ISO 7211-2 method A) and its yarns weighed",
    )
    u = np.sqrt(np.diagonal(covariance))
    return _Weighed(cause, log_evidence + math.log(NOTHING_PRIOR), plain.mean, u, 0.0, 0.0)


def _context(cause: Cause, evidence: Evidence, shows_other: bool) -> float:
    """What the weave's repeat and forked readings say of a cause, beside the numbers."""
    factor = 1.0
    if shows_other:
        factor *= 1.0 if cause.other_weave else REPEAT_MISREAD
    elif cause.other_weave:
        factor *= REPEAT_MISREAD
    if evidence.ends_forked and "ends" in cause.forks:
        factor *= FORKED
    if evidence.picks_forked and "picks" in cause.forks:
        factor *= FORKED
    return factor


def _other_weave(declared: tuple[int, int] | None, seen: tuple[int, int] | None) -> bool:
    """Whether the repeat seen cannot belong to the declared weave.

    A part of the repeat may be all that shows, and colours may make it several times as long;
    only a repeat that is neither a part nor a multiple belongs to another weave.
    """
    if declared is None or seen is None:
        return False
    return any(a % b and b % a for a, b in zip(declared, seen, strict=True))


def _log_normal(residuals: Floats, covariances: Floats) -> Floats:
    """Log density of the multivariate normal, node by node."""
    _, determinants = np.linalg.slogdet(covariances)
    solved = np.linalg.solve(covariances, residuals[..., None])[..., 0]
    n = residuals.shape[-1]
    squared = np.einsum("ni,ni->n", residuals, solved)
    return np.asarray(-0.5 * (squared + determinants + n * math.log(2 * math.pi)))


def _log_sum(logs: Floats) -> float:
    largest = float(np.max(logs))
    return largest + math.log(float(np.sum(np.exp(logs - largest))))


def _suspect(
    weighed: _Weighed, weight: float, plain: _Weighed, evidence: Evidence, tied: list[str]
) -> Suspect:
    name = weighed.cause.name
    others = tuple(each for each in tied if each != name) if name in tied else ()
    return Suspect(
        cause=name,
        weight=weight,
        speaks_for=_speaks_for(weighed, plain, evidence),
        speaks_against=_speaks_against(weighed, evidence),
        settle=weighed.cause.settle,
        tied_with=others,
    )


def _speaks_for(weighed: _Weighed, plain: _Weighed, evidence: Evidence) -> tuple[str, ...]:
    """The numbers that the sheet does not explain and this cause does, and what it takes."""
    without = (evidence.values - plain.mean) / plain.u
    with_it = (evidence.values - weighed.mean) / weighed.u
    explained = (np.abs(without) > TELLING) & (np.abs(with_it) <= TELLING)
    if not explained.any() and len(without):
        better = np.abs(without) - np.abs(with_it)
        explained[int(np.argmax(better))] = bool(np.max(better) > 0)
    said = [
        f"{SEEN[seen]} {_shown(seen, value, u)}: the sheet leads to "
        f"{_shown(seen, was, u)}, this to {_shown(seen, now, u)}"
        for seen, value, u, was, now, counts in zip(
            evidence.present,
            evidence.values,
            np.sqrt(np.diagonal(evidence.covariance)),
            plain.mean,
            weighed.mean,
            explained,
            strict=True,
        )
        if counts
    ]
    if weighed.cause.takes:
        said.append(weighed.cause.takes.format(100 * weighed.size))
    return tuple(said)


def _speaks_against(weighed: _Weighed, evidence: Evidence) -> tuple[str, ...]:
    distance = np.abs(evidence.values - weighed.mean) / weighed.u
    return tuple(
        f"{SEEN[seen]} {_shown(seen, value, own)}: this would lead to {_shown(seen, mean, u)} ± "
        f"{rounded(mean, u)[1]}"
        for seen, value, own, mean, u, far in zip(
            evidence.present,
            evidence.values,
            np.sqrt(np.diagonal(evidence.covariance)),
            weighed.mean,
            weighed.u,
            distance,
            strict=True,
        )
        if far > TELLING
    )


def _shown(seen: int, value: float, u: float) -> str:
    unit = {0: " a cm", 1: " a cm", 5: " g/m²"}.get(int(seen), "")
    return f"{rounded(float(value), float(u))[0]}{unit}"


__all__ = ["NOTHING_FITS", "diagnose"]
