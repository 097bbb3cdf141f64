"""Is the stored orientation applied once, whatever file holds it, and dpi turned with it?"""

from __future__ import annotations

import io

import numpy as np
import picture_files as files
import pytest
from PIL import Image, ImageOps

from imgcover.findings import Flag, has
from imgcover.picture.orientation import turned, turned_pair
from imgcover.picture.reader import read_picture

RGB = files.grainy(12, 20)
WRITERS = {
    "JPEG": {"quality": 95, "subsampling": 0},
    "PNG": {},
    "WEBP": {"lossless": True},
}


@pytest.mark.parametrize("orientation", range(1, 9))
@pytest.mark.parametrize("kind", WRITERS)
def test_a_turned_picture_is_shown_as_a_referee_shows_it(kind: str, orientation: int) -> None:
    """Truth is a referee: Pillow's exif_transpose of the same file."""
    block = files.exif(orientation=orientation, x=600.0, y=300.0, unit=2)
    data = files.pillow(Image.fromarray(RGB), kind, exif=block, **WRITERS[kind])
    picture = read_picture(data, name="turned")
    shown = np.asarray(ImageOps.exif_transpose(Image.open(io.BytesIO(data))))
    np.testing.assert_array_equal(picture.stored, shown)
    assert picture.orientation == orientation
    assert picture.dpi == ((600.0, 300.0) if orientation < 5 else (300.0, 600.0))
    assert has(picture.findings, Flag.PICTURE_TURNED) == (orientation > 1)


@pytest.mark.parametrize("orientation", range(1, 9))
def test_a_turned_tiff_is_shown_by_its_own_tag(orientation: int) -> None:
    """Truth is published: TIFF 6.0 names the side that row 0 and column 0 are shown on."""
    tag = (274, "H", 1, orientation, True)
    data = files.tiff(RGB, extratags=[tag], resolution=(600, 300), resolutionunit=2)
    picture = read_picture(data, name="turned.tif")
    shown = {
        1: RGB,  # row 0 at the top, column 0 on the left
        2: RGB[:, ::-1],  # top, right
        3: RGB[::-1, ::-1],  # bottom, right
        4: RGB[::-1],  # bottom, left
        5: RGB.swapaxes(0, 1),  # left, top
        6: RGB[::-1].swapaxes(0, 1),  # right, top
        7: RGB[::-1, ::-1].swapaxes(0, 1),  # right, bottom
        8: RGB[:, ::-1].swapaxes(0, 1),  # left, bottom
    }[orientation]
    np.testing.assert_array_equal(picture.stored, shown)
    assert picture.dpi == ((600.0, 300.0) if orientation < 5 else (300.0, 600.0))


@pytest.mark.parametrize("orientation", range(1, 9))
def test_the_pixels_hash_does_not_follow_the_turn(orientation: int) -> None:
    """Truth is symmetry: the stored values are the same whatever the mark says."""
    data = [
        files.pillow(Image.fromarray(RGB), "PNG", exif=files.exif(orientation=each))
        for each in (1, orientation)
    ]
    first, second = (read_picture(each, name="x") for each in data)
    assert first.pixels_sha256 == second.pixels_sha256
    assert (first.sha256 == second.sha256) == (orientation == 1)


def test_turning_and_turning_back_is_nothing() -> None:
    """Truth is symmetry: 6 undoes 8, the others undo themselves."""
    deep = files.deep(5, 7)
    for orientation in range(1, 9):
        back = {6: 8, 8: 6}.get(orientation, orientation)
        np.testing.assert_array_equal(turned(turned(deep, orientation), back), deep)
        assert turned_pair(turned_pair((3.0, 4.0), orientation), back) == (3.0, 4.0)


@pytest.mark.parametrize(("stored", "found"), [(0, False), (9, True), (255, True)])
def test_an_impossible_orientation_turns_nothing(stored: int, found: bool) -> None:
    """Truth is published: EXIF 2.32 knows 1 to 8; 0 is written where nothing is known."""
    data = files.pillow(Image.fromarray(RGB), "PNG", exif=files.exif(orientation=stored))
    picture = read_picture(data, name="x")
    np.testing.assert_array_equal(picture.stored, RGB)
    assert picture.orientation == 1
    assert has(picture.findings, Flag.ORIENTATION_UNKNOWN) == found


def test_a_broken_exif_block_is_said() -> None:
    """Truth is drawn: an EXIF block that points past its own end."""
    data = files.pillow(Image.fromarray(RGB), "PNG", exif=b"II*\0\xff\xff\0\0")
    assert has(read_picture(data, name="x").findings, Flag.EXIF_UNREADABLE)


@pytest.mark.parametrize(
    ("jfif", "block", "dpi", "contradicts"),
    [
        ((300, 300), {}, (300.0, 300.0), False),
        ((72, 72), {"x": 600.0, "y": 600.0, "unit": 2}, (600.0, 600.0), False),
        ((600, 600), {"x": 72.0, "y": 72.0, "unit": 2}, (600.0, 600.0), False),
        ((72, 72), {"x": 96.0, "y": 96.0, "unit": 2}, (72.0, 72.0), False),
        ((300, 300), {"x": 600.0, "y": 600.0, "unit": 2}, None, True),
        ((600, 600), {"x": 236.22, "y": 236.22, "unit": 3}, (600.0, 600.0), False),
    ],
)
def test_two_claims_of_resolution_are_held_together(
    jfif: tuple[int, int],
    block: dict[str, float],
    dpi: tuple[float, float] | None,
    contradicts: bool,
) -> None:
    """Truth is drawn: what JFIF and EXIF were told. A default gives way, two statements do not."""
    options = {"exif": files.exif(**block)} if block else {}
    data = files.pillow(Image.fromarray(RGB), "JPEG", dpi=jfif, **options)
    picture = read_picture(data, name="x.jpg")
    assert picture.dpi == (None if dpi is None else pytest.approx(dpi, rel=1e-4))
    assert has(picture.findings, Flag.DPI_CONTRADICTS_ITSELF) == contradicts


def test_resolution_is_read_in_every_unit() -> None:
    """Truth is theory: 600 dpi is 236.2 a centimetre and 23622 a metre; unit-less is no claim."""
    png = files.pillow(Image.fromarray(RGB), "PNG", dpi=(600, 300))
    assert read_picture(png, name="p").dpi == pytest.approx((600, 300), rel=1e-4)
    bmp = files.pillow(Image.fromarray(RGB), "BMP", dpi=(600, 300))
    assert read_picture(bmp, name="b").dpi == pytest.approx((600, 300), rel=1e-4)
    centimetres = files.tiff(RGB, resolution=(236.22, 118.11), resolutionunit=3)
    assert read_picture(centimetres, name="t").dpi == pytest.approx((600, 300), rel=1e-4)
    unitless = files.tiff(RGB, resolution=(2, 1), resolutionunit=1)
    assert read_picture(unitless, name="t").dpi is None
    zero = files.pillow(Image.fromarray(RGB), "PNG", dpi=(0, 0))
    assert read_picture(zero, name="p").dpi is None
