"""How one bad photograph of a rule is drawn: the rule flat, bent, laid, partly hidden, and seen."""

from __future__ import annotations

from dataclasses import dataclass, field

import cv2
import numpy as np
from drawn_rules import compressed
from numpy.typing import NDArray
from PIL import Image, ImageDraw, ImageFont


@dataclass(frozen=True, slots=True)
class Edge:
    """One graduated edge to draw; lengths in mm."""

    step: float
    steps: tuple[int, ...]
    heights: tuple[float, ...]
    width: float = 0.18
    wander: float = 0.0
    ragged: float = 0.0
    lost: float = 0.0
    digits: float = 2.6
    touching: bool = False
    foot: float = 0.0


@dataclass(slots=True)
class Look:
    """Everything that makes one picture bad."""

    edges: list[Edge]
    length: float = 150.0
    width: float = 26.0
    body: float = 0.7
    ink: float = 0.06
    px_per_mm: float = 12.0
    shape: tuple[int, int] = (1200, 1400)
    turn: float = 0.0
    grain: float = 0.01
    glare: float = 0.0
    worn: float = 0.0
    bend: float = 0.0
    blur: float = 0.6
    defocus: float = 0.0
    uneven: float = 0.2
    noise: float = 0.006
    jpeg: int = 0
    lean: tuple[float, float] = (0.0, 0.0)
    focal: float = 1.2
    hide: str = ""
    paper: float = 0.0
    notes: list[str] = field(default_factory=list)


