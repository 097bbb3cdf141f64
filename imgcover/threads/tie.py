"""Two readings of one set, and a declared weave that may decide as it helps a person."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np

from imgcover.threads.candidates import Candidate
from imgcover.threads.profile import Multiple
from imgcover.weave import Weave


def settled(
    one: Candidate, ends: Multiple, picks: Multiple, woven: Weave
) -> tuple[Multiple, Multiple] | None:
    """Break a tie by the declared weave.

    Parameters
    ----------
    one : Candidate
        What the factors of both sets multiply.
    ends, picks : Multiple
        What the profiles say; at least one with a rival.
    woven : Weave
        As declared, its ends being the set across the picture.

    Returns
    -------
    tuple of Multiple, or None
        Both without a rival; None where the weave bears out none of the readings.

    Notes
    -----
    A weave says how many threads of each set lie in its smallest cell, and how that cell lies. The
    picture shows a cell too. Only one reading can put as many threads into it as the weave does;
    where none does, something else repeats (dents, pairs, colours) or the weave does not show. What
    decides is not in the picture: the count must carry `rests-on-declared-weave`.
    """
    want = cell(woven)
    for across, down in itertools.product(_readings(ends), _readings(picks)):
        index = across.factor * down.factor * one.index
        if [index, across.factor * one.parts[0], down.factor * one.parts[1]] == [*want]:
            return across, down
    return None


def cell(woven: Weave) -> tuple[int, int, int]:
    """Crossings in the smallest cell of a weave, and how it divides the ends and the picks.

    Examples
    --------
    >>> from imgcover.weave import weave
    >>> cell(weave("plain")), cell(weave("2/2 hopsack")), cell(weave("2/2 warp rib"))
    ((2, 1, 1), (8, 2, 2), (4, 1, 2))
    """
    picks, ends = woven.matrix.shape
    moves = [
        (across, down)
        for across, down in itertools.product(range(ends), range(picks))
        if (np.roll(woven.matrix, (down, across), axis=(0, 1)) == woven.matrix).all()
    ]
    return (
        picks * ends // len(moves),
        math.gcd(ends, *(across for across, _ in moves)),
        math.gcd(picks, *(down for _, down in moves)),
    )


def _readings(multiple: Multiple) -> list[Multiple]:
    both = [replace(multiple, rival=None)]
    if multiple.rival is not None:
        both.append(replace(multiple, factor=multiple.rival, rival=None))
    return both


__all__ = ["cell", "settled"]
