"""Where an audit may read: inside its folder and its articles, ordinary files only."""

from __future__ import annotations

import os
import stat
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

LARGEST_FILE = 4_000_000_000
"""Bytes: the largest picture that is read (300 megapixels of 16-bit colour) takes 1.8 GB bare."""


class OffGroundsError(Exception):
    """A name that leads out, or to something that is no ordinary file; says why."""


@dataclass(frozen=True, slots=True)
class Grounds:
    """The folders that may be read.

    Parameters
    ----------
    bases : tuple of Path
        Resolved, the audited folder first.
    """

    bases: tuple[Path, ...]

    @classmethod
    def of(cls, folders: Sequence[Path]) -> Grounds:
        """Take the folders as they really lie, links followed."""
        return cls(tuple(folder.resolve() for folder in folders))

    def resolve(self, name: str | Path) -> Path:
        """Find what a name stands for, seen from each base in turn.

        Parameters
        ----------
        name : str or Path
            Relative to a base, or absolute; back slashes, and letters with their accents composed
            another way, are taken where nothing else is found.

        Returns
        -------
        Path
            Resolved and inside a base; it may not exist.

        Raises
        ------
        OffGroundsError
            When it leads out of every base.
        """
        text = str(name)
        if "\0" in text:
            raise OffGroundsError("the name holds a NUL")
        tries = [text] if os.sep == "\\" or "\\" not in text else [text, text.replace("\\", "/")]
        if not text.isascii():
            # ä may be one letter in the sheet and two in the file's name, or the other way round
            tries += [
                unicodedata.normalize(form, each) for form in ("NFC", "NFD") for each in tries
            ]
        inside = [path for each in tries for path in self._inside(each)]
        if not inside:
            raise OffGroundsError("it leads out of the audited folder")
        return next((path for path in inside if os.path.lexists(path)), inside[0])

    def _inside(self, name: str) -> list[Path]:
        # realpath stops at a loop of links instead of raising; opening tells then
        reached = [Path(os.path.realpath(base / name)) for base in self.bases]
        return [path for path in reached if any(path.is_relative_to(b) for b in self.bases)]


def read_file(path: Path, *, most: int = LARGEST_FILE) -> bytes:
    """Read an ordinary file whole; nothing else is waited for.

    Parameters
    ----------
    path : Path
        Resolved: a link in its last place is not followed.
    most : int
        Bytes.

    Raises
    ------
    OffGroundsError
        When it cannot be opened, is a pipe, device, socket or folder, or is too large.
    """
    # a pipe would hold the opener until someone writes to it; NONBLOCK does not exist on Windows
    flags = os.O_RDONLY | getattr(os, "O_NOFOLLOW", 0) | getattr(os, "O_NONBLOCK", 0)
    flags |= getattr(os, "O_BINARY", 0) | getattr(os, "O_CLOEXEC", 0)
    try:
        # looked at first: only opening a device may already do something
        kind = os.lstat(path)
        if not stat.S_ISREG(kind.st_mode):
            raise OffGroundsError(f"it is {kind_of(kind.st_mode)}, not a file")
        handle = os.open(path, flags)
    except FileNotFoundError:
        raise OffGroundsError("there is no such file") from None
    except OSError as fault:
        raise OffGroundsError(f"it cannot be opened ({fault.strerror})") from None
    with os.fdopen(handle, "rb") as file:
        kind = os.fstat(handle)
        if not stat.S_ISREG(kind.st_mode):
            raise OffGroundsError(f"it is {kind_of(kind.st_mode)}, not a file")
        if kind.st_size > most:
            raise OffGroundsError(f"it is larger than {most // 1_000_000} MB")
        try:
            # read one byte past the end: a file that grows meanwhile is half written
            content = file.read(kind.st_size + 1)
        except OSError as fault:
            raise OffGroundsError(f"it cannot be read ({fault.strerror})") from None
    if len(content) != kind.st_size:
        raise OffGroundsError("it changed while it was read")
    return content


def kind_of(mode: int) -> str:
    """Name what a mode says a thing is."""
    kinds = {
        stat.S_IFDIR: "a folder",
        stat.S_IFIFO: "a pipe",
        stat.S_IFSOCK: "a socket",
        stat.S_IFCHR: "a device",
        stat.S_IFBLK: "a device",
        stat.S_IFLNK: "a link",
        stat.S_IFREG: "a file",
    }
    return kinds.get(stat.S_IFMT(mode), "something else")


__all__ = ["Grounds", "OffGroundsError", "kind_of", "read_file"]
