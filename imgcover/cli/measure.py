"""`imgcover measure`: pictures, and perhaps a declaration, in; a decision out."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode

EXAMPLES = """\b
Examples:
  imgcover measure swatch.png --pitch 600dpi
  imgcover measure swatch.png --pitch 600dpi --light backlit -a harrow.toml
  imgcover measure s1.png s2.png s3.png --lot 4711 -a harrow.toml --pitch 600dpi
  imgcover measure - -f json --pitch 42.3um < swatch.tif
"""


def measure(
    pictures: Annotated[
        list[str],
        typer.Argument(metavar="PICTURE", help="Pictures of swatches; - reads stdin."),
    ],
    article: Annotated[
        Path | None,
        typer.Option(
            "--article", "-a", metavar="FILE", help="The declaration to hold them against."
        ),
    ] = None,
    light: Annotated[
        Literal["backlit", "reflected"] | None,
        typer.Option(help="How the swatch was lit; cover is measured on backlit pictures."),
    ] = None,
    warp: Annotated[
        Literal["vertical", "horizontal"],
        typer.Option(help="Which way the warp runs in the shown picture."),
    ] = "vertical",
    pitch: Annotated[
        str | None,
        typer.Option(metavar="PITCH", help="Scale: 600dpi, 23.62px/mm or 42.3um."),
    ] = None,
    pitch_y: Annotated[
        str | None,
        typer.Option(metavar="PITCH", help="Scale down the stored picture, where it differs."),
    ] = None,
    pitch_u: Annotated[
        str | None,
        typer.Option(metavar="SHARE", help="Standard uncertainty of the pitch, such as 0.2%."),
    ] = None,
    rule: Annotated[
        Literal["auto", "mm", "inch"] | None,
        typer.Option(help="Read the scale from a rule in the picture."),
    ] = None,
    rule_class: Annotated[
        Literal["1", "2", "3"],
        typer.Option(help="Accuracy class of the rule (OIML R 35)."),
    ] = "2",
    sheet: Annotated[
        bool, typer.Option("--sheet", help="Read the scale from the printed sheet in the picture.")
    ] = False,
    bars: Annotated[
        str | None,
        typer.Option(metavar="A,B", help="The sheet's bars as a steel rule measures them, mm."),
    ] = None,
    bars_u: Annotated[
        str | None, typer.Option(metavar="MM", help="Standard uncertainty of reading a bar.")
    ] = None,
    device: Annotated[
        str | None,
        typer.Option(metavar="NAME|FILE", help="Certificate of the device that took the picture."),
    ] = None,
    metadata: Annotated[
        bool, typer.Option("--metadata", help="Trust the resolution the file claims.")
    ] = False,
    tone: Annotated[
        str | None,
        typer.Option(
            metavar="TONE",
            help="Transfer curve: srgb, linear or gamma:G; as the file says, else srgb.",
        ),
    ] = None,
    blank: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="The light table without cloth, same exposure."),
    ] = None,
    dark: Annotated[
        Path | None, typer.Option(metavar="FILE", help="The same exposure with the light off.")
    ] = None,
    backing: Annotated[
        Literal["light", "dark"] | None,
        typer.Option(help="The swatch lies on a card of clearly other lightness."),
    ] = None,
    gsm: Annotated[
        str | None, typer.Option(metavar="G/M2", help="Mass from the balance, g/m2.")
    ] = None,
    gsm_u: Annotated[
        str | None, typer.Option(metavar="G/M2", help="Its standard uncertainty, g/m2.")
    ] = None,
    region: Annotated[
        str | None,
        typer.Option(metavar="X,Y,W,H", help="Measure only this part, px of the shown picture."),
    ] = None,
    lot: Annotated[
        str | None, typer.Option(metavar="NAME", help="The pictures are places of this one lot.")
    ] = None,
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
        Literal["text", "json", "jsonl", "csv"],
        typer.Option("--format", "-f", help="How it is told."),
    ] = "text",
    output: Annotated[
        Path | None,
        typer.Option("--output", "-o", metavar="FILE", help="Write there, whole or not at all."),
    ] = None,
    overlay: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Draw what was counted over each picture."),
    ] = None,
    ledger: Annotated[
        Path | None, typer.Option(metavar="FILE", help="Append the records to this ledger.")
    ] = None,
    as_reference: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Write the [reference] of an approved swatch."),
    ] = None,
) -> ExitCode:
    """Measure ends, picks and cover, and say if they are as declared."""
    from imgcover.cli.measuring import Asked, measured

    said = {
        "light": light,
        "warp": warp,
        "pitch": pitch,
        "pitch-y": pitch_y,
        "pitch-u": pitch_u,
        "rule": rule,
        "rule-class": rule_class,
        "sheet": "yes" if sheet else None,
        "bars": bars,
        "bars-u": bars_u,
        "device": device,
        "metadata": "yes" if metadata else None,
        "tone": tone,
        "blank": None if blank is None else str(blank),
        "dark": None if dark is None else str(dark),
        "backing": backing,
        "gsm": gsm,
        "gsm-u": gsm_u,
        "region": region,
        "risk": risk,
    }
    return measured(
        Asked(
            pictures=pictures,
            words={name: word for name, word in said.items() if word is not None},
            article=article,
            lot=lot,
            units=units,
            form=form,
            output=output,
            overlay=overlay,
            ledger=ledger,
            as_reference=as_reference,
        )
    )


__all__ = ["EXAMPLES", "measure"]
