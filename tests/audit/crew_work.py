"""Work for the crew's tests: in a module of its own, since other processes must import it."""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path


def double(n: int) -> int:
    return 2 * n


def slow(load: tuple[int, float]) -> int:
    time.sleep(load[1])
    return load[0]


def threads(_: int) -> str:
    return os.environ["OPENBLAS_NUM_THREADS"]


def stumble(load: tuple[int, str, str]) -> int:
    """Do as the load says; leave a mark each time so that tries can be counted."""
    n, what, marks = load
    tries = len(list(Path(marks).glob(f"{n}-*")))
    (Path(marks) / f"{n}-{tries}").touch()
    if what == "die":
        os.kill(os.getpid(), signal.SIGKILL)
    if what == "die once" and tries == 0:
        os._exit(9)
    if what == "hang":
        time.sleep(600)
    if what == "raise":
        raise ZeroDivisionError("planted")
    if what == "leave":
        raise SystemExit(3)
    if what == "no memory":
        raise MemoryError
    return n


def pid(_: int) -> int:
    return os.getpid()


def broken_order() -> object:
    """What cannot be loaded in the worker, as when a library is missing there."""
    return _Unloadable()


class _Unloadable:
    def __reduce__(self) -> tuple[object, tuple[str]]:
        return (__import__, ("no_such_library",))


def unlike() -> int:
    """What no two processes agree on."""
    return os.getpid()
