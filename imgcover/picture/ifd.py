"""Tag directories as TIFF files and EXIF blocks hold them: which tag says what?

Every offset is checked against the data; a value is fetched only when it is asked for, because
camera makers leave offsets in EXIF that point outside it.

References
----------
TIFF revision 6.0 (Adobe, 1992), section 2; BigTIFF differs by 64-bit counts and offsets.
"""

from __future__ import annotations

import struct
from collections.abc import Iterator
from dataclasses import dataclass

FORMATS = {
    1: "B",
    2: "s",
    3: "H",
    4: "I",
    5: "II",
    6: "b",
    7: "s",
    8: "h",
    9: "i",
    10: "ii",
    11: "f",
    12: "d",
    13: "I",
    16: "Q",
    17: "q",
    18: "Q",
}
"""Field types of TIFF 6.0 and BigTIFF as `struct` writes them; "II" and "ii" are rationals."""
MOST_DIRECTORIES = 10_000
"""A chain longer than any scan job is a loop or an attack."""


class DirectoryError(ValueError):
    """A directory that is cut short, points outside its data or holds values of a wrong type."""


@dataclass(frozen=True, slots=True)
class Tree:
    """The data that directories live in, and how its numbers are written.

    Parameters
    ----------
    data : bytes
        The whole file, or the whole EXIF block from its byte-order mark on.
    order : {"<", ">"}
        Byte order.
    big : bool
        Whether counts and offsets are 64-bit (BigTIFF).
    first : int
        Offset of the first directory.
    """

    data: bytes
    order: str
    big: bool
    first: int

    def unpack(self, form: str, offset: int) -> tuple[int, ...]:
        """Read integers at an offset; outside the data is a fault."""
        form = self.order + form
        if offset < 0 or offset + struct.calcsize(form) > len(self.data):
            raise DirectoryError("a tag directory points past the end of the file")
        return struct.unpack_from(form, self.data, offset)

    def directory(self, offset: int) -> Directory:
        """Read the directory at an offset.

        Raises
        ------
        DirectoryError
            When it does not lie inside the data.
        """
        count_form, size, next_form = ("Q", 20, "Q") if self.big else ("H", 12, "I")
        (count,) = self.unpack(count_form, offset)
        begin = offset + struct.calcsize("=" + count_form)
        if begin + count * size > len(self.data):
            raise DirectoryError("a tag directory is cut short")
        entries: dict[int, tuple[int, int, int]] = {}
        for index in range(count):
            at = begin + index * size
            tag, kind, length = self.unpack("HHQ" if self.big else "HHI", at)
            entries.setdefault(tag, (kind, length, at + (12 if self.big else 8)))
        (following,) = self.unpack(next_form, begin + count * size)
        return Directory(self, entries, following)

    def chain(self) -> Iterator[Directory]:
        """Walk the directories of the main chain, first page first.

        Raises
        ------
        DirectoryError
            When the chain leaves the data, loops, or never ends.
        """
        seen: set[int] = set()
        offset = self.first
        while offset:
            if offset in seen or len(seen) >= MOST_DIRECTORIES:
                raise DirectoryError("its chain of pages runs in a circle")
            seen.add(offset)
            directory = self.directory(offset)
            yield directory
            offset = directory.following


@dataclass(frozen=True, slots=True)
class Directory:
    """One directory: asks for tags by number.

    Parameters
    ----------
    tree : Tree
        Where it lives.
    entries : dict
        Tag to (field type, count, offset of the value field).
    following : int
        Offset of the next directory in the chain, 0 at the end.
    """

    tree: Tree
    entries: dict[int, tuple[int, int, int]]
    following: int

    def __contains__(self, tag: int) -> bool:
        return tag in self.entries

    def _place(self, tag: int) -> tuple[str, int, int]:
        kind, count, at = self.entries[tag]
        if kind not in FORMATS:
            raise DirectoryError(f"tag {tag} has the unknown field type {kind}")
        form = FORMATS[kind]
        size = struct.calcsize("=" + form) * count
        if size > (8 if self.tree.big else 4):
            (at,) = self.tree.unpack("Q" if self.tree.big else "I", at)
        if at + size > len(self.tree.data):
            raise DirectoryError(f"the value of tag {tag} lies past the end of the file")
        return form, count, at

    def check(self, tag: int) -> None:
        """Make sure that a tag's value lies inside the data; unknown types are passed over."""
        if self.entries[tag][0] in FORMATS:
            self._place(tag)

    def raw(self, tag: int) -> bytes:
        """Give the bytes of a tag's value, empty when it is absent."""
        if tag not in self.entries:
            return b""
        form, count, at = self._place(tag)
        return self.tree.data[at : at + struct.calcsize("=" + form) * count]

    def numbers(self, tag: int) -> tuple[int, ...]:
        """Give the whole numbers of a tag, empty when it is absent."""
        if tag not in self.entries:
            return ()
        form, count, at = self._place(tag)
        if form not in "BHIQbhiq":
            raise DirectoryError(f"tag {tag} does not hold whole numbers")
        return struct.unpack_from(f"{self.tree.order}{count}{form}", self.tree.data, at)

    def number(self, tag: int, default: int) -> int:
        """Give the first whole number of a tag, or the default when it is absent."""
        values = self.numbers(tag)
        return values[0] if values else default

    def ratio(self, tag: int) -> float | None:
        """Give the first value of a tag as a real number; None when absent or divided by zero."""
        if tag not in self.entries:
            return None
        form, count, at = self._place(tag)
        if count < 1 or form == "s":
            return None
        values = struct.unpack_from(self.tree.order + form, self.tree.data, at)
        if len(values) == 1:
            return float(values[0])
        return values[0] / values[1] if values[1] else None


def open_tree(data: bytes) -> Tree:
    """Find the byte order and the first directory of a TIFF file or an EXIF block.

    Raises
    ------
    DirectoryError
        When the data does not begin as TIFF.
    """
    order = {b"II": "<", b"MM": ">"}.get(data[:2])
    if order is None or len(data) < 8:
        raise DirectoryError("it does not begin with a byte-order mark")
    (magic,) = struct.unpack_from(order + "H", data, 2)
    if magic == 42:
        return Tree(data, order, False, struct.unpack_from(order + "I", data, 4)[0])
    if magic == 43 and len(data) >= 16:
        return Tree(data, order, True, struct.unpack_from(order + "Q", data, 8)[0])
    raise DirectoryError("its byte-order mark is not followed by 42 or 43")


__all__ = ["Directory", "DirectoryError", "Tree", "open_tree"]
