"""Which findings keep a line undecided, whatever its numbers say."""

from __future__ import annotations

from collections.abc import Iterable

from imgcover.findings import Flag
from imgcover.verdict.line import Quantity

SETTS = frozenset({Quantity.ENDS, Quantity.PICKS})

HOLDS: dict[Flag, frozenset[Quantity]] = {
    Flag.RESTS_ON_DECLARED_WEAVE: SETTS,
    Flag.WARP_UNCERTAIN: SETTS,
    Flag.SCALES_DISAGREE: SETTS,
}
"""Each finding, and the lines that it keeps open."""


def holds(flags: Iterable[Flag], quantity: Quantity) -> tuple[str, ...]:
    """Say, in the findings' words, why a line must stay undecided.

    Returns
    -------
    tuple of str
        One reason a finding, in the registry's order; empty when nothing stands in the way.
    """
    given = set(flags)
    return tuple(flag.message for flag in Flag if flag in given and quantity in HOLDS.get(flag, ()))


__all__ = ["HOLDS", "holds"]
