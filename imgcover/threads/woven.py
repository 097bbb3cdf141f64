"""Whether what repeats in a field is made of two sets of threads that cross."""

from __future__ import annotations

import math

from imgcover.repeat.spectrum import spectrum
from imgcover.threads.candidates import Candidate
from imgcover.threads.field import windows_of
from imgcover.threads.identify import WINDOW, Identified
from imgcover.threads.individual import individuality
from imgcover.threads.profile import SILENT
from imgcover.threads.witness import streak

LEAST_STREAK = 0.4
"""ln(power) along an axis over the power beside it, of the weaker axis, mean of two window sizes.
150 drawn cloths lie at 0.41 to 5, real ones from 0.42; knits, bricks, nets, leather and perforated
sheets at 0.39 at the most."""

MOST_AGAINST = 0.3
"""Share of the lines at broken multiples of the threads: 0.14 at the most in drawn cloth."""

OPEN_GRID_LINES, OPEN_GRID_STREAK = 6.0, 0.3
"""A plain open grid has no weave lines to show and even threads: there the two threads' lines must
tower over the floor, and fainter streaks do."""

REGULAR_LINES, REGULAR_SCORE = 4.0, 6.0
"""A lattice that repeats on three threads or more, stepping one by one along both sets, with both
threads' own lines in it and next to nothing beside it, is that of a twill or satin. In closed
warp-faced cloth the other set has no streak to show."""


SURE_SCORE = 7.0
"""Spectral witnesses below which only plain cloth that shows its weave is believed: 200 drawn
cloths lie above it; rib knits, pickets, scales and water reach 6.8."""

SILENT_PAIR = 0.17
"""Share of the strongest line's amplitude that the louder of the threads' own lines reaches in a
printed screen of dots in quincunx; 0.2 and more in two-colour cloth."""

STRAIGHT = 12.0
"""Degrees of turn within which a pair is taken for what it looks like: nearly all swatches lie so,
and few combinations of other lines of a pattern do."""

EVEN_LOUDNESS = 0.55
"""Share of the strongest line's amplitude: where a lattice with weave lines in it has both threads'
own lines among its strongest, threads that are too even to leave a streak are threads still."""

TURNED_LOUDNESS = 0.1
"""A turned pair whose own lines are fainter than this is a combination of other lines."""

NO_INDIVIDUALS = 0.03
"""Likeness of a thread's pieces (`individual.individuality`) that neither set reaches in printed
dots, sheets and some bricks; few of 300 drawn cloths stay below it in both sets."""

STAMPED = 0.1
"""Roughness (`Individuality.rough`) below which pieces are as alike as print and punch make them:
0.08 at the most in printed dots, 0.16 and more in drawn open cloth."""

CROSSED = 0.01
"""Distance of a cell from the product of two stripes (`Individuality.not_crossed`): 0.001 in even
meshes however blurred, 0.02 to 0.11 in printed dots. A mesh of wire is as even as print is."""

INDIVIDUALS, PLAINLY_INDIVIDUALS = 0.05, 0.1
"""Likeness that stands for a streak in open grids, whose streaks are short of lines to be seen
between, and likeness that stands for a plain spectrum."""

FAINT_STREAK = 0.2
"""Streak that plain individuals must show all the same: 0.25 in drawn cloth, 0.17 in knits."""

LOUD_INDIVIDUALS = 0.4
"""Share of the strongest line's amplitude that the quieter set must reach beside such likeness:
rib knits are individuals both ways too, and their courses reach 0.24."""

ABSENT = 0.035
"""Share of the strongest line's amplitude: in a lattice with weave lines in it, no set of drawn
cloth stays below 0.13 nor one of real cloth below 0.05; rails of fences and lines of text do."""

SATIN_LOUDNESS = 0.5
"""Share of the strongest line's amplitude that the louder set reaches in weaves on five threads and
more: 0.6 in drawn cloth, 0.33 where the diagonals of a checkerboard are taken for a satin's."""


