"""Turns what is stored into what is shown, once.

References
----------
TIFF revision 6.0 (Adobe, 1992), Orientation; EXIF 2.32, 4.6.4.A.
"""

from __future__ import annotations

from typing import cast

import cv2

from imgcover.picture.header import Stored

TURNS: dict[int, tuple[str, int | None, int | None]] = {
    2: ("mirrored left to right", None, 1),
    3: ("a half turn", cv2.ROTATE_180, None),
    4: ("mirrored top to bottom", None, 0),
    5: ("mirrored, then a quarter turn anticlockwise", cv2.ROTATE_90_COUNTERCLOCKWISE, 0),
    6: ("a quarter turn clockwise", cv2.ROTATE_90_CLOCKWISE, None),
    7: ("mirrored, then a quarter turn clockwise", cv2.ROTATE_90_CLOCKWISE, 0),
    8: ("a quarter turn anticlockwise", cv2.ROTATE_90_COUNTERCLOCKWISE, None),
}
"""Stored orientation to what is done: in words, OpenCV's turn, then OpenCV's flip of the result."""


def turned(stored: Stored, orientation: int) -> Stored:
    """Show a stored picture the way its orientation says.

    Parameters
    ----------
    stored : ndarray, shape (rows, columns) or (rows, columns, n)
        As the file holds it.
    orientation : int
        1…8 as TIFF and EXIF number them.

    Returns
    -------
    ndarray
        As shown; rows and columns exchanged for orientations 5 to 8. The same array for 1.
    """
    if orientation == 1:
        return stored
    _, turn, flip = TURNS[orientation]
    shown: Stored = stored
    if turn is not None:
        shown = cast("Stored", cv2.rotate(shown, turn))
    if flip is not None:
        shown = cast("Stored", cv2.flip(shown, flip))
    return shown


def swaps_axes(orientation: int) -> bool:
    """Whether stored columns become shown rows."""
    return orientation >= 5


def turned_pair(pair: tuple[float, float] | None, orientation: int) -> tuple[float, float] | None:
    """Turn an (x, y) pair of the stored axes into one of the shown axes."""
    if pair is None or not swaps_axes(orientation):
        return pair
    return pair[1], pair[0]


__all__ = ["TURNS", "swaps_axes", "turned", "turned_pair"]
