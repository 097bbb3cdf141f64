"""A picture as it is shown, turned into linear light only where it is asked for.

An A4 scan at 600 dpi is 35 million pixels: 104 MB as stored, 140 MB more as linear light. So the
stored values are kept and looked up window by window.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding
from imgcover.picture.header import Stored
from imgcover.tone import Tone

Channel = Literal["luminance", "red", "green", "blue", "grey"]

LUMINANCE = (0.2126, 0.7152, 0.0722)
"""Shares of linear red, green and blue in luminance (IEC 61966-2-1, from ITU-R BT.709)."""
PRIMARIES: tuple[Channel, ...] = ("red", "green", "blue")
BAND = 1 << 17
"""Pixels converted at a time: a megabyte and a half of light stays in the processor's cache."""


@dataclass(frozen=True, slots=True, eq=False)
class Picture:
    """One decoded picture, whole and the right way up.

    Parameters
    ----------
    name : str
        What the picture is called in messages and records.
    stored : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        Stored values, oriented as shown; RGB order.
    tone : Tone
        How stored values stand for light.
    channel : {"luminance", "red", "green", "blue", "grey"}
        What `light` gives: "grey" for a picture without colour.
    sha256 : str
        Hash of the file's bytes.
    pixels_sha256 : str
        Hash of the decoded values as stored, before orientation and without alpha:
        "<rows>x<columns>x<samples> uint<bits>\\n", then the values row by row, RGB, little-endian.
    bits : int
        Depth of the stored values, 8 or 16.
    dpi : (float, float) or None
        Resolution the file claims, along shown columns (x) and shown rows (y).
    orientation : int
        1…8 as the file holds it; it has been applied.
    clipped_low, clipped_high : float
        Shares 0…1 of pixels at the smallest and the largest storable value in the channel, as
        `clipping.clipped_shares` counts them.
    findings : tuple of Finding
        What was noticed on the way.
    lossy : bool
        Whether the file's format drops what is fine and faint.
    """

    name: str
    stored: Stored
    tone: Tone
    channel: Channel
    sha256: str
    pixels_sha256: str
    bits: int
    dpi: tuple[float, float] | None
    orientation: int
    clipped_low: float
    clipped_high: float
    findings: tuple[Finding, ...] = ()
    lossy: bool = False

    @property
    def rows(self) -> int:
        """Shown height in pixels."""
        return int(self.stored.shape[0])

    @property
    def columns(self) -> int:
        """Shown width in pixels."""
        return int(self.stored.shape[1])

    def light(self, window: tuple[slice, slice] | None = None) -> NDArray[np.float32]:
        """Give the linear light of a window, or of the whole picture.

        Parameters
        ----------
        window : (slice, slice), optional
            Rows and columns, without steps.

        Returns
        -------
        ndarray, shape of the window, float32, linear light 0…1
        """
        return channel_light(
            self.stored if window is None else self.stored[window], self.tone, self.channel
        )

    def coarse(self, factor: int) -> NDArray[np.float32]:
        """Give means of linear light over square blocks.

        Parameters
        ----------
        factor : int
            Side of a block in pixels.

        Returns
        -------
        ndarray, shape (rows // factor, columns // factor), float32, linear light 0…1
            The rows and columns that fill no whole block are left out.

        Raises
        ------
        ValueError
            When the factor is below one or larger than the picture.
        """
        rows, columns = self.rows // factor if factor > 0 else 0, self.columns // max(factor, 1)
        if not rows or not columns:
            raise ValueError(f"factor must be 1 to {min(self.rows, self.columns)}, got {factor}")
        means = np.empty((rows, columns), dtype=np.float32)
        step = max(1, BAND // (factor * self.columns))
        for first in range(0, rows, step):
            last = min(first + step, rows)
            fine = self.light(np.s_[first * factor : last * factor, : columns * factor])
            cv2.resize(
                fine, (columns, last - first), dst=means[first:last], interpolation=cv2.INTER_AREA
            )
        return means


def channel_light(stored: Stored, tone: Tone, channel: Channel) -> NDArray[np.float32]:
    """Turn stored values into the linear light of one channel.

    Parameters
    ----------
    stored : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        Stored values; RGB order.
    tone : Tone
        Their transfer curve.
    channel : {"luminance", "red", "green", "blue", "grey"}
        Which light is meant; "grey" goes with two dimensions, the others with three.

    Returns
    -------
    ndarray, shape (rows, columns), float32, linear light 0…1
    """
    table = tone.lut(8 * stored.dtype.itemsize)
    if channel in PRIMARIES:
        stored = stored[..., PRIMARIES.index(channel)]
    rows, columns = stored.shape[:2]
    light = np.empty((rows, columns), dtype=np.float32)
    step = max(1, BAND // max(1, columns))
    convert = _luminance if stored.ndim == 3 else _single
    for first in range(0, len(light), step):
        convert(stored[first : first + step], table, light[first : first + step])
    return light


def _single(stored: Stored, table: NDArray[np.float32], light: NDArray[np.float32]) -> None:
    np.take(table, stored, out=light, mode="clip")  # "clip" skips numpy's slow bounds check


def _luminance(stored: Stored, table: NDArray[np.float32], light: NDArray[np.float32]) -> None:
    if stored.dtype == np.uint8:
        # one pass over the interleaved colours, three times as fast as one a colour
        weighted = (table[:, None] * np.array(LUMINANCE, np.float32))[None]
        cv2.transform(cv2.LUT(stored, weighted), np.ones((1, 3), np.float32), dst=light)
        return
    light[...] = 0
    for index, share in enumerate(LUMINANCE):
        light += np.take(table, stored[..., index], mode="clip") * np.float32(share)


__all__ = ["LUMINANCE", "PRIMARIES", "Channel", "Picture", "channel_light"]