def crossing(seen: Identified) -> bool:
    """Whether both sets are made of individual threads that run on across the other set.

    Knits, bricks, scales and printed dots repeat in two directions too, but nothing in them goes
    on unbroken along both.
    """
    e, one = seen.evidence, seen.candidate
    quieter, louder = sorted(
        each.amplitude / seen.followed.loudest for each in (seen.ends, seen.picks)
    )
    if e.against > MOST_AGAINST or _hexagonal(one) or _silent(one, quieter, louder, seen):
        return False
    alike = individuality(seen.origin, one, seen.followed)
    stamped = alike.rough < STAMPED and alike.not_crossed > CROSSED
    doubtful = stamped if one.index == 1 else e.against > 0.05
    if doubtful and max(alike.ends, alike.picks) < NO_INDIVIDUALS:
        return False
    if one.index > 4 and one.parts != (1, 1) and alike.least < NO_INDIVIDUALS:
        return False
    wires = one.index == 1 and alike.rough < STAMPED and alike.not_crossed < 0.5 * CROSSED
    lines = min(e.ends_line, e.picks_line)
    narrow = min(e.ends_streak, e.picks_streak)
    straight = abs(one.turn) < STRAIGHT
    plain = one.index == 2 and one.parts == (1, 1)
    if e.score < SURE_SCORE and not (
        straight
        and (
            wires
            or (plain and narrow > 0.3)
            or (alike.least > PLAINLY_INDIVIDUALS and narrow > FAINT_STREAK)
        )
    ):
        return False
    if not straight and quieter < TURNED_LOUDNESS:
        return False
    even = one.index > 1 and one.parts == (1, 1) and quieter > EVEN_LOUDNESS
    if straight and even and e.against < 0.05:
        return True
    apart = 0.5 if one.index > 4 else 0.1
    regular = one.index > 2 and one.parts == (1, 1) and e.against < 0.03 and e.apart < apart
    if straight and regular and narrow > 0 and lines > REGULAR_LINES and e.score > REGULAR_SCORE:
        return True
    if narrow > 2 * LEAST_STREAK:
        return True
    grid = straight and one.index == 1 and quieter > EVEN_LOUDNESS
    if grid and (wires or alike.least > INDIVIDUALS):
        return True
    loud = one.parts == (1, 1) and quieter > LOUD_INDIVIDUALS
    if loud and alike.least > 2 * PLAINLY_INDIVIDUALS and narrow > FAINT_STREAK:
        return True
    wide = spectrum(windows_of(seen.origin, min(2 * WINDOW, *seen.origin.light.shape)))
    wider = min(streak(wide, one.ends), streak(wide, one.picks))
    if one.index == 1 and lines > OPEN_GRID_LINES and wider > OPEN_GRID_STREAK:
        return True
    return narrow + wider > 2 * LEAST_STREAK


def _hexagonal(one: Candidate) -> bool:
    """Whether the lattice is that of a net or of close-packed dots: six equal neighbours."""
    ratio = max(one.pixels) / min(one.pixels)
    twice = one.index == 4 and one.parts != (1, 1)
    plain = one.index == 2 and one.parts == (1, 1)
    among = (plain and abs(ratio / math.sqrt(3) - 1) < 0.015) or (
        twice and abs(ratio / math.sqrt(12) - 1) < 0.015
    )
    return among and abs(one.skew) < 0.7


def _silent(one: Candidate, quieter: float, louder: float, seen: Identified) -> bool:
    """Whether an axis has no line of its own and the lattice does not make up for it."""
    if one.index == 1:
        return quieter < SILENT
    loud = [each.amplitude / seen.followed.loudest for each in (seen.ends, seen.picks)]
    parted = any(each < SILENT and parts > 1 for each, parts in zip(loud, one.parts, strict=True))
    least = SATIN_LOUDNESS if _exactly_square(one) else SILENT_PAIR
    dots = one.parts == (1, 1) and one.index == 2 and louder < least
    satin = one.parts == (1, 1) and one.index > 4 and louder < SATIN_LOUDNESS
    return parted or dots or satin or quieter < ABSENT


def _exactly_square(one: Candidate) -> bool:
    """Whether both sets are as equal as only a drawn raster is: cloth differs by 0.1 % at least."""
    return abs(one.pixels[0] / one.pixels[1] - 1) < 5e-4 and abs(one.skew) < 0.03


__all__ = ["crossing"]
