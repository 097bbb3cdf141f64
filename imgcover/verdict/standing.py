"""Which findings keep a line undecided, or leave it without a value."""

from __future__ import annotations

from collections.abc import Iterable

from imgcover.findings import Flag, Severity
from imgcover.verdict.line import Quantity

SETTS = frozenset({Quantity.ENDS, Quantity.PICKS})

HOLDS: dict[Flag, frozenset[Quantity]] = {
    Flag.RESTS_ON_DECLARED_WEAVE: SETTS,
    Flag.WARP_UNCERTAIN: SETTS,
    Flag.SCALES_DISAGREE: SETTS,
    Flag.CERTIFICATE_EXPIRED: SETTS,
    Flag.CERTIFICATE_OTHER_RESOLUTION: SETTS,
}
"""Each finding, and the lines that it keeps open."""

COVER_MISSING = frozenset(
    flag for flag in Flag if flag.message.startswith("optical cover was not measured")
)
"""Every finding that refuses the cover alone begins with these words; setts stand without it."""


def holds(flags: Iterable[Flag], quantity: Quantity) -> tuple[str, ...]:
    """Say, in the findings' words, why a line must stay undecided.

    Returns
    -------
    tuple of str
        One reason a finding, in the registry's order; empty when nothing stands in the way.
    """
    given = set(flags)
    return tuple(flag.message for flag in Flag if flag in given and quantity in HOLDS.get(flag, ()))


def why_missing(flags: Iterable[Flag], quantity: Quantity) -> str:
    """Say why a quantity has no value, in the words of the findings that refused it."""
    given = set(flags)
    refusals = {flag for flag in given if flag.severity is Severity.REFUSAL} - COVER_MISSING
    wanted = given & COVER_MISSING if quantity is Quantity.COVER else refusals
    reasons = [flag.message for flag in Flag if flag in (wanted or refusals)]
    return "; ".join(reasons) or "it could not be measured"


__all__ = ["COVER_MISSING", "HOLDS", "holds", "why_missing"]
