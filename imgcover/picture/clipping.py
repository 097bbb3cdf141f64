"""How much of a picture is at the end of its scale, where light is no longer told apart?"""

from __future__ import annotations

from typing import cast

import cv2
import numpy as np

from imgcover.picture.header import Stored
from imgcover.picture.picture import PRIMARIES, Channel

STRIPE = 1 << 18
"""Pixels looked at together: most stripes hold neither end of the scale and are not counted."""
SENSOR_BITS = (8, 10, 12, 14)
"""Depths of the converters whose values come in 16-bit files, shifted up or not."""
CEILINGS = {
    level << shift
    for bits in SENSOR_BITS
    for level in [(1 << bits) - 1]
    for shift in {0, 16 - bits}
    if level << shift > 255
}
"""The largest values such converters can leave in a 16-bit file."""


def ceiling(stored: Stored) -> int:
    """Give the largest value that the picture can hold.

    Parameters
    ----------
    stored : ndarray, uint8 or uint16
        The picture as stored.

    Returns
    -------
    int
        255 or 65535; for a 16-bit picture whose largest value is exactly where a converter of
        fewer bits ends, that value: a 12-bit camera saturates at 4095 or 65520.
    """
    top = int(np.iinfo(stored.dtype).max)
    if stored.dtype == np.uint8 or stored.size == 0:
        return top
    largest = int(stored.max())
    return largest if largest in CEILINGS else top


def clipped_shares(stored: Stored, channel: Channel) -> tuple[float, float]:
    """Count the shares of pixels at the smallest and at the largest value.

    Parameters
    ----------
    stored : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        The picture as stored.
    channel : {"luminance", "red", "green", "blue", "grey"}
        What is measured. For luminance a pixel counts as dark with every colour at the smallest
        value, and as clipped with any colour at the largest.

    Returns
    -------
    low, high : float
        Shares 0…1.
    """
    top = ceiling(stored)
    dark = bright = 0
    step = max(1, STRIPE // stored.shape[1])
    for first in range(0, len(stored), step):
        stripe = stored[first : first + step]
        if channel in PRIMARIES:
            stripe = cast("Stored", cv2.extractChannel(stripe, PRIMARIES.index(channel)))
        pixels = stripe.shape[0] * stripe.shape[1]
        lowest, highest, _, _ = cv2.minMaxLoc(stripe.reshape(len(stripe), -1))
        dark += _count_within(stripe, 0, 0) if lowest == 0 else 0
        bright += pixels - _count_within(stripe, 0, top - 1) if highest >= top else 0
    pixels = stored.shape[0] * stored.shape[1]
    return dark / pixels, bright / pixels


def _count_within(stored: Stored, low: int, high: int) -> int:
    """Count the pixels whose every value lies between two, both included."""
    if stored.ndim == 2:
        return cv2.countNonZero(cv2.inRange(stored, float(low), float(high)))
    return cv2.countNonZero(cv2.inRange(stored, (float(low),) * 3, (float(high),) * 3))


__all__ = ["ceiling", "clipped_shares"]
