"""`imgcover plan`: what a device can tell about an article, before anyone scans."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode
from imgcover.cli.output import keep_apart, opened

EXAMPLES = """\b
Examples:
  imgcover plan harrow.toml
  imgcover plan harrow.toml --pitch 600dpi --pitch-u 0.2%
  imgcover plan harrow.toml --device flatbed.toml
  imgcover plan harrow.toml --pitch 4um --detail 6um -f json
"""


def plan(
    article: Annotated[Path, typer.Argument(metavar="ARTICLE", help="The declaration (TOML).")],
    device: Annotated[
        str | None,
        typer.Option(metavar="NAME|FILE", help="Certificate of the device that will be used."),
    ] = None,
    pitch: Annotated[
        str | None,
        typer.Option(metavar="PITCH", help="600dpi, 23.62px/mm or 42.3um; chosen when not given."),
    ] = None,
    pitch_y: Annotated[
        str | None,
        typer.Option(metavar="PITCH", help="Down the stored picture, where it differs."),
    ] = None,
    pitch_u: Annotated[
        str | None,
        typer.Option(metavar="SHARE", help="Standard uncertainty of the pitch, such as 0.2%."),
    ] = None,
    detail: Annotated[
        str, typer.Option(metavar="UM", help="Smallest detail the device shows; 50um of flatbeds.")
    ] = "50um",
    scatter: Annotated[
        str,
        typer.Option(metavar="SHARE", help="Standard deviation between places of a lot, assumed."),
    ] = "0.5%",
    risk: Annotated[
        str | None,
        typer.Option(
            metavar="P", help="Largest risk of a wrong decision; the guard band is 2u without."
        ),
    ] = None,
    units: Annotated[
        Literal["inch", "cm"] | None,
        typer.Option(help="Of the text; as declared when not given. JSON is always SI."),
    ] = None,
    form: Annotated[
        Literal["text", "json"], typer.Option("--format", "-f", help="How it is told.")
    ] = "text",
    output: Annotated[
        Path | None,
        typer.Option("--output", "-o", metavar="FILE", help="Write there, whole or not at all."),
    ] = None,
) -> ExitCode:
    """Say what a device can tell about an article.

    Pixels a thread, the field and the places that its tolerances take, and how well cover is read
    of the declared cloth, drawn as the device would show it.
    """
    from imgcover.cloth.declaration import read_declaration
    from imgcover.plan.planning import plan as planned
    from imgcover.plan.planning import scale_for
    from imgcover.plan.telling import plan_record
    from imgcover.report.data import json_array
    from imgcover.report.layout import units_of
    from imgcover.report.planned import planned_text
    from imgcover.request import read_options
    from imgcover.scale.pitch import parse_pitch, parse_pitch_u

    said = {
        "device": device,
        "pitch": pitch,
        "pitch-y": pitch_y,
        "pitch-u": pitch_u,
        "risk": risk,
    }
    words = {name: word for name, word in said.items() if word is not None}
    keep_apart("--output", output, [article])
    declaration = read_declaration(article)
    detail_mm = 1 / parse_pitch(detail, option="--detail").px_per_mm
    record = plan_record(
        planned(
            declaration,
            scale_for(declaration, words, detail_mm=detail_mm),
            detail_mm=detail_mm,
            between=parse_pitch_u(scatter, option="--scatter"),
            risk=read_options(words).risk,
        )
    )
    with opened(output, encoding=None if form == "text" else "utf-8") as write:
        if form == "text":
            write(planned_text(record, units=units or units_of(declaration)))
        else:
            for piece in json_array([record]):
                write(piece)
    return ExitCode.CONFORMS


__all__ = ["EXAMPLES", "plan"]
