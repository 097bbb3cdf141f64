"""Walks the markers of a JPEG stream: are all its parts there, in order, to the end?

References
----------
ITU-T T.81 (1992), annex B.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field

from imgcover.picture.header import damaged, not_read_here

SOI, EOI, SOS, DRI = 0xD8, 0xD9, 0xDA, 0xDD
APP0, APP1, APP2 = 0xE0, 0xE1, 0xE2
FRAMES = {0xC0: "baseline", 0xC1: "extended", 0xC2: "progressive"}
"""Huffman-coded frames; arithmetic, lossless and hierarchical ones are hardly ever written."""
OTHER_FRAMES = {0xC3, 0xC5, 0xC6, 0xC7, 0xC9, 0xCA, 0xCB, 0xCD, 0xCE, 0xCF}
NEXT_MARKER = re.compile(rb"\xff[^\x00\xff\xd0-\xd7]", re.DOTALL)
"""What ends a scan: anything but a stuffed zero, a fill byte or a restart mark."""
RESTART = re.compile(rb"\xff[\xd0-\xd7]", re.DOTALL)
TRUNCATED = "the JPEG is truncated: it stops before its end mark"


@dataclass(frozen=True, slots=True)
class Component:
    """One colour channel: its sampling factors across and down."""

    across: int
    down: int


@dataclass(frozen=True, slots=True)
class Frame:
    """What the frame header says; components by their identifier."""

    width: int
    height: int
    progressive: bool
    components: dict[int, Component]

    def units(self, scanned: list[int]) -> int:
        """Count the coded units of a scan over these components (T.81, A.2)."""
        widest = max(each.across for each in self.components.values())
        tallest = max(each.down for each in self.components.values())
        if len(scanned) > 1:
            return -(-self.width // (8 * widest)) * -(-self.height // (8 * tallest))
        one = self.components[scanned[0]]
        columns = -(-self.width * one.across // widest)
        rows = -(-self.height * one.down // tallest)
        return -(-columns // 8) * -(-rows // 8)

    def blocks(self) -> int:
        """Count the 8 × 8 blocks of the whole picture."""
        if len(self.components) == 1:
            return self.units(list(self.components))
        each = sum(one.across * one.down for one in self.components.values())
        return self.units(list(self.components)) * each


@dataclass(slots=True)
class Segments:
    """The parts of one JPEG stream that are needed afterwards."""

    frame: Frame
    end: int = 0
    app0: list[bytes] = field(default_factory=list)
    app1: list[bytes] = field(default_factory=list)
    app2: list[bytes] = field(default_factory=list)


def walk(data: bytes, name: str) -> Segments:
    """Go from marker to marker up to the end mark.

    Parameters
    ----------
    data : bytes
        The whole file, beginning with the start mark.
    name : str
        What to call it in an error.

    Returns
    -------
    Segments
        `end` is the offset just past the end mark.

    Raises
    ------
    PictureError
        When anything is missing, out of order, or of a sort not read here.
    """
    frame: Frame | None = None
    apps: dict[int, list[bytes]] = {APP0: [], APP1: [], APP2: []}
    sent: dict[tuple[int, int], int] = {}
    interval = coded = 0
    for marker, begin, end, stop in _segments(data, name):
        body = data[begin:end]
        if marker in apps:
            apps[marker].append(body)
        elif marker in OTHER_FRAMES:
            raise not_read_here(name, "the JPEG is arithmetic-coded, lossless or hierarchical")
        elif marker in FRAMES:
            if frame is not None:
                raise damaged(name, "the JPEG has two frame headers")
            frame = _frame(body, name, progressive=marker == 0xC2)
        elif marker == DRI and len(body) == 2:
            interval = int.from_bytes(body, "big")
        elif marker == SOS:
            if frame is None:
                raise damaged(name, "the JPEG has no frame header")
            scanned = _note_scan(body, frame, sent, name)
            _check_restarts(data, (end, stop), frame.units(scanned), interval, name)
            coded += stop - end
        elif marker == EOI:
            if frame is None or not _all_sent(frame, sent):
                raise damaged(name, "the JPEG is truncated: some of its scans are missing")
            if coded * 8 < frame.blocks():  # a block takes at least one bit
                raise damaged(name, "the JPEG is truncated: it holds too little for its size")
            return Segments(frame, end, apps[APP0], apps[APP1], apps[APP2])
    raise damaged(name, TRUNCATED)


def _segments(data: bytes, name: str) -> Iterator[tuple[int, int, int, int]]:
    """Yield marker, begin and end of each segment's body, and where its scan data stop."""
    at = 2
    while at + 2 <= len(data):
        if data[at] != 0xFF:
            raise damaged(name, "the JPEG is damaged: a marker is not where it should be")
        marker = data[at + 1]
        if marker == 0xFF:  # fill byte
            at += 1
        elif marker == EOI:
            yield marker, at + 2, at + 2, at + 2
            return
        elif marker in (0x00, SOI) or 0xD0 <= marker <= 0xD7:
            raise damaged(name, "the JPEG is damaged: a marker is not where it should be")
        else:
            size = int.from_bytes(data[at + 2 : at + 4], "big")
            if size < 2 or at + 2 + size > len(data):
                raise damaged(name, TRUNCATED)
            begin, end = at + 4, at + 2 + size
            at = _scan_end(data, end, name) if marker == SOS else end
            yield marker, begin, end, at


