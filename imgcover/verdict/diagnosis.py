"""What must be wrong? Names what would explain a disagreement. It indicates, it never proves."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from imgcover.quantity import rounded
from imgcover.verdict.decision import DEFAULT_RISK
from imgcover.verdict.departure import SEEN, Floats
from imgcover.verdict.evidence import Evidence, agrees
from imgcover.verdict.other_cloth import causes_in_cloth
from imgcover.verdict.sheet import Sheet
from imgcover.verdict.slips import slips
from imgcover.verdict.verdict import Suspect
from imgcover.verdict.weighing import (
    NOTHING_FITS,
    Weighed,
    log_sum,
    shows_other_weave,
    weigh,
    weigh_declared,
    weigh_nothing,
)

TIED = 0.5 * math.log(10)
"""Two causes under which what was seen is equally probable but for a factor of √10 are a tie: such
a Bayes factor is "not worth more than a bare mention" (Jeffreys, Theory of Probability, app. B).
How common the causes are orders them, but is no evidence."""
LEAST_WEIGHT = 0.02
"""Causes below this are left out of the list."""
MOST_LISTED = 6
"""More than these nobody would check."""
TELLING = 2.0
"""Standard uncertainties beyond which a number speaks for or against."""
PER_INCH = 2.54
"""Threads an inch in one thread a centimetre."""


def diagnose(
    sheet: Sheet, evidence: Evidence, *, risk: float | None = None, failed: bool = False
) -> tuple[Suspect, ...]:
    """Say what would explain a disagreement, best first.

    Parameters
    ----------
    sheet : Sheet
    evidence : Evidence
    risk : float, optional
        The share of deliveries that are as declared for which a cause may yet be named; None is
        what U = 2 u leaves on one side.
    failed : bool
        Whether a line does not conform: a cause is then wanted whatever the whole looks like.

    Returns
    -------
    tuple of Suspect
        Empty where everything can be the declared cloth.
    """
    asked = failed or shows_other_weave(sheet, evidence)
    asked = asked or bool(evidence.ends_forks or evidence.picks_forks)
    if not asked and agrees(sheet, evidence, risk=DEFAULT_RISK if risk is None else risk):
        return ()
    causes = (*causes_in_cloth(sheet), *slips(sheet))
    weighed = [*weigh(causes, sheet, evidence), weigh_nothing(sheet, evidence)]
    weighed.sort(key=lambda each: each.log_weight, reverse=True)
    total = log_sum(each.log_weight for each in weighed)
    listed = [
        (each, weight)
        for each in weighed[:MOST_LISTED]
        if (weight := math.exp(each.log_weight - total)) >= LEAST_WEIGHT or each is weighed[0]
    ]
    tied = _tied([each for each, _ in listed])
    declared = weigh_declared(sheet, evidence)
    return tuple(
        Suspect(
            cause=each.cause.name,
            weight=weight,
            speaks_for=tuple(_speaks_for(each, declared, sheet, evidence)),
            speaks_against=tuple(_speaks_against(each, sheet, evidence)),
            settle=each.cause.settle,
            tied_with=tuple(name for name in tied if name != each.cause.name)
            if each.cause.name in tied
            else (),
        )
        for each, weight in listed
    )


def _tied(listed: list[Weighed]) -> tuple[str, ...]:
    """Causes that the evidence cannot tell from the first; empty where that stands alone."""
    best = listed[0]
    if best.cause.name == NOTHING_FITS:
        return ()
    names = [
        each.cause.name
        for each in listed
        if each.log_evidence >= best.log_evidence - TIED and each.cause.name != NOTHING_FITS
    ]
    return tuple(names) if len(names) > 1 else ()


def _speaks_for(
    weighed: Weighed, declared: Weighed, sheet: Sheet, evidence: Evidence
) -> Iterator[str]:
    """Say the numbers that the sheet does not explain and this cause does, and what it takes."""
    without = np.abs(evidence.values - declared.mean) / declared.u
    with_it = np.abs(evidence.values - weighed.mean) / weighed.u
    explained = (without > TELLING) & (with_it <= TELLING)
    better = without - with_it
    if not explained.any() and better.size and better.max() > 0:
        explained[int(np.argmax(better))] = True
    own_u = np.sqrt(np.diagonal(evidence.covariance))
    for i in np.flatnonzero(explained):
        name = SEEN[evidence.present[i]]
        seen, was, now = (
            _shown(name, sheet, value, own_u[i])
            for value in (evidence.values[i], declared.mean[i], weighed.mean[i])
        )
        yield f"{name} {seen}: {_origin(name, sheet)} leads to {was}, this to {now}"
    yield from _forks_for(weighed, sheet, evidence)
    if weighed.cause.other_weave and shows_other_weave(sheet, evidence):
        yield _repeats(sheet, evidence)
    if weighed.cause.takes:
        size, size_u = rounded(*(100 * each for each in _size(weighed, declared, evidence)))
        yield weighed.cause.takes.format(f"{size} ± {size_u}")


def _size(weighed: Weighed, declared: Weighed, evidence: Evidence) -> tuple[float, float]:
    """How large the deviation is; of a sett that was counted, as counted."""
    for i, seen in enumerate(evidence.present):
        if SEEN[seen] == weighed.cause.sett:
            u = math.sqrt(evidence.covariance[i, i]) / declared.mean[i]
            return abs(evidence.values[i] / declared.mean[i] - 1), u
    return weighed.size, weighed.size_u


def _forks_for(weighed: Weighed, sheet: Sheet, evidence: Evidence) -> Iterator[str]:
    for which, forks in (("ends", evidence.ends_forks), ("picks", evidence.picks_forks)):
        if forks and weighed.cause.forks == which:
            factor, unit = _unit(which, sheet)
            readings = " or ".join(f"{each * factor:.4g}" for each in forks)
            yield f"the {which} could be read as {readings}{unit}"


def _speaks_against(weighed: Weighed, sheet: Sheet, evidence: Evidence) -> Iterator[str]:
    """Say the numbers that this cause does not explain."""
    distance: Floats = np.abs(evidence.values - weighed.mean) / weighed.u
    own_u = np.sqrt(np.diagonal(evidence.covariance))
    for i in np.flatnonzero(distance > TELLING):
        name = SEEN[evidence.present[i]]
        factor, unit = _unit(name, sheet)
        mean, u = rounded(float(weighed.mean[i]) * factor, float(weighed.u[i]) * factor)
        seen = _shown(name, sheet, evidence.values[i], own_u[i])
        yield f"{name} {seen}: this would lead to {mean} ± {u}{unit}"
    if not weighed.cause.other_weave and shows_other_weave(sheet, evidence):
        yield _repeats(sheet, evidence)


def _repeats(sheet: Sheet, evidence: Evidence) -> str:
    seen, declared = evidence.repeat or (), sheet.repeat or ()
    return (
        f"the picture shows a repeat of {' × '.join(map(str, seen))} threads, the declared weave "
        f"has {' × '.join(map(str, declared))}"
    )


def _origin(name: str, sheet: Sheet) -> str:
    return "the approved swatch" if sheet.approved and "cover" in name else "the sheet"


def _shown(name: str, sheet: Sheet, value: float, u: float) -> str:
    factor, unit = _unit(name, sheet)
    return f"{rounded(float(value) * factor, float(u) * factor)[0]}{unit}"


def _unit(name: str, sheet: Sheet) -> tuple[float, str]:
    """Speak of a sett in the unit of the sheet."""
    in_inch = {"ends": sheet.ends_in_inch, "picks": sheet.picks_in_inch}.get(name)
    if in_inch is None:
        return 1.0, " g/m²" if name == "mass" else ""
    return (PER_INCH, " an inch") if in_inch else (1.0, " a cm")


__all__ = ["diagnose"]
