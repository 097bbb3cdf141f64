"""A module that takes its time, as numeric libraries do on a busy machine."""

from __future__ import annotations

import multiprocessing
import time

if multiprocessing.parent_process() is not None:
    time.sleep(2)


def double(n: int) -> int:
    return 2 * n
