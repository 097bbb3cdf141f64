"""Is the lot the cloth on the paper? Several places, their mean, and what they leave open."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import Prediction
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.verdict.decision import Decision
from imgcover.verdict.line import Quantity, Sample
from imgcover.verdict.observed import Observed
from imgcover.verdict.place import merged
from imgcover.verdict.pooled import Pooled, pooled
from imgcover.verdict.standard import PLACES, shortest_length_mm
from imgcover.verdict.standing import holds, why_missing
from imgcover.verdict.swatch import judge_samples
from imgcover.verdict.verdict import Scope, Verdict, line_record

SCHEMA = "imgcover/lot/1"
ONE_PLACE = "one place never decides a lot"


@dataclass(frozen=True, slots=True)
class LotVerdict:
    """A verdict on a lot, with the places it rests on.

    Parameters
    ----------
    lot, article : str
    places : tuple of Observed
        Pictures of one place merged.
    required : int
        How many places the standard asks for.
    means : dict of Quantity to Pooled
        Mean, scatter and n of everything measured at one place at least.
    verdict : Verdict
    """

    lot: str
    article: str
    places: tuple[Observed, ...]
    required: int
    means: dict[Quantity, Pooled]
    verdict: Verdict

    @property
    def n_places(self) -> int:
        """Places where ends or picks could be measured."""
        return sum(1 for each in self.places if each.ends is not None or each.picks is not None)

    @property
    def decision(self) -> Decision:
        """The decision on the whole lot."""
        return self.verdict.decision

    def record(self) -> dict[str, Any]:
        """Lay it out as the lot record (schema imgcover/lot/1); densities in 1/cm."""
        return {
            "schema": SCHEMA,
            "lot": self.lot,
            "article": self.article,
            "n_places": self.n_places,
            "required": self.required,
            "places": [_place_record(each) for each in self.places],
            "means": {str(each): _mean_record(mean) for each, mean in self.means.items()},
            "lines": [line_record(each) for each in self.verdict.lines],
            "decision": self.decision.value,
            "risk": self.verdict.risk,
            "diagnosis": [each.record() for each in self.verdict.diagnosis],
            "mean_count": None
            if self.verdict.mean_count is None
            else self.verdict.mean_count.record(),
            "findings": [_finding_record(each) for each in self.verdict.findings],
        }


def judge_lot(
    declaration: Declaration,
    prediction: Prediction,
    pictures: Iterable[Observed],
    *,
    lot: str,
    risk: float | None = None,
    required: int = PLACES,
) -> LotVerdict:
    """Judge a lot by the mean over its places.

    The u of a mean is its scatter between places over √n, with what is common to all places (the
    scale, the light's levels); few places widen the guard band by Student's t. Fewer places than
    the standard's are said, not refused; one place leaves the lot undecided.

    Parameters
    ----------
    declaration : Declaration
    prediction : Prediction
    pictures : iterable of Observed
        Pictures of one named place are merged first.
    lot : str
        The lot's name.
    risk : float, optional
        As in `imgcover.verdict.swatch.judge`.
    required : int
        Places that the standard asks for.
    """
    places = merged(pictures)
    means = {q: mean for q in Quantity if (mean := _mean(places, q)) is not None}
    flags = frozenset().union(*(each.flags for each in places))
    samples = {q: _sample(q, means.get(q), flags) for q in Quantity}
    verdict = judge_samples(
        declaration,
        prediction,
        samples,
        _as_observed(places, means, flags),
        scope=Scope.LOT,
        findings=_findings(places, means, required),
        risk=risk,
    )
    return LotVerdict(lot, declaration.article.code, places, required, means, verdict)


def measured_lot(
    pictures: Iterable[Observed], *, lot: str, required: int = PLACES
) -> dict[str, Any]:
    """Lay out the record of a lot of which nothing was declared: means, and nothing to decide.

    Parameters
    ----------
    pictures : iterable of Observed
        As in `judge_lot`.
    lot : str
        The lot's name.
    required : int
        Places that the standard asks for.
    """
    places = merged(pictures)
    means = {q: mean for q in Quantity if (mean := _mean(places, q)) is not None}
    return {
        "schema": SCHEMA,
        "lot": lot,
        "article": None,
        "n_places": sum(p.ends is not None or p.picks is not None for p in places),
        "required": required,
        "places": [_place_record(each) for each in places],
        "means": {str(each): _mean_record(mean) for each, mean in means.items()},
        "lines": [],
        "decision": None,
        "risk": None,
        "diagnosis": [],
        "mean_count": None,
        "findings": [_finding_record(each) for each in _findings(places, means, required)],
    }


def _mean(places: Sequence[Observed], quantity: Quantity) -> Pooled | None:
    """Average a quantity over the places that tell it."""
    if quantity is Quantity.COVER or quantity is Quantity.MASS:
        cover = quantity is Quantity.COVER
        given = [v for p in places if (v := p.cover if cover else p.gsm) is not None]
        # light table and balance err alike at every place: their u does not average out
        return pooled(given, common_u=max(v.u for v in given)) if given else None
    pairs = [
        (value, spread.u_relative * value.value, p.scale_u * value.value)
        for p in places
        for value, spread in [
            (p.ends, p.ends_spread) if quantity is Quantity.ENDS else (p.picks, p.picks_spread)
        ]
        if value is not None
    ]
    if not pairs:
        return None
    common_u = max(scale for _, _, scale in pairs)
    own = [max(v.u**2 - scale**2, 0.0) + local**2 for v, local, scale in pairs]
    field_u = math.sqrt(math.fsum(own) / len(own))
    return pooled([v for v, _, _ in pairs], common_u=common_u, field_u=field_u)


def _sample(quantity: Quantity, mean: Pooled | None, flags: frozenset[Flag]) -> Sample:
    if mean is None:
        return Sample(None, n=0, missing=why_missing(flags, quantity))
    reasons = holds(flags, quantity)
    # one weighing may stand for a lot; one place of a picture may not
    if mean.n == 1 and quantity is not Quantity.MASS:
        reasons = (*reasons, ONE_PLACE)
    return Sample(mean.mean, mean.n, mean.freedom, reasons)


def _as_observed(
    places: Sequence[Observed], means: dict[Quantity, Pooled], flags: frozenset[Flag]
) -> Observed:
    """The lot as one observation, for the diagnosis."""

    def mean(quantity: Quantity) -> Measured | None:
        return means[quantity].mean if quantity in means else None

    def system(values: list[Measured | None]) -> Measured | None:
        given = [each for each in values if each is not None]
        return pooled(given, common_u=max(v.u for v in given)).mean if given else None

    repeats = {p.repeat for p in places if p.repeat is not None}
    ends, picks = mean(Quantity.ENDS), mean(Quantity.PICKS)
    return Observed(
        ends=ends,
        picks=picks,
        cover=mean(Quantity.COVER),
        warp_cover=system([p.warp_cover for p in places]),
        weft_cover=system([p.weft_cover for p in places]),
        gsm=mean(Quantity.MASS),
        conditioned=all(p.conditioned for p in places if p.gsm is not None),
        scale_u=max((p.scale_u for p in places), default=0.0),
        repeat=repeats.pop() if len(repeats) == 1 else None,
        ends_forks=() if ends else next((p.ends_forks for p in places if p.ends_forks), ()),
        picks_forks=() if picks else next((p.picks_forks for p in places if p.picks_forks), ()),
        flags=flags,
    )


def _findings(
    places: Sequence[Observed], means: dict[Quantity, Pooled], required: int
) -> tuple[Finding, ...]:
    """Say how the places stand beside the standard's number and distances."""
    findings = []
    counted = max((means[q].n for q in (Quantity.ENDS, Quantity.PICKS) if q in means), default=0)
    if counted < required:
        findings.append(
            found(
                Flag.FEWER_PLACES_THAN_STANDARD,
                f"counted at {counted} places; ISO 7211-2 asks for {required}",
            )
        )
    short = [
        f"{quantity} over {min(lengths):.0f} mm instead of {wanted:.0f} mm at "
        f"{len(lengths)} of {mean.n} places"
        for quantity in (Quantity.ENDS, Quantity.PICKS)
        if (mean := means.get(quantity)) is not None
        and (lengths := _short_lengths(places, quantity, mean))
        and (wanted := shortest_length_mm(mean.mean.value))
    ]
    if short:
        message = f"counted shorter than ISO 7211-2 asks: {'; '.join(short)}"
        findings.append(found(Flag.SHORTER_LENGTH_THAN_STANDARD, message))
    if any(Flag.PICTURES_OF_A_PLACE_DISAGREE in p.flags for p in places):
        findings.append(found(Flag.PICTURES_OF_A_PLACE_DISAGREE))
    return tuple(findings)


def _short_lengths(places: Sequence[Observed], quantity: Quantity, mean: Pooled) -> list[float]:
    """Lengths, mm, of the places where threads were counted over less than the standard asks."""
    wanted = shortest_length_mm(mean.mean.value)
    lengths = [p.ends_length_mm if quantity is Quantity.ENDS else p.picks_length_mm for p in places]
    return [length for length in lengths if length is not None and length < wanted]


def _measured_record(value: Measured | None) -> dict[str, Any] | None:
    return None if value is None else {"value": value.value, "u": value.u, "unit": value.unit}


def _place_record(place: Observed) -> dict[str, Any]:
    return {
        "place": place.place or None,
        "ends": _measured_record(place.ends),
        "picks": _measured_record(place.picks),
        "cover": _measured_record(place.cover),
        "mass": _measured_record(place.gsm),
        "length_ends_mm": place.ends_length_mm,
        "length_picks_mm": place.picks_length_mm,
    }


def _mean_record(mean: Pooled) -> dict[str, Any]:
    freedom = None if math.isinf(mean.freedom) else mean.freedom
    return {
        **(_measured_record(mean.mean) or {}),
        "n": mean.n,
        "scatter": mean.scatter,
        "freedom": freedom,
    }


def _finding_record(finding: Finding) -> dict[str, str]:
    return {
        "code": finding.code,
        "severity": finding.severity.value,
        "message": finding.message,
        "remedy": finding.remedy,
    }


__all__ = ["LotVerdict", "judge_lot", "measured_lot"]
