"""A plan laid out for machines, with what there is to do about it."""

from __future__ import annotations

import math
from collections.abc import Iterator

from imgcover.ledger.canonical import Record
from imgcover.ledger.sections import findings_section, laid, quantity
from imgcover.plan.planning import CoverPlan, Plan, SystemPlan
from imgcover.plan.sight import COMFORTABLE_PIXELS, FEWEST_DETAILS, Standing, detail_dpi
from imgcover.plan.trial import THREADS_DRAWN, Told
from imgcover.verdict.line import Basis

SCHEMA = "imgcover/plan/1"


def plan_record(planned: Plan) -> Record:
    """Lay a plan out.

    Parameters
    ----------
    planned : Plan

    Returns
    -------
    dict
        Schema imgcover/plan/1; densities 1/cm, lengths mm, `u` and `guard` of threads relative,
        of cover fractions. Keys whose value is not known or not asked are null.
    """
    article, scale, needed = planned.declaration.article, planned.scale, planned.resolution
    return laid(
        {
            "schema": SCHEMA,
            "article": {
                "code": article.code,
                "description": article.description,
                "weave": article.weave,
                "sha256": planned.declaration.sha256,
            },
            "device": {
                "scale_from": str(scale.source),
                "x": quantity(scale.x),
                "y": quantity(scale.y),
                "detail_mm": planned.detail_mm,
            },
            "resolution": {
                "least_dpi": needed.least,
                "unflagged_dpi": needed.unflagged,
                "comfortable_dpi": needed.comfortable,
                "usual_dpi": needed.usual,
                "detail_dpi": detail_dpi(planned.detail_mm),
            },
            "ends": _system_section(planned.ends),
            "picks": _system_section(planned.picks),
            "cover": _cover_section(planned.cover),
            "places": planned.places,
            "drawn": planned.pictures,
            "to_do": list(to_do(planned)),
            "assumed": list(assumed(planned)),
            "findings": findings_section(scale.findings),
        }
    )


def to_do(planned: Plan) -> Iterator[str]:
    """Say what stands in the way and what would help, the gravest first."""
    yield from _finer(planned)
    for name, system in (("ends", planned.ends), ("picks", planned.picks)):
        yield from _counting(name, system)
    yield from _covering(planned.cover)


def assumed(planned: Plan) -> Iterator[str]:
    """Say what the plan rests on."""
    yield f"the device shows no detail below {1000 * planned.detail_mm:.3g} µm (--detail)"
    yield (
        f"densities differ by {100 * planned.between:.2g} % (standard deviation) from place to "
        "place of a lot (--scatter)"
    )
    if planned.pictures:
        yield (
            f"the cloth is as even as the {planned.pictures} drawn of it, about {THREADS_DRAWN} "
            "threads each way; coloured, hairy or damaged cloth is read less well"
        )
    yield "the swatch may lie either way round: the coarser axis counts for both systems"


def _finer(planned: Plan) -> Iterator[str]:
    """What is to be done about the resolution."""
    worst = min((planned.ends, planned.picks), key=lambda each: each.sight.pixels).sight
    standing, needed = worst.standing, planned.resolution
    if standing is Standing.COMFORTABLE:
        return
    if worst.details < FEWEST_DETAILS and worst.pixels >= COMFORTABLE_PIXELS:
        yield (
            f"a thread has {worst.details:.2g} details of {1000 * planned.detail_mm:.3g} µm: take "
            "the pictures through a lens that shows smaller ones"
        )
        return
    if needed.usual is None:
        said = f"a device that shows finer detail, at {needed.comfortable:.0f}dpi or more"
    else:
        said = f"{needed.usual}dpi"
    told = {
        Standing.REFUSED: "threads so fine are refused",
        Standing.FLAGGED: "the counts will be flagged",
        Standing.ENOUGH: "enough to count; cover is told better at more",
    }[standing]
    yield f"{worst.pixels:.2g} pixels a thread: {told}; use {said}"


