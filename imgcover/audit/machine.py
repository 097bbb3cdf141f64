"""How many pictures this machine can measure at once."""

from __future__ import annotations

import os
import re
from pathlib import Path

BYTES_A_JOB = 1_000_000_000
"""An A4 colour scan at 600 dpi stays below this while it is measured."""
MEMINFO = Path("/proc/meminfo")
CGROUP = Path("/sys/fs/cgroup")
"""Where a container's share of the machine is written, version 2."""


def jobs_that_fit() -> int:
    """One process a core, but no more than the free memory holds; at least one."""
    jobs = _cores()
    free = _free_bytes()
    if free is not None:
        jobs = min(jobs, free // BYTES_A_JOB)
    return max(1, jobs)


def _cores() -> int:
    # the cores this process may use, not those the machine has
    affinity = getattr(os, "sched_getaffinity", None)
    cores = len(affinity(0)) if affinity is not None else os.cpu_count() or 1
    quota = re.match(r"(\d+) (\d+)", _text(CGROUP / "cpu.max"))
    if quota is not None:
        cores = min(cores, max(1, round(int(quota[1]) / int(quota[2]))))
    return cores


def _free_bytes() -> int | None:
    """Free memory of the machine or of the container, whichever is less; None where unknown."""
    found = re.search(r"^MemAvailable:\s+(\d+) kB", _text(MEMINFO), re.MULTILINE)
    free = [int(found[1]) * 1024] if found is not None else []
    most, used = _text(CGROUP / "memory.max").strip(), _text(CGROUP / "memory.current").strip()
    if most.isdecimal() and used.isdecimal():
        free.append(max(0, int(most) - int(used)))
    return min(free) if free else None


def _text(path: Path) -> str:
    try:
        return path.read_text(encoding="ascii", errors="replace")
    except OSError:
        return ""


__all__ = ["jobs_that_fit"]
