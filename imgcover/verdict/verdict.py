"""What is said of a swatch or a lot: the lines, the whole, the risk, and what must be wrong."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from enum import StrEnum
from typing import Any

from imgcover.findings import Finding
from imgcover.verdict.decision import Decision, overall
from imgcover.verdict.line import Line
from imgcover.verdict.mean_count import MeanCount


class Scope(StrEnum):
    """What a verdict speaks for."""

    SWATCH = "swatch"
    LOT = "lot"


@dataclass(frozen=True, slots=True)
class Suspect:
    """One thing that would explain what was seen. It indicates, it does not prove.

    Parameters
    ----------
    cause : str
        What may be wrong.
    weight : float
        Its probability among all the causes weighed, 0…1.
    speaks_for, speaks_against : tuple of str
        The numbers that support it and those that do not.
    settle : str
        The check that would settle it.
    tied_with : tuple of str
        Causes that this evidence cannot tell from it.
    """

    cause: str
    weight: float
    speaks_for: tuple[str, ...]
    speaks_against: tuple[str, ...]
    settle: str
    tied_with: tuple[str, ...] = ()

    def record(self) -> dict[str, Any]:
        """Lay it out as the record holds it."""
        return {
            "cause": self.cause,
            "weight": self.weight,
            "for": list(self.speaks_for),
            "against": list(self.speaks_against),
            "settle": self.settle,
            "tied_with": list(self.tied_with),
        }


@dataclass(frozen=True, slots=True)
class Verdict:
    """A decision with everything it rests on.

    Parameters
    ----------
    scope : Scope
    decision : Decision
        One line that does not conform decides; else one open line leaves the whole open.
    risk : float or None
        The largest probability that the decision on the whole is wrong: that any conforming line
        is wrong (the sum over the lines), or that every failing line is (the smallest of theirs).
        None where nothing was decided.
    lines : tuple of Line
    diagnosis : tuple of Suspect
        Best first; empty where all agrees within its uncertainty.
    findings : tuple of Finding
    mean_count : MeanCount or None
        Of all yarn in the cloth, where it was weighed and both systems were counted.
    """

    scope: Scope
    decision: Decision
    risk: float | None
    lines: tuple[Line, ...]
    diagnosis: tuple[Suspect, ...]
    findings: tuple[Finding, ...]
    mean_count: MeanCount | None = None

    def record(self) -> dict[str, Any]:
        """Lay it out as the record holds it; the findings go to the record's own list."""
        return {
            "scope": self.scope.value,
            "decision": self.decision.value,
            "risk": self.risk,
            "lines": [line_record(line) for line in self.lines],
            "diagnosis": [each.record() for each in self.diagnosis],
            "mean_count": None if self.mean_count is None else self.mean_count.record(),
        }


def line_record(line: Line) -> dict[str, Any]:
    """Lay a line out as the record holds it."""
    laid = asdict(line)
    return {key: each.value if isinstance(each, StrEnum) else each for key, each in laid.items()}


def whole(
    scope: Scope,
    lines: tuple[Line, ...],
    diagnosis: tuple[Suspect, ...],
    findings: tuple[Finding, ...],
    mean: MeanCount | None,
) -> Verdict:
    """Draw the lines together into one verdict."""
    decision = overall(tuple(line.decision for line in lines))
    risk = overall_risk(lines, decision)
    return Verdict(scope, decision, risk, lines, diagnosis, findings, mean)


def overall_risk(lines: tuple[Line, ...], decision: Decision) -> float | None:
    """Bound the probability that the decision on the whole is wrong.

    All lines conform: the chance that at least one does not is at most the sum of theirs
    (Boole's inequality; no independence is assumed). A whole that does not conform is wrongly
    refused only if every failing line is wrong, at most the smallest of theirs.
    """
    wrongs = [line.wrong for line in lines if line.decision is decision and line.wrong is not None]
    if decision is Decision.UNDECIDED or not wrongs:
        return None
    return min(1.0, sum(wrongs)) if decision is Decision.CONFORMS else min(wrongs)


__all__ = ["Scope", "Suspect", "Verdict", "line_record", "overall_risk", "whole"]
