"""What lies beside cloth and looks like a rule without being one; drawn as badly seen as rules are.

Truth is drawn: no picture here holds a rule. Squared paper has a pitch, and in some its heavy lines
reach over the edge like a rule's long lines: then a reading must be that pitch, and no other unit.
"""

from __future__ import annotations

from dataclasses import dataclass

import cv2
import numpy as np
from drawn_rules import compressed, woven
from numpy.typing import NDArray

from imgcover.loom.rule import INCH_MM

KINDS = (
    "mm paper",
    "inch paper",
    "wide squares",
    "comb",
    "zip",
    "bar code",
    "keys",
    "tassels",
    "protractor",
    "lines of print",
    "cloth",
    "stitches",
)
FINE = 3
"""Drawn pixels to one of the picture, along each axis."""


@dataclass(frozen=True, slots=True)
class Bare:
    """One picture, and the only scale that may be read in it, px/mm, if any."""

    seed: int
    light: NDArray[np.float32]
    px_per_mm: float | None
    what: str


def harsh_bare(seed: int) -> Bare:
    """Draw one picture; everything follows from the seed."""
    generator = np.random.default_rng([29, seed])
    kind = KINDS[seed % len(KINDS)]
    shape = (int(generator.integers(700, 1200)), int(generator.integers(700, 1200)))
    thread = generator.uniform(3, 16)
    light = woven(shape, thread_px=thread, turn=generator.normal(0, 0.2), generator=generator)
    pitch = generator.uniform(4.5, 15)
    truth = None
    if kind != "cloth":
        drawn, truth = _drawn(kind, pitch, generator)
        light = laid(light, drawn, generator)
    light = cv2.GaussianBlur(light, (0, 0), generator.uniform(0.5, 0.15 * pitch))
    rows, columns = shape
    y, x = np.ogrid[-1 : 1 : rows * 1j, -1 : 1 : columns * 1j]  # type: ignore[misc]
    slope = generator.uniform(-0.25, 0.25, 2)
    light = light * (0.75 + slope[0] * x + slope[1] * y)
    light = light + generator.normal(0, generator.uniform(0.003, 0.015), shape)
    light = ((np.round(np.clip(light, 0, 1) ** (1 / 2.2) * 255) / 255) ** 2.2).astype(np.float32)
    if generator.random() < 0.5:
        light = compressed(light, int(generator.integers(55, 95)))
    return Bare(seed, light, truth, f"{kind} pitch {pitch:.1f} px")


