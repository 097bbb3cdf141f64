"""In which channel of a colour picture is the cloth clearest?

Luminance unless another is clearly better. Clearness is texture over noise: the spread of the
light at thread scale against the grain between neighbouring pixels, both measured on small
windows. Luminance wins where cloth is grey or the colours agree; a channel wins where warp and
weft, or cloth and light, differ in hue but not in luminance, or where another channel is clipped.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import cast

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.picture.clipping import ceiling
from imgcover.picture.header import Stored
from imgcover.picture.picture import LUMINANCE, PRIMARIES, Channel, channel_light
from imgcover.tone import Tone

WINDOW, ACROSS = 192, 4
"""Sixteen windows of 192 pixels: 3 threads at 60 px a thread, and 0.6 million pixels in all."""
CLEAR_ENOUGH = 8.0
"""Texture at eight times the grain leaves nothing to gain: luminance stays, so that colour
patterns, which stand out in single channels, do not drown the threads."""
CLEARLY_BETTER = 1.5
"""A channel must beat luminance by this factor: on noisy grey cloth none passes 1.1."""
LOST_LIGHT, UNCLIPPED = 0.002, 0.001
"""Luminance is given up when clipping touches this share of it: red in 1 % of the pixels, blue in
3 %. A channel counts as whole with at most 0.1 % of its pixels at the largest value."""
GRAIN = np.outer([1, -2, 1], [1, -2, 1]).astype(np.float32)
"""Second differences both ways: blind to threads along either axis, which vary along one only.
Its response to white noise of sd 1 has sd 6."""
SKIP = 5
"""Values left out between two looked at: 7,000 a window are plenty for a median."""
MAD_TO_SD = 1.4826
"""Median absolute deviation to standard deviation, for normal noise."""


@dataclass(frozen=True, slots=True)
class Choice:
    """The channel chosen, and why where that is worth saying."""

    channel: Channel
    reason: str = ""


def choose_channel(stored: Stored, tone: Tone) -> Choice:
    """Choose the channel to measure in.

    Parameters
    ----------
    stored : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        The picture as stored.
    tone : Tone
        Its transfer curve.

    Returns
    -------
    Choice
        "grey" for two dimensions.
    """
    if stored.ndim == 2:
        return Choice("grey")
    windows = _windows(stored)
    clipped = _clipped_shares(windows)
    whole: list[Channel] = [
        one for one, share in zip(PRIMARIES, clipped, strict=True) if share < UNCLIPPED
    ]
    lost = sum(share * clip for share, clip in zip(LUMINANCE, clipped, strict=True))
    if lost > LOST_LIGHT and whole:
        best = max(whole, key=lambda one: _clearness(windows, tone, one))
        return Choice(best, "other colours are at the largest value the file can hold")
    luminance = _clearness(windows, tone, "luminance")
    if luminance >= CLEAR_ENOUGH:
        return Choice("luminance")
    clearness = {one: _clearness(windows, tone, one) for one in PRIMARIES}
    best = max(PRIMARIES, key=clearness.__getitem__)
    if clearness[best] > CLEARLY_BETTER * luminance:
        told = f"the cloth is {clearness[best] / luminance:.1f} times as clear there"
        return Choice(best, f"{told} as in luminance")
    return Choice("luminance")


def _windows(stored: Stored) -> list[Stored]:
    """Cut windows from the middles of an even grid: the same picture gives the same windows."""
    return [
        stored[top, left] for top in _spans(stored.shape[0]) for left in _spans(stored.shape[1])
    ]


def _spans(length: int) -> list[slice]:
    size = min(WINDOW, length)
    count = min(ACROSS, length // size)
    starts = [(2 * index + 1) * length // (2 * count) - size // 2 for index in range(count)]
    return [slice(start, start + size) for start in starts]


def _clipped_shares(windows: list[Stored]) -> list[float]:
    top = ceiling(cast("Stored", np.stack(windows)))
    shares = [(window == top).mean(axis=(0, 1)) for window in windows]
    return [float(share) for share in np.mean(shares, axis=0)]


def _clearness(windows: list[Stored], tone: Tone, channel: Channel) -> float:
    """Give the median over the windows of texture over grain."""
    return float(
        np.median([_texture_over_grain(channel_light(one, tone, channel)) for one in windows])
    )


def _texture_over_grain(light: NDArray[np.float32]) -> float:
    grain = cv2.filter2D(light, -1, GRAIN, borderType=cv2.BORDER_REFLECT)
    smooth = cv2.blur(light, (3, 3), borderType=cv2.BORDER_REFLECT)
    texture = smooth - cv2.blur(smooth, (61, 61), borderType=cv2.BORDER_REFLECT)
    return _spread(texture) / max(_spread(grain) / 6, 1e-5)


def _spread(values: NDArray[np.generic]) -> float:
    """Give the standard deviation as the median absolute value tells it; nearly all are about 0."""
    return MAD_TO_SD * float(np.median(np.abs(values.ravel()[::SKIP])))


__all__ = ["Choice", "choose_channel"]
