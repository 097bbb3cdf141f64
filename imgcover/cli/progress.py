"""How far an audit is: one line that is written over on a terminal, plain lines in a log."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from types import TracebackType
from typing import Self

from imgcover.cli.output import tell

SELDOM_S = 30.0
"""Between lines of a log: a night's audit leaves a thousand of them, not a hundred thousand."""
OFTEN_S = 0.2
"""Between two looks of a terminal's line."""
WIDTH = 60
"""Columns that the line may take and that are wiped after it."""


class Progress:
    """Counts pictures and tells how long the others will take.

    Parameters
    ----------
    total : int
        Pictures in all.
    clock : callable
        Seconds, never going back.
    """

    def __init__(self, total: int, *, clock: Callable[[], float] = time.monotonic) -> None:
        self._total = total
        self._clock = clock
        self._begun = self._told = clock()
        self._done = 0
        self._measured = 0
        self._live = sys.stderr is not None and sys.stderr.isatty()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        fault: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._wipe()

    def step(self, *, measured: bool) -> None:
        """Count one picture; those that were known took no time and tell nothing about the rest."""
        self._done += 1
        if measured:
            self._measured += 1
        now = self._clock()
        if now - self._told >= (OFTEN_S if self._live else SELDOM_S):
            self._told = now
            if self._live:
                sys.stderr.write(f"\r{self.line(now):<{WIDTH}}")
                sys.stderr.flush()
            else:
                tell(self.line(now))

    def say(self, line: str) -> None:
        """Tell something in between."""
        self._wipe()
        tell(line)

    def line(self, now: float) -> str:
        """Say how far it is, and how long the rest will take."""
        said = f"{self._done} of {self._total} pictures"
        if not self._measured or self._done == self._total:
            return said
        rest = (now - self._begun) / self._measured * (self._total - self._done)
        return f"{said}, about {_span(rest)} left"

    def _wipe(self) -> None:
        if self._live:
            sys.stderr.write("\r" + " " * WIDTH + "\r")
            sys.stderr.flush()


def _span(seconds: float) -> str:
    if seconds < 100:
        return f"{seconds:.0f} s"
    if seconds < 6000:
        return f"{seconds / 60:.0f} min"
    return f"{seconds / 3600:.1f} h"


__all__ = ["Progress"]
