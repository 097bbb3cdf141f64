"""Which findings keep a line undecided, whatever its numbers say."""

from __future__ import annotations

from collections.abc import Iterable

from imgcover.findings import Flag
from imgcover.verdict.line import Quantity

SETTS = frozenset({Quantity.ENDS, Quantity.PICKS})
COVER = frozenset({Quantity.COVER})

HOLDS: dict[str, frozenset[Quantity]] = {
    "rests-on-declared-weave": SETTS,
    "warp-near-45": SETTS,
    "scales-disagree": SETTS,
    "certificate-expired": SETTS,
    "certificate-other-resolution": SETTS,
}
"""Code of the finding, and the lines that it keeps open."""


def holds(flags: Iterable[Flag], quantity: Quantity) -> tuple[str, ...]:
    """Say, in the findings' words, why a line must stay undecided.

    Returns
    -------
    tuple of str
        One reason a finding, in the registry's order; empty when nothing stands in the way.
    """
    given = set(flags)
    return tuple(
        flag.message for flag in Flag if flag in given and quantity in HOLDS.get(flag.code, ())
    )


__all__ = ["HOLDS", "holds"]
