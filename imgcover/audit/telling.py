"""An audit told: lots summed and remembered, then records, table, workbook and pages written."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from imgcover.audit.folder import LotName, some_of
from imgcover.audit.lots import Member, member, place_numbers, sum_lot
from imgcover.audit.out_folder import page_name
from imgcover.audit.outcome import Crew, Lost
from imgcover.audit.run import Round, record_in
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import Prediction, predict
from imgcover.errors import DeclarationError
from imgcover.ledger.canonical import canonical
from imgcover.ledger.chain import Entry, Head, Row
from imgcover.ledger.store import Ledger
from imgcover.report.glance import Glance, glance
from imgcover.report.index_page import LotLine, index_page
from imgcover.report.layout import Units, units_of
from imgcover.report.lot_page import About, lot_page
from imgcover.report.lots_csv import lots_csv_lines
from imgcover.report.workbook import AuditWorkbook

LOT_SCHEMA = "imgcover/lot/1"


@dataclass(frozen=True, slots=True, kw_only=True)
class ToldLot:
    """A lot as it stands in the ledger.

    Parameters
    ----------
    name : LotName
    row : int
        Of the ledger, where its record is.
    decision : str or None
        None where nothing was declared.
    n_places, required : int
        Places counted, and asked for by the standard.
    indices : tuple of int
        Its pictures' places in the list.
    numbers : tuple of int or None
        Its pictures' places in the lot.
    unread : int
        Pictures that gave no number.
    units : {"inch", "cm"}
        As its declaration says.
    page : str
        Of its page, inside the out folder.
    """

    name: LotName
    row: int
    decision: str | None
    n_places: int
    required: int
    indices: tuple[int, ...]
    numbers: tuple[int | None, ...]
    unread: int
    units: Units
    page: str

    def record(self, ledger: Ledger) -> dict[str, Any]:
        """Fetch the lot's record, schema imgcover/lot/1; one lot at a time is in memory."""
        row = ledger.row(self.row)
        assert row is not None, "a lot is gone from the ledger"
        record: dict[str, Any] = json.loads(row.entry.body)
        return record


@dataclass(frozen=True, slots=True, kw_only=True)
class PageOrder:
    """What a worker needs to write a lot's page.

    Parameters
    ----------
    record : mapping
        Of the lot.
    glances : tuple of Glance
    about : About
    """

    record: Mapping[str, Any]
    glances: tuple[Glance, ...]
    about: About


def sum_lots(round_: Round, *, risk: float | None) -> Iterator[ToldLot]:
    """Sum every lot of the list and append it to the ledger, in the list's order.

    Yields
    ------
    ToldLot
        Once it is on the disk.
    """
    pages: set[str] = set()
    predicted: dict[Path | None, Prediction] = {}
    for name, indices in round_.listing.lots().items():
        declared = round_.book.declared(name.article)
        declaration = None if isinstance(declared, DeclarationError) else declared
        rows = [row for _, row in _rows(round_, indices)]
        members = [member(row, json.loads(row.entry.body)) for row in rows]
        subject = f"lot:{round_.folder}/{name.lot}/{name.paper}"
        key = _lot_key(round_, rows, declaration, risk)
        kept = round_.ledger.last(subject)
        if kept is None or kept.entry.key != key:
            if declaration is not None and name.article not in predicted:
                predicted[name.article] = predict(declaration)
            summed = sum_lot(
                members,
                lot=name.lot,
                declaration=declaration,
                prediction=predicted.get(name.article),
                risk=risk,
            )
            round_.ledger.append([Entry(LOT_SCHEMA, subject, key, canonical(summed), _now())])
            kept = round_.ledger.last(subject)
            assert kept is not None
        record = json.loads(kept.entry.body)
        page = page_name(name.lot, name.paper, taken=pages)
        pages.add(page.lower())
        yield ToldLot(
            name=name,
            row=kept.n,
            decision=record["decision"],
            n_places=record["n_places"],
            required=record["required"],
            indices=tuple(indices),
            numbers=place_numbers(members),
            unread=sum(_gave_nothing(each) for each in members),
            units=units_of(declaration),
            page=page,
        )