def flat(look: Look, scale: float, generator: np.random.Generator) -> NDArray[np.float32]:
    """Draw the rule flat, first edge along the first row, a second along the last."""
    shape = (round(look.width * scale), round(look.length * scale))
    rows, columns = shape
    grain = generator.normal(0, 1, (rows, max(2, columns // 400))).astype(np.float32)
    grain = cv2.GaussianBlur(cv2.resize(grain, (columns, rows)), (0, 0), 0.06 * scale)
    body = look.body * (1 + look.grain * grain / max(float(grain.std()), 1e-6))
    ink = np.zeros(shape, np.float32)
    for edge, turned in zip(look.edges, (False, True), strict=False):
        drawn = _edge_ink(edge, shape, look.length, scale, generator)
        ink = np.maximum(ink, drawn[::-1, ::-1] if turned else drawn)
    if look.worn:
        size = (columns // round(3 * scale) + 2, rows // round(3 * scale) + 2)
        cloud = generator.normal(0.3, 0.6, size[::-1]).astype(np.float32)
        ink *= 1 - np.clip(look.worn * cv2.resize(cloud, (columns, rows)), 0, 1)
    light = body * (1 - ink) + look.ink * ink
    if look.glare:
        across = np.linspace(-2, 2, columns, dtype=np.float32) + generator.uniform(-1.5, 1.5)
        light = light + look.glare * np.exp(-(across**2) * 4)[None, :]
    return np.asarray(np.clip(light, 0, 1), dtype=np.float32)


def _edge_ink(
    edge: Edge, shape: tuple[int, int], length: float, scale: float, generator: np.random.Generator
) -> NDArray[np.float32]:
    """Draw lines of uneven place, width and reach, and digits in a bold face."""
    canvas = Image.new("L", shape[::-1], 0)
    pen = ImageDraw.Draw(canvas)
    count = int((length - 10) / edge.step)
    slow = np.cumsum(generator.normal(0, 1, count))
    slow = slow - np.linspace(slow[0], slow[-1], count)
    slow *= edge.wander / max(float(np.abs(slow).max()), 1e-6)
    font = ImageFont.load_default(max(8, edge.digits * scale * 1.3))
    for number in range(count):
        level = max(i for i, every in enumerate(edge.steps) if number % every == 0)
        if generator.random() < edge.lost:
            continue
        middle = 5 + number * edge.step + slow[number] + generator.normal(0, 0.5 * edge.wander)
        half = edge.width / 2 * generator.uniform(0.85, 1.2)
        low, high = edge.foot, edge.foot + edge.heights[level] + generator.normal(0, edge.ragged)
        # the last pixel is drawn as well: a box ends one before the next begins
        box = [(middle - half) * scale, low * scale, (middle + half) * scale - 1, high * scale - 1]
        pen.rectangle([round(each) for each in box], fill=255)
        if edge.digits and level == len(edge.steps) - 1 and number:
            down = edge.foot + edge.heights[-1] + (-0.5 * edge.digits if edge.touching else 0.5)
            right = middle + (edge.width + 0.1 if edge.touching else -0.4 * edge.digits)
            pen.text(
                (right * scale, down * scale),
                str(number // edge.steps[-1]),
                255,
                font,
                stroke_width=max(1, round(0.12 * scale)),
            )
    return np.asarray(canvas, dtype=np.float32) / 255


def bent(flat: NDArray[np.float32], sag: float) -> NDArray[np.float32]:
    """Bend a tape in its plane: its middle lies `sag` pixels off the line of its ends."""
    rows, columns = flat.shape
    across = np.linspace(-1, 1, columns, dtype=np.float32)
    x = np.tile(np.arange(columns, dtype=np.float32), (rows, 1))
    shift = np.float32(sag) * (1 - across**2)
    y = np.arange(rows, dtype=np.float32)[:, None] - shift[None, :]
    slope = 2 * sag * across / (columns / 2)
    x = x + slope * (y - rows / 2)
    return np.asarray(cv2.remap(flat, x, y, cv2.INTER_LINEAR, borderMode=cv2.BORDER_REPLICATE))


def place(look: Look, generator: np.random.Generator) -> NDArray[np.float64]:
    """Return mm on the rule to picture: laid in the plane, then seen by a camera that leans."""
    size = np.array(look.shape[::-1], dtype=float)
    c, s = look.px_per_mm * np.cos(look.turn), look.px_per_mm * np.sin(look.turn)
    linear = np.array([[c, -s], [s, c]])
    middle = generator.uniform(-0.3, 0.3, 2) * size * (1.0 if not look.hide else 0.5)
    slide = generator.uniform(-0.15, 0.15) * look.length
    offset = middle - linear @ [look.length / 2 + slide, look.width / 2]
    plane = np.eye(3)
    plane[:2, :2], plane[:2, 2] = linear, offset
    a, b = look.lean
    turn_x = np.array([[1, 0, 0], [0, np.cos(a), -np.sin(a)], [0, np.sin(a), np.cos(a)]])
    turn_y = np.array([[np.cos(b), 0, np.sin(b)], [0, 1, 0], [-np.sin(b), 0, np.cos(b)]])
    turned = turn_x @ turn_y
    focal = look.focal * float(size.max())
    # the plane through the origin at distance `focal`: one pixel there is one pixel here
    camera = np.array(
        [
            [focal * turned[0, 0], focal * turned[0, 1], 0.0],
            [focal * turned[1, 0], focal * turned[1, 1], 0.0],
            [turned[2, 0], turned[2, 1], focal],
        ]
    )
    centre = np.eye(3)
    centre[:2, 2] = size / 2 - 0.5
    return np.asarray(centre @ camera @ plane)


def hidden(
    light: NDArray[np.float32],
    ground: NDArray[np.float32],
    place: NDArray[np.float64],
    look: Look,
    generator: np.random.Generator,
) -> NDArray[np.float32]:
    """Lay cloth over parts of the rule."""
    long, wide = look.length, look.width
    u = generator.uniform
    boxes: list[tuple[float, float, float, float]] = []
    if look.hide == "ends":
        shown, start = u(25, 55), u(0.2, 0.5) * long
        boxes = [(-20, -5, start, wide + 5), (start + shown, -5, long + 20, wide + 5)]
    elif look.hide == "feet":
        boxes = [(-20, -5, long + 20, look.edges[0].foot + u(0.2, 1.1) * look.edges[0].heights[0])]
    elif look.hide == "tips":
        boxes = [(-20, u(0.9, 1.3) * look.edges[0].heights[0], long + 20, wide + 5)]
    elif look.hide == "patches":
        boxes = [(x, -5, x + u(3, 9), u(1, wide)) for x in u(0, long, 7)]
    mask = np.zeros(light.shape, np.uint8)
    for x0, y0, x1, y1 in boxes:
        corners = np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]])
        seen = cv2.perspectiveTransform(corners[None], place)[0]
        cv2.fillPoly(mask, [np.round(seen).astype(np.int32)], 1)
    return np.where(mask > 0, ground, light).astype(np.float32)


def seen(
    light: NDArray[np.float32], look: Look, generator: np.random.Generator
) -> NDArray[np.float32]:
    """Lens, uneven light, noise, eight bits, JPEG."""
    rows, columns = light.shape
    light = cv2.GaussianBlur(light, (0, 0), look.blur)
    if look.defocus > 0.5:
        half = int(np.ceil(look.defocus))
        y, x = np.mgrid[-half : half + 1, -half : half + 1]
        disc = np.clip(look.defocus + 0.5 - np.hypot(x, y), 0, 1).astype(np.float32)
        light = cv2.filter2D(light, -1, disc / disc.sum(), borderType=cv2.BORDER_REFLECT)
    y, x = np.ogrid[-1 : 1 : rows * 1j, -1 : 1 : columns * 1j]  # type: ignore[misc]
    way = generator.uniform(0, 2 * np.pi)
    light = light * (0.75 + 0.7 * look.uneven * (np.cos(way) * x + np.sin(way) * y) / 1.5)
    light = light + generator.normal(0, look.noise, light.shape) * np.sqrt(0.2 + np.abs(light))
    stored = np.round(np.clip(light, 0, 1) ** (1 / 2.2) * 255) / 255
    light = (stored**2.2).astype(np.float32)
    return compressed(light, look.jpeg) if look.jpeg else light


__all__ = ["Edge", "Look", "bent", "flat", "hidden", "place", "seen"]
