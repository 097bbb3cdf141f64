"""One worker process: one piece of work at a time, ended without mercy when it overruns."""

from __future__ import annotations

import contextlib
import multiprocessing
import os
import pickle
import signal
import sys
import threading
import time
import traceback
from collections.abc import Callable, Iterator
from multiprocessing.connection import Connection
from typing import Any

READY = "ready"
FINISHED = "finished"
FAULTED = "faulted"
NO_MEMORY = "no memory"

THREAD_SETTINGS = (
    *("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"),
    *("NUMEXPR_NUM_THREADS", "VECLIB_MAXIMUM_THREADS", "BLIS_NUM_THREADS"),
)
"""One process a core: libraries that start threads of their own would only queue for it."""
CLOSING_S = 2.0


START_S = 300.0
"""A process that has not loaded its libraries by then never will."""


class Hand:
    """A worker process and the pipe to it.

    Parameters
    ----------
    work : callable
        What it will first be asked for: it loads the libraries of that, and then says READY. That
        takes seconds, and is not counted against the first piece of work.
    """

    def __init__(self, work: Callable[[Any], Any]) -> None:
        context = multiprocessing.get_context("spawn")
        self.pipe, theirs = context.Pipe()
        self._process = context.Process(target=_serve, args=(theirs,), daemon=True)
        with _one_thread():
            self._process.start()
        # kept open here, a dead worker's end would never read as closed
        theirs.close()
        self.index: int | None = None
        self.is_ready = False
        self.until = time.monotonic() + START_S
        self._order = b""
        self._limit_s = 0.0
        self._send(pickle.dumps(work))

    def give(self, index: int, work: Callable[[Any], Any], load: object, limit_s: float) -> None:
        """Hand out one piece of work; its clock starts when the worker is ready."""
        self.index = index
        self._order = pickle.dumps((work, load))
        self._limit_s = limit_s
        if self.is_ready:
            self._begin()

    def ready(self) -> None:
        """It has loaded its libraries, and starts on what it was given."""
        self.is_ready = True
        self._begin()

    def _begin(self) -> None:
        self.until = time.monotonic() + self._limit_s
        self._send(self._order)

    def _send(self, content: bytes) -> None:
        with contextlib.suppress(BrokenPipeError, ConnectionResetError):
            # it died meanwhile: reading from it tells
            self.pipe.send_bytes(content)

    def take(self) -> tuple[str, Any]:
        """Receive what it says; only when its pipe can be read.

        Raises
        ------
        EOFError, OSError
            When it died.
        """
        kind, said = self.pipe.recv()
        return kind, said

    def end(self) -> None:
        """Kill it, whatever it is doing."""
        self.pipe.close()
        self._process.kill()
        self._process.join()
        self._process.close()

    def dismiss(self) -> None:
        """Let an idle one go home."""
        self.pipe.close()
        self._process.join(CLOSING_S)
        if self._process.is_alive():
            self._process.kill()
            self._process.join()
        self._process.close()

    def how_it_ended(self) -> str:
        """Say how a dead one came to its end."""
        self._process.join(CLOSING_S)
        code = self._process.exitcode
        if code is not None and code < 0:
            with contextlib.suppress(ValueError):
                return f"ended by {signal.Signals(-code).name}"
        return f"ended with code {code}"


@contextlib.contextmanager
def _one_thread() -> Iterator[None]:
    before = {name: os.environ.get(name) for name in THREAD_SETTINGS}
    os.environ.update(dict.fromkeys(THREAD_SETTINGS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


def _serve(pipe: Connection) -> None:
    """Work until the pipe closes. Runs in the worker process."""
    # Ctrl-C reaches the whole group; the parent decides what becomes of the work
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _leave_with_parent()
    listening = False
    while True:
        try:
            order = pipe.recv_bytes()
        except (EOFError, OSError):
            return
        try:
            pipe.send(_done(order) if listening else _loaded(order))
        except OSError:
            return
        if not listening:
            listening = True
            _quiet()


def _loaded(order: bytes) -> tuple[str, Any]:
    """Load what the work needs; reading the name of a function imports its module."""
    try:
        pickle.loads(order)
    except BaseException as fault:
        return FAULTED, "".join(traceback.format_exception(fault))
    return READY, None


def _done(order: bytes) -> tuple[str, Any]:
    """Do what was ordered."""
    try:
        work, load = pickle.loads(order)
        return FINISHED, work(load)
    except MemoryError:
        return NO_MEMORY, "out of memory"
    except BaseException as fault:  # SystemExit in a library, too, must not end the worker
        return FAULTED, "".join(traceback.format_exception(fault))


def _leave_with_parent() -> None:
    """End at once when the parent is gone, however it went: an orphan would only heat the room."""
    parent = multiprocessing.parent_process()
    if parent is None:
        return

    def watch() -> None:
        parent.join()
        os._exit(1)

    threading.Thread(target=watch, daemon=True).start()


def _quiet() -> None:
    """Send what decoders write on stderr nowhere; names from pictures may steer a terminal."""
    if os.environ.get("IMGCOVER_DEBUG"):
        return
    nowhere = os.open(os.devnull, os.O_WRONLY)
    for stream in (sys.__stdout__, sys.__stderr__):
        if stream is not None:
            with contextlib.suppress(OSError, ValueError):
                os.dup2(nowhere, stream.fileno())
    os.close(nowhere)


__all__ = ["FAULTED", "FINISHED", "NO_MEMORY", "READY", "START_S", "Hand"]