def _counting(name: str, system: SystemPlan) -> Iterator[str]:
    if system.told is not None and not system.told.right:
        yield f"{name} cannot be told: {_first(system.told)}"
        return
    proof, room = system.proof, system.room
    if room is None:
        yield f"no tolerance is declared for {name}: write [tolerance] {name}"
    if proof is None or room is None:
        return
    if not proof.possible:
        yield (
            f"no swatch can be proved to have its {name} within {100 * room.nearest:.2g} %: the "
            f"guard band is {100 * proof.guard:.2g} %"
        )
    elif proof.needed_mm is None:
        yield (
            f"of {name}, the guard band takes {100 * proof.guard / room.nearest:.0f} % of the "
            "tolerance, and over any field more than half: many swatches in order will stay "
            "undecided"
        )
    if proof.better is not None:
        yield (
            f"a scale with u of {_share_down(proof.better.u)} or better would prove the {name} "
            f"at {proof.better.places} places: make the device's certificate (imgcover "
            "calibrate), or state --pitch-u where it is known"
        )
    elif proof.places is None:
        yield (
            f"no number of places proves the mean {name} of a lot: its tolerance is too narrow "
            "beside the scatter from place to place"
        )


def _covering(cover: CoverPlan) -> Iterator[str]:
    if cover.told is not None and not cover.told.right:
        yield f"cover cannot be told: {_first(cover.told)}"
        return
    if cover.guard is None:
        return
    if cover.room is None:
        yield "no tolerance is declared for cover: write [tolerance] cover"
        return
    if cover.ample:
        return
    points, taken = 100 * cover.room.nearest, 100 * cover.guard
    grade = "takes most of" if cover.possible else "is more than"
    yield f"the guard band of cover, {taken:.2g} points, {grade} the tolerance of {points:.2g}"
    if cover.basis is Basis.MODEL:
        yield (
            "the model's u is the larger part: hold cover against an approved swatch "
            "(imgcover measure --as-reference), or declare it ([cover] declared)"
        )


def _first(told: Told) -> str:
    return told.reasons[0]


def _share_down(share: float) -> str:
    """Two digits of a percentage, rounded to the strict side."""
    percent = 100 * share
    step = 10.0 ** (math.floor(math.log10(percent)) - 1)
    return f"{math.floor(percent / step) * step:.2g}%"


def _system_section(system: SystemPlan) -> Record:
    proof, room, told = system.proof, system.room, system.told
    return {
        "per_cm": 10 * system.per_mm,
        "pixels": system.sight.pixels,
        "details": system.sight.details,
        "standing": system.sight.standing.value,
        "told": told is not None and told.right,
        "off": None if told is None else told.off,
        "tolerance": None if room is None else room.nearest,
        "u": None if proof is None else proof.u,
        "guard": None if proof is None else proof.guard,
        "possible": None if proof is None else proof.possible,
        "standard_mm": None if proof is None else proof.standard_mm,
        "needed_mm": None if proof is None else proof.needed_mm,
        "field_mm": None if proof is None else proof.field_mm,
        "places": None if proof is None else proof.places,
        "better_scale": None
        if proof is None or proof.better is None
        else {"u": proof.better.u, "places": proof.better.places},
    }


def _cover_section(cover: CoverPlan) -> Record:
    told = cover.told
    return {
        "expected": quantity(cover.expected),
        "told": told is not None and told.right,
        "u_reading": None if told is None or not told.right else told.u,
        "off": None if told is None else told.off,
        "basis": None if cover.basis is None else cover.basis.value,
        "tolerance": None if cover.room is None else cover.room.nearest,
        "u": cover.u,
        "guard": cover.guard,
        "possible": cover.possible,
        "ample": cover.ample,
    }


__all__ = ["SCHEMA", "assumed", "plan_record", "to_do"]
