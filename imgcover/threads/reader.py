"""Ends and picks of one picture: counted, or refused with the reason."""

from __future__ import annotations

import dataclasses
import math
from fractions import Fraction
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding, Flag, found
from imgcover.repeat.spectrum import folded_over
from imgcover.threads.counting import Counted, count
from imgcover.threads.field import LightSource, Region, field_of, whole
from imgcover.threads.follow import Followed
from imgcover.threads.identify import Identified, identify, taken_as
from imgcover.threads.profile import amplitudes
from imgcover.threads.reading import Fork, ThreadReading, ThreadSet, Tile, Track
from imgcover.threads.regions import (
    UNCLEAR,
    Pieces,
    away_from_bare,
    bow_of,
    divide,
    local_density,
    without_strays,
)
from imgcover.threads.telling import (
    FEWEST_PIXELS,
    NEAR_HALF_RIGHT,
    is_lost,
    is_weak,
    of_field,
    of_set,
)
from imgcover.threads.tie import settled
from imgcover.threads.woven import crossing
from imgcover.weave import Weave

Direction = Literal["vertical", "horizontal"]
SetName = Literal["ends", "picks"]

FEWEST_THREADS = 6.0
"""Threads across the field: with fewer, one thread more or less at the edge is the uncertainty."""

LEAST_AGREEING = 0.75
"""Share of the clear tiles that must agree on the density: a few hold a burl or a hole, but where
many differ the threads were not followed."""

CLEAR_SCORE, COARSE_PIXELS = 8.0, 18.0
"""A score most drawn cloths reach, with enough threads in a window: the smaller picture is then not
asked."""

MOST_UNCLEAR = 0.38
"""Share of all tiles that may hold threads and yet not be followed: a third out of focus is left
out. More, and stripes or checks break the field into parts between which threads are lost."""

FINEST_WHEN_SMALL = 6.0
"""Pixels a thread left in a picture made smaller: finer threads are read at full size, and what
they leave in the smaller picture is not a thread."""

LEAST_SCORE = 5.0
"""Spectral witnesses (`witness.Evidence.score`): 150 drawn cloths lie at 7.2 to 12, real ones from
5.4; noise, gravel, foliage and water below 4."""

LEAST_LINE = 4.0
"""ln(power over floor) of the fainter set's own line below which a set that could not be followed
was never there: 5.1 in drawn cloth with a lost set, 3.5 in a brick wall, 2.4 in laid paper."""

EDGE = 1.7
"""How far the outermost threads stray, in units of the phase's unevenness from place to place:
fitted so that 2 u covers 95 % of counted truth (tests/threads/sweep_threads.py)."""

TURN = 0.5
"""Share of the tiles' scatter by which two means over a field turned by 45 degrees differ."""

FOLDED = "the strongest pattern is as fine as the pixels themselves: threads may be folded over"

DIAGONAL = (
    "the pattern can be read as threads turned by about 45 degrees, or as straight plain cloth"
    " of twice as many threads on the diagonals"
)


