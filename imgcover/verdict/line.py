"""One line of a verdict: a declared figure, its limits, what was measured, and what follows."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from enum import StrEnum

from imgcover.quantity import Measured, rounded
from imgcover.verdict.decision import (
    DEFAULT_RISK,
    Decision,
    Limits,
    decide,
    guard_band,
    probability_inside,
)


class Quantity(StrEnum):
    """What can be judged."""

    ENDS = "ends"
    PICKS = "picks"
    COVER = "cover"
    MASS = "mass"


class Basis(StrEnum):
    """Where the value comes from that a measurement is held against."""

    DECLARED = "declared"
    REFERENCE = "reference"
    MODEL = "model"


UNIT = {
    Quantity.ENDS: "1/cm",
    Quantity.PICKS: "1/cm",
    Quantity.COVER: "1",
    Quantity.MASS: "g/m2",
}
"""The unit each quantity is judged in, as the record writes it."""
SPOKEN = {
    Quantity.ENDS: "ends",
    Quantity.PICKS: "picks",
    Quantity.COVER: "optical cover",
    Quantity.MASS: "mass",
}
SPOKEN_UNIT = {
    Quantity.ENDS: " a cm",
    Quantity.PICKS: " a cm",
    Quantity.COVER: "",
    Quantity.MASS: " g/m²",
}
AGAINST = {
    Basis.DECLARED: "declared",
    Basis.REFERENCE: "measured on the approved swatch",
    Basis.MODEL: "expected from the declared construction",
}


@dataclass(frozen=True, slots=True)
class Aim:
    """A figure to hold a measurement against.

    Parameters
    ----------
    quantity : Quantity
    basis : Basis
    value : Measured
        The figure; its u is 0 where it is only declared.
    limits : Limits or None
        What its tolerance allows; None where no tolerance was declared.
    """

    quantity: Quantity
    basis: Basis
    value: Measured
    limits: Limits | None


@dataclass(frozen=True, slots=True)
class Line:
    """One judged figure. `u` is one standard uncertainty; `None` is not known or not limited.

    Parameters
    ----------
    quantity : Quantity
    basis : Basis
    unit : str
        Of every number in the line.
    declared : float
        What was declared, approved or expected, as `basis` says.
    lower, upper : float or None
        The tolerance limits.
    accept_lower, accept_upper : float or None
        What the guard band leaves of them; crossed where it leaves nothing.
    guard : float or None
        The guard band w.
    risk : float or None
        The largest probability of a wrong decision that the guard band leaves at a limit.
    wrong : float or None
        The probability that this decision is wrong; None where nothing was decided.
    measured, u : float or None
        The measured value, and u with the variation between places or over the field, and with
        that of the model or the approved swatch where it is held against one.
    freedom : float or None
        Effective degrees of freedom of u; None where they are many.
    n : int
        How many places the value comes from.
    decision : Decision
    reason : str
        Why, in a sentence.
    holds : tuple of str
        What keeps the line undecided whatever its numbers say.
    """

    quantity: Quantity
    basis: Basis
    unit: str
    declared: float
    lower: float | None
    upper: float | None
    accept_lower: float | None
    accept_upper: float | None
    guard: float | None
    risk: float | None
    wrong: float | None
    measured: float | None
    u: float | None
    freedom: float | None
    n: int
    decision: Decision
    reason: str
    holds: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Sample:
    """What was measured of a quantity, ready to be judged.

    Parameters
    ----------
    value : Measured or None
        None where it could not be measured.
    n : int
        Number of places.
    freedom : float
        Effective degrees of freedom of its u.
    holds : tuple of str
        Reasons that keep the line undecided whatever the numbers say.
    missing : str
        Why there is no value.
    """

    value: Measured | None
    n: int = 1
    freedom: float = math.inf
    holds: tuple[str, ...] = ()
    missing: str = "it could not be measured"


def judge_line(aim: Aim, sample: Sample, *, risk: float | None = None) -> Line:
    """Hold a measured value against a figure.

    Parameters
    ----------
    aim : Aim
        The figure and its limits.
    sample : Sample
        What was measured.
    risk : float, optional
        As in `guard_band`.
    """
    if sample.value is None:
        return _open_line(aim, sample, None, f"{SPOKEN[aim.quantity]} not judged: {sample.missing}")
    u = math.hypot(sample.value.u, aim.value.u)
    apart = _deviation(aim, sample.value.value, u)
    if aim.limits is None:
        reason = f"{apart}; no tolerance declared (write [tolerance] {aim.quantity})"
        return _open_line(aim, sample, u, reason)
    guard = guard_band(u, risk=risk, freedom=sample.freedom, width=aim.limits.width)
    decision = decide(sample.value.value, aim.limits, guard)
    reason = f"{apart}; {_because(aim.limits, guard, decision)}"
    if sample.holds:
        reason += f"; left undecided: {'; '.join(sample.holds)}"
        decision = Decision.UNDECIDED
    inside = probability_inside(sample.value.value, u, aim.limits, sample.freedom)
    lower, upper = aim.limits.lower, aim.limits.upper
    return replace(
        _open_line(aim, sample, u, reason),
        accept_lower=None if lower is None else lower + guard,
        accept_upper=None if upper is None else upper - guard,
        guard=guard,
        risk=DEFAULT_RISK if risk is None else risk,
        wrong=_wrong(decision, inside),
        decision=decision,
    )


def _open_line(aim: Aim, sample: Sample, u: float | None, reason: str) -> Line:
    """Lay out a line on which nothing is decided yet."""
    return Line(
        quantity=aim.quantity,
        basis=aim.basis,
        unit=UNIT[aim.quantity],
        declared=aim.value.value,
        lower=None if aim.limits is None else aim.limits.lower,
        upper=None if aim.limits is None else aim.limits.upper,
        accept_lower=None,
        accept_upper=None,
        guard=None,
        risk=None,
        wrong=None,
        measured=None if sample.value is None else sample.value.value,
        u=u,
        freedom=None if math.isinf(sample.freedom) else sample.freedom,
        n=sample.n,
        decision=Decision.UNDECIDED,
        reason=reason,
        holds=sample.holds,
    )


def _wrong(decision: Decision, inside: float) -> float | None:
    if decision is Decision.CONFORMS:
        return 1.0 - inside
    return inside if decision is Decision.DOES_NOT_CONFORM else None


def _deviation(aim: Aim, measured: float, u: float) -> str:
    """Say both values and how far apart they are, rounded by u."""
    shown, shown_u = rounded(measured, u)
    unit = SPOKEN_UNIT[aim.quantity]
    difference = measured - aim.value.value
    if aim.quantity is Quantity.COVER:
        apart = f"{100 * difference:+.1f} points"
    else:
        apart = f"{100 * difference / aim.value.value:+.1f} %"
    return (
        f"{SPOKEN[aim.quantity]} {shown} ± {shown_u}{unit} against "
        f"{rounded(aim.value.value, u)[0]}{unit} {AGAINST[aim.basis]}, {apart}"
    )


def _because(limits: Limits, guard: float, decision: Decision) -> str:
    span = _span(limits, guard)
    if decision is Decision.CONFORMS:
        return f"inside the limits {span} by more than the guard band"
    if decision is Decision.DOES_NOT_CONFORM:
        return f"outside the limits {span} by more than the guard band"
    if limits.shrunk(guard) is None:
        return f"the limits {span} lie closer together than the measurement can tell apart"
    return f"too near the limits {span} to be proved either way"


def _span(limits: Limits, guard: float) -> str:
    """Write the limits with the digits that the guard band deserves."""
    lower = None if limits.lower is None else rounded(limits.lower, guard)[0]
    upper = None if limits.upper is None else rounded(limits.upper, guard)[0]
    if lower is None:
        return f"(at most {upper})"
    return f"(at least {lower})" if upper is None else f"({lower} to {upper})"


__all__ = ["Aim", "Basis", "Line", "Quantity", "Sample", "judge_line"]
