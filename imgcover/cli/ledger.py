"""`imgcover ledger`: what was remembered, looked into and held against a report's last line."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode

EXAMPLES = """\b
Examples:
  imgcover ledger list goods-in-audit/ledger.sqlite
  imgcover ledger show goods-in-audit/ledger.sqlite 12
  imgcover ledger export goods-in-audit/ledger.sqlite -o ledger.jsonl
  imgcover ledger verify goods-in-audit/ledger.sqlite --head 22:494d2c371d2751aa9d190e84
"""
File = Annotated[Path, typer.Argument(metavar="LEDGER", help="The ledger's file.")]


def listed(
    ledger: File,
    current: Annotated[
        bool, typer.Option("--current", help="Leave out what was superseded.")
    ] = False,
) -> ExitCode:
    """List the rows: number, time, decision, what it is about, and what superseded it."""
    from imgcover.cli.remembered import list_rows

    return list_rows(ledger, current=current)


def show(
    ledger: File,
    row: Annotated[int, typer.Argument(min=1, metavar="ROW", help="The row's number.")],
    form: Annotated[
        Literal["text", "json"], typer.Option("--format", "-f", help="How it is told.")
    ] = "text",
    units: Annotated[
        Literal["inch", "cm"], typer.Option(help="Of the text; JSON is always SI.")
    ] = "cm",
) -> ExitCode:
    """Show one row: the record as it was sealed."""
    from imgcover.cli.remembered import show_row

    return show_row(ledger, row, form=form, units=units)


def export(
    ledger: File,
    output: Annotated[
        Path | None,
        typer.Option("--output", "-o", metavar="FILE", help="Write there, whole or not at all."),
    ] = None,
) -> ExitCode:
    """Write every row as a line of JSON, seals included, to be checked without this program."""
    from imgcover.cli.remembered import export_rows

    return export_rows(ledger, output)


def verify(
    ledger: File,
    head: Annotated[
        str | None,
        typer.Option(
            metavar="N:SEAL",
            help="The ledger head at a report's foot; 20 digits of the seal are enough.",
        ),
    ] = None,
) -> ExitCode:
    """Follow the chain of seals: changed, removed and, with a head, cut-off rows show."""
    from imgcover.cli.remembered import verify_rows

    return verify_rows(ledger, head)


def assembled() -> typer.Typer:
    """Put the ledger's commands together."""
    app = typer.Typer(
        help="Look into a ledger, export it, or hold it against a report.",
        epilog=EXAMPLES,
        rich_markup_mode=None,
        add_completion=False,
    )
    app.command("list", epilog=EXAMPLES)(listed)
    app.command("show", epilog=EXAMPLES)(show)
    app.command("export", epilog=EXAMPLES)(export)
    app.command("verify", epilog=EXAMPLES)(verify)
    return app


__all__ = ["EXAMPLES", "assembled"]