def _drawn(
    kind: str, pitch: float, generator: np.random.Generator
) -> tuple[NDArray[np.float32], float | None]:
    """Draw the thing flat, `FINE` times finer, its lines `pitch` picture pixels apart."""
    if kind in ("mm paper", "inch paper", "wide squares"):
        return _paper(kind, pitch, generator)
    step = pitch * FINE
    count = int(generator.integers(40, 90))
    size = (int(18 * step), int(count * step))
    reach = np.full(count, generator.uniform(3, 6))
    number = np.arange(count)
    if kind == "comb":
        reach = np.where(generator.random(count) < 0.1, reach * generator.uniform(0.3, 0.8), reach)
    elif kind == "bar code":
        guards = np.isin(number % generator.integers(20, 50), (0, 2))
        reach = np.where(guards, reach * 1.2, reach)
    elif kind == "keys":
        reach = np.where(np.isin(number % 12, (1, 3, 6, 8, 10)), 0.6 * reach, reach)
    elif kind == "tassels":
        every = int(generator.choice([2, 3, 4, 6, 7, 8, 9, 12, 15, 16, 25]))
        reach = np.where(number % every == 0, 1.5 * reach, reach)
        reach = reach + generator.normal(0, generator.uniform(0.05, 0.5), count)
    elif kind == "protractor":
        return _protractor(step, generator), None
    paper = np.full(size, generator.uniform(0.5, 0.9), np.float32)
    ink = np.float32(generator.uniform(0.04, 0.4))
    width = generator.uniform(0.15, 0.5) * step
    for index, height in zip(number, reach, strict=True):
        left, right = round((index + 0.3) * step), round((index + 0.3) * step + width)
        if kind == "bar code" and generator.random() < 0.5 and height == reach.min():
            continue
        tall = round(height * step)
        if kind == "zip":
            start = round((4 + 0.8 * (index % 2)) * step)
            paper[start : start + tall // 2, left:right] = ink
        elif kind == "stitches":
            tall = round((1 + index % 3) * step)
            paper[:tall, left:right] = ink
        elif kind == "lines of print":
            for start in range(0, size[0], round(3 * step)):
                if generator.random() < 0.8:
                    high = round(step * generator.uniform(1, 2))
                    paper[start : start + high, left:right] = ink
        else:
            paper[:tall, left:right] = ink
    return paper, None


def _paper(
    kind: str, pitch: float, generator: np.random.Generator
) -> tuple[NDArray[np.float32], float | None]:
    """Squared paper; on some the heavier lines reach over the frame of the squares."""
    square = {"mm paper": 1.0, "inch paper": INCH_MM / 10, "wide squares": 5.0}[kind]
    if kind == "wide squares":
        square = float(generator.choice([4.0, 5.0, INCH_MM / 4, INCH_MM / 8]))
    step, count = pitch * FINE, int(generator.integers(40, 80))
    margin = int(6 * step)
    across = int(generator.integers(15, 40))
    paper = np.full((int(across * step) + margin, int(count * step)), 0.85, np.float32)
    over = generator.random() < 0.4
    weights = {1: generator.uniform(0.1, 0.4), 5: generator.uniform(0.2, 0.6), 10: 0.7}
    every = (1, 5, 10) if kind != "wide squares" else (1,)
    for axis, lines in ((0, across), (1, count)):
        for index in range(lines):
            level = max(each for each in every if index % each == 0)
            width = max(1, round(step * (0.08 + 0.03 * every.index(level))))
            start = margin - (round((1 + every.index(level)) * step) if over and axis else 0)
            at = round(index * step) + (margin if axis == 0 else 0)
            part = np.s_[start:, at : at + width] if axis else np.s_[at : at + width, :]
            paper[part] = np.minimum(paper[part], 0.85 * (1 - weights[level]))
    return paper, pitch / square


def _protractor(step: float, generator: np.random.Generator) -> NDArray[np.float32]:
    """Degrees on an arc: every fifth and tenth line longer, on a curve."""
    radius = step * 180 / np.pi
    size = (int(1.1 * radius), int(2.2 * radius))
    paper = np.full(size, generator.uniform(0.6, 0.9), np.float32)
    middle = np.array([1.1 * radius, 1.05 * radius])
    for degree in range(181):
        high = 3.0 + 1.5 * (degree % 5 == 0) + 1.5 * (degree % 10 == 0)
        way = np.array([np.cos(np.radians(degree)), -np.sin(np.radians(degree))])
        ends = [tuple(int(v) for v in middle + way * r) for r in (radius, radius - high * step)]
        cv2.line(paper, ends[0], ends[1], 0.1, max(1, round(0.15 * step)), cv2.LINE_AA)
    return paper


def laid(
    cloth: NDArray[np.float32], drawn: NDArray[np.float32], generator: np.random.Generator
) -> NDArray[np.float32]:
    """Lay it on the cloth at any turn, so that its upper edge shows."""
    rows, columns = cloth.shape
    turn = generator.choice([0, 90, 180, 270]) + generator.normal(0, 4)
    if generator.random() < 0.3:
        turn = generator.uniform(0, 360)
    c, s = np.cos(np.radians(turn)) / FINE, np.sin(np.radians(turn)) / FINE
    linear = np.array([[c, -s], [s, c]])
    middle = np.array([columns, rows]) * generator.uniform(0.35, 0.65, 2)
    offset = middle - linear @ [drawn.shape[1] / 2, drawn.shape[0] / 2]
    matrix = np.column_stack([linear, offset])
    soft = cv2.GaussianBlur(drawn, (0, 0), FINE / 2.5)
    size = (columns, rows)
    seen = cv2.warpAffine(soft, matrix, size, flags=cv2.INTER_LINEAR)
    mask = cv2.warpAffine(np.ones_like(drawn), matrix, size, flags=cv2.INTER_LINEAR)
    return (cloth * (1 - mask) + seen * mask).astype(np.float32)