def write_reports(
    round_: Round, lots: list[ToldLot], crew: Crew, *, drawn: dict[str, int] | None = None
) -> Head:
    """Write records.jsonl, lots.csv, report.xlsx, a page a lot and report.html.

    Parameters
    ----------
    round_ : Round
    lots : list of ToldLot
        From `sum_lots`.
    crew : Crew
        Who writes the pages.
    drawn : dict of str to int, optional
        Pages of an earlier round by the ledger's row that they tell: a page that would tell the
        same row is left as it is, with the head of its own day. Brought up to date.

    Returns
    -------
    Head
        Of the ledger, as every report ends with it.
    """
    head, made_at = round_.ledger.head(), _now()
    told = {} if drawn is None else drawn
    about = About(
        units="cm", head=str(head), made_at=made_at.replace("T", " "), versions=round_.book.versions
    )
    _write_records(round_, lots)
    lines = lots_csv_lines(
        ((lot.record(round_.ledger), lot.page, lot.row) for lot in lots), head=(head.n, head.seal)
    )
    round_.out.write("lots.csv", "\ufeff" + "".join(lines))
    _write_workbook(round_, lots, about)
    orders = (
        (n, _page_order(round_, lot, about))
        for n, lot in enumerate(lots)
        if told.get(lot.page) != lot.row
    )
    for outcome in crew.run(made_page, orders):
        if isinstance(outcome, Lost):
            raise RuntimeError(f"the page of a lot could not be written: {outcome.said}")
        lot = lots[outcome.index]
        round_.out.write(lot.page, outcome.answer)
        told[lot.page] = lot.row
    round_.out.write("report.html", _first_page(round_, lots, about))
    return head


def older_pages(round_: Round, lots: list[ToldLot]) -> list[str]:
    """Say which pages of earlier audits still lie beside those of this one: they hold no more."""
    names = sorted(set(round_.out.pages()) - {lot.page for lot in lots})
    if not names:
        return []
    return [f"pages of earlier audits, not of this one: {some_of(names)}"]


def made_page(order: PageOrder) -> str:
    """Write a lot's page; called in a worker, so that it costs the parent nothing."""
    return lot_page(order.record, order.glances, about=order.about)


def _rows(round_: Round, indices: list[int] | tuple[int, ...]) -> Iterator[tuple[int, Row]]:
    for index in indices:
        row = round_.ledger.last(round_.subject(index))
        assert row is not None, "a picture of the list is not in the ledger"
        yield index, row


def _lot_key(
    round_: Round, rows: list[Row], declaration: Declaration | None, risk: float | None
) -> str:
    """Hash what a lot's record rests on: while it is the same there is nothing to sum."""
    parts = {
        "versions": round_.book.versions,
        "pictures": [[row.entry.subject, row.seal] for row in rows],
        "declaration": None if declaration is None else declaration.sha256,
        "risk": risk,
    }
    return hashlib.sha256(canonical(parts).encode("utf-8")).hexdigest()


def _gave_nothing(each: Member) -> bool:
    seen = each.observed
    return seen.ends is None and seen.picks is None and seen.cover is None


def _write_records(round_: Round, lots: list[ToldLot]) -> None:
    with round_.out.opened("records.jsonl") as file:
        for _, row in _rows(round_, tuple(range(len(round_.listing.pictures)))):
            file.write(f"{canonical(record_in(row.entry))}\n".encode())
        for lot in lots:
            file.write(f"{canonical(lot.record(round_.ledger))}\n".encode())


def _write_workbook(round_: Round, lots: list[ToldLot], about: About) -> None:
    with (
        round_.out.opened("report.xlsx") as file,
        AuditWorkbook(file, scratch=round_.out.scratch) as book,
    ):
        for lot in lots:
            book.lot(lot.record(round_.ledger))
            for _, row in _rows(round_, lot.indices):
                book.picture(json.loads(row.entry.body), row=row.n)
        book.about(
            [
                ("audited folder", round_.folder),
                ("lot sheet", round_.listing.sheet or "none: sub-folders are the lots"),
                ("made at", about.made_at),
                *((f"version of {name}", version) for name, version in about.versions.items()),
                ("ledger head", about.head),
            ]
        )


def _page_order(round_: Round, lot: ToldLot, about: About) -> PageOrder:
    declared = round_.book.declared(lot.name.article)
    glances = tuple(
        glance(
            json.loads(row.entry.body),
            number=number,
            row=row.n,
            thumbnail=round_.out.small(row.entry.key) if row.entry.key else None,
        )
        for number, (_, row) in zip(lot.numbers, _rows(round_, lot.indices), strict=True)
    )
    told = About(
        units=lot.units,
        head=about.head,
        made_at=about.made_at,
        versions=about.versions,
        description=declared.article.description if isinstance(declared, Declaration) else "",
        article_sha256=declared.sha256 if isinstance(declared, Declaration) else "",
        unread=lot.name.paper if isinstance(declared, DeclarationError) else "",
    )
    return PageOrder(record=lot.record(round_.ledger), glances=glances, about=told)


def _first_page(round_: Round, lots: list[ToldLot], about: About) -> str:
    lines = (LotLine(lot=lot.record(round_.ledger), units=lot.units, link=lot.page) for lot in lots)
    notes = [f"declaration {fault}" for fault in round_.book.faults]
    notes += [*round_.listing.notes, *older_pages(round_, lots)]
    return index_page(
        lines,
        title=round_.folder,
        pictures=len(round_.listing.pictures),
        unread=sum(lot.unread for lot in lots),
        notes=notes,
        about=about,
    )


def _now() -> str:
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


__all__ = ["PageOrder", "ToldLot", "made_page", "older_pages", "sum_lots", "write_reports"]
