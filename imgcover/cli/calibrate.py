"""`imgcover calibrate`: print a scale sheet, make a device's certificate, see if it still holds."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode

EXAMPLES = """\b
Examples:
  imgcover calibrate sheet -o sheet.pdf
  imgcover calibrate read bed-0.png bed-90.png --bars 180.3,260.6 --name bench-2 -o bench-2.toml
  imgcover calibrate check today.png --device bench-2.toml
"""
Scans = Annotated[list[Path], typer.Argument(metavar="SCAN", help="Scans of the printed sheet.")]
BarsOption = Annotated[
    str | None,
    typer.Option("--bars", metavar="A,B", help="Both bars as a steel rule measures them, mm."),
]
BarsU = Annotated[
    float, typer.Option("--bars-u", metavar="MM", help="Standard uncertainty of reading a bar.")
]
RuleClassOption = Annotated[
    Literal["1", "2", "3"], typer.Option("--rule-class", help="Accuracy class of the steel rule.")
]
ToneOption = Annotated[
    str | None, typer.Option("--tone", metavar="TONE", help="srgb, linear or gamma:G.")
]


def sheet(
    output: Annotated[
        Path, typer.Option("--output", "-o", metavar="FILE", help="A .pdf, .svg or .png file.")
    ],
) -> ExitCode:
    """Draw the scale sheet, to be printed at 100 % and measured with a steel rule."""
    from imgcover.cli.calibrating import write_sheet

    return write_sheet(output)


def read(
    scans: Scans,
    bars: BarsOption = None,
    bars_u: BarsU = 0.15,
    rule_class: RuleClassOption = "2",
    name: Annotated[
        str, typer.Option("--name", metavar="NAME", help="What the device is called.")
    ] = "scanner",
    dpi: Annotated[
        str | None,
        typer.Option("--dpi", metavar="N|X,Y", help="Resolution set, where no file states it."),
    ] = None,
    days: Annotated[
        int, typer.Option("--valid-days", min=1, max=3650, help="How long it is to hold.")
    ] = 365,
    tone: ToneOption = None,
    output: Annotated[
        Path | None,
        typer.Option("--output", "-o", metavar="FILE", help="Write the certificate there."),
    ] = None,
) -> ExitCode:
    """Read scans of the measured sheet and write the device's certificate."""
    from imgcover.cli.calibrating import read_scans

    return read_scans(
        scans,
        bars=bars,
        bars_u=bars_u,
        rule_class=int(rule_class),
        name=name,
        dpi=dpi,
        days=days,
        tone=tone,
        output=output,
    )


def check(
    scans: Scans,
    device: Annotated[
        str, typer.Option("--device", metavar="NAME|FILE", help="The certificate to check.")
    ],
    bars: BarsOption = None,
    bars_u: BarsU = 0.15,
    rule_class: RuleClassOption = "2",
    tone: ToneOption = None,
) -> ExitCode:
    """See whether a certificate still holds; the bars are the certificate's unless given."""
    from imgcover.cli.calibrating import check_scans

    return check_scans(
        scans, device=device, bars=bars, bars_u=bars_u, rule_class=int(rule_class), tone=tone
    )


def assembled() -> typer.Typer:
    """Put the calibration commands together."""
    app = typer.Typer(
        help="Print a scale sheet; make a device's certificate; see if it still holds.",
        epilog=EXAMPLES,
        add_completion=False,
        rich_markup_mode=None,
        no_args_is_help=True,
        pretty_exceptions_enable=False,
    )
    for command in (sheet, read, check):
        app.command(command.__name__, epilog=EXAMPLES)(command)
    return app


__all__ = ["EXAMPLES", "assembled"]
