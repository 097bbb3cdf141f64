"""The exit codes: what the shell is told, and which of several weighs most."""

from __future__ import annotations

from collections.abc import Iterable
from enum import IntEnum


class ExitCode(IntEnum):
    """What the shell is told; `MEANING` says it in words."""

    CONFORMS = 0
    DOES_NOT_CONFORM = 1
    USAGE = 2
    UNDECIDED = 3
    BUG = 70
    OUTPUT = 74
    INTERRUPTED = 130


MEANING = {
    ExitCode.CONFORMS: "all decided and conform, or measured with nothing declared",
    ExitCode.DOES_NOT_CONFORM: (
        "something does not conform, a certificate no longer holds, or a ledger was altered"
    ),
    ExitCode.USAGE: "usage, or an invalid declaration, lot sheet or certificate",
    ExitCode.UNDECIDED: "undecided, or neither ends nor picks could be measured",
    ExitCode.BUG: "a bug in imgcover; IMGCOVER_DEBUG=1 shows where",
    ExitCode.OUTPUT: "output or ledger cannot be read or written",
    ExitCode.INTERRUPTED: "interrupted",
}
"""The words of the README's table."""

WEIGHT = (
    *(ExitCode.CONFORMS, ExitCode.UNDECIDED, ExitCode.DOES_NOT_CONFORM),
    *(ExitCode.USAGE, ExitCode.OUTPUT, ExitCode.BUG, ExitCode.INTERRUPTED),
)
"""Lightest first: an open decision never hides a refusal, and no decision hides a fault."""


def gravest(codes: Iterable[ExitCode]) -> ExitCode:
    """Choose the code that speaks for several; of none, CONFORMS.

    Examples
    --------
    >>> gravest([ExitCode.UNDECIDED, ExitCode.DOES_NOT_CONFORM, ExitCode.CONFORMS]).name
    'DOES_NOT_CONFORM'
    """
    return max(codes, key=WEIGHT.index, default=ExitCode.CONFORMS)


__all__ = ["MEANING", "ExitCode", "gravest"]
