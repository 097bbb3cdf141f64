"""Was a picture ever stored with losses, whatever kind of file holds it now?

JPEG cuts a picture into blocks of 8 × 8 pixels and keeps whole multiples of a step of each block's
cosine transform. Pictures saved anew as PNG or TIFF keep that: on the old grid of blocks, and on no
other, the transform's values still lie near multiples of one step each. Turned, scaled or sharpened
pictures have lost the trace.

References
----------
ITU-T T.81 (1992), annex A.3: the transform and its quantization.
"""

from __future__ import annotations

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.picture.header import Stored

Floats = NDArray[np.float32]

BLOCK = 8
"""Side of a block, px."""
LOOKED_AT = ((0, 1), (1, 0), (1, 1), (0, 2), (2, 0), (1, 2), (2, 1))
"""Values of the transform that are looked at, as frequencies down and across: cloth has much of
these low ones, and files keep them most finely, so that they lie on many multiples."""
STEPS = np.arange(2, 21)
"""Steps tried, grey levels: finer ones hardly move the light, coarser ones show at a glance."""
SIDE, ACROSS = 80, 3
"""Nine parts of 80 pixels: 729 blocks on each grid."""
NEAR, FEWEST_VALUES = 0.4, 100
"""Mean cosine of the turns from multiple to multiple, over so many values at least: beyond chance
by six standard deviations, and 0.5 to 0.9 for files of quality 90 to 85."""
FEWEST = 3
"""So many of the values looked at must tell of the same grid."""
UNLIKE = 0.5
"""Share of the blocks that must differ: where a drawing repeats with the blocks, all lie near some
multiple of some step."""
LUMA = np.array([[0.299, 0.587, 0.114]], np.float32)
"""What colour files keep most finely (ITU-T T.871)."""


def step_of_losses(stored: Stored) -> float:
    """Say how coarsely the picture was ever stored in blocks of a cosine transform, as JPEG does.

    Parameters
    ----------
    stored : ndarray, shape (rows, columns) or (rows, columns, 3), uint8 or uint16
        However it is turned.

    Returns
    -------
    float
        The usual step of the transform's low frequencies, grey levels: 2 at quality 90, 4 at 85, 6
        at 75, 12 at 50. 0 where no trace is found; quality 95 and more leaves none.
    """
    if stored.dtype != np.uint8 or min(stored.shape[:2]) < 2 * BLOCK:
        return 0.0
    parts = _parts(stored)
    looked_at = [_transforms(parts, down, across) for down, across in LOOKED_AT]
    steps = np.stack([_steps(values) for values in looked_at])
    grid = int(np.argmax((steps > 0).sum(axis=0)))
    told = np.flatnonzero(steps[:, grid])
    if len(told) < FEWEST or not all(_differ(looked_at[k][:, grid]) for k in told):
        return 0.0
    return float(np.median(steps[told, grid]))


def _parts(stored: Stored) -> list[Floats]:
    """Cut parts, evenly spread, whose first pixels lie on one grid of blocks."""
    sides = [min(SIDE, length // BLOCK * BLOCK) for length in stored.shape[:2]]
    starts = [
        np.linspace(0, length - side, ACROSS if length > side else 1).astype(int) // BLOCK * BLOCK
        for length, side in zip(stored.shape[:2], sides, strict=True)
    ]
    cut = [
        stored[row : row + sides[0], column : column + sides[1]].astype(np.float32)
        for row in starts[0]
        for column in starts[1]
    ]
    if stored.ndim == 2:
        return cut
    return [np.asarray(cv2.transform(part, LUMA), np.float32) for part in cut]


def _transforms(parts: list[Floats], down: int, across: int) -> Floats:
    """One value of the cosine transform of every block on each of the 64 grids: (blocks, 64)."""
    rows, columns = (length // BLOCK - 1 for length in parts[0].shape)
    blocks = []
    for part in parts:
        moved = cv2.sepFilter2D(part, -1, _wave(across), _wave(down), anchor=(0, 0))
        cut = moved[: rows * BLOCK, : columns * BLOCK].reshape(rows, BLOCK, columns, BLOCK)
        blocks.append(cut.transpose(0, 2, 1, 3).reshape(-1, BLOCK * BLOCK))
    return np.asarray(np.concatenate(blocks), np.float32)


def _wave(frequency: int) -> Floats:
    """One row of the transform (A.3.3)."""
    size = np.sqrt((1 if frequency == 0 else 2) / BLOCK)
    turns = (2 * np.arange(BLOCK) + 1) * frequency * np.pi / (2 * BLOCK)
    return np.asarray(size * np.cos(turns), np.float32)


def _steps(values: Floats) -> NDArray[np.int64]:
    """Coarsest step near whose multiples, 0 left out, the values lie on each grid; 0 for none."""
    found, size = np.zeros(values.shape[1], np.int64), np.abs(values)
    ones = np.ones(len(values), np.float32)  # sums by multiplying: ten times as fast as summing
    for step in STEPS:
        there = (size > step / 2).astype(np.float32)
        counts = ones @ there
        if counts.max() < FEWEST_VALUES:
            break
        there *= np.cos(values * np.float32(2 * np.pi / step))
        found[(ones @ there > NEAR * counts) & (counts >= FEWEST_VALUES)] = step
    return found


def _differ(values: Floats) -> bool:
    """Say whether the blocks are not all repeats of a few."""
    return len(np.unique(values.round(3))) > UNLIKE * values.size


__all__ = ["step_of_losses"]
