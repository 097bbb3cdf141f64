"""`imgcover measure`, carried out: each picture inspected, told, drawn and remembered in turn."""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from imgcover.cli.exits import ExitCode, gravest
from imgcover.cli.output import keep_apart, opened, tell
from imgcover.errors import OptionError
from imgcover.inspection import Inspection, inspect
from imgcover.ledger.canonical import Record, canonical, digest
from imgcover.ledger.chain import Entry
from imgcover.ledger.record import Sample
from imgcover.report.data import json_array, json_lines
from imgcover.report.layout import Units, units_of
from imgcover.report.reference import reasons_against, reference_toml
from imgcover.report.rows import csv_lines
from imgcover.report.text import lot_text, record_text
from imgcover.request import Request, read_options

if TYPE_CHECKING:
    from imgcover.audit.lots import Member
    from imgcover.cloth.declaration import Declaration
    from imgcover.ledger.store import Ledger

# declarations, lots, ledger and overlays are loaded when they are asked for: half of all loading

Form = Literal["text", "json", "jsonl", "csv"]
STDIN = "-"


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """What the command line asked for, options of measuring still in words.

    Parameters
    ----------
    pictures : sequence of str
        Paths; "-" is stdin.
    words : mapping of str to str
        Options as `imgcover.request.read_options` takes them.
    article : Path or None
    lot : str or None
    units : {"inch", "cm"} or None
    form : {"text", "json", "jsonl", "csv"}
    output, overlay, ledger, as_reference : Path or None
    """

    pictures: Sequence[str]
    words: Mapping[str, str]
    article: Path | None
    lot: str | None
    units: Units | None
    form: Form
    output: Path | None
    overlay: Path | None
    ledger: Path | None
    as_reference: Path | None


def measured(asked: Asked) -> ExitCode:
    """Measure every picture, tell it as asked, and say how it ended."""
    _check(asked)
    declaration = _declared(asked.article)
    units = asked.units or units_of(declaration)
    requests = _requests(asked, declaration)
    with ExitStack() as stack:
        write = stack.enter_context(
            opened(asked.output, encoding=None if asked.form == "text" else "utf-8")
        )
        ledger = _ledger(asked.ledger, stack)
        run = _Run(asked, declaration, units, ledger)
        for piece in _told(run.records(requests), asked.form, units):
            write(piece)
        run.finish()
    return run.code()


class _Run:
    """One going through the pictures: what was found so far, and what is still to be told."""

    def __init__(
        self, asked: Asked, declaration: Declaration | None, units: Units, ledger: Ledger | None
    ) -> None:
        self._asked = asked
        self._declaration = declaration
        self._units = units
        self._ledger = ledger
        self._codes: list[ExitCode] = []
        self._members: list[Member] = []
        self._lot: Record | None = None
        self._drawn: set[str] = set()
        self._last: Record | None = None

    def records(self, requests: Iterator[Request]) -> Iterator[Record]:
        """Give each picture's record as soon as it is made, then the lot's."""
        for request in requests:
            inspection = inspect(request)
            record = inspection.record
            self._codes.append(code_of(record))
            self._remember(record)
            if self._asked.lot is not None:
                self._members.append(_member(request.name, inspection))
            if self._asked.overlay is not None:
                self._draw(inspection, self._asked.overlay)
            self._last = record
            yield record
        if self._asked.lot is not None:
            from imgcover.audit.lots import sum_lot

            summed = sum_lot(
                self._members,
                lot=self._asked.lot,
                declaration=self._declaration,
                risk=read_options(self._asked.words).risk,
            )
            self._lot = summed
            self._remember(summed)
            yield summed

    def finish(self) -> None:
        """Sum up several pictures on stderr, and write the reference of an approved swatch."""
        if len(self._codes) > 1:
            tell(_summary(self._codes))
        if self._asked.as_reference is not None and self._last is not None:
            self._approve(self._last, self._asked.as_reference)

    def code(self) -> ExitCode:
        """How it ended: as the lot did where there is one, else as the gravest picture did."""
        return gravest(self._codes) if self._lot is None else code_of(self._lot)

    def _approve(self, record: Record, path: Path) -> None:
        if record["cover"] is None or record["cover"]["optical"] is None:
            tell(f"no reference was written: {reasons_against(record)}")
            self._codes.append(ExitCode.UNDECIDED)
            return
        with opened(path) as write:
            write(reference_toml(record))

    def _remember(self, record: Record) -> None:
        if self._ledger is not None:
            self._ledger.append([_entry(record)])

    def _draw(self, inspection: Inspection, folder: Path) -> None:
        answers = inspection.answers
        if answers.picture is None or answers.threads is None:
            return
        from imgcover.report.overlay import overlay, write_overlay

        pixels = overlay(
            inspection.record,
            picture=answers.picture,
            threads=answers.threads,
            scale=answers.scale,
            cover=answers.cover,
            region=inspection.record["provenance"]["options"]["region"],
            units=self._units,
        )
        write_overlay(pixels, folder / self._free_name(answers.name))

    def _free_name(self, name: str) -> str:
        """A file name for an overlay that no other picture of this run has."""
        stem = "stdin" if name == STDIN else Path(name).stem
        numbers = (f"{stem}.overlay.png", *(f"{stem}-{n}.overlay.png" for n in range(2, 100_000)))
        free = next(each for each in numbers if each not in self._drawn)
        self._drawn.add(free)
        return free


