"""The commands, put together. Nothing numeric is imported here: `--help` must answer at once."""

from __future__ import annotations

from typing import Annotated

import typer

from imgcover import __version__
from imgcover.cli import audit, calibrate, draw, ledger, measure, plan, predict

EPILOG = "Exit codes, findings and what no picture can tell: README.md."


def assembled() -> typer.Typer:
    """Put the commands together; `imgcover.cli.door` runs them and says how they end."""
    # no rich: its panels read square brackets in file names as markup, and its import takes longer
    # than all of help may
    app = typer.Typer(
        help="Reads pictures of woven cloth and holds them against what was declared.",
        epilog=EPILOG,
        add_completion=False,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
    )
    app.callback()(_top)
    app.command("measure", epilog=measure.EXAMPLES)(measure.measure)
    app.command("predict", epilog=predict.EXAMPLES)(predict.predict)
    app.command("plan", epilog=plan.EXAMPLES)(plan.plan)
    app.command("audit", epilog=audit.EXAMPLES)(audit.audit)
    app.add_typer(calibrate.assembled(), name="calibrate")
    app.add_typer(ledger.assembled(), name="ledger")
    app.command("draw", epilog=draw.EXAMPLES)(draw.draw)
    return app


def _say_version(asked: bool) -> None:
    if asked:
        typer.echo(f"imgcover {__version__}")
        raise typer.Exit


def _top(
    version: Annotated[
        bool,
        typer.Option("--version", help="Say the version and stop.", callback=_say_version),
    ] = False,
) -> None:
    """Stand above the commands, for what is asked of none of them."""


__all__ = ["assembled"]
