"""Which pair of wave vectors is the threads': the whole road from a field to a decision."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from imgcover.repeat.phase import Transformed, transform
from imgcover.repeat.spectrum import Peak, Spectrum, peaks, spectrum
from imgcover.threads.candidates import Candidate, candidates
from imgcover.threads.counting import count
from imgcover.threads.field import Field, flattened, outlines, windows_of
from imgcover.threads.follow import Followed, follow
from imgcover.threads.lattice import Lattice, fit_lattices
from imgcover.threads.lines import lines_of, refined
from imgcover.threads.profile import Multiple, which_multiple
from imgcover.threads.witness import Evidence, weigh

WINDOW = 256
"""Pixels a side of the spectrum's windows: 12 to 80 threads of the sizes met at one zoom."""

LOWEST_CUTS = (0.0, 1 / 30, 1 / 14, 1 / 8)
"""Cycles per pixel below which peaks are set aside in turn: stripes and checks many threads wide
lay a lattice of their own under everything else."""

MOST_PEAKS = 40
"""Peaks kept; a checked twill shows some thirty."""

STEADY = 0.0015
"""Unevenness as a share of the count; even cloth lies below it."""

STEADIER = 0.7
"""Outlines are noisier than the light: they must be this much steadier to be followed instead."""

BESIDE = 0.03
"""Relative difference of two views' densities beyond which one follows a wave beside the threads'
own: 0.07 in drawn checks of 16 ends a repeat; cloth that was read right lies below 0.03 but for
bare bed and selvedges, which lose threads either way."""

OUTLINED = 5.0
"""Pixels a thread below which both edges of a thread run into one, and outlines bear no witness."""

SEEN_WELL = 0.65
"""Share of the field in which threads are followed; with less of it too many tiles are unclear."""

PAIRED = 0.3
"""Share of a thread's own line that its half line reaches where threads lie in pairs."""

WAIST = 0.33
"""Share of its own line that a pair's double line reaches where the two threads of a rib are hardly
seen apart: 0.38 in two drawn ribs and 0.42 in dents of two that were read as plain cloth."""

SEEN_APART = 6.0
"""Pixels a thread from which on the two of a pair are seen apart through an ordinary lens."""

TOLERANCE = 0.8
"""Bins a peak may lie from its place: irregular spacing broadens and splits lines."""


@dataclass(frozen=True, slots=True, eq=False)
class Identified:
    """The likeliest threads of a field, followed over it.

    Parameters
    ----------
    candidate : Candidate
        Wave vectors in cycles per field pixel.
    evidence : Evidence
        The spectral witnesses.
    origin : Field
        The field that was read.
    field : Transformed
        The flattened field's transform.
    followed : Followed
        Phases of both sets.
    sigma : float
        Smoothing used to follow, field pixels.
    ends, picks : Multiple
        What the folded profiles say.
    seen : Spectrum
        Averaged power.
    agreed : bool
        Whether the threads' light and their outlines tell the same density, where the light is
        unsteady and the outlines are no steadier.
    """

    candidate: Candidate
    evidence: Evidence
    origin: Field
    field: Transformed
    followed: Followed
    sigma: float
    ends: Multiple
    picks: Multiple
    seen: Spectrum
    agreed: bool


def identify(field: Field) -> Identified | None:
    """Find the threads of a field.

    Returns
    -------
    Identified or None
        None where no two crossing sets of lines stand out.
    """
    side = min(WINDOW, min(field.light.shape))
    seen = spectrum(windows_of(field, side))
    least = 2.2 if seen.windows > 3 else 3.0
    found = peaks(seen, excess=least, most=MOST_PEAKS)
    if len(found) < 2:
        return None
    tolerance = TOLERANCE / side
    heard = weigh(candidates(_lattices(found, tolerance)), seen, found, tolerance=tolerance)
    if not heard:
        return None
    best, evidence = heard[0]
    best = refined(best, found, tolerance=tolerance)
    for _ in range(3):
        tracked = _track(field, best, seen)
        if tracked is None:
            return None
        flat, followed, sigma = tracked
        ends = which_multiple(
            flat, followed, followed.ends, best.ends, sigma=sigma, parts=best.parts[0]
        )
        picks = which_multiple(
            flat, followed, followed.picks, best.picks, sigma=sigma, parts=best.parts[1]
        )
        if ends.factor == 1 == picks.factor:
            break
        best = _scaled(best, ends.factor, picks.factor)
    else:
        return None
    ends, picks = (
        _doubted(best, ends, picks, *best.pixels),
        _doubted(best, picks, ends, *reversed(best.pixels)),
    )
    followed, agreed = _steadiest(field, best, followed, sigma)
    return Identified(best, evidence, field, flat, followed, sigma, ends, picks, seen, agreed)


def _doubted(
    of: Candidate, one: Multiple, other: Multiple, pixels: float, pixels_other: float
) -> Multiple:
    """Doubt a set that could be pairs too fine to be seen apart.

    Beside a set that shows pairs, or where plain cloth could be a rib or a dent of two that work or
    lie as one: then the pair's waist is left, as a strong second line.
    """
    paired = other.halved > PAIRED and one.halved < PAIRED / 3
    rib = of.index <= 2 and of.parts == (1, 1) and one.doubled > WAIST
    coarser = pixels > 1.25 * pixels_other
    if one.rival is None and (paired or rib) and coarser and pixels < 2 * SEEN_APART:
        return replace(one, rival=2 * one.factor)
    return one