def code_of(record: Mapping[str, Any]) -> ExitCode:
    """The exit code that one picture's or lot's record asks for.

    Parameters
    ----------
    record : mapping
        Schema imgcover/record/1 or imgcover/lot/1.
    """
    verdict = record["verdict"] if "picture" in record else record
    if verdict is None or verdict["decision"] is None:
        return ExitCode.CONFORMS if _is_counted(record) else ExitCode.UNDECIDED
    return {
        "conforms": ExitCode.CONFORMS,
        "does not conform": ExitCode.DOES_NOT_CONFORM,
        "undecided": ExitCode.UNDECIDED,
    }[verdict["decision"]]


def _is_counted(record: Mapping[str, Any]) -> bool:
    """Whether ends or picks were measured, where nothing was declared."""
    section = record["threads"] if "picture" in record else record["means"]
    return section is not None and any(section.get(key) for key in ("ends", "picks"))


def _declared(article: Path | None) -> Declaration | None:
    if article is None:
        return None
    from imgcover.cloth.declaration import read_declaration

    return read_declaration(article)


def _ledger(path: Path | None, stack: ExitStack) -> Ledger | None:
    if path is None:
        return None
    from imgcover.ledger.store import Ledger

    return stack.enter_context(Ledger.open(path))


def _member(name: str, inspection: Inspection) -> Member:
    from imgcover.audit.lots import Member

    return Member(name, inspection.record["picture"]["pixels_sha256"], inspection.observed)


def _check(asked: Asked) -> None:
    """Refuse what cannot be meant, before anything is measured."""
    if list(asked.pictures).count(STDIN) > 1:
        raise OptionError("PICTURE", "stdin is named twice", "name - once")
    if asked.as_reference is not None and len(asked.pictures) != 1:
        raise OptionError(
            "--as-reference",
            f"{len(asked.pictures)} pictures were given",
            "approve one swatch: name its picture alone",
        )
    named = (
        *asked.pictures,
        asked.article,
        *(asked.words.get(each) for each in ("blank", "dark", "device")),
    )
    inputs = [Path(each) for each in named if each is not None]
    keep_apart("--output", asked.output, inputs)
    keep_apart("--as-reference", asked.as_reference, inputs)


def _requests(asked: Asked, declaration: Declaration | None) -> Iterator[Request]:
    options = read_options(asked.words)
    for number, given in enumerate(asked.pictures, 1):
        place = None if asked.lot is None else str(number)
        yield Request(
            source=sys.stdin.buffer.read() if given == STDIN else Path(given),
            # a record is sent on as proof: it says nothing of the folders of this machine
            name=given if given == STDIN else Path(given).name,
            options=options,
            declaration=declaration,
            sample=Sample(lot=asked.lot, place=place),
        )


def _told(records: Iterator[Record], form: Form, units: Units) -> Iterator[str]:
    machine: dict[str, Callable[[Iterator[Record]], Iterator[str]]] = {
        "json": json_array,
        "jsonl": json_lines,
        "csv": csv_lines,
    }
    if form != "text":
        yield from machine[form](records)
        return
    for number, record in enumerate(records):
        told = record_text if "picture" in record else lot_text
        yield ("\n" if number else "") + told(record, units=units)


def _entry(record: Record) -> Entry:
    """The ledger's row of a record; a picture measured again supersedes what was said of it."""
    body = {key: value for key, value in record.items() if key != "envelope"}
    made_at = record.get("envelope", {}).get("made_at", "")
    if "picture" in record:
        lot, picture = record["sample"]["lot"] or "", record["picture"]
        # scanners number each folder from 1: another picture of the same name is another swatch
        told = "" if picture["sha256"] is None else f" {picture['sha256'][:12]}"
        subject = f"picture:{lot}/{picture['name']}{told}"
    else:
        subject = f"lot:{record['lot']}/{record['article'] or ''}"
    return Entry(record["schema"], subject, digest(record), canonical(body), made_at)


def _summary(codes: Sequence[ExitCode]) -> str:
    words = {
        ExitCode.CONFORMS: "without objection",
        ExitCode.DOES_NOT_CONFORM: "not conforming",
        ExitCode.UNDECIDED: "undecided or not measured",
    }
    counts = Counter(codes)
    parts = [f"{counts[code]} {word}" for code, word in words.items() if counts[code]]
    return f"{len(codes)} pictures: {', '.join(parts)}"


__all__ = ["Asked", "Form", "code_of", "measured"]
