"""What comes back for a piece of work that was handed out: an answer, or how it was lost."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from enum import StrEnum
from typing import Generic, Protocol, TypeVar

Load = TypeVar("Load")
Answer = TypeVar("Answer")


class Loss(StrEnum):
    """How a piece of work was lost."""

    DIED = "died"
    """Its process ended: killed by the system, out of memory, or crashed in a library."""
    HUNG = "hung"
    """It was not done within its time limit."""
    FAULT = "fault"
    """It raised: a bug."""


@dataclass(frozen=True, slots=True)
class Done(Generic[Answer]):
    """A piece of work that was done."""

    index: int
    answer: Answer


@dataclass(frozen=True, slots=True)
class Lost:
    """A piece of work that was not; `said` is for the developer."""

    index: int
    loss: Loss
    said: str


class Crew(Protocol):
    """Whoever does the work: processes of this machine, or a cluster."""

    def run(
        self, work: Callable[[Load], Answer], loads: Iterable[tuple[int, Load]]
    ) -> Iterator[Done[Answer] | Lost]:
        """Do the work on every load, each once; answers come as they are done, in any order."""
        ...


__all__ = ["Answer", "Crew", "Done", "Load", "Loss", "Lost"]
