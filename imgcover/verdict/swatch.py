"""Is the swatch on the table the cloth on the paper?"""

from __future__ import annotations

import math
from collections.abc import Mapping

from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import Prediction
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured, rounded
from imgcover.verdict.aims import aims
from imgcover.verdict.decision import Decision
from imgcover.verdict.diagnosis import diagnose
from imgcover.verdict.evidence import evidence_of
from imgcover.verdict.line import Quantity, Sample, judge_line
from imgcover.verdict.mean_count import mean_count
from imgcover.verdict.observed import Observed, Spread
from imgcover.verdict.sheet import sheet_of
from imgcover.verdict.standing import holds, why_missing
from imgcover.verdict.verdict import Scope, Verdict, whole

COVER_DIFFERS = 2.0
"""Standard uncertainties of the difference beyond which cover and model are said to differ."""

CAN_BE_CHANCE = (
    "by itself this can still be chance: weigh a cut of known area (--gsm), or hold the swatch "
    "against an approved one"
)


def judge(
    declaration: Declaration,
    prediction: Prediction,
    observed: Observed,
    *,
    risk: float | None = None,
) -> Verdict:
    """Judge one swatch against its declaration.

    Parameters
    ----------
    declaration : Declaration
        What was declared.
    prediction : Prediction
        What the declared construction leads to.
    observed : Observed
        What was seen; never touched by what was declared.
    risk : float, optional
        Largest probability that a stated decision is wrong; None takes the guard band U = 2 u.

    Returns
    -------
    Verdict
        With scope swatch: one place never decides a lot.
    """
    values = {
        Quantity.ENDS: _of_cloth(observed.ends, observed.ends_spread),
        Quantity.PICKS: _of_cloth(observed.picks, observed.picks_spread),
        Quantity.COVER: observed.cover,
        Quantity.MASS: observed.gsm,
    }
    samples = {
        q: Sample(v, holds=holds(observed.flags, q), missing=why_missing(observed.flags, q))
        for q, v in values.items()
    }
    return judge_samples(
        declaration, prediction, samples, observed, scope=Scope.SWATCH, findings=(), risk=risk
    )


def judge_samples(
    declaration: Declaration,
    prediction: Prediction,
    samples: Mapping[Quantity, Sample],
    observed: Observed,
    *,
    scope: Scope,
    findings: tuple[Finding, ...],
    risk: float | None,
) -> Verdict:
    """Judge what a swatch or a lot gave: lines, findings, diagnosis, and the whole.

    Parameters
    ----------
    declaration, prediction
        As in `judge`.
    samples : mapping of Quantity to Sample
        One for every quantity.
    observed : Observed
        The same, for the diagnosis.
    scope : Scope
    findings : tuple of Finding
        Those that are already there.
    risk : float or None
    """
    lines = tuple(
        judge_line(aim, samples[quantity], risk=risk)
        for quantity, aim in aims(declaration, prediction).items()
        if is_asked(quantity, samples[quantity].value, aim.limits is not None)
    )
    # while the scale itself is open, every cause would explain the wrong numbers
    diagnosis = (
        ()
        if Flag.SCALES_DISAGREE in observed.flags
        else diagnose(
            sheet_of(declaration),
            evidence_of(observed),
            risk=risk,
            failed=any(line.decision is Decision.DOES_NOT_CONFORM for line in lines),
        )
    )
    more = (
        cover_finding(observed.cover, prediction.cover, explained=bool(diagnosis)),
        mass_finding(declaration, observed.gsm),
    )
    said = (*findings, *(finding for finding in more if finding is not None))
    return whole(scope, lines, diagnosis, said, mean_count(declaration, observed))


def is_asked(quantity: Quantity, value: Measured | None, has_limits: bool) -> bool:
    """Whether a figure gets a line.

    Ends and picks always do; cover where it was measured or a tolerance asks for it; mass only
    where it was weighed, since no picture can tell it.
    """
    if quantity in (Quantity.ENDS, Quantity.PICKS):
        return True
    if quantity is Quantity.MASS:
        return value is not None
    return value is not None or has_limits


def cover_finding(
    cover: Measured | None, predicted: Measured, *, explained: bool
) -> Finding | None:
    """Say where the cover differs from the model by more than both uncertainties explain.

    One right cloth in twenty differs by more than two u. So where the diagnosis, which keeps to
    the stated risk over everything seen, stays silent, the remedy is a better look.
    """
    if cover is None:
        return None
    u = math.hypot(cover.u, predicted.u)
    if abs(cover.value - predicted.value) <= COVER_DIFFERS * u:
        return None
    seen, expected = rounded(cover.value, cover.u), rounded(predicted.value, predicted.u)
    more = "more" if cover.value > predicted.value else "less"
    return found(
        Flag.COVER_DIFFERS_FROM_MODEL,
        f"optical cover is {seen[0]} ± {seen[1]}, {more} than the {expected[0]} ± {expected[1]} "
        "that the declared construction leads to",
        None if explained else CAN_BE_CHANCE,
    )


def mass_finding(declaration: Declaration, gsm: Measured | None) -> Finding | None:
    """Say that a mass with a tolerance was left unjudged because nothing was weighed."""
    if gsm is not None or declaration.tolerance.mass is None:
        return None
    return found(Flag.MASS_NOT_WEIGHED)


def _of_cloth(field: Measured | None, spread: Spread) -> Measured | None:
    """Widen the u of a field's density by how the density varies from place to place."""
    if field is None:
        return None
    return Measured(field.value, math.hypot(field.u, field.value * spread.u_relative), field.unit)


__all__ = ["judge", "judge_samples"]
