"""An audit as a workbook: typed cells, limits beside values, and marks that follow the cells."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, BinaryIO, Self

from imgcover.report.lots_csv import QUANTITIES, lot_values
from imgcover.report.plain import plain

if TYPE_CHECKING:
    from types import TracebackType

LONGEST_CELL = 32_000
"""Characters; a cell of the format holds 32 767."""
MOST_ROWS = 1_048_000
"""A sheet of the format holds 1 048 576."""


@dataclass(frozen=True, slots=True)
class Column:
    """A column: what its head says, how wide it is, and the format of its numbers."""

    title: str
    width: float = 11
    digits: str = "General"


def _lot_columns() -> dict[str, Column]:
    columns = {
        "lot": Column("lot", 20),
        "article": Column("article", 16),
        "decision": Column("decision", 17),
        "risk": Column("risk", 8, "0.0000"),
        "places": Column("places", 8, "0"),
        "required": Column("required", 9, "0"),
    }
    units = {"per_cm": "/cm", "fraction": "", "g_per_m2": "g/m²"}
    for quantity, unit in QUANTITIES.items():
        digits = "0.0000" if quantity == "cover" else "0.000"
        said = f"{quantity} {units[unit]}".strip()
        columns[f"{quantity}_{unit}"] = Column(said, 11, digits)
        for key in ("u", "scatter", "declared", "lower", "upper", "accept_lower", "accept_upper"):
            columns[f"{quantity}_{key}"] = Column(f"{quantity} {key.replace('_', ' ')}", 10, digits)
        columns[f"{quantity}_decision"] = Column(f"{quantity} decision", 16)
    columns["findings"] = Column("findings", 40)
    return columns


LOTS = _lot_columns()
SAMPLE = ("lot", "piece", "place", "operator", "conditioned", "note")
"""What the lot sheet says of a picture's swatch, beside its article."""
PICTURES = {
    "picture": Column("picture", 32),
    "lot": Column("lot", 20),
    "piece": Column("piece", 10),
    "place": Column("place", 10),
    "light": Column("light", 10),
    "decision": Column("decision", 17),
    "ends": Column("ends /cm", 11, "0.000"),
    "ends_u": Column("ends u", 9, "0.000"),
    "picks": Column("picks /cm", 11, "0.000"),
    "picks_u": Column("picks u", 9, "0.000"),
    "cover": Column("cover", 9, "0.0000"),
    "cover_u": Column("cover u", 9, "0.0000"),
    "scale": Column("scale from", 24),
    "row": Column("ledger row", 10, "0"),
    "findings": Column("findings", 40),
    "operator": Column("operator", 12),
    "conditioned": Column("conditioned", 12),
    "note": Column("note", 30),
    "sha256": Column("SHA-256 of the file", 66),
}
FINDINGS = {
    "picture": Column("picture", 32),
    "lot": Column("lot", 20),
    "severity": Column("severity", 10),
    "code": Column("code", 30),
    "message": Column("message", 70),
    "remedy": Column("remedy", 50),
}


