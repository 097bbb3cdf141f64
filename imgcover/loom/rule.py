"""Draws rules: what does a graduated rule of known division look like beside the cloth?

A rule is drawn flat at several times the picture's resolution, lines with their exact coverage of
each pixel, and then laid into the picture by a homography. The truth is the homography.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import cv2
import numpy as np
from numpy.typing import NDArray

INCH_MM = 25.4


class Division(StrEnum):
    """The smallest division of a drawn scale."""

    MM = "1 mm"
    HALF_MM = "1/2 mm"
    TENTH = "1/10 in"
    SIXTEENTH = "1/16 in"
    THIRTYSECOND = "1/32 in"
    SIXTYFOURTH = "1/64 in"


STEP_MM = {
    Division.MM: 1.0,
    Division.HALF_MM: 0.5,
    Division.TENTH: INCH_MM / 10,
    Division.SIXTEENTH: INCH_MM / 16,
    Division.THIRTYSECOND: INCH_MM / 32,
    Division.SIXTYFOURTH: INCH_MM / 64,
}

STEPS = {
    Division.MM: (1, 5, 10),
    Division.HALF_MM: (1, 2, 10, 20),
    Division.TENTH: (1, 5, 10),
    Division.SIXTEENTH: (1, 2, 4, 8, 16),
    Division.THIRTYSECOND: (1, 2, 4, 8, 16, 32),
    Division.SIXTYFOURTH: (1, 2, 4, 8, 16, 32, 64),
}
"""Every how many divisions a line grows longer, shortest lines first."""


class Material(StrEnum):
    """What the rule is made of: its ground, not its colour."""

    PLASTIC = "plastic"
    STEEL = "steel"
    WOOD = "wood"
    TAPE = "tape"
    BLOCKS = "blocks"
    """A museum rule: alternating dark and light blocks behind the line scale's foot."""


@dataclass(frozen=True, slots=True)
class DrawnScale:
    """One graduated edge of a rule; lengths are mm."""

    division: Division
    line_lengths: tuple[float, ...]
    """One for each step of `STEPS[division]`, shortest first."""
    line_width: float = 0.18
    foot: float = 0.0
    """Distance of the lines' foot from the rule's edge."""
    start: float = 6.0
    """Distance of line 0 from the rule's end."""
    digits: float = 2.5
    """Height of the digits; 0 for none."""
    baseline: bool = False
    """Whether a line joins the feet of the graduations."""


@dataclass(frozen=True, slots=True)
class DrawnRule:
    """A rule to draw; lengths are mm, lightnesses are linear light 0…1."""

    near: DrawnScale | None
    far: DrawnScale | None
    length: float = 150.0
    width: float = 30.0
    material: Material = Material.PLASTIC
    body: float = 0.75
    ink: float = 0.05
    wear: float = 0.0
    """Share of each line's contrast that is lost, at the worst place."""
    dust: float = 0.0
    """Specks and fibres a cm²."""


def draw_rule(
    rule: DrawnRule, *, px_per_mm: float, generator: np.random.Generator
) -> NDArray[np.float32]:
    """Draw a rule flat, its near edge along the last row.

    Parameters
    ----------
    rule : DrawnRule
        What to draw.
    px_per_mm : float
        Of the drawing.
    generator : numpy.random.Generator
        For ground, wear and dust.

    Returns
    -------
    ndarray, shape (width, length) in drawn pixels, float32, linear light 0…1
    """
    shape = (round(rule.width * px_per_mm), round(rule.length * px_per_mm))
    ground = _ground(rule, shape, px_per_mm, generator)
    ink = np.zeros(shape, dtype=np.float32)
    for scale, flipped in ((rule.near, True), (rule.far, False)):
        if scale is not None:
            drawn = _scale_ink(scale, shape, rule, px_per_mm)
            ink = np.maximum(ink, drawn[::-1, ::-1] if flipped else drawn)
    if rule.wear:
        rough = _cloud(shape, 4.0 * px_per_mm, generator)
        ink *= 1.0 - rule.wear * np.clip(0.5 + rough, 0.0, 1.0)
    drawn = ground * (1.0 - ink) + rule.ink * ink
    if rule.dust:
        _strew(drawn, rule.dust * rule.length * rule.width / 100.0, px_per_mm, generator)
    return np.asarray(np.clip(drawn, 0.0, 1.0), dtype=np.float32)


