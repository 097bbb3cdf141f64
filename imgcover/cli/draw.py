"""`imgcover draw`: cloth with known truth, as a scanner would see it; recorded drawings anew."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Literal

import typer

from imgcover.cli.exits import ExitCode
from imgcover.cli.output import opened

if TYPE_CHECKING:
    from imgcover.loom.article import Departure
    from imgcover.loom.camera import CameraSpec

EXAMPLES = """\b
Examples:
  imgcover draw harrow.toml --dpi 1200 --light backlit -o drawn
  imgcover draw harrow.toml --departs picks=0.92 --turn 2 --seed 7 -o drawn
  imgcover draw --recorded samples-synthetic/drawn.toml -o anew
  imgcover draw --recorded samples-synthetic/drawn.toml --compare
"""
MM_PER_INCH = 25.4
COARSEST, FINEST = 50.0, 12_800.0
"""Dots an inch: below, no thread is told from its neighbour; above, no scanner goes."""
SMALLEST, LARGEST = 16, 20_000
"""Pixels a side: an A4 at 1200 dpi is 14,000 high; beyond it a slip of the pen fills the memory."""


def draw(
    articles: Annotated[
        list[Path] | None,
        typer.Argument(metavar="ARTICLE", help="Declarations (TOML) of the cloths to draw."),
    ] = None,
    recorded: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Draw every picture that this file records, anew."),
    ] = None,
    compare: Annotated[
        bool,
        typer.Option("--compare", help="Hold them against the recorded ones; write nothing."),
    ] = False,
    light: Annotated[
        Literal["backlit", "reflected"], typer.Option(help="From which side the light comes.")
    ] = "backlit",
    dpi: Annotated[float, typer.Option(metavar="N", help="Dots an inch of the scanner.")] = 1200.0,
    size: Annotated[
        str, typer.Option(metavar="W,H", help="Width and height of the picture, px.")
    ] = "1200,1200",
    turn: Annotated[
        float, typer.Option(metavar="DEG", help="How far the swatch lies turned, clockwise.")
    ] = 0.0,
    departs: Annotated[
        str | None,
        typer.Option(
            metavar="FACTORS",
            help="How the cloth departs from its declaration: ends, picks, warp_tex, weft_tex.",
        ),
    ] = None,
    seed: Annotated[int, typer.Option(min=0, help="The same seed draws the same picture.")] = 1,
    kind: Annotated[Literal["png", "jpg", "tif"], typer.Option(help="Kind of file.")] = "png",
    output: Annotated[
        Path, typer.Option("--output", "-o", metavar="DIR", help="Where pictures and truth go.")
    ] = Path("drawn"),
) -> ExitCode:
    """Draw declared cloths with their counted truth beside them."""
    from imgcover.cloth.declaration import read_declaration
    from imgcover.loom.camera import CameraSpec
    from imgcover.loom.redraw import draw_into, redraw

    if bool(articles) == (recorded is not None):
        raise typer.BadParameter("give articles to draw, or --recorded FILE")
    if compare and recorded is None:
        raise typer.BadParameter("--compare goes with --recorded FILE")
    if recorded is not None and compare:
        return _compared(recorded)
    with opened(None, encoding=None) as write:
        if recorded is not None:
            for path in redraw(recorded, output):
                write(f"{path}\n")
            return ExitCode.CONFORMS
        camera = _camera(CameraSpec, light=light, dpi=dpi, turn=turn)
        width, height = _size(size)
        for article in articles or ():
            for path in draw_into(
                output,
                read_declaration(article),
                camera,
                seed=seed,
                width=width,
                height=height,
                departure=_departure(departs),
                suffix=f".{kind}",
            ):
                write(f"{path}\n")
    return ExitCode.CONFORMS


def _compared(recorded: Path) -> ExitCode:
    """Compare kept pictures with the same drawn anew; what differs does not conform."""
    from imgcover.loom.redraw import compare

    code = ExitCode.CONFORMS
    with opened(None, encoding=None) as write:
        for each in compare(recorded):
            write(f"{each.file}: {each.differs or 'the same'}\n")
            code = code if each.same else ExitCode.DOES_NOT_CONFORM
    return code


def _camera(
    make: type[CameraSpec], *, light: Literal["backlit", "reflected"], dpi: float, turn: float
) -> CameraSpec:
    if not COARSEST <= dpi <= FINEST:
        raise typer.BadParameter(f"--dpi takes {COARSEST:g} to {FINEST:g}, got {dpi:g}")
    if not -360 <= turn <= 360:
        raise typer.BadParameter(f"--turn takes degrees from -360 to 360, got {turn:g}")
    return make(px_per_mm=dpi / MM_PER_INCH, light=light, rotation_deg=turn)


def _size(text: str) -> tuple[int, int]:
    sides = [int(part) if part.strip().isdecimal() else 0 for part in text.split(",")]
    if len(sides) != 2 or not all(SMALLEST <= side <= LARGEST for side in sides):
        raise typer.BadParameter(f"--size takes W,H of {SMALLEST} to {LARGEST} px, got {text!r}")
    return sides[0], sides[1]


def _departure(text: str | None) -> Departure | None:
    """Read `picks=0.92,warp_tex=1.1`."""
    from imgcover.loom.article import Departure

    if text is None:
        return None
    try:
        return Departure(**dict(_factors(text)))
    except (TypeError, ValueError) as fault:
        raise typer.BadParameter(
            f"--departs takes factors such as picks=0.92,warp_tex=1.1 of ends, picks, warp_tex "
            f"and weft_tex; got {text!r} ({fault})"
        ) from None


def _factors(text: str) -> Iterator[tuple[str, float]]:
    for part in text.split(","):
        name, _, factor = part.partition("=")
        yield name.strip(), float(factor)


__all__ = ["EXAMPLES", "draw"]
