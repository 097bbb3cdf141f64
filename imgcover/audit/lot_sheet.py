"""What does the lot sheet list? Reads lots.csv or lots.xlsx whole, or refuses it."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path

from imgcover.audit.workbook import read_workbook
from imgcover.errors import LotSheetError

SHEET_NAMES = ("lots.csv", "lots.xlsx")
TABLES = frozenset({".csv", ".xlsx", ".xls", ".xlsm", ".ods", ".tsv"})
"""Endings of tables; of one under another name it is said that it was not read."""
LARGEST_FILE = 50_000_000
"""Bytes: a hundred thousand pictures with long notes; anything larger is another file."""

SAMPLE_COLUMNS = ("lot", "article", "piece", "place", "operator", "conditioned", "note")
OPTION_COLUMNS = (
    *("light", "warp", "pitch", "pitch-y", "rule", "device", "tone"),
    *("blank", "dark", "backing", "gsm", "region"),
)
COLUMNS = ("picture", *SAMPLE_COLUMNS, *OPTION_COLUMNS)
NEEDED = ("picture", "lot")
CHOICES = {
    "light": ("backlit", "reflected"),
    "warp": ("vertical", "horizontal"),
    "rule": ("auto", "mm", "inch"),
    "backing": ("light", "dark"),
}
"""Columns with few valid words; the others are read where they are used."""


@dataclass(frozen=True, slots=True)
class SheetRow:
    """One picture as the lot sheet lists it.

    Parameters
    ----------
    where : str
        Sheet and row, for messages.
    cells : dict of str to str
        By column, blanks stripped; only the cells that hold something.
    """

    where: str
    cells: dict[str, str]

    def get(self, column: str) -> str | None:
        """What a cell holds; None where it is empty."""
        return self.cells.get(column)


def find_sheet(folder: Path) -> Path | None:
    """Find the folder's lot sheet.

    Raises
    ------
    LotSheetError
        When there are two: which one holds cannot be guessed.
    """
    found = [path for path in tables(folder) if path.name.lower() in SHEET_NAMES]
    if len(found) > 1:
        both = " and ".join(path.name for path in found)
        raise LotSheetError(str(folder), f"holds both {both}", "keep the one that holds")
    return found[0] if found else None


def tables(folder: Path) -> list[Path]:
    """List everything in a folder that may be a lot sheet by its ending, whatever its name."""
    try:
        return sorted(path for path in folder.iterdir() if path.suffix.lower() in TABLES)
    except OSError as fault:
        raise LotSheetError(
            str(folder), f"cannot be read ({fault.strerror})", "check its permissions"
        ) from None


def read_sheet(path: Path) -> tuple[SheetRow, ...]:
    """Read a lot sheet.

    Parameters
    ----------
    path : Path
        A .csv (UTF-8; comma, semicolon or tab) or .xlsx file.

    Returns
    -------
    tuple of SheetRow
        In the sheet's order.

    Raises
    ------
    LotSheetError
        When it cannot be read, has unknown, doubled or missing columns, lists no picture, or a
        cell holds none of its column's valid words. Row and column are named.
    """
    try:
        if not path.is_file():
            raise LotSheetError(path.name, "is not a file", "save the lot sheet there")
        if path.stat().st_size > LARGEST_FILE:
            raise LotSheetError(path.name, "too large for a lot sheet", "split the lots")
        lines = read_workbook(path) if path.suffix.lower() == ".xlsx" else _read_csv(path)
        return tuple(_rows(path.name, lines))
    except OSError as fault:
        raise LotSheetError(
            path.name, f"cannot be read ({fault.strerror})", "check its permissions"
        ) from None


def _rows(name: str, lines: Sequence[Sequence[str]]) -> Iterator[SheetRow]:
    filled = [(n, line) for n, line in enumerate(lines, start=1) if any(line)]
    if not filled:
        raise LotSheetError(name, "is empty", f"its first row names columns: {', '.join(COLUMNS)}")
    heads = _heads(name, filled[0][1])
    if len(filled) == 1:
        raise LotSheetError(name, "lists no picture", "add a row for each picture")
    for n, line in filled[1:]:
        where = f"{name} row {n}"
        if any(line[len(heads) :]):
            raise LotSheetError(where, "has more cells than there are columns", "check its commas")
        named = zip(heads, line, strict=False)
        cells = {head: cell for head, cell in named if cell}
        if "" in cells:
            raise LotSheetError(where, "a cell stands under no column name", "name the column")
        yield _checked(SheetRow(where, cells))


def _heads(name: str, line: Sequence[str]) -> list[str]:
    heads = ["-".join(cell.lower().replace("_", " ").split()) for cell in line]
    for head in filter(None, heads):
        if head not in COLUMNS:
            close = get_close_matches(head, COLUMNS, n=1)
            hint = f'nearest valid column: "{close[0]}"' if close else ", ".join(COLUMNS)
            raise LotSheetError(name, f'unknown column "{head}"', hint)
        if heads.count(head) > 1:
            raise LotSheetError(name, f'column "{head}" stands twice', "keep one")
    for head in NEEDED:
        if head not in heads:
            raise LotSheetError(name, f'column "{head}" is missing', "add it")
    return heads


def _checked(row: SheetRow) -> SheetRow:
    for column in NEEDED:
        if not row.get(column):
            raise LotSheetError(f"{row.where}, {column}", "is empty", "fill it in")
    for column, valid in CHOICES.items():
        cell = row.get(column)
        if cell is not None and cell.lower() in valid:
            # spreadsheets begin a cell with a capital by themselves
            row.cells[column] = cell.lower()
        elif cell is not None:
            raise LotSheetError(
                f"{row.where}, {column}",
                f'expected {" or ".join(valid)}, got "{cell}"',
                "write one",
            )
    return row


def _read_csv(path: Path) -> list[list[str]]:
    text = _decoded(path)
    if "\0" in text:
        raise LotSheetError(path.name, "is not text", "save it as CSV (UTF-8)")
    stated = re.match(r"sep=([,;\t])\r?\n", text, re.IGNORECASE)
    if stated is not None:
        # some spreadsheets write this line before all others, and do not show it as a row
        text = text[stated.end() :]
    first = next((line for line in text.splitlines() if line.strip()), "")
    mark = stated[1] if stated is not None else max(",;\t", key=first.count)
    try:
        # "\n" inside quotes belongs to a cell, so the text is not split into lines first
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=mark, strict=True)
        return [[cell.strip() for cell in line] for line in reader]
    except csv.Error as fault:
        raise LotSheetError(path.name, f"is not CSV ({fault})", "save it as CSV again") from None


def _decoded(path: Path) -> str:
    content = path.read_bytes()
    wide = content.startswith((b"\xff\xfe", b"\xfe\xff"))
    try:
        return content.decode("utf-16" if wide else "utf-8-sig")
    except UnicodeDecodeError:
        # an old code page would turn a picture's name into another name without a word
        raise LotSheetError(
            path.name, "is not UTF-8 text", 'save it as "CSV UTF-8", or as lots.xlsx'
        ) from None


__all__ = [
    "CHOICES",
    "COLUMNS",
    "OPTION_COLUMNS",
    "SAMPLE_COLUMNS",
    "SheetRow",
    "find_sheet",
    "read_sheet",
    "tables",
]
