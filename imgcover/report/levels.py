"""What the cover rests on: the mean cell, and where the open and the yarn level lie."""

from __future__ import annotations

import numpy as np

from imgcover.cover.reading import CoverReading
from imgcover.report.canvas import ENDS, FAINT, INK, PORE, Canvas, eight_bits, resized


def draw_mean_cell(sheet: Canvas, cover: CoverReading, at: tuple[int, int], side: int) -> None:
    """Draw the mean cell four times over, so that a pore is seen whole; bright is open."""
    if cover.mean_cell is None:
        return
    four = np.tile(cover.mean_cell, (2, 2)).astype(np.float32)
    grey = np.clip(255 * resized(four, side, side), 0, 255).astype(np.uint8)
    sheet.put(eight_bits(grey), at)
    sheet.words("mean cell, twice each way", (at[0], at[1] - 20), size=13, colour=FAINT)


def draw_histogram(
    sheet: Canvas, cover: CoverReading, at: tuple[int, int], size: tuple[int, int]
) -> None:
    """Draw how often each share of the light field occurs, with the levels that were found.

    Parameters
    ----------
    sheet : Canvas
    cover : CoverReading
    at : tuple of int
        Upper left corner.
    size : tuple of int
        Width and height of the plot.
    """
    if cover.histogram is None or cover.histogram.counts.max() == 0:
        return
    (x, y), (width, height) = at, size
    edges, counts = cover.histogram.edges, np.sqrt(cover.histogram.counts)
    span = edges[-1] - edges[0]
    for low, high, count in zip(edges, edges[1:], counts / counts.max(), strict=False):
        left = x + width * (low - edges[0]) / span
        right = x + width * (high - edges[0]) / span
        tall = float(count) * (height - 20)
        if tall >= 1:
            sheet.fill((left, y + height - tall), (max(1.0, right - left - 1), tall), FAINT)
    for level, word, colour in (
        (cover.yarn_level, "yarn", INK),
        (cover.threshold_level, "edge", ENDS),
        (cover.open_level, "open", PORE),
    ):
        if level is not None:
            place = x + width * (level - edges[0]) / span
            sheet.line((place, y + 14), (place, y + height), colour, 2)
            sheet.words(word, (place, y + 12), size=13, colour=colour, anchor="md")
    sheet.line((x, y + height), (x + width, y + height), INK)
    sheet.words("0", (x, y + height + 3), size=12, colour=FAINT)
    sheet.words(
        f"light, share of the light field: {edges[-1]:.2g}",
        (x + width, y + height + 3),
        size=12,
        colour=FAINT,
        anchor="ra",
    )


__all__ = ["draw_histogram", "draw_mean_cell"]
