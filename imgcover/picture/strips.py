"""Decodes the strips or tiles of one TIFF page; each must fill its place exactly.

References
----------
TIFF revision 6.0 (Adobe, 1992), sections 3, 9, 13, 14, 15, 22.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import cast

import imagecodecs
import numpy as np
from numpy.typing import NDArray

from imgcover.picture.header import Stored, damaged, through_codec
from imgcover.picture.jpeg import has_grey_block, parses_strictly
from imgcover.picture.markers import walk

CODECS: dict[int, Callable[[bytes, int], bytes | bytearray]] = {
    1: lambda piece, size: piece,
    5: lambda piece, size: imagecodecs.lzw_decode(piece, out=size),
    7: lambda piece, size: piece,
    8: lambda piece, size: imagecodecs.zlib_decode(piece, out=size),
    32773: lambda piece, size: imagecodecs.packbits_decode(piece, out=size),
    32946: lambda piece, size: imagecodecs.zlib_decode(piece, out=size),
    50000: lambda piece, size: imagecodecs.zstd_decode(piece, out=size),
}
"""Compression tag to the decoder of one piece, given the bytes it must yield; 7 is JPEG, which
yields pixels and is decoded apart."""
PLAIN, JPEG = 1, 7
UNPACKERS = 2
"""Threads: one would take longer over an LZW scan than over the same scan as PNG."""
LARGEST_TILE = 1 << 26
"""Pixels. A tile may be larger than its picture, but not so that decoding it fills the memory."""


@dataclass(frozen=True, slots=True)
class Piece:
    """One strip or tile: its packed bytes, its plane, its first row and its first column."""

    packed: memoryview
    plane: int
    row: int
    column: int


@dataclass(frozen=True, slots=True)
class Layout:
    """How one page lies in its file: pieces of rows × columns, row by row, plane by plane."""

    data: bytes
    order: str
    width: int
    height: int
    rows: int
    columns: int
    tiled: bool
    bits: int
    samples: int
    planar: bool
    compression: int
    differenced: bool
    in_rgb: bool
    tables: bytes
    offsets: tuple[int, ...]
    counts: tuple[int, ...]

    def pieces(self) -> Iterator[Piece]:
        """Yield the strips or tiles in the order in which the file lists them."""
        down = -(-self.height // self.rows)
        across = -(-self.width // self.columns)
        view = memoryview(self.data)  # slices of it copy nothing
        for index, (at, count) in enumerate(zip(self.offsets, self.counts, strict=True)):
            plane, inside = divmod(index, down * across)
            row, column = divmod(inside, across)
            yield Piece(view[at : at + count], plane, row * self.rows, column * self.columns)

    def expected(self) -> int:
        """Count the pieces a whole page has; 0 when the sizes make no sense."""
        if min(self.width, self.height, self.rows, self.columns) < 1:
            return 0
        if self.rows * self.columns > max(LARGEST_TILE, self.width * self.height):
            return 0
        across = -(-self.width // self.columns)
        return -(-self.height // self.rows) * across * (self.samples if self.planar else 1)


def decode_layout(layout: Layout, name: str, *, lookup: Stored | None, inverted: bool) -> Stored:
    """Decode a page.

    Parameters
    ----------
    layout : Layout
        Where its pieces lie.
    name : str
        What to call the file in an error.
    lookup : ndarray, shape (2**bits, 3), or None
        The palette, for a page that has one.
    inverted : bool
        Whether zero means white.

    Returns
    -------
    ndarray, shape (height, width) or (height, width, samples), uint8 or uint16
        As stored, in this machine's byte order.

    Raises
    ------
    PictureError
        When a piece is missing or does not fill its place.
    """
    if layout.expected() == 0 or len(layout.offsets) != layout.expected():
        raise damaged(name, "the TIFF is damaged: strips or tiles are missing")
    dtype = np.uint8 if layout.bits == 8 else np.uint16
    page = cast("Stored", np.empty((layout.height, layout.width, layout.samples), dtype=dtype))

    def place(piece: Piece) -> None:
        height = layout.rows if layout.tiled else min(layout.rows, layout.height - piece.row)
        pixels = _pixels(layout, piece.packed, height, name)
        room = page[piece.row : piece.row + height, piece.column : piece.column + layout.columns]
        if layout.planar:
            room = room[..., piece.plane : piece.plane + 1]
        room[...] = pixels[: room.shape[0], : room.shape[1]]

    with ThreadPoolExecutor(UNPACKERS) as beside:  # decoders release the interpreter
        for _ in beside.map(place, layout.pieces()):
            pass
    if inverted:
        np.subtract(np.iinfo(dtype).max, page[..., 0], out=page[..., 0])
    if lookup is not None:
        return lookup[page[..., 0]]
    return page[..., 0] if layout.samples == 1 else page


def _pixels(layout: Layout, packed: memoryview, height: int, name: str) -> Stored:
    """Decode one strip or tile to its shape (height, columns, samples of the piece)."""
    samples = 1 if layout.planar else layout.samples
    shape = (height, layout.columns, samples)
    if layout.compression == JPEG:
        return _jpeg_piece(layout, bytes(packed), shape, name)
    # some writers fill the last strip up to its full number of rows
    room = layout.rows * layout.columns * samples * layout.bits // 8
    size = height * layout.columns * samples * layout.bits // 8
    unpack = CODECS[layout.compression]
    raw: bytes | bytearray | memoryview = packed  # sliced, not copied: it may be the whole file
    if layout.compression != PLAIN:
        raw = through_codec(name, "TIFF", lambda: unpack(bytes(packed), room))
    if len(raw) < size:
        raise damaged(name, "the TIFF is truncated: a strip or tile holds too little")
    dtype = np.dtype(np.uint8) if layout.bits == 8 else np.dtype(layout.order + "u2")
    piece = np.frombuffer(raw, dtype, height * layout.columns * samples).reshape(shape)
    if not layout.differenced:
        return piece
    native = np.ascontiguousarray(piece, dtype=dtype.newbyteorder("="))
    summed: Stored = through_codec(name, "TIFF", lambda: imagecodecs.delta_decode(native, axis=1))
    return summed


def _jpeg_piece(
    layout: Layout, packed: bytes, shape: tuple[int, int, int], name: str
) -> NDArray[np.uint8]:
    """Decode a JPEG strip, its tables put back in place, and show that it is whole."""
    stream = packed[:2] + layout.tables[2:-2] + packed[2:]
    walk(stream, name)
    colour = None if shape[2] == 1 else "rgb" if layout.in_rgb else "ycbcr"
    piece = through_codec(
        name,
        "TIFF",
        lambda: imagecodecs.jpeg8_decode(
            stream, colorspace=colour, outcolorspace=None if colour is None else "rgb"
        ),
    )
    if piece.size < shape[0] * shape[1] * shape[2] or piece.size % (shape[1] * shape[2]):
        raise damaged(name, "the TIFF is truncated: a strip or tile holds too little")
    if has_grey_block(piece) and not parses_strictly(stream):
        raise damaged(name, "the TIFF is truncated: the data of a strip or tile end early")
    return np.asarray(piece.reshape(-1, shape[1], shape[2]))


__all__ = ["CODECS", "Layout", "decode_layout"]
