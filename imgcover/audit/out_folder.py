"""Where an audit writes: everything inside one folder, each file whole or not at all."""

from __future__ import annotations

import contextlib
import hashlib
import os
import re
from collections.abc import Container, Iterator
from pathlib import Path
from typing import BinaryIO

from imgcover.errors import OutputError

LONGEST_STEM = 40
"""Letters of a lot's name in its page's name; the whole name stands in the page."""


FOLDERS = frozenset({"lots", "small"})
"""Made before anything is written: where both are an audit wrote, also one that was stopped."""
REPORTS = FOLDERS | {"records.jsonl"}
"""Where all of these lie inside an audited folder there are reports, and no goods."""
OWN_NAMES = ("lots.csv", "lots.xlsx", "report.html", "report.xlsx", "records.jsonl")
"""What reports are called, and a lot sheet; where no audit wrote they are somebody else's."""


def foreign(folder: Path) -> list[str]:
    """Name what lies in a folder under a report's name and was not written by an audit."""
    if all((folder / name).is_dir() for name in FOLDERS):
        return []
    return [name for name in OWN_NAMES if (folder / name).exists()]


class OutFolder:
    """The folder of an audit's reports.

    Parameters
    ----------
    root : Path
        Made where there is none.

    Raises
    ------
    OutputError
        When it cannot be made or is no folder.
    """

    def __init__(self, root: Path) -> None:
        self.root = root
        with _told(root):
            for folder in (root, root / "lots", root / "small", self.scratch):
                folder.mkdir(parents=True, exist_ok=True)

    @property
    def scratch(self) -> Path:
        """Where libraries may keep what they would else put into the home folder."""
        return self.root / ".scratch"

    @property
    def ledger(self) -> Path:
        """Where the ledger is unless another place was named."""
        return self.root / "ledger.sqlite"

    def write(self, name: str, content: bytes | str) -> None:
        """Write a file beside its place and rename it.

        Raises
        ------
        OutputError
            When it cannot be written.
        """
        with self.opened(name) as file:
            file.write(content if isinstance(content, bytes) else content.encode())

    @contextlib.contextmanager
    def opened(self, name: str) -> Iterator[BinaryIO]:
        """Open a file that appears whole when this ends well, and not at all otherwise."""
        place = self.root / name
        # two audits may write here at once
        beside = place.with_name(f".{place.name}.{os.getpid()}.part")
        with _told(place):
            try:
                with beside.open("wb") as file:
                    yield file
                    file.flush()
                    os.fsync(file.fileno())
                beside.replace(place)
            finally:
                beside.unlink(missing_ok=True)

    def pages(self) -> list[str]:
        """Name the lots' pages that are there, also those of lots that are no longer listed."""
        return sorted(f"lots/{path.name}" for path in (self.root / "lots").glob("*.html"))

    def small(self, key: str) -> Path:
        """Where the small picture of a record lies."""
        return self.root / "small" / f"{key[:32]}.jpg"

    def keep_small(self, key: str, content: bytes) -> None:
        """Keep a small picture; it is drawn, not measured, so the disk may take its time."""
        place = self.small(key)
        beside = place.with_name(f".{place.name}.{os.getpid()}.part")
        with _told(place):
            beside.write_bytes(content)
            beside.replace(place)


RESERVED = frozenset(
    {"con", "prn", "aux", "nul", *(f"{kind}{n}" for kind in ("com", "lpt") for n in range(10))}
)
"""Names of devices on Windows, whatever ending they are given."""


def page_name(lot: str, article: str, *, taken: Container[str] = ()) -> str:
    """Name a lot's page by plain letters that every system and address takes.

    Parameters
    ----------
    lot, article : str
        Their names.
    taken : container of str
        Names of other pages, in small letters.

    Examples
    --------
    >>> page_name("4711", "harrow.toml")
    'lots/4711.html'
    >>> page_name("../4711 é", "")
    'lots/4711-07bc2718.html'
    """
    stem = re.sub(r"[^A-Za-z0-9]+", "-", lot).strip("-")[:LONGEST_STEM]
    bare = f"lots/{stem}.html"
    if stem == lot and stem.lower() not in RESERVED and bare.lower() not in taken:
        return bare
    told = hashlib.sha256(f"{lot}\n{article}".encode("utf-8", "surrogatepass")).hexdigest()
    return f"lots/{f'{stem}-{told[:8]}'.lstrip('-')}.html"


@contextlib.contextmanager
def _told(place: Path) -> Iterator[None]:
    try:
        yield
    except OSError as fault:
        reason = fault.strerror or type(fault).__name__
        raise OutputError(
            str(place), f"cannot be written ({reason})", "choose another --out, or make room"
        ) from fault


__all__ = ["REPORTS", "OutFolder", "foreign", "page_name"]