class AuditWorkbook:
    """A workbook that is written as the audit is told, one row in memory at a time.

    A context manager; the file is written when it ends well.

    Parameters
    ----------
    file : BinaryIO
        Where the workbook goes.
    scratch : Path
        A folder for the rows of finished sheets until then.
    """

    def __init__(self, file: BinaryIO, *, scratch: Path) -> None:
        from xlsxwriter import Workbook

        # text stays text whatever it begins with; rows go to the file as they are finished
        self._book = Workbook(
            file,
            {
                "constant_memory": True,
                "tmpdir": str(scratch),
                "strings_to_formulas": False,
                "strings_to_urls": False,
                "strings_to_numbers": False,
            },
        )
        self._heads = self._book.add_format({"bold": True, "bottom": 1, "text_wrap": True})
        self._text = self._book.add_format({"num_format": "@"})
        self._formats = {
            digits: self._book.add_format({"num_format": digits})
            for digits in ("General", "0", "0.000", "0.0000")
        }
        self._marks = {
            "conforms": self._book.add_format({"font_color": "#1d6b2c", "bg_color": "#e7f2e6"}),
            "does not conform": self._book.add_format(
                {"font_color": "#a3211a", "bg_color": "#fbe6e4", "bold": True}
            ),
            "undecided": self._book.add_format({"font_color": "#7a5600", "bg_color": "#fdf3d8"}),
        }
        self._lots = _Sheet(self, "Lots", LOTS)
        self._pictures = _Sheet(self, "Pictures", PICTURES)
        self._findings = _Sheet(self, "Findings", FINDINGS)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        fault: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if kind is None:
            self._lots.finish()
            self._pictures.finish()
            self._findings.finish()
            self._book.close()

    def lot(self, lot: Mapping[str, Any]) -> None:
        """Add a lot, schema imgcover/lot/1, and its findings."""
        self._lots.add(lot_values(lot))
        self._noticed({"lot": lot["lot"]}, lot["findings"])

    def picture(self, record: Mapping[str, Any], *, row: int | None) -> None:
        """Add a picture, schema imgcover/record/1, and its findings."""
        threads, cover, verdict = record["threads"] or {}, record["cover"] or {}, record["verdict"]
        scale, sample = record["scale"], record["sample"]
        values: dict[str, Any] = {
            "picture": record["picture"]["name"],
            "sha256": record["picture"]["sha256"],
            "light": record["light"],
            "decision": None if verdict is None else verdict["decision"],
            "scale": None if scale is None else scale["source"],
            "row": row,
            "findings": " ".join(dict.fromkeys(each["code"] for each in record["findings"])),
            **{key: sample[key] for key in SAMPLE},
        }
        for name, measured in (
            ("ends", threads.get("ends")),
            ("picks", threads.get("picks")),
            ("cover", cover.get("optical")),
        ):
            if measured is not None:
                values |= {name: measured["value"], f"{name}_u": measured["u"]}
        self._pictures.add(values)
        named = {"picture": record["picture"]["name"], "lot": sample["lot"]}
        self._noticed(named, record["findings"])

    def about(self, facts: Sequence[tuple[str, str]]) -> None:
        """Add the last sheet: what it was made from and with, and the ledger's head."""
        sheet = self._book.add_worksheet("About")
        sheet.set_column(0, 0, 18)
        sheet.set_column(1, 1, 100)
        for n, (name, said) in enumerate(facts):
            sheet.write_string(n, 0, plain(name), self._text)
            sheet.write_string(n, 1, plain(said)[:LONGEST_CELL], self._text)

    def _noticed(self, where: dict[str, Any], findings: Iterable[Mapping[str, str]]) -> None:
        for each in findings:
            self._findings.add({**where, **each})


class _Sheet:
    """One sheet: its head, its rows, and the marks over them."""

    def __init__(self, owner: AuditWorkbook, name: str, columns: Mapping[str, Column]) -> None:
        self._owner = owner
        self._columns = columns
        self._sheet = owner._book.add_worksheet(name)
        self._next = 1
        for at, column in enumerate(columns.values()):
            self._sheet.set_column(at, at, column.width)
            self._sheet.write_string(0, at, column.title, owner._heads)
        self._sheet.freeze_panes(1, 1)
        self._sheet.set_landscape()
        self._sheet.set_paper(9)  # A4
        self._sheet.fit_to_pages(1, 0)
        self._sheet.repeat_rows(0)

    def add(self, values: Mapping[str, Any]) -> None:
        """Write a row; nothing is written where nothing is known."""
        if self._next > MOST_ROWS:
            return
        for at, (key, column) in enumerate(self._columns.items()):
            value = values.get(key)
            if isinstance(value, str):
                self._sheet.write_string(
                    self._next, at, plain(value)[:LONGEST_CELL], self._owner._text
                )
            elif value is not None:
                form = self._owner._formats[column.digits]
                self._sheet.write_number(self._next, at, value, form)
        self._next += 1

    def finish(self) -> None:
        """Lay the marks and the filter over the rows there are."""
        last = max(1, self._next - 1)
        self._sheet.autofilter(0, 0, last, len(self._columns) - 1)
        for at, key in enumerate(self._columns):
            if key.endswith("decision"):
                for decision, mark in self._owner._marks.items():
                    rule = {"type": "cell", "criteria": "==", "value": f'"{decision}"'}
                    self._sheet.conditional_format(1, at, last, at, {**rule, "format": mark})
        self._mark_outside(last)

    def _mark_outside(self, last: int) -> None:
        """Colour a mean that lies outside its limits; the limits may be edited to see what if."""
        from xlsxwriter.utility import xl_col_to_name

        letters = {key: f"${xl_col_to_name(at)}2" for at, key in enumerate(self._columns)}
        for at, key in enumerate(self._columns):
            quantity = key.partition("_")[0]
            if key != f"{quantity}_{QUANTITIES.get(quantity)}":
                continue
            mean, low, high = (
                letters[each] for each in (key, f"{quantity}_lower", f"{quantity}_upper")
            )
            beyond = f'OR(AND({low}<>"",{mean}<{low}),AND({high}<>"",{mean}>{high}))'
            rule = {"type": "formula", "criteria": f'=AND({mean}<>"",{beyond})'}
            mark = self._owner._marks["does not conform"]
            self._sheet.conditional_format(1, at, last, at, {**rule, "format": mark})


__all__ = ["AuditWorkbook"]
