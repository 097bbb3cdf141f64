"""One picture of an audit, measured: what is called in the workers."""

from __future__ import annotations

from dataclasses import dataclass, replace
from importlib import import_module
from typing import Any

import cv2
import numpy as np

from imgcover.asking import ALWAYS_ASKED
from imgcover.audit.evidence import evidence_text
from imgcover.audit.grounds import OffGroundsError, read_file
from imgcover.audit.orders import Order
from imgcover.audit.outcome import Loss, Lost
from imgcover.errors import ImgcoverError
from imgcover.findings import Finding, Flag, found
from imgcover.inspection import Inspection, inspect, refuse
from imgcover.ledger.canonical import UNHASHED, canonical
from imgcover.ledger.sections import findings_section
from imgcover.picture.picture import Picture
from imgcover.report.canvas import eight_bits, resized
from imgcover.report.closeup import close_up
from imgcover.report.strips import marked_sets
from imgcover.request import Request

for each in (*ALWAYS_ASKED, "imgcover.verdict.swatch"):
    # loaded with this module: a worker's clock starts when all that it will need is there
    import_module(each)

SMALL = 360
"""Side of a small picture, px: three stand beside one another on a page, and print sharp enough
there to count along."""
SMALL_QUALITY = 82
"""JPEG; threads and marks stay apart, and forty of them keep a page under two megabytes."""
LOST_FLAG = {
    Loss.DIED: Flag.MEASURING_DIED,
    Loss.HUNG: Flag.MEASURING_TOOK_TOO_LONG,
    Loss.FAULT: Flag.PROGRAM_FAULT,
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """A picture's record, ready to be remembered.

    Parameters
    ----------
    body : str
        The record on one line, without its envelope.
    made_at : str
        From the envelope.
    evidence : str
        What a lot takes of it (`imgcover.audit.evidence`).
    picture_sha256 : str or None
        Of the file's bytes, as they were measured.
    small : bytes or None
        A small JPEG of what was counted; None of a picture that could not be read.
    unread : str
        Empty, or why the picture itself could not be read.
    refused : str
        Empty, or what is wrong with a file that an option names.
    """

    body: str
    made_at: str
    evidence: str
    picture_sha256: str | None
    small: bytes | None = None
    unread: str = ""
    refused: str = ""


def measure_one(order: Order) -> Answer:
    """Measure one picture.

    Parameters
    ----------
    order : Order

    Returns
    -------
    Answer
        Also of a picture that is out of reach or cannot be read.
    """
    cv2.setNumThreads(1)  # one process a core: threads would only queue for it
    if order.path is None and order.content is None:
        return _refused(order, found(Flag.PICTURE_OUT_OF_REACH, order.fault))
    try:
        content = order.content
        if content is None:
            assert order.path is not None
            content = read_file(order.path)
    except OffGroundsError as fault:
        return _refused(order, found(Flag.PICTURE_OUT_OF_REACH, str(fault)))
    try:
        inspection = inspect(_request(order, content))
    except ImgcoverError as fault:
        # an exposure or certificate that the options name; the picture itself cannot raise
        return replace(
            _refused(order, found(Flag.OPTION_UNUSABLE, str(fault), fault.remedy)),
            refused=str(fault),
        )
    return _answer(order, inspection, small=_small(inspection))


def lost_answer(order: Order, lost: Lost) -> Answer:
    """Make the record of a picture that could not be measured because of what measuring did."""
    flag = LOST_FLAG[lost.loss]
    # how a process died or where a bug lies is not the inspector's, and not the same every time
    return _refused(order, found(flag))


def _request(order: Order, content: bytes) -> Request:
    return Request(
        source=content,
        name=order.name,
        options=order.options,
        declaration=order.declaration,
        sample=order.sample,
    )


def _refused(order: Order, finding: Finding) -> Answer:
    bare = replace(order.options, blank=None, dark=None, device=None)
    return _answer(order, refuse(_request(replace(order, options=bare), b""), finding))


def _answer(order: Order, inspection: Inspection, *, small: bytes | None = None) -> Answer:
    record: dict[str, Any] = dict(inspection.record)
    made_at = record.pop(UNHASHED)["made_at"]
    told = "" if inspection.answers.picture is not None else record["findings"][0]["message"]
    record["findings"] = [*findings_section(order.notes), *record["findings"]]
    return Answer(
        body=canonical(record),
        made_at=made_at,
        evidence=evidence_text(inspection.observed),
        picture_sha256=record["picture"]["sha256"],
        small=small,
        unread=told,
    )


def _small(inspection: Inspection) -> bytes | None:
    answers = inspection.answers
    picture, threads = answers.picture, answers.threads
    if picture is None:
        return None
    marked = [] if threads is None else marked_sets(threads, backlit=answers.light == "backlit")
    if threads is not None and marked:
        seen = () if answers.cover is None else answers.cover.seen
        drawn = close_up(picture.stored, marked=marked, tiles=threads.tiles, seen=seen, side=SMALL)
        pixels = drawn.pixels
    else:
        pixels = _shrunk(picture)
    done, coded = cv2.imencode(
        ".jpg", np.ascontiguousarray(pixels[..., ::-1]), [cv2.IMWRITE_JPEG_QUALITY, SMALL_QUALITY]
    )
    return coded.tobytes() if done else None


def _shrunk(picture: Picture) -> Any:
    """The whole picture, where nothing was counted that could be shown larger."""
    scale = SMALL / max(picture.rows, picture.columns)
    size = [max(1, round(each * scale)) for each in (picture.columns, picture.rows)]
    pixels = eight_bits(resized(picture.stored, *size))
    return pixels if pixels.ndim == 3 else np.repeat(pixels[..., None], 3, axis=2)


__all__ = ["Answer", "lost_answer", "measure_one"]
