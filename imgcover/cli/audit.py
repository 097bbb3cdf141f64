"""`imgcover audit`: a folder of lots in, records, decisions and reports out."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode

EXAMPLES = """\b
Examples:
  imgcover audit samples-synthetic
  imgcover audit goods-in --articles papers --out reports --light backlit --pitch 600dpi
  imgcover audit goods-in --watch
  imgcover audit goods-in --cluster tls://mill-server:8786 --cluster-tls certificates

The folder holds lots.csv or lots.xlsx (picture, lot, article, piece, place, operator, conditioned,
note, and any of light, warp, pitch, pitch-y, rule, device, tone, blank, dark, backing, gsm and
region); without one, each sub-folder is a lot and its article.toml the declaration. A second run
measures only what is new or changed.
"""


def audit(
    folder: Annotated[Path, typer.Argument(metavar="FOLDER", help="The folder of lots.")],
    articles: Annotated[
        Path | None, typer.Option(metavar="DIR", help="Another folder with declarations.")
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Where reports go; FOLDER-audit here when not given."),
    ] = None,
    ledger: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="The ledger; in the reports' folder when not given."),
    ] = None,
    jobs: Annotated[
        int | None,
        typer.Option(min=1, metavar="N", help="Pictures at once; as cores and memory allow."),
    ] = None,
    time_limit: Annotated[
        float, typer.Option(min=1.0, metavar="S", help="Seconds that one picture may take.")
    ] = 120.0,
    cluster: Annotated[
        str | None,
        typer.Option(metavar="ADDRESS", help="Measure on this dask.distributed scheduler."),
    ] = None,
    cluster_tls: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Folder with ca.pem, cert.pem and key.pem for tls://."),
    ] = None,
    cluster_send: Annotated[
        Literal["bytes", "path"],
        typer.Option(help="Send what pictures hold, or their path on a disk all workers see."),
    ] = "bytes",
    watch: Annotated[
        bool, typer.Option("--watch", help="Go on as pictures come into the folder; Ctrl-C ends.")
    ] = False,
    fresh: Annotated[
        bool, typer.Option("--fresh", help="Measure everything again, also what did not change.")
    ] = False,
    light: Annotated[
        Literal["backlit", "reflected"] | None,
        typer.Option(help="Of pictures whose row in the lot sheet does not say."),
    ] = None,
    warp: Annotated[
        Literal["vertical", "horizontal"],
        typer.Option(help="Which way the warp runs, where the sheet does not say."),
    ] = "vertical",
    pitch: Annotated[
        str | None,
        typer.Option(metavar="PITCH", help="Scale, where the sheet does not say: 600dpi, 42.3um."),
    ] = None,
    pitch_y: Annotated[
        str | None, typer.Option(metavar="PITCH", help="Scale down the stored picture.")
    ] = None,
    pitch_u: Annotated[
        str | None,
        typer.Option(metavar="SHARE", help="Standard uncertainty of the pitch, such as 0.2%."),
    ] = None,
    rule: Annotated[
        Literal["auto", "mm", "inch"] | None,
        typer.Option(help="Read the scale from a rule in each picture."),
    ] = None,
    rule_class: Annotated[
        Literal["1", "2", "3"], typer.Option(help="Accuracy class of the rule (OIML R 35).")
    ] = "2",
    sheet: Annotated[
        bool, typer.Option("--sheet", help="Read the scale from the printed sheet in each picture.")
    ] = False,
    bars: Annotated[
        str | None,
        typer.Option(metavar="A,B", help="The sheet's bars as a steel rule measures them, mm."),
    ] = None,
    bars_u: Annotated[
        str | None, typer.Option(metavar="MM", help="Their standard uncertainty, mm.")
    ] = None,
    device: Annotated[
        str | None,
        typer.Option(metavar="NAME|FILE", help="Certificate of the device that took them."),
    ] = None,
    metadata: Annotated[
        bool, typer.Option("--metadata", help="Trust the resolution that files claim.")
    ] = False,
    tone: Annotated[
        str | None, typer.Option(metavar="TONE", help="Transfer curve: srgb, linear or gamma:G.")
    ] = None,
    blank: Annotated[
        Path | None, typer.Option(metavar="FILE", help="The light table without cloth.")
    ] = None,
    dark: Annotated[
        Path | None, typer.Option(metavar="FILE", help="The exposure with the light off.")
    ] = None,
    backing: Annotated[
        Literal["light", "dark"] | None,
        typer.Option(help="The swatches lie on a card of clearly other lightness."),
    ] = None,
    risk: Annotated[
        str | None,
        typer.Option(metavar="P", help="Risk of a wrong acceptance; without it the band is 2u."),
    ] = None,
) -> ExitCode:
    """Measure a folder of lots, decide each lot, and keep the proof."""
    from imgcover.cli.auditing import AuditAsked, audited

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
        "risk": risk,
    }
    return audited(
        AuditAsked(
            folder=folder,
            articles=articles,
            out=out,
            ledger=ledger,
            words={name: word for name, word in said.items() if word is not None},
            jobs=jobs,
            time_limit=time_limit,
            cluster=cluster,
            cluster_tls=cluster_tls,
            cluster_send=cluster_send,
            watch=watch,
            fresh=fresh,
        )
    )


__all__ = ["EXAMPLES", "audit"]
