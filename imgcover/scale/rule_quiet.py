"""How does the picture look without what repeats all over it?

Cloth under a clear rule, or threads that stand as close as a rule's lines, drown the graduations.
Cloth repeats over the whole field and so has sharp peaks in the spectrum; a row of lines is thin
and has none as sharp. What stands far above its surroundings there is pressed down to them.
"""

from __future__ import annotations

import cv2
import numpy as np
from numpy.typing import NDArray
from scipy import fft

SLOW = 41
"""Pixels over which the slow light is taken, which is kept as it is (as `rule_seeds.even_out`)."""
SMOOTHED = 5
"""Bins: a peak of uneven cloth is a few bins wide."""
SURROUNDINGS = 61
"""Bins over which the usual power is taken: wide against a peak, narrow against falloff."""
ABOVE_USUAL = 8.0
"""Times the usual power (geometric mean) that is left: single bins of noise, smoothed, hardly ever
reach three."""


def quieten(tone: NDArray[np.float32]) -> NDArray[np.float32]:
    """Press down what repeats all over a picture.

    Parameters
    ----------
    tone : ndarray, shape (rows, columns), float32
        Square root of linear light.

    Returns
    -------
    ndarray, shape (rows, columns), float32
        The same, not below zero.
    """
    slow = cv2.blur(tone, (SLOW, SLOW), borderType=cv2.BORDER_REFLECT)
    fast = tone - slow
    rows, columns = fast.shape
    window = np.hanning(rows)[:, None] * np.hanning(columns)[None, :]
    # the spectrum repeats from the last row to the first: its middle is turned to the middle
    power = fft.fftshift(np.abs(fft.rfft2(fast * window.astype(np.float32))) ** 2, axes=0)
    smooth = cv2.blur(power, (SMOOTHED, SMOOTHED), borderType=cv2.BORDER_REFLECT) + 1e-12
    size = (SURROUNDINGS, SURROUNDINGS)
    usual = np.exp(cv2.blur(np.log(smooth), size, borderType=cv2.BORDER_REFLECT))
    gain = np.sqrt(np.minimum(1.0, ABOVE_USUAL * usual / smooth)).astype(np.float32)
    gain = np.asarray(cv2.erode(gain, np.ones((3, 3), np.uint8)))
    left = fft.irfft2(fft.rfft2(fast) * fft.ifftshift(gain, axes=0), s=fast.shape)
    return np.asarray(np.maximum(left + slow, 0.0), dtype=np.float32)


__all__ = ["quieten"]
