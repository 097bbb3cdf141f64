"""Work spread over the processes of this machine; a lost worker costs only its own picture."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable, Iterator
from multiprocessing.connection import wait
from types import TracebackType
from typing import Any, Self

from imgcover.audit.hand import FAULTED, FINISHED, NO_MEMORY, READY, START_S, Hand
from imgcover.audit.outcome import Answer, Done, Load, Loss, Lost

MOST_FALSE_STARTS = 3
"""Workers in a row that end before they are ready: the machine cannot carry them."""


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
        self._false_starts = 0

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
            self._hand_out(work, loads, most, underway)
            while underway:
                done = [(outcome, underway.pop(outcome.index)) for outcome in self._gather()]
                # first give out, then tell: nobody waits while what was done is written down
                self._hand_out(work, loads, most, underway)
                yield from done
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
            hand = self._started(work) if idle is None else idle
            underway[index] = load
            hand.give(index, work, load, self._limit_s)

    def _started(self, work: Callable[[Any], Any]) -> Hand:
        hand = Hand(work)
        self._hands.append(hand)
        return hand

    def _gather(self) -> Iterator[Done[Any] | Lost]:
        """Wait for an answer, a death or a deadline, whichever comes first."""
        busy = [hand for hand in self._hands if hand.index is not None]
        patience = min(hand.until for hand in busy) - time.monotonic()
        spoken = set(wait([hand.pipe for hand in busy], timeout=max(0.0, patience)))
        for hand in busy:
            overrun = time.monotonic() >= hand.until
            if hand.pipe in spoken:
                outcome = self._heard(hand)
            elif overrun:
                outcome = self._overrun(hand)
            else:
                continue
            if outcome is not None:
                yield outcome

    def _heard(self, hand: Hand) -> Done[Any] | Lost | None:
        index = hand.index
        assert index is not None
        try:
            kind, said = hand.take()
        except (EOFError, OSError):
            return self._died(hand, index)
        if not hand.is_ready:
            if kind != READY:
                raise RuntimeError(f"a worker process cannot load the program: {said}")
            self._false_starts = 0
            hand.ready()
            return None
        hand.index = None
        if kind == FINISHED:
            return Done(index, said)
        return Lost(index, {FAULTED: Loss.FAULT, NO_MEMORY: Loss.DIED}[kind], str(said))

    def _died(self, hand: Hand, index: int) -> Lost:
        how = hand.how_it_ended()
        if not hand.is_ready:
            self._false_start(how)
        self._remove(hand)
        return Lost(index, Loss.DIED, how)

    def _overrun(self, hand: Hand) -> Lost:
        index = hand.index
        assert index is not None
        if not hand.is_ready:
            self._false_start(f"did not load its libraries in {START_S:g} s")
        self._remove(hand)
        return Lost(index, Loss.HUNG, f"not done in {self._limit_s:g} s")

    def _false_start(self, how: str) -> None:
        """Give up when no worker gets as far as work; one alone may be chance."""
        self._false_starts += 1
        if self._false_starts >= MOST_FALSE_STARTS:
            raise RuntimeError(f"no worker process could be started: the last {how}")

    def _remove(self, hand: Hand) -> None:
        self._hands.remove(hand)
        hand.end()


__all__ = ["LocalCrew"]
