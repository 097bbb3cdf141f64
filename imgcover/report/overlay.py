"""What was counted, drawn over the picture it was counted in: the evidence of one swatch.

From the top: what was decided; the whole picture with its region, the tiles that were left out
and the ways along which threads were counted; a close-up with every thread's line and every pore;
the mean cell and the light levels; and the counted ways, row under row, each thread marked.
"""

from __future__ import annotations

import contextlib
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import cv2

from imgcover.cover.reading import CoverReading
from imgcover.errors import OutputError
from imgcover.picture.picture import Picture
from imgcover.report.canvas import (
    ENDS,
    FAINT,
    INK,
    LEFT_OUT,
    PICKS,
    PORE,
    Canvas,
    Pixels,
    stacked,
    text_width,
)
from imgcover.report.closeup import close_up
from imgcover.report.headline import headline
from imgcover.report.layout import Units
from imgcover.report.levels import draw_histogram, draw_mean_cell
from imgcover.report.strips import MARGIN, Marked, counting_strip, marked_sets, path_across
from imgcover.report.wholeview import draw_path, draw_region, draw_scale_bar, draw_whole, fitted
from imgcover.scale.scale import Scale
from imgcover.threads.reading import ThreadReading

SHEET = 1600
"""Width of the sheet, px: A4 landscape at about 140 dpi, and a common screen."""
VIEW = (880, 660)
"""Largest width and height of the whole view, px."""
CLOSE_UP = 640
"""Side of the close-up, px."""


def overlay(
    record: Mapping[str, Any],
    *,
    picture: Picture,
    threads: ThreadReading,
    scale: Scale | None,
    cover: CoverReading | None,
    region: tuple[int, int, int, int] | None,
    units: Units,
) -> Pixels:
    """Draw the evidence of one measured picture.

    Parameters
    ----------
    record : mapping
        The picture's record, for the words.
    picture, threads, scale, cover
        The rooms' answers.
    region : tuple of int or None
        (x, y, width, height) that was asked for, px of the shown picture.
    units : {"inch", "cm"}

    Returns
    -------
    ndarray, shape (rows, 1600, 3), uint8, RGB
    """
    reading = CoverReading() if cover is None else cover
    marked = marked_sets(threads, backlit=record["light"] == "backlit")
    sheets = [
        _header(record, units, has_pores=bool(reading.seen)),
        _views(picture, threads, marked, scale, reading, region),
    ]
    if reading.histogram is not None or reading.mean_cell is not None:
        sheets.append(_levels(reading))
    sheets += [
        counting_strip(
            picture.stored,
            each,
            tiles=threads.tiles,
            title=_title(each, record["threads"]),
            width=SHEET,
        )
        for each in marked
    ]
    return stacked(sheets).pixels


def _title(marked: Marked, section: Mapping[str, Any] | None) -> str:
    """What was counted over which length, in the numbers of the record."""
    threads = marked.threads
    title = f"{marked.name}: {threads.counted:.2f} counted over {threads.length_px:.0f} px"
    length = None if section is None else section[f"length_{marked.name}_mm"]
    if length is not None:
        title += f" = {length:.2f} mm"
    fx, fy = threads.frequency
    return f"{title}  (laid from top to bottom)" if abs(fy) > abs(fx) else title


def write_overlay(pixels: Pixels, path: Path) -> None:
    """Write the sheet as a PNG, whole or not at all.

    Raises
    ------
    OutputError
        When the folder cannot be made or the file not written.
    """
    beside = path.with_name(f".{path.name}.part")
    made, encoded = cv2.imencode(".png", pixels[..., ::-1])
    if not made:
        raise OutputError(str(path), "could not be encoded as PNG", "report this as a fault")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        beside.write_bytes(encoded.tobytes())
        beside.replace(path)
    except OSError as fault:
        with contextlib.suppress(OSError):  # the folder itself may be what is missing
            beside.unlink(missing_ok=True)
        reason = fault.strerror or type(fault).__name__
        raise OutputError(
            str(path), f"cannot be written ({reason})", "choose another folder, or make room"
        ) from fault


def _header(record: Mapping[str, Any], units: Units, *, has_pores: bool) -> Canvas:
    sheet = Canvas.blank(SHEET, 76)
    sheet.words(headline(record, units=units), (MARGIN, 14), size=22)
    legend = [("ends", ENDS), ("picks", PICKS), ("left out", LEFT_OUT)]
    x = float(MARGIN)
    for word, colour in [*legend, *([("open area", PORE)] if has_pores else [])]:
        sheet.fill((x, 53), (12, 12), colour)
        sheet.words(word, (x + 18, 51), size=14, colour=FAINT)
        x += 18 + text_width(word, 14) + 24
    return sheet


def _views(
    picture: Picture,
    threads: ThreadReading,
    marked: Sequence[Marked],
    scale: Scale | None,
    cover: CoverReading,
    region: tuple[int, int, int, int] | None,
) -> Canvas:
    view = fitted(picture.stored.shape, (MARGIN, 8), VIEW)
    sheet = Canvas.blank(SHEET, max(view.size[1] + 46, CLOSE_UP + 40))
    draw_whole(
        sheet,
        view,
        picture.stored,
        tiles=threads.tiles,
        seen=cover.seen,
        light_field=cover.light_field,
    )
    for each in marked:
        draw_path(sheet, view, path_across(each.threads, threads.tiles), each.colour)
    if region is not None:
        draw_region(sheet, view, region, INK)
    if scale is not None:
        draw_scale_bar(sheet, view, scale.x.value)
    large = close_up(
        picture.stored, marked=marked, tiles=threads.tiles, seen=cover.seen, side=CLOSE_UP
    )
    corner = (SHEET - MARGIN - CLOSE_UP, 8)
    sheet.image.paste(large.image, corner)
    return sheet


def _levels(cover: CoverReading) -> Canvas:
    sheet = Canvas.blank(SHEET, 260)
    draw_mean_cell(sheet, cover, (MARGIN, 30), 200)
    draw_histogram(sheet, cover, (MARGIN + 240, 20), (SHEET - 2 * MARGIN - 240, 200))
    return sheet


__all__ = ["overlay", "write_overlay"]
