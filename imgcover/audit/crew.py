"""Work spread over the processes of this machine; a lost worker costs only its own picture."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable, Iterator
from multiprocessing.connection import wait
from types import TracebackType
from typing import Any, Self

from imgcover.audit.hand import FAULTED, FINISHED, NO_MEMORY, READY, Hand
from imgcover.audit.outcome import Answer, Done, Load, Loss, Lost

MOST_FALSE_STARTS = 3
"""Workers in a row that end before they listen: Python itself cannot be started any more."""
START_S = 180.0
"""A process that does not listen by then never will."""


class LocalCrew:
    """As many worker processes as are asked for, started when first needed.

    Parameters
    ----------
    hands : int
        Worker processes.
    limit_s : float
        Seconds that one piece of work may take.
    """

    def __init__(self, *, hands: int, limit_s: float) -> None:
        if hands < 1:
            raise ValueError(f"hands must be at least 1, got {hands}")
        if limit_s <= 0:
            raise ValueError(f"limit_s must be positive, got {limit_s}")
        self._most = hands
        self._limit_s = limit_s
        self._hands: list[Hand] = []

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        fault: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        for hand in self._hands:
            if kind is None and hand.index is None:
                hand.dismiss()
            else:
                hand.end()
        self._hands.clear()

    def run(
        self, work: Callable[[Load], Answer], loads: Iterable[tuple[int, Load]]
    ) -> Iterator[Done[Answer] | Lost]:
        """Do the work on every load; answers come as they are done, in any order.

        Parameters
        ----------
        work : callable
            A module's function: it is called in other processes.
        loads : iterable of (int, object)
            Drawn one by one as workers fall idle, each with the number it comes back under.

        Yields
        ------
        Done or Lost
            Work whose process died or hung is done again at the end, alone on the machine, before
            it is given up.
        """
        lost: list[tuple[int, Load]] = []
        for outcome, load in self._spread(work, iter(loads), self._most):
            if isinstance(outcome, Lost) and outcome.loss is not Loss.FAULT:
                lost.append((outcome.index, load))
            else:
                yield outcome
        for outcome, _ in self._spread(work, iter(lost), 1):
            yield outcome

    def _spread(
        self, work: Callable[[Load], Answer], loads: Iterator[tuple[int, Load]], most: int
    ) -> Iterator[tuple[Done[Answer] | Lost, Load]]:
        underway: dict[int, Load] = {}
        try:
            while True:
                self._hand_out(work, loads, most, underway)
                if not underway:
                    return
                for outcome in self._gather():
                    yield outcome, underway.pop(outcome.index)
        finally:
            # left in the middle: what is underway belongs to nobody any more
            for hand in [hand for hand in self._hands if hand.index is not None]:
                self._remove(hand)

    def _hand_out(
        self,
        work: Callable[[Load], Answer],
        loads: Iterator[tuple[int, Load]],
        most: int,
        underway: dict[int, Load],
    ) -> None:
        while len(underway) < most:
            following = next(loads, None)
            if following is None:
                return
            index, load = following
            idle = next((hand for hand in self._hands if hand.index is None), None)
            hand = self._started() if idle is None else idle
            underway[index] = load
            hand.give(index, work, load, self._limit_s)

    def _started(self) -> Hand:
        """Start a worker and wait until it listens; libraries are loaded with the first work."""
        said = ""
        for _ in range(MOST_FALSE_STARTS):
            hand = Hand()
            try:
                if wait([hand.pipe], timeout=START_S) and hand.take()[0] == READY:
                    self._hands.append(hand)
                    return hand
            except (EOFError, OSError):
                pass
            said = hand.how_it_ended()
            hand.end()
        raise RuntimeError(f"no worker process could be started: the last {said}")

    def _gather(self) -> Iterator[Done[Any] | Lost]:
        """Wait for an answer, a death or a deadline, whichever comes first."""
        busy = [hand for hand in self._hands if hand.index is not None]
        patience = min(hand.until for hand in busy) - time.monotonic()
        spoken = set(wait([hand.pipe for hand in busy], timeout=max(0.0, patience)))
        for hand in busy:
            if hand.pipe in spoken:
                yield self._heard(hand)
            elif time.monotonic() >= hand.until:
                index = hand.index
                self._remove(hand)
                assert index is not None
                yield Lost(index, Loss.HUNG, f"not done in {self._limit_s:g} s")

    def _heard(self, hand: Hand) -> Done[Any] | Lost:
        index = hand.index
        assert index is not None
        try:
            kind, said = hand.take()
        except (EOFError, OSError):
            how = hand.how_it_ended()
            self._remove(hand)
            return Lost(index, Loss.DIED, how)
        hand.index = None
        if kind == FINISHED:
            return Done(index, said)
        return Lost(index, {FAULTED: Loss.FAULT, NO_MEMORY: Loss.DIED}[kind], str(said))

    def _remove(self, hand: Hand) -> None:
        self._hands.remove(hand)
        hand.end()


__all__ = ["LocalCrew"]