class Plain:
    """An array of linear light, as a light source."""

    def __init__(self, array: NDArray[np.float32]) -> None:
        self._array = array
        self.rows, self.columns = array.shape

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Linear light of a window, or of all."""
        return self._array if window is None else self._array[window]


def read_threads(
    source: LightSource,
    *,
    warp: Direction = "vertical",
    weave: Weave | None = None,
    region: Region | None = None,
) -> ThreadReading:
    """Count the ends and the picks of a picture of woven cloth.

    Parameters
    ----------
    source : LightSource
        A Picture, or `Plain(array)`.
    warp : {"vertical", "horizontal"}
        How the warp runs in the shown picture.
    weave : Weave or None
        The declared weave; it may break a tie between two readings, nothing else.
    region : Region or None
        The part to read; None reads all.

    Returns
    -------
    ThreadReading
        A set that could not be counted is None, and a finding says why.
    """
    part = region or whole(source)
    if min(part.width, part.height) < FEWEST_THREADS * FEWEST_PIXELS:
        return _refused(found(Flag.TOO_FEW_THREADS))
    seen = _best_zoom(source, part)
    if seen is None or seen.evidence.score < LEAST_SCORE:
        return _refused(found(Flag.NO_CROSSING_THREADS))
    if seen.origin.zoom == 1 and folded_over(seen.seen):
        return _refused(found(Flag.TOO_COARSE, FOLDED, "scan at twice the resolution or more"))
    if not crossing(seen):
        return _refused(found(Flag.NOT_WOVEN))
    if seen.candidate.index == 1 and abs(seen.candidate.turn) > NEAR_HALF_RIGHT:
        # threads turned by 45 degrees, or the diagonals of straight plain cloth in two colours
        return _refused(found(Flag.TWO_READINGS, DIAGONAL, "lay the swatch straight"))
    settled_by = _settled(seen, weave, warp)
    if settled_by is None:
        return _read(seen, part, warp)
    reading = _read(settled_by, part, warp)
    told = found(Flag.RESTS_ON_DECLARED_WEAVE)
    return dataclasses.replace(reading, findings=(*reading.findings, told))


def _settled(seen: Identified, weave: Weave | None, warp: Direction) -> Identified | None:
    """Let the declared weave decide where two readings stay possible; None where none do."""
    if weave is None or (seen.ends.rival is None and seen.picks.rival is None):
        return None
    if warp == "horizontal":
        weave = dataclasses.replace(weave, matrix=weave.matrix.T)
    both = settled(seen.candidate, seen.ends, seen.picks, weave)
    return None if both is None else taken_as(seen, *both)


def _names(warp: Direction) -> tuple[SetName, SetName]:
    """What the set across the picture and the set down it are called."""
    return ("ends", "picks") if warp == "vertical" else ("picks", "ends")


def _best_zoom(source: LightSource, region: Region) -> Identified | None:
    """Read at the picture's own size and made smaller, and keep what speaks most clearly."""
    best: Identified | None = None
    for zoom in (1, 3):
        if zoom > 1 and min(region.width, region.height) < 128 * zoom:
            break
        if best is not None and _clear(best):
            break
        seen = identify(field_of(source, region, zoom))
        if seen is None or (zoom > 1 and min(seen.candidate.pixels) < FINEST_WHEN_SMALL):
            continue
        if best is None or seen.evidence.score > best.evidence.score:
            best = seen
    return best


def _clear(seen: Identified) -> bool:
    """Whether a reading needs no second look at a smaller scale."""
    return seen.evidence.score > CLEAR_SCORE and max(seen.candidate.pixels) < COARSE_PIXELS


def _refused(*findings: Finding, tiles: tuple[Tile, ...] = ()) -> ThreadReading:
    return ThreadReading(None, None, None, tiles, None, (), findings)


def _read(seen: Identified, region: Region, warp: Direction) -> ThreadReading:
    one, followed = seen.candidate, seen.followed
    if not seen.agreed:
        return _refused(found(Flag.THREADS_LOST))
    period = max(one.pixels)
    followed = away_from_bare(followed, seen.origin.light, period)
    pieces = divide(followed, period, seen.origin.light.shape)
    clear = len(pieces.blocks)
    pieces = without_strays(followed, pieces, one.ends, one.picks)
    unclear = sum(tile.reason in UNCLEAR for tile in pieces.tiles)
    if len(pieces.blocks) < LEAST_AGREEING * clear or unclear > MOST_UNCLEAR * len(pieces.tiles):
        return _refused(found(Flag.THREADS_LOST))
    tiles = tuple(_in_picture(tile, seen) for tile in pieces.tiles)
    if not pieces.blocks:
        return _refused(found(Flag.NO_CROSSING_THREADS), tiles=tiles)
    followed = dataclasses.replace(followed, valid=pieces.valid)
    phases = ((followed.ends, one.ends), (followed.picks, one.picks))
    counts = [count(phase, followed, vector) for phase, vector in phases]
    # a break in one set leaves the other in doubt: both are read from the same lines
    doubted = max((each.doubted for each in counts if each is not None), default=0.0)
    across, down = (
        _set(seen, phase, pieces, vector, counted, doubted)
        for (phase, vector), counted in zip(phases, counts, strict=True)
    )
    if across is None or down is None:
        return _refused(found(Flag.TOO_FEW_THREADS), tiles=tiles)
    faint = min(seen.evidence.ends_line, seen.evidence.picks_line) < LEAST_LINE
    if faint and (is_lost(across) or is_lost(down)):
        return _refused(found(Flag.NOT_WOVEN), tiles=tiles)
    names = _names(warp)
    findings: list[Finding] = []
    forks = []
    for name, multiple, each in zip(names, (seen.ends, seen.picks), (across, down), strict=True):
        if multiple.rival is not None:
            ratio = float(multiple.rival / multiple.factor)
            other = (each.frequency[0] * ratio, each.frequency[1] * ratio)
            forks.append(Fork(name, (each.frequency, other)))
        findings += of_set(name, each, multiple.rival is not None)
    named = list(zip(names, (across, down), strict=True))
    refused = {each.set_name for each in forks}
    refused |= {name for name, each in named if is_weak(each)}
    kept = {name: None if name in refused else each for name, each in named}
    findings += of_field(seen.candidate.turn, seen.origin.region, region, tiles)
    return ThreadReading(
        kept["ends"],
        kept["picks"],
        _track(seen, followed, warp),
        tiles,
        one.repeat,
        tuple(forks),
        tuple(findings),
    )