def lay_rule(
    picture: NDArray[np.float32],
    flat: NDArray[np.float32],
    *,
    px_per_mm: float,
    mm_to_picture: NDArray[np.float64],
    shadow: float = 0.0,
    clear: bool = False,
    oversample: int = 2,
) -> NDArray[np.float32]:
    """Lay a drawn rule into a picture.

    Parameters
    ----------
    picture : ndarray, shape (rows, columns), float32, linear light 0…1
        What it is laid on; not changed.
    flat : ndarray
        From `draw_rule`.
    px_per_mm : float
        Of `flat`.
    mm_to_picture : ndarray, shape (3, 3)
        Homography from mm on the rule (x along it, y across, origin at the drawing's first
        corner) to picture pixels.
    shadow : float
        How far, in picture pixels, the rule's shadow reaches.
    clear : bool
        Whether the rule is of clear plastic: `flat` is then what it lets through, and the cloth
        shows under it.
    oversample : int
        Picture pixels are averaged from this many samples squared.

    Returns
    -------
    ndarray, shape (rows, columns), float32, linear light 0…1
    """
    rows, columns = picture.shape
    from_flat = np.array([[1, 0, 0.5], [0, 1, 0.5], [0, 0, px_per_mm]]) / px_per_mm
    shift = (oversample - 1) / 2
    to_fine = np.array([[oversample, 0, shift], [0, oversample, shift], [0, 0, 1.0]])
    matrix = to_fine @ mm_to_picture @ from_flat
    size = (columns * oversample, rows * oversample)
    light = cv2.warpPerspective(flat, matrix, size, flags=cv2.INTER_LINEAR)
    mask = cv2.warpPerspective(np.ones_like(flat), matrix, size, flags=cv2.INTER_LINEAR)
    light = cv2.resize(light, (columns, rows), interpolation=cv2.INTER_AREA)
    mask = cv2.resize(mask, (columns, rows), interpolation=cv2.INTER_AREA)
    under = picture
    if shadow:
        dark = cv2.GaussianBlur(mask, (0, 0), shadow)
        under = (picture * (1.0 - 0.5 * dark)).astype(np.float32)
    if clear:
        return (under * (1.0 - mask + light)).astype(np.float32)
    return (under * (1.0 - mask) + light).astype(np.float32)


def squared_paper(
    shape: tuple[int, int],
    *,
    px_per_mm: float,
    square_mm: float = 1.0,
    line_mm: float = 0.12,
    heavy_every: int = 5,
) -> NDArray[np.float32]:
    """Draw squared paper: every `heavy_every`-th line heavier. It is not a rule.

    Returns
    -------
    ndarray, shape `shape`, float32, linear light 0…1
    """
    paper = np.full(shape, 0.85, dtype=np.float32)
    for axis in (0, 1):
        centres = (np.arange(shape[axis]) + 0.5) / px_per_mm
        number = np.round(centres / square_mm)
        distance = np.abs(centres - number * square_mm) * px_per_mm
        heavy = np.where(number % heavy_every == 0, 2.0, 1.0)
        cover = np.clip(heavy * line_mm * px_per_mm / 2 + 0.5 - distance, 0.0, 1.0)
        dark = (1.0 - 0.25 * heavy * cover).astype(np.float32)
        paper *= dark[:, None] if axis == 0 else dark[None, :]
    return paper


def _scale_ink(
    scale: DrawnScale, shape: tuple[int, int], rule: DrawnRule, px_per_mm: float
) -> NDArray[np.float32]:
    """Return the share of each pixel that is inked, the scale's edge along row 0."""
    ink = np.zeros(shape, dtype=np.float32)
    step = STEP_MM[scale.division]
    steps = STEPS[scale.division]
    count = int((rule.length - 2 * scale.start) / step + 1e-9) + 1
    half = scale.line_width / 2
    for number in range(count):
        level = max(i for i, every in enumerate(steps) if number % every == 0)
        centre = scale.start + number * step
        rows = _cover(scale.foot, scale.foot + scale.line_lengths[level], shape[0], px_per_mm)
        columns = _cover(centre - half, centre + half, shape[1], px_per_mm)
        ink[rows[0], columns[0]] = np.maximum(
            ink[rows[0], columns[0]], rows[1][:, None] * columns[1][None, :]
        )
    if scale.baseline:
        rows = _cover(scale.foot - half, scale.foot + half, shape[0], px_per_mm)
        end = scale.start + (count - 1) * step
        columns = _cover(scale.start - half, end + half, shape[1], px_per_mm)
        ink[rows[0], columns[0]] = np.maximum(
            ink[rows[0], columns[0]], rows[1][:, None] * columns[1][None, :]
        )
    if scale.digits:
        _write_digits(ink, scale, count, px_per_mm)
    if rule.material is Material.BLOCKS:
        _write_blocks(ink, scale, count, px_per_mm)
    return ink


def _cover(
    start: float, stop: float, size: int, px_per_mm: float
) -> tuple[slice, NDArray[np.float32]]:
    """Return which pixels an interval of mm touches, and how much of each it covers."""
    first, last = start * px_per_mm, stop * px_per_mm
    low, high = max(0, int(np.floor(first))), min(size, int(np.ceil(last)))
    pixels = np.arange(low, max(low, high))
    cover = np.minimum(pixels + 1, last) - np.maximum(pixels, first)
    return slice(low, max(low, high)), np.clip(cover, 0.0, 1.0).astype(np.float32)


