"""When a counted set is not to be given, and what is said of a reading's weaknesses."""

from __future__ import annotations

import math

from imgcover.findings import Finding, Flag, found
from imgcover.threads.field import Region
from imgcover.threads.reading import ThreadSet, Tile

FEW_PIXELS = 5.0
"""Below it the count is flagged."""

FEWEST_PIXELS = 3.0
"""Pixels a thread: below it a wave and its harmonics fold over each other (DEVELOPERS, threads)."""

LARGEST_SCATTER = 0.045
"""Relative scatter of the density between tiles of eight threads. Uneven cloth reaches 0.03; where
stripes turn the contrast over and a thread was lost it is 0.1."""

NEAR_HALF_RIGHT = 35.0
"""Degrees of turn from which on the nearer axis says little about which set is the warp."""

LARGEST_U, LARGEST_U_THREADS = 0.0075, 0.15
"""A count looser than both, relative and in threads, has lost its threads somewhere. Among a
handful of threads the unknown place of the outermost alone is more than the first."""

HALF_A_THREAD, LARGEST_U_THEN = 0.25, 0.005
"""Threads of u from which on one thread more or less is not excluded (2 u is half a thread), and
the relative u from which on that matters: among hundreds of threads it does not."""


def is_lost(each: ThreadSet) -> bool:
    """Whether threads were lost on the way from edge to edge."""
    threads = each.u_relative * each.counted
    unsure = threads > HALF_A_THREAD and each.u_relative > LARGEST_U_THEN
    loose = threads > LARGEST_U_THREADS and each.u_relative > LARGEST_U
    return unsure or loose or each.local_scatter > LARGEST_SCATTER


def is_weak(each: ThreadSet) -> bool:
    """Whether a set's count is not to be given."""
    return each.pixels_a_thread < FEWEST_PIXELS or is_lost(each)


def of_set(name: str, each: ThreadSet, forked: bool) -> list[Finding]:
    """List what weakens or refuses one set's count."""
    said = []
    pixels = each.pixels_a_thread
    if pixels < FEWEST_PIXELS:
        message = f"only {pixels:.1f} pixels a thread: the {name} are too fine for this picture"
        remedy = f"scan at {math.ceil(8 / pixels)} times the resolution"
        said.append(found(Flag.TOO_COARSE, message, remedy))
    elif pixels < FEW_PIXELS:
        said.append(found(Flag.FEW_PIXELS_A_THREAD, f"only {pixels:.1f} pixels a thread ({name})"))
    if is_lost(each):
        said.append(found(Flag.THREADS_LOST, f"the {name} could not be followed over the field"))
    if forked:
        said.append(found(Flag.TWO_READINGS, f"two readings of the {name} stay possible"))
    return said


def of_field(turn: float, cut: Region, region: Region, tiles: tuple[Tile, ...]) -> list[Finding]:
    """List what weakens the reading of the whole field.

    Parameters
    ----------
    turn : float
        Degrees by which the swatch lies turned.
    cut, region : Region
        The part that was read, and the part that was asked for.
    """
    said = []
    if abs(turn) > NEAR_HALF_RIGHT:
        said.append(found(Flag.WARP_UNCERTAIN, f"the swatch is turned by {turn:.0f} degrees"))
    elif abs(turn) > 3:
        said.append(found(Flag.SWATCH_TURNED, f"the swatch is turned by {turn:.1f} degrees"))
    out = sum(not tile.used for tile in tiles)
    if out:
        message = f"{out} of {len(tiles)} parts of the field could not be followed"
        said.append(found(Flag.TILES_LEFT_OUT, message))
    if cut.width < 0.9 * region.width or cut.height < 0.9 * region.height:
        said.append(found(Flag.MIDDLE_COUNTED))
    return said


__all__ = [
    "FEWEST_PIXELS",
    "FEW_PIXELS",
    "NEAR_HALF_RIGHT",
    "is_lost",
    "is_weak",
    "of_field",
    "of_set",
]
