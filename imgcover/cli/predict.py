"""`imgcover predict`: what a declared construction leads to, before anyone scans."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode
from imgcover.cli.output import keep_apart, opened

EXAMPLES = """\b
Examples:
  imgcover predict harrow.toml
  imgcover predict harrow.toml marl.toml
  imgcover predict harrow.toml -f json
"""


def predict(
    articles: Annotated[
        list[Path],
        typer.Argument(metavar="ARTICLE", help="Declarations (TOML); several: side by side."),
    ],
    form: Annotated[
        Literal["text", "json", "jsonl", "csv"],
        typer.Option("--format", "-f", help="How it is told."),
    ] = "text",
    output: Annotated[
        Path | None,
        typer.Option("--output", "-o", metavar="FILE", help="Write there, whole or not at all."),
    ] = None,
) -> ExitCode:
    """Say the cover, mass and limits that a declaration leads to."""
    from imgcover.cloth.comparison import compare
    from imgcover.cloth.declaration import read_declaration
    from imgcover.cloth.prediction import predict as predicted
    from imgcover.report.data import json_array, json_lines
    from imgcover.report.predicted import (
        comparison_text,
        prediction_csv,
        prediction_record,
        prediction_text,
    )

    keep_apart("--output", output, articles)
    declarations = [read_declaration(path) for path in articles]
    predictions = [predicted(each) for each in declarations]
    comparison = compare(predictions) if len(predictions) > 1 else None
    with opened(output, encoding=None if form == "text" else "utf-8") as write:
        if form == "text" and comparison is not None:
            write(comparison_text(comparison))
        elif form == "text":
            article = declarations[0].article
            write(
                prediction_text(
                    predictions[0], description=article.description, weave=article.weave
                )
            )
        else:
            records = [
                prediction_record(
                    prediction, declaration=declaration, comparison=comparison, index=index
                )
                for index, (prediction, declaration) in enumerate(
                    zip(predictions, declarations, strict=True)
                )
            ]
            told = {"json": json_array, "jsonl": json_lines, "csv": prediction_csv}[form]
            for piece in told(records):
                write(piece)
    return ExitCode.CONFORMS


__all__ = ["EXAMPLES", "predict"]
