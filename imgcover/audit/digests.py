"""What files hold, by hash; a file that was hashed and has not been touched is not read again."""

from __future__ import annotations

import hashlib
import os
import time
from pathlib import Path

from imgcover.audit.grounds import read_file

SETTLED_NS = 2_000_000_000
"""A file changed less than this before it was hashed may change again within one tick of the file
system's clock (2 s on FAT) and look untouched."""

Trace = tuple[int, int, int, int]


class Digests:
    """SHA-256 of files, remembered for as long as this lives."""

    def __init__(self) -> None:
        self._known: dict[Path, tuple[Trace, str]] = {}

    def of(self, path: Path) -> str:
        """Hash a file.

        Raises
        ------
        OffGroundsError
            When it is no ordinary file or cannot be read.
        """
        trace = _trace(path)
        known = self._known.get(path)
        if known is not None and known[0] == trace:
            return known[1]
        digest = hashlib.sha256(read_file(path)).hexdigest()
        if trace is not None and trace == _trace(path) and _is_settled(trace):
            self._known[path] = (trace, digest)
        return digest


def _trace(path: Path) -> Trace | None:
    try:
        seen = os.lstat(path)
    except OSError:
        return None
    return seen.st_ino, seen.st_size, seen.st_mtime_ns, seen.st_ctime_ns


def _is_settled(trace: Trace) -> bool:
    return time.time_ns() - max(trace[2], trace[3]) > SETTLED_NS


__all__ = ["Digests"]