def _scan_end(data: bytes, begin: int, name: str) -> int:
    found = NEXT_MARKER.search(data, begin)
    if found is None:
        raise damaged(name, TRUNCATED)
    return found.start()


def _frame(body: bytes, name: str, *, progressive: bool) -> Frame:
    if len(body) < 6 or len(body) != 6 + 3 * body[5]:
        raise damaged(name, "the JPEG frame header is malformed")
    if body[0] != 8:
        raise not_read_here(name, f"the JPEG has {body[0]} bits a sample")
    components = {
        body[at]: Component(body[at + 1] >> 4, body[at + 1] & 15) for at in range(6, len(body), 3)
    }
    if len(components) != body[5] or not all(
        1 <= factor <= 4 for each in components.values() for factor in (each.across, each.down)
    ):
        raise damaged(name, "the JPEG frame header is malformed")
    height, width = int.from_bytes(body[1:3], "big"), int.from_bytes(body[3:5], "big")
    return Frame(width, height, progressive, components)


def _note_scan(body: bytes, frame: Frame, sent: dict[tuple[int, int], int], name: str) -> list[int]:
    """Note which coefficients of which components a scan brings, and down to which bit."""
    count = body[0] if body else 0
    if not 1 <= count <= 4 or len(body) != 4 + 2 * count:
        raise damaged(name, "a JPEG scan header is malformed")
    scanned = [body[1 + 2 * index] for index in range(count)]
    if any(each not in frame.components for each in scanned):
        raise damaged(name, "a JPEG scan header is malformed")
    first, last, low = (body[-3], body[-2], body[-1] & 15) if frame.progressive else (0, 63, 0)
    for each in scanned:
        for coefficient in range(first, min(last, 63) + 1):
            sent[each, coefficient] = low
    return scanned


def _all_sent(frame: Frame, sent: dict[tuple[int, int], int]) -> bool:
    """Whether every coefficient of every component came, to its last bit."""
    return all(sent.get((each, k)) == 0 for each in frame.components for k in range(64))


def _check_restarts(
    data: bytes, span: tuple[int, int], units: int, interval: int, name: str
) -> None:
    """Hold the restart marks of a scan against the number and order they must have."""
    expected = -(-units // interval) - 1 if interval else 0
    count = 0
    for count, match in enumerate(RESTART.finditer(data, *span), start=1):
        if match[0][1] != 0xD0 + (count - 1) % 8:
            raise damaged(name, "the JPEG is damaged: a stretch of its scan data is missing")
    if count != expected:
        raise damaged(name, "the JPEG is damaged: a stretch of its scan data is missing")


__all__ = ["Component", "Frame", "Segments", "walk"]
