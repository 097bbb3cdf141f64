"""The cells of a lot sheet that was kept as a workbook (.xlsx), as text."""

from __future__ import annotations

import datetime
import math
import warnings
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from imgcover.errors import LotSheetError

LARGEST_UNPACKED = 200_000_000
"""Bytes: a workbook is a zip file, and a small one can hold a disk full of zeros."""
SHEET = "lots"


def read_workbook(path: Path) -> list[list[str]]:
    """Read every cell of a workbook's one sheet, or of its sheet "lots".

    Parameters
    ----------
    path : Path
        A .xlsx file.

    Returns
    -------
    list of list of str
        Row by row; numbers as one would write them, dates in ISO 8601.

    Raises
    ------
    LotSheetError
        When it is no workbook, damaged, too large, or holds several sheets and none is "lots".
    """
    _check_size(path)
    # imported here: listing a folder with a CSV sheet must not pay for it
    from openpyxl import load_workbook

    try:
        with warnings.catch_warnings():
            # it warns of styles and drop-downs that it does not keep; nothing of them is read
            warnings.simplefilter("ignore")
            # once for what cells show and once for what they hold: a formula that no spreadsheet
            # program has worked out yet shows nothing, and must not pass for an empty cell
            shown, held = (_lines(load_workbook, path, data_only=each) for each in (True, False))
            return [
                [
                    _written(cell, held_cell, f"{path.name} row {n}")
                    for cell, held_cell in zip(line, held_line, strict=True)
                ]
                for n, (line, held_line) in enumerate(zip(shown, held, strict=True), start=1)
            ]
    except LotSheetError:
        raise
    except Exception as fault:  # openpyxl meets damage with whatever its parsers raise
        raise LotSheetError(
            path.name, f"is not a readable workbook ({type(fault).__name__})", "save it again"
        ) from None


def _lines(
    load_workbook: Callable[..., Any], path: Path, *, data_only: bool
) -> list[tuple[Any, ...]]:
    book = load_workbook(path, read_only=True, data_only=data_only)
    names = book.sheetnames
    named = [name for name in names if name.lower() == SHEET]
    if len(names) > 1 and not named:
        raise LotSheetError(
            path.name, f"holds {len(names)} sheets", f'name the one that lists "{SHEET}"'
        )
    sheet = book[(named or names)[0]]
    lines = list(sheet.iter_rows())
    book.close()
    return lines


def _check_size(path: Path) -> None:
    try:
        with zipfile.ZipFile(path) as archive:
            unpacked = sum(part.file_size for part in archive.infolist())
    except zipfile.BadZipFile:
        raise LotSheetError(
            path.name, "is not a workbook", "save it as .xlsx, or as lots.csv"
        ) from None
    if unpacked > LARGEST_UNPACKED:
        raise LotSheetError(path.name, "unpacks to more than a lot sheet can be", "save it again")


def _written(shown: Any, held: Any, where: str) -> str:
    """Write a cell as its reader sees it: what it shows, and what it holds."""
    cell = shown.value
    # the result of a formula that is an empty text is marked as text
    if cell is None and held.value is not None and shown.data_type != "str":
        raise LotSheetError(
            where,
            "a formula has no value yet",
            "open the sheet in a spreadsheet program and save it, or write the value itself",
        )
    if cell is None:
        return ""
    if isinstance(cell, bool):
        return "yes" if cell else "no"
    if isinstance(cell, float) and math.isfinite(cell) and cell == int(cell):
        return str(int(cell))
    if isinstance(cell, datetime.datetime) and cell.time() == datetime.time.min:
        return cell.date().isoformat()
    if isinstance(cell, datetime.datetime | datetime.date | datetime.time):
        return cell.isoformat()
    text = str(cell).strip()
    if text.startswith("#") and text.endswith(("!", "?", "/A")) and text.isupper():
        raise LotSheetError(where, f"a formula failed ({text})", "write the value itself")
    return text


__all__ = ["read_workbook"]
