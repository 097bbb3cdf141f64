"""The spine: one picture through every room.

    file → Picture → Scale → Threads → Cover ┐
    article.toml → Declaration → Prediction ─┴→ Verdict → Record

What is declared enters beside the picture and meets it in the verdict. Only the declared weave is
handed to the threads room, which may break a tie with it and then says so.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import UTC, datetime
from typing import TYPE_CHECKING

from imgcover.asking import (
    certificate,
    count_threads,
    density_in,
    exposure,
    find_scale,
    getting_ready,
    measure_cover,
    noticed,
)
from imgcover.errors import PictureError
from imgcover.findings import Finding, Flag, Severity, found
from imgcover.ledger.canonical import Record
from imgcover.ledger.provenance import Provenance, file_sha256, library_versions
from imgcover.ledger.record import Answers, Sample, record_of
from imgcover.picture.reader import read_picture
from imgcover.request import Request
from imgcover.verdict.observed import Observed
from imgcover.verdict.observing import observe

if TYPE_CHECKING:
    from imgcover.cloth.prediction import Prediction


@dataclass(frozen=True, slots=True, eq=False)
class Inspection:
    """One picture inspected.

    Parameters
    ----------
    answers : Answers
        What each room said.
    observed : Observed
        What the verdict on its lot takes of it.
    record : dict
        Schema imgcover/record/1.
    """

    answers: Answers
    observed: Observed
    record: Record


def inspect(request: Request) -> Inspection:
    """Walk one picture through every room.

    Parameters
    ----------
    request : Request
        The picture, and what is asked of it.

    Returns
    -------
    Inspection
        Also of a picture that cannot be read or holds no cloth: its record says why.

    Raises
    ------
    OptionError, CertificateError
        When a file that an option names cannot be used.
    """
    options, declaration = request.options, request.declaration
    try:
        with getting_ready():
            picture = read_picture(request.source, name=request.name, tone=options.tone)
    except PictureError as fault:
        return _judged(_unread(_asked(request), request, fault), request)
    scale = find_scale(picture, options)
    weave = None if declaration is None else declaration.article.weave
    threads = count_threads(picture, options, scale, declared_weave=weave)
    density = density_in(threads, scale.scale, options)
    cover = measure_cover(picture, threads, scale.scale, options)
    measured = replace(
        _asked(request),
        sha256=picture.sha256,
        picture=picture,
        scale=scale.scale,
        threads=threads,
        density=density,
        cover=cover,
        findings=(
            *picture.findings,
            *scale.findings,
            *noticed(threads, density),
            *cover.findings,
        ),
    )
    return _judged(measured, request)


def refuse(request: Request, finding: Finding) -> Inspection:
    """Make the record of a picture that was never opened; the finding says why.

    Parameters
    ----------
    request : Request
        Its source is not touched.
    finding : Finding
        A refusal.
    """
    return _judged(replace(_asked(request), findings=(finding,)), request)


def _judged(answers: Answers, request: Request) -> Inspection:
    """Hold what was measured against what is declared, and lay down the record."""
    declaration, options = request.declaration, request.options
    observed = observe(
        threads=answers.threads,
        density=answers.density,
        scale=answers.scale,
        cover=answers.cover,
        gsm=options.gsm,
        conditioned=request.sample.is_conditioned,
        findings=answers.findings,
        place=request.sample.place or "",
    )
    if declaration is not None:
        # loaded only where there is something to judge against
        from imgcover.cloth.prediction import predict
        from imgcover.verdict.swatch import judge

        prediction = predict(declaration)
        verdict = judge(declaration, prediction, observed, risk=options.risk)
        findings = (*answers.findings, *_warnings(prediction), *verdict.findings)
        answers = replace(answers, prediction=prediction, verdict=verdict, findings=findings)
    answers = replace(answers, findings=tuple(dict.fromkeys(answers.findings)))
    return Inspection(answers, observed, record_of(answers, made_at=_now()))


def _asked(request: Request) -> Answers:
    """What is known of a picture without looking at it."""
    options, declaration = request.options, request.declaration
    blank, dark = (exposure(path, options.tone) for path in (options.blank, options.dark))
    device = certificate(options.device)
    return Answers(
        name=request.name,
        sample=_sample(request),
        light=options.light,
        warp=options.warp,
        provenance=Provenance(
            libraries=library_versions(),
            article_sha256=None if declaration is None else declaration.sha256,
            device=None if device is None else device.sha256,
            blank=None if blank is None else blank.sha256,
            dark=None if dark is None else dark.sha256,
            options=options.record(),
        ),
    )


def _sample(request: Request) -> Sample:
    """The article's code is the declaration's, where the sheet names none."""
    if request.declaration is None or request.sample.article is not None:
        return request.sample
    return replace(request.sample, article=request.declaration.article.code)


def _unread(answers: Answers, request: Request, fault: PictureError) -> Answers:
    finding = found(Flag.PICTURE_UNREADABLE, fault.fault, fault.remedy)
    return replace(answers, sha256=file_sha256(request.source), findings=(finding,))


def _warnings(prediction: Prediction) -> tuple[Finding, ...]:
    """What is weak in the declaration itself; its remarks belong to `imgcover predict`."""
    return tuple(each for each in prediction.findings if each.severity is not Severity.INFO)


def _now() -> str:
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


__all__ = ["Inspection", "inspect", "refuse"]
