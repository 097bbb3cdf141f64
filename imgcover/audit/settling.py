"""Which pictures of a watched folder are whole: a scanner writes for seconds, and says nothing."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from pathlib import Path

from imgcover.audit.folder import Listing

STILL_S = 2.0
"""A file that has kept its size and time this long is taken as whole; scanners write without
pauses, and a copy over a slow network pauses for less."""
OLD_S = 30.0
"""A file last changed this long ago was whole before the watching began."""
LOOK_MS = 1_000
"""How often files that are still growing are looked at, and the folder where nothing tells of
changes, as on a network share."""

Trace = tuple[int, int]


class Settling:
    """Remembers since when each file has been still.

    Parameters
    ----------
    clock : callable
        Seconds, never going back.
    """

    def __init__(self, clock: Callable[[], float] = time.monotonic) -> None:
        self._clock = clock
        self._since: dict[Path, tuple[Trace, float]] = {}

    def is_whole(self, path: Path | None) -> bool:
        """Whether a file is there and has been still for long enough."""
        if path is None:
            return True  # its fault is already known and will not pass
        try:
            seen = path.stat()
        except OSError:
            return False
        trace = (seen.st_size, seen.st_mtime_ns)
        before = self._since.get(path)
        now = self._clock()
        if before is None or before[0] != trace:
            age = time.time() - seen.st_mtime if before is None else 0.0
            self._since[path] = (trace, now - STILL_S if age > OLD_S else now)
        return now - self._since[path][1] >= STILL_S

    def split(self, listing: Listing) -> tuple[Listing, int]:
        """Leave out what is not whole yet, and say how many pictures that are."""
        whole = tuple(each for each in listing.pictures if self.is_whole(each.path))
        return replace(listing, pictures=whole), len(listing.pictures) - len(whole)


def looks(folders: Sequence[Path], *, left_out: Sequence[Path]) -> Iterator[None]:
    """Yield whenever something changed in the folders, and once in a while without.

    Parameters
    ----------
    folders : sequence of Path
        Watched with everything in them.
    left_out : sequence of Path
        Folders and files in which the audit itself writes.
    """
    from watchfiles import watch

    own = [str(path.resolve()) for path in left_out]

    def is_foreign(_: object, path: str) -> bool:
        return not any(path == each or path.startswith(each + os.sep) for each in own)

    yield None
    for _ in watch(
        *folders,
        watch_filter=is_foreign,
        rust_timeout=LOOK_MS,
        yield_on_timeout=True,
        raise_interrupt=True,
    ):
        yield None


def signature(listing: Listing, papers: Sequence[Path]) -> tuple[object, ...]:
    """What a round rests on: while it is the same there is nothing to do.

    Parameters
    ----------
    listing : Listing
        Whole pictures only.
    papers : sequence of Path
        Lot sheet and declarations.
    """
    pictures = tuple((each.name, _trace(each.path)) for each in listing.pictures)
    articles = sorted({each.article for each in listing.pictures if each.article is not None})
    return (pictures, tuple((str(path), _trace(path)) for path in (*papers, *articles)))


def _trace(path: Path | None) -> Trace | None:
    try:
        seen = None if path is None else path.stat()
    except OSError:
        return None
    return None if seen is None else (seen.st_size, seen.st_mtime_ns)


__all__ = ["Settling", "looks", "signature"]
