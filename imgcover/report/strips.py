"""Strips of cloth with every thread marked and numbered, so that a doubter can count along."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.repeat.between import between
from imgcover.report.canvas import ENDS, LEFT_OUT, PICKS, Canvas, Colour, Pixels, eight_bits
from imgcover.threads.reading import ThreadReading, ThreadSet, Tile, Track

MARGIN = 24
"""White left and right of a strip, px."""
THREAD_SHOWN = 16
"""Each thread is shown at least this wide, px: a line and its neighbour then stay apart."""
WIDEST_SHOWN = 32
"""Wider threads are shrunk to this: more of them pass before the eye must change the row."""
STRIP = 72
"""Height of a strip, px: some four or five crossing threads."""
RULER = 26
"""Height of the numbers and ticks above it, px."""
ROWS = 24
"""Most rows a strip is broken into; what is beyond them is said, not drawn."""


@dataclass(frozen=True, slots=True)
class Path:
    """A straight way across the threads.

    Parameters
    ----------
    start : tuple of float
        (x, y), px, where it begins.
    across : tuple of float
        Unit vector (x, y) at right angles to the threads, the way that is walked.
    length : float
        How far, px.
    """

    start: tuple[float, float]
    across: tuple[float, float]
    length: float

    def at(self, walked: float) -> tuple[float, float]:
        """The point (x, y) after `walked` px."""
        return (
            self.start[0] + walked * self.across[0],
            self.start[1] + walked * self.across[1],
        )


def path_across(threads: ThreadSet, tiles: Sequence[Tile]) -> Path:
    """Choose the way across the threads that meets the most counted tiles.

    Parameters
    ----------
    threads : ThreadSet
        The set to walk across.
    tiles : sequence of Tile
        The pieces of the field.
    """
    used = [tile for tile in tiles if tile.used] or list(tiles)
    left, top = min(tile.x for tile in used), min(tile.y for tile in used)
    right = max(tile.x + tile.width for tile in used)
    bottom = max(tile.y + tile.height for tile in used)
    size = math.hypot(*threads.frequency)
    across = (threads.frequency[0] / size, threads.frequency[1] / size)
    box = (float(left), float(top), float(right - 1), float(bottom - 1))
    centre = ((left + right) / 2, (top + bottom) / 2)
    middles = [(tile.x + tile.width / 2, tile.y + tile.height / 2) for tile in used]
    # of ways that meet equally many tiles, the one nearest to the middle of the field
    middles.sort(key=lambda middle: math.dist(middle, centre))
    paths = [_clipped(middle, across, box) for middle in middles]
    return max(paths, key=lambda path: sum(_meets(path, tile) for tile in used))


def _clipped(
    middle: tuple[float, float], across: tuple[float, float], box: tuple[float, float, float, float]
) -> Path:
    """The part of a straight line that lies in a box (left, top, right, bottom)."""
    low, high = -math.inf, math.inf
    for place, step, near, far in zip(middle, across, box[:2], box[2:], strict=True):
        if abs(step) > 1e-9:
            ends = sorted(((near - place) / step, (far - place) / step))
            low, high = max(low, ends[0]), min(high, ends[1])
    start = (middle[0] + low * across[0], middle[1] + low * across[1])
    return Path(start, across, high - low)


def _meets(path: Path, tile: Tile) -> bool:
    walked = (tile.x + tile.width / 2 - path.start[0]) * path.across[0] + (
        tile.y + tile.height / 2 - path.start[1]
    ) * path.across[1]
    x, y = path.at(walked)
    return abs(x - tile.x - tile.width / 2) <= tile.width / 2 and (
        abs(y - tile.y - tile.height / 2) <= tile.height / 2
    )


def strip_pixels(
    shown: NDArray[np.uint8 | np.uint16], path: Path, *, scale: float, height: int
) -> Pixels:
    """Cut the cloth along a path out of the picture, straightened.

    Parameters
    ----------
    shown : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        The picture as stored.
    path : Path
        Its middle line.
    scale : float
        Strip pixels a picture pixel.
    height : int
        Height of the strip, strip pixels.

    Returns
    -------
    ndarray, shape (height, columns, 3), uint8
        The path runs from left to right.
    """
    walked = np.arange(max(1, int(path.length * scale))) / scale
    aside = (np.arange(height) - (height - 1) / 2) / scale
    x = path.start[0] + walked[None, :] * path.across[0] - aside[:, None] * path.across[1]
    y = path.start[1] + walked[None, :] * path.across[1] + aside[:, None] * path.across[0]
    how = cv2.INTER_CUBIC if scale >= 2 else cv2.INTER_LINEAR
    grid = (x.astype(np.float32), y.astype(np.float32))
    cut = np.asarray(cv2.remap(shown, *grid, how, borderMode=cv2.BORDER_REPLICATE))
    return eight_bits(cut)


@dataclass(frozen=True, slots=True, eq=False)
class Marked:
    """One set of threads as it is drawn.

    Parameters
    ----------
    threads : ThreadSet
        What was counted.
    track : Track
        Where it was followed.
    phase : ndarray, shape of the track's grid, float64
        Its phase there, cycles; whole numbers lie on the middle of each thread.
    name : str
        "ends" or "picks".
    colour : tuple of int
        Of its marks.
    """

    threads: ThreadSet
    track: Track
    phase: NDArray[np.float64]
    name: str
    colour: Colour


def marked_sets(reading: ThreadReading, *, backlit: bool) -> list[Marked]:
    """The counted sets of a reading, with their phases turned to the middle of the threads.

    The track's whole numbers lie on the lightest line: before light, that is the gap.
    """
    if reading.track is None:
        return []
    aside = 0.5 if backlit else 0.0
    sides = (
        (reading.ends, reading.track.ends, "ends", ENDS),
        (reading.picks, reading.track.picks, "picks", PICKS),
    )
    return [
        Marked(threads, reading.track, phase + aside, name, colour)
        for threads, phase, name, colour in sides
        if threads is not None
    ]


def thread_places(marked: Marked, path: Path) -> list[tuple[int, float]]:
    """Where along the path each thread's middle lies.

    Parameters
    ----------
    marked : Marked
        The set that is crossed.
    path : Path
        A way across it.

    Returns
    -------
    list of (int, float)
        The thread's number, counted on through places that could not be followed, and px from
        the start of the path; threads in such places are left out, but for single ones.
    """
    track = marked.track
    walked = np.arange(0.0, path.length, 0.5)
    x = path.start[0] + walked * path.across[0]
    y = path.start[1] + walked * path.across[1]
    column = np.interp(x, track.x, np.arange(track.x.size))
    row = np.interp(y, track.y, np.arange(track.y.size))
    deviation = marked.phase - _plane(marked.threads, track)
    cycles = between(deviation, row, column)
    cycles += marked.threads.frequency[0] * x + marked.threads.frequency[1] * y
    followed = track.valid[np.rint(row).astype(int), np.rint(column).astype(int)]
    if followed.sum() < 2:
        return []
    rising = np.maximum.accumulate(cycles[followed])
    first = math.ceil(rising[0])
    numbers = np.arange(first, math.floor(rising[-1]) + 1)
    places = np.interp(numbers, rising, walked[followed])
    # one thread lost between two that are followed is as sure as they are
    seen_at = walked[followed]
    after = np.clip(np.searchsorted(seen_at, places), 1, seen_at.size - 1)
    sure = seen_at[after] - seen_at[after - 1] < 2 * marked.threads.pixels_a_thread
    return [
        (int(number) - first + 1, float(place))
        for number, place, seen in zip(numbers, places, sure, strict=True)
        if seen
    ]


def _plane(threads: ThreadSet, track: Track) -> NDArray[np.float64]:
    """The even part of the phase: what is left varies slowly enough to be interpolated."""
    fx, fy = threads.frequency
    return np.asarray(fx * track.x[None, :] + fy * track.y[:, None])


def counting_strip(
    shown: NDArray[np.uint8 | np.uint16],
    marked: Marked,
    *,
    tiles: Sequence[Tile],
    title: str,
    width: int,
) -> Canvas:
    """Draw a way across the threads, row under row, each thread marked and each tenth numbered.

    Parameters
    ----------
    shown : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        The picture as stored.
    marked : Marked
        The set that is crossed.
    tiles : sequence of Tile
        The pieces of the field.
    title : str
        What was counted.
    width : int
        Of the sheet, px.
    """
    path = path_across(marked.threads, tiles)
    scale = _magnification(marked.threads.pixels_a_thread)
    places = thread_places(marked, path)
    room = (width - 2 * MARGIN) / scale
    needed = math.ceil(path.length / room)
    rows = min(ROWS, needed)
    sheet = Canvas.blank(width, 44 + rows * (RULER + STRIP + 8))
    left = f"  (the first {rows} of {needed} rows)" if needed > rows else ""
    sheet.words(title + left, (MARGIN, 12), size=17, colour=marked.colour)
    for row in range(rows):
        piece = Path(path.at(row * room), path.across, min(room, path.length - row * room))
        top = 44 + row * (RULER + STRIP + 8)
        numbered = [
            (number, MARGIN + (place - row * room) * scale)
            for number, place in places
            if 0 <= place - row * room <= piece.length
        ]
        sheet.put(strip_pixels(shown, piece, scale=scale, height=STRIP), (MARGIN, top + RULER))
        _mark_left_out(sheet, piece, tiles, scale=scale, top=top + RULER + STRIP)
        _mark_threads(sheet, numbered, top=top, colour=marked.colour)
    return sheet


def _magnification(pitch: float) -> float:
    """Strip pixels a picture pixel, whole where larger, for threads that far apart."""
    if pitch < THREAD_SHOWN:
        return float(math.ceil(THREAD_SHOWN / pitch))
    return min(1.0, WIDEST_SHOWN / pitch)


def _mark_threads(
    sheet: Canvas, numbered: list[tuple[int, float]], *, top: int, colour: Colour
) -> None:
    """Tick every thread above the strip, and draw its line over the strip's upper part only."""
    edge = top + RULER
    for number, x in numbered:
        tall = 12 if number % 10 == 0 else 8 if number % 5 == 0 else 5
        over = STRIP if number % 10 == 0 else STRIP // 2
        sheet.line((x, edge - tall), (x, edge + over), colour)
        if number % 10 == 0 or number == 1:
            sheet.words(str(number), (x, edge - 13), size=12, colour=colour, anchor="md")


def _mark_left_out(
    sheet: Canvas, piece: Path, tiles: Sequence[Tile], *, scale: float, top: int
) -> None:
    """Underline where the strip runs over tiles that were not counted."""
    steps = np.linspace(0.0, piece.length, max(2, int(piece.length * scale / 4)))
    for near, far in pairwise(steps):
        x, y = piece.at(float(near + far) / 2)
        if any(_holds(tile, x, y) and not tile.used for tile in tiles):
            sheet.line(
                (MARGIN + near * scale, top + 3), (MARGIN + far * scale, top + 3), LEFT_OUT, 3
            )


def _holds(tile: Tile, x: float, y: float) -> bool:
    return 0 <= x - tile.x < tile.width and 0 <= y - tile.y < tile.height


__all__ = [
    *("Marked", "Path", "counting_strip", "marked_sets"),
    *("path_across", "strip_pixels", "thread_places"),
]
