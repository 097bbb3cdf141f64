"""`imgcover ledger`, carried out: rows listed, shown, exported and verified."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Literal

from imgcover.cli.exits import ExitCode
from imgcover.cli.output import opened, tell
from imgcover.errors import LedgerError
from imgcover.ledger.chain import Head, Row
from imgcover.ledger.export import exported
from imgcover.ledger.store import Ledger
from imgcover.ledger.verify import verify
from imgcover.report.data import json_array
from imgcover.report.layout import Units
from imgcover.report.plain import plain
from imgcover.report.text import lot_text, record_text


def list_rows(path: Path, *, current: bool) -> ExitCode:
    """Write one line a row, oldest first."""
    with Ledger.read(path) as ledger, opened(None, encoding=None) as write:
        superseded = ledger.superseded()
        for row in ledger.rows():
            later = superseded.get(row.n)
            if later is None or not current:
                write(_line(row, later) + "\n")
        tell(f"ledger head {ledger.head()}")
    return ExitCode.CONFORMS


def show_row(path: Path, n: int, *, form: Literal["text", "json"], units: Units) -> ExitCode:
    """Write one row's record."""
    with Ledger.read(path) as ledger:
        row = ledger.row(n)
        if row is None:
            last = ledger.head().n
            raise LedgerError(str(path), f"there is no row {n}", f"it has rows 1 to {last}")
        later = ledger.superseded().get(n)
    record = json.loads(row.entry.body)
    if form == "json":
        with opened(None) as write:
            for piece in json_array([record]):
                write(piece)
        return ExitCode.CONFORMS
    with opened(None, encoding=None) as write:
        told = record_text if "picture" in record else lot_text
        write(told(record, units=units))
        write(f"\n  row {row.n}, {row.entry.made_at}, seal {row.seal}\n")
        if row.supersedes is not None:
            write(f"  supersedes row {row.supersedes}\n")
        if later is not None:
            write(f"  superseded by row {later}: this no longer holds\n")
    return ExitCode.CONFORMS


def export_rows(path: Path, output: Path | None) -> ExitCode:
    """Write every row as a line of JSON."""
    with Ledger.read(path) as ledger, opened(output) as write:
        for line in exported(ledger.rows()):
            write(line)
    return ExitCode.CONFORMS


def verify_rows(path: Path, head: str | None) -> ExitCode:
    """Follow the chain and say what it shows; an altered ledger ends with 1."""
    named = None if head is None else Head.parse(head)
    with Ledger.read(path) as ledger:
        seen = verify(ledger.rows(), head=named)
    with opened(None, encoding=None) as write:
        for fault in seen.faults:
            write(f"{fault}\n")
        if seen.holds:
            write(f"all {seen.head.n} rows are as they were written; {seen.completeness}\n")
        write(f"ledger head {seen.head}\n")
    return ExitCode.CONFORMS if seen.holds else ExitCode.DOES_NOT_CONFORM


def _line(row: Row, later: int | None) -> str:
    record = json.loads(row.entry.body)
    verdict = record.get("verdict") if "picture" in record else record
    decision = "measured" if verdict is None else verdict["decision"] or "measured"
    mark = f"  superseded by {later}" if later is not None else ""
    return f"{row.n:>6}  {row.entry.made_at}  {decision:<16}  {plain(row.entry.subject)}{mark}"


__all__ = ["export_rows", "list_rows", "show_row", "verify_rows"]