def _set(
    seen: Identified,
    phase: NDArray[np.float64],
    pieces: Pieces,
    frequency: tuple[float, float],
    counted: Counted | None,
    doubted: float,
) -> ThreadSet | None:
    """One set of threads, in picture pixels."""
    followed = dataclasses.replace(seen.followed, valid=pieces.valid)
    rows, columns = seen.origin.light.shape
    reach = abs(frequency[0]) * columns + abs(frequency[1]) * rows
    if counted is None or reach < FEWEST_THREADS:
        return None
    zoom = seen.origin.zoom
    local = local_density(phase, followed, pieces, frequency)
    parts = _parts(counted, doubted)
    # lines across turned cloth each meet other threads, and their mean is that of a sample
    turned = abs(math.sin(2 * math.atan2(frequency[1], frequency[0])))
    parts["turn"] = TURN * turned * local.scatter / math.sqrt(len(pieces.blocks))
    return ThreadSet(
        frequency=(counted.frequency[0] / zoom, counted.frequency[1] / zoom),
        counted=counted.counted,
        length_px=counted.length_px * zoom,
        u_relative=math.hypot(*parts.values()),
        components=parts,
        local_scatter=local.scatter,
        local_low=local.low,
        local_high=local.high,
        parts=local.parts,
        bow=bow_of(phase, followed, pieces.valid, frequency),
    )


def _parts(counted: Counted, doubted: float) -> dict[str, float]:
    """Parts of the relative standard uncertainty.

    On drawn cloth with threads added or dropped in up to a fifth of the lines of sight the count
    was off by as large a part of a thread, however many the breaks.
    """
    return {
        "phase": counted.noise,
        "edge": EDGE * counted.irregular,
        "breaks": min(counted.broken, doubted / counted.counted),
    }


def _in_picture(tile: Tile, seen: Identified) -> Tile:
    zoom, at = seen.origin.zoom, seen.origin.region
    return Tile(
        at.x + tile.x * zoom,
        at.y + tile.y * zoom,
        tile.width * zoom,
        tile.height * zoom,
        tile.used,
        tile.reason,
    )


def _track(seen: Identified, followed: Followed, warp: Direction) -> Track:
    """The phases in picture pixels, whole numbers on the lightest line of each thread."""
    zoom, at = seen.origin.zoom, seen.origin.region
    one = seen.candidate
    phases = []
    for deviation, vector in ((followed.ends, one.ends), (followed.picks, one.picks)):
        values, _ = amplitudes(
            seen.field, followed, deviation, vector, sigma=seen.sigma, multiples=(Fraction(1),)
        )
        lightest = float(np.angle(values[0])) / (2 * math.pi)
        plane = vector[0] * followed.x[None, :] + vector[1] * followed.y[:, None]
        phases.append(plane + deviation + lightest)
    across, down = phases
    ends, picks = (across, down) if warp == "vertical" else (down, across)
    half = (zoom - 1) / 2
    return Track(
        at.x + followed.x * zoom + half,
        at.y + followed.y * zoom + half,
        ends,
        picks,
        followed.valid,
    )


__all__ = ["Direction", "Plain", "read_threads"]
