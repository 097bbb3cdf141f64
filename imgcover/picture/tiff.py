"""Reads TIFF and BigTIFF: which pages are there, are they whole, and what does the first one say?

References
----------
TIFF revision 6.0 (Adobe, 1992); Adobe Photoshop TIFF technical notes (2002) for deflate.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from imgcover.findings import Finding, Flag, found
from imgcover.picture.exif import dpi_of, one_dpi, orientation_of, tone_of
from imgcover.picture.header import Header, Stored, damaged, not_read_here
from imgcover.picture.ifd import Directory, DirectoryError, Tree, open_tree
from imgcover.picture.profile import ProfileError, nearest_tone, tone_of_profile
from imgcover.picture.strips import CODECS, Layout, decode_layout
from imgcover.tone import Tone

SIGNATURES = (b"II*\0", b"MM\0*", b"II+\0", b"MM\0+")
WIDTH, HEIGHT, BITS, COMPRESSION, PHOTOMETRIC, FILL_ORDER = 256, 257, 258, 259, 262, 266
SUBFILE, STRIP_OFFSETS, SAMPLES, STRIP_ROWS, STRIP_BYTES, PLANAR = 254, 273, 277, 278, 279, 284
PREDICTOR, COLOUR_MAP, TILE_WIDTH, TILE_HEIGHT, TILE_OFFSETS, TILE_BYTES = (
    317,
    320,
    322,
    323,
    324,
    325,
)
TRANSFER, EXTRA, FORMAT, TABLES, PROFILE, RAW_CAMERA = 301, 338, 339, 347, 34675, 50706
WHITE_IS_ZERO, BLACK_IS_ZERO, RGB, PALETTE, YCBCR = 0, 1, 2, 3, 6
"""Photometric interpretations read here."""
COLOURS = {WHITE_IS_ZERO: 1, BLACK_IS_ZERO: 1, RGB: 3, PALETTE: 1, YCBCR: 3}
"""Colour samples of each; a file may add one more, which counts as alpha."""
FORMATS = {2: "signed whole numbers", 3: "floating-point numbers", 4: "numbers of unknown kind"}
"""Sample formats that are refused: what is black and what is white is not said."""
JPEG = 7


def read_tiff(data: bytes, name: str) -> Header:
    """Check every page of a TIFF file for wholeness, and read what the first one says.

    Parameters
    ----------
    data : bytes
        The whole file.
    name : str
        What to call it in an error.

    Raises
    ------
    PictureError
        When any page points outside the file, or the first is of a sort not read here.
    ProfileError
        When its colour profile cannot be honoured.
    """
    try:
        tree = open_tree(data)
        pages = list(tree.chain())
        if not pages:
            raise damaged(name, "the TIFF holds no picture")
        for page in pages:
            _check_whole(page, len(data), name)
        return _read_page(tree, pages, name)
    except DirectoryError as fault:
        raise damaged(name, f"the TIFF is truncated or damaged: {fault}") from fault


def _check_whole(page: Directory, size: int, name: str) -> None:
    for tag in page.entries:
        page.check(tag)
    for offsets, counts in ((STRIP_OFFSETS, STRIP_BYTES), (TILE_OFFSETS, TILE_BYTES)):
        begins, lengths = page.numbers(offsets), page.numbers(counts)
        if len(begins) != len(lengths):
            raise damaged(name, "the TIFF is damaged: it does not say how long its data are")
        if any(begin + length > size for begin, length in zip(begins, lengths, strict=True)):
            raise damaged(name, "the TIFF is truncated: its data go on past the end of the file")


def _read_page(tree: Tree, pages: list[Directory], name: str) -> Header:
    page = pages[0]
    if RAW_CAMERA in page or page.number(SUBFILE, 0) & 1:
        raise not_read_here(name, "the first page is a preview, as in a camera's raw file")
    sort = _sort(page, name)
    layout = _layout(tree, page, sort, name)
    lookup = _colour_map(page, sort.bits, name) if sort.photometric == PALETTE else None
    inverted = sort.photometric == WHITE_IS_ZERO
    orientation, odd = orientation_of(page)
    tone, tone_from = _tone(page, sort)
    dpi, contradiction = one_dpi(dpi_of(page))
    return Header(
        kind="TIFF",
        width=layout.width,
        height=layout.height,
        bits=sort.bits if lookup is None else 8 * lookup.itemsize,
        samples=sort.samples if lookup is None else 3,
        decode=lambda: decode_layout(layout, name, lookup=lookup, inverted=inverted),
        orientation=orientation,
        dpi=dpi,
        tone=tone,
        tone_from=tone_from,
        findings=(*odd, *contradiction, *_more_pages(pages)),
    )


@dataclass(frozen=True, slots=True)
class _Sort:
    """Kind of samples: photometric interpretation, depth, samples a pixel, compression."""

    photometric: int
    bits: int
    samples: int
    compression: int


def _sort(page: Directory, name: str) -> _Sort:
    photometric = page.number(PHOTOMETRIC, -1)
    compression = page.number(COMPRESSION, 1)
    samples = page.number(SAMPLES, 1)
    bits = set(page.numbers(BITS) or (1,))
    formats = set(page.numbers(FORMAT)) - {1}
    if formats:
        told = FORMATS.get(min(formats), "numbers of unknown kind")
        raise not_read_here(name, f"the TIFF holds {max(bits)}-bit {told}")
    if bits not in ({8}, {16}):
        raise not_read_here(name, f"the TIFF has {'/'.join(map(str, sorted(bits)))} bits a sample")
    if photometric not in COLOURS or (photometric == YCBCR and compression != JPEG):
        raise not_read_here(name, f"the TIFF's colours are of kind {photometric}, not grey or RGB")
    if samples not in (COLOURS[photometric], COLOURS[photometric] + 1):
        raise not_read_here(name, f"the TIFF has {samples} samples a pixel")
    if photometric == PALETTE and samples > 1:
        raise not_read_here(name, "the TIFF has a palette and more samples besides")
    if compression not in CODECS:
        raise not_read_here(name, f"the TIFF is packed by method {compression}")
    return _Sort(photometric, bits.pop(), samples, compression)


def _layout(tree: Tree, page: Directory, sort: _Sort, name: str) -> Layout:
    width, height = page.number(WIDTH, 0), page.number(HEIGHT, 0)
    if page.number(FILL_ORDER, 1) != 1:
        raise not_read_here(name, "the TIFF stores its bits backwards")
    predictor = page.number(PREDICTOR, 1)
    if predictor not in (1, 2):
        raise not_read_here(name, f"the TIFF uses predictor {predictor}")
    tiled = TILE_OFFSETS in page
    rows = page.number(TILE_HEIGHT if tiled else STRIP_ROWS, height)
    columns = page.number(TILE_WIDTH, 0) if tiled else width
    return Layout(
        data=tree.data,
        order=tree.order,
        width=width,
        height=height,
        rows=rows if tiled else min(rows, height),
        columns=columns,
        tiled=tiled,
        bits=sort.bits,
        samples=sort.samples,
        planar=page.number(PLANAR, 1) == 2 and sort.samples > 1,
        compression=sort.compression,
        differenced=predictor == 2 and sort.compression != JPEG,
        in_rgb=sort.photometric != YCBCR,
        tables=page.raw(TABLES),
        offsets=page.numbers(TILE_OFFSETS if tiled else STRIP_OFFSETS),
        counts=page.numbers(TILE_BYTES if tiled else STRIP_BYTES),
    )


def _colour_map(page: Directory, bits: int, name: str) -> Stored:
    """Give the palette, shape (2**bits, 3); 8-bit where its 16-bit entries say no more."""
    values = np.array(page.numbers(COLOUR_MAP), dtype=np.uint16)
    if values.size != 3 << bits:
        raise damaged(name, "the TIFF is damaged: its palette is incomplete")
    colours = values.reshape(3, -1).T
    if (colours % 257 == 0).all() or (colours % 256 == 0).all():
        return np.ascontiguousarray((colours >> 8).astype(np.uint8))
    return np.ascontiguousarray(colours)


def _tone(page: Directory, sort: _Sort) -> tuple[Tone | None, str]:
    """Find the claimed curve: ICC profile, then transfer function, then EXIF colour space."""
    if profile := page.raw(PROFILE):
        return tone_of_profile(profile), "its ICC profile"
    if values := page.numbers(TRANSFER):
        curves = np.array(values[: len(values) >> sort.bits << sort.bits], dtype=np.float64)
        tones = {nearest_tone(one / 65535) for one in curves.reshape(-1, 1 << sort.bits)}
        if len(tones) == 1:
            return tones.pop(), "its transfer function"
        raise ProfileError("has a different tone curve for each colour")
    tone = tone_of(page)
    return (tone, "its EXIF colour space") if tone is not None else (None, "")


def _more_pages(pages: list[Directory]) -> tuple[Finding, ...]:
    """Say that further pages were left; previews and masks of the first are not pages."""
    count = 1 + sum(page.number(SUBFILE, 0) & 5 == 0 for page in pages[1:])
    if count == 1:
        return ()
    return (found(Flag.FIRST_PAGE_ONLY, f"the file holds {count} pages; only the first was read"),)


__all__ = ["SIGNATURES", "read_tiff"]