def taken_as(seen: Identified, ends: Multiple, picks: Multiple) -> Identified | None:
    """Follow a field anew with its ties settled.

    Parameters
    ----------
    seen : Identified
        What was found.
    ends, picks : Multiple
        Their factors say which multiples of the wave vectors the threads are.
    """
    one = _scaled(seen.candidate, ends.factor, picks.factor)
    tracked = _track(seen.origin, one, seen.seen)
    if tracked is None:
        return None
    flat, followed, sigma = tracked
    followed, agreed = _steadiest(seen.origin, one, followed, sigma)
    return replace(
        seen,
        candidate=one,
        field=flat,
        followed=followed,
        sigma=sigma,
        ends=ends,
        picks=picks,
        agreed=agreed,
    )


def _lattices(found: list[Peak], tolerance: float) -> list[Lattice]:
    cuts = [
        [each for each in found if math.hypot(each.fx, each.fy) > cut][:24] for cut in LOWEST_CUTS
    ]
    out: list[Lattice] = []
    for kept, before in zip(cuts, [[], *cuts], strict=False):
        if len(kept) >= 2 and kept != before:  # often no peak lies between two cuts
            out += fit_lattices(kept, tolerance=tolerance, most=4)
    return out


def _track(
    field: Field, one: Candidate, seen: Spectrum
) -> tuple[Transformed, Followed, float] | None:
    period = max(one.pixels)
    # two neighbouring lines of the lattice must not leak into each other
    sigma = min(max(0.55 / one.lattice.shortest, 0.7 * period), 2 * period)
    flat = transform(flattened(field.light, period), margin=math.ceil(4 * sigma))
    lines = lines_of(one, seen)
    followed = follow(flat, one.ends, one.picks, lines=lines, sigma=sigma)
    return None if followed is None else (flat, followed, sigma)


def _steadiest(
    field: Field, one: Candidate, plain: Followed, sigma: float
) -> tuple[Followed, bool]:
    """Follow the threads' outlines too, where their light is unsteady, and keep what is steadier.

    Each set may be taken from where it is steadier: stripes along one set leave the other alone.
    Where neither is, both must tell the same density: the light of even stripes follows a wave
    beside the threads' own just as steadily.
    """
    if max(_unsteadiness(plain, one)) < STEADY and plain.valid.mean() > SEEN_WELL:
        return plain, True
    period = max(one.pixels)
    drawn = outlines(field, period)
    seen = spectrum(windows_of(drawn, min(WINDOW, *drawn.light.shape)))
    flat = transform(flattened(drawn.light, period), margin=math.ceil(4 * sigma))
    other = follow(flat, one.ends, one.picks, lines=lines_of(one, seen), sigma=sigma)
    if other is None:
        return plain, True
    both = plain.valid & other.valid
    offered = [
        plain,
        other,
        replace(plain, ends=other.ends, valid=both),
        replace(plain, picks=other.picks, valid=both),
    ]
    doubts = [_doubt(each, one) for each in offered]
    best = int(np.argmin(doubts))
    if doubts[best] < STEADIER * doubts[0]:
        return offered[best], True
    fine = min(one.pixels) < OUTLINED
    return plain, fine or _same_density(plain, other, one)


def _same_density(plain: Followed, other: Followed, one: Candidate) -> bool:
    """Whether two views of the same threads tell the same density of both sets."""
    for phases, vector in (
        ((plain.ends, other.ends), one.ends),
        ((plain.picks, other.picks), one.picks),
    ):
        counts = [
            count(phase, view, vector) for phase, view in zip(phases, (plain, other), strict=True)
        ]
        seen = [math.hypot(*each.frequency) for each in counts if each is not None]
        if len(seen) == 2 and abs(seen[1] / seen[0] - 1) > BESIDE:
            return False
    return True


def _doubt(followed: Followed, one: Candidate) -> float:
    """Unsteadiness of the worse set; a view that has lost sight of the field comes last."""
    blind = followed.valid.mean() < SEEN_WELL
    return max(_unsteadiness(followed, one)) + (1.0 if blind else 0.0)


def _unsteadiness(followed: Followed, one: Candidate) -> tuple[float, float]:
    """How unevenly each set seems to lie, relative to its density."""
    across, down = (
        count(phase, followed, vector)
        for phase, vector in ((followed.ends, one.ends), (followed.picks, one.picks))
    )
    return (
        math.inf if across is None else across.irregular + across.broken,
        math.inf if down is None else down.irregular + down.broken,
    )


def _scaled(one: Candidate, ends: Fraction, picks: Fraction) -> Candidate:
    across, down = float(ends), float(picks)
    return Candidate(
        (one.ends[0] * across, one.ends[1] * across),
        (one.picks[0] * down, one.picks[1] * down),
        max(1, round(one.index * across * down)),
        (max(1, round(one.parts[0] * across)), max(1, round(one.parts[1] * down))),
        one.lattice,
    )


__all__ = ["Identified", "identify", "taken_as"]