def _write_digits(
    ink: NDArray[np.float32], scale: DrawnScale, count: int, px_per_mm: float
) -> None:
    """Number the longest lines, beyond their ends."""
    every = STEPS[scale.division][-1]
    height = scale.digits * px_per_mm
    font = cv2.FONT_HERSHEY_SIMPLEX
    thickness = max(1, round(height / 9))
    size = height / 21.0
    top = scale.foot + max(scale.line_lengths) + 0.4
    for number in range(every, count, every):
        words = str(number // every)
        (width, tall), _ = cv2.getTextSize(words, font, size, thickness)
        canvas = np.zeros((tall + 2 * thickness, width + 2 * thickness), dtype=np.uint8)
        cv2.putText(canvas, words, (thickness, tall), font, size, 255, thickness, cv2.LINE_AA)
        column = round((scale.start + number * STEP_MM[scale.division]) * px_per_mm) - width // 2
        row = round(top * px_per_mm)
        place = ink[row : row + canvas.shape[0], column : column + canvas.shape[1]]
        if column > 0 and place.shape == canvas.shape:
            np.maximum(place, canvas / np.float32(255), out=place)


def _write_blocks(
    ink: NDArray[np.float32], scale: DrawnScale, count: int, px_per_mm: float
) -> None:
    """Lay a row of alternating blocks, one for each longest line, beyond the digits."""
    every = STEPS[scale.division][-1]
    step = STEP_MM[scale.division]
    top = scale.foot + max(scale.line_lengths) + scale.digits + 1.5
    rows = _cover(top, top + 4.0, ink.shape[0], px_per_mm)
    for number in range(0, count - every, 2 * every):
        left = scale.start + number * step
        columns = _cover(left, left + every * step, ink.shape[1], px_per_mm)
        ink[rows[0], columns[0]] = rows[1][:, None] * columns[1][None, :]


def _ground(
    rule: DrawnRule, shape: tuple[int, int], px_per_mm: float, generator: np.random.Generator
) -> NDArray[np.float32]:
    """Draw the rule's bare body: brushed steel, wood grain, moulded plastic, woven tape."""
    rows, columns = shape
    body = np.full(shape, rule.body, dtype=np.float32)
    if rule.material is Material.STEEL:
        lines = generator.normal(0.0, 0.06, (rows, 1)).astype(np.float32)
        glare = np.linspace(0, 2 * np.pi, columns, dtype=np.float32)[None, :]
        sheen = 0.15 * np.cos(glare * 1.5 + generator.uniform(0, 6))
        return np.asarray(body * (1 + lines + sheen), dtype=np.float32)
    if rule.material is Material.WOOD:
        grain = generator.normal(0.0, 1.0, (rows, max(2, columns // 60)))
        wide = cv2.resize(grain.astype(np.float32), (columns, rows), interpolation=cv2.INTER_LINEAR)
        return np.asarray(body * (1 + 0.08 * cv2.GaussianBlur(wide, (0, 0), 1.0)), dtype=np.float32)
    if rule.material is Material.TAPE:
        y, x = np.mgrid[0:rows, 0:columns].astype(np.float32) * np.float32(6.0 / px_per_mm)
        return np.asarray(body * (1 + 0.04 * np.sin(x * 1.3) * np.sin(y * 1.1)), dtype=np.float32)
    speckle = generator.normal(0.0, 0.01, shape).astype(np.float32)
    return np.asarray(body * (1 + speckle), dtype=np.float32)


def _cloud(
    shape: tuple[int, int], size: float, generator: np.random.Generator
) -> NDArray[np.float32]:
    """Return a cloudy field of standard deviation 0.5 whose clouds are `size` pixels wide."""
    coarse = (max(2, int(shape[0] / size) + 2), max(2, int(shape[1] / size) + 2))
    field = generator.normal(0.0, 0.5, coarse).astype(np.float32)
    return np.asarray(
        cv2.resize(field, (shape[1], shape[0]), interpolation=cv2.INTER_CUBIC), dtype=np.float32
    )


def _strew(
    drawn: NDArray[np.float32], number: float, px_per_mm: float, generator: np.random.Generator
) -> None:
    """Strew specks and short fibres of light or dark dust, in place."""
    rows, columns = drawn.shape
    for _ in range(generator.poisson(number)):
        x, y = generator.uniform(0, columns), generator.uniform(0, rows)
        tone = float(generator.choice([0.15, 0.9]))
        if generator.random() < 0.5:
            radius = max(1, round(generator.uniform(0.05, 0.25) * px_per_mm))
            cv2.circle(drawn, (int(x), int(y)), radius, tone, -1, cv2.LINE_AA)
        else:
            turn = generator.uniform(0, np.pi)
            reach = generator.uniform(0.5, 3.0) * px_per_mm
            end = (int(x + reach * np.cos(turn)), int(y + reach * np.sin(turn)))
            width = max(1, round(0.05 * px_per_mm))
            cv2.line(drawn, (int(x), int(y)), end, tone, width, cv2.LINE_AA)


__all__ = [
    "STEPS",
    "STEP_MM",
    "Division",
    "DrawnRule",
    "DrawnScale",
    "Material",
    "draw_rule",
    "lay_rule",
    "squared_paper",
]
