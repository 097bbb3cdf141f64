"""Pictures of cloth with a rule of known scale in them, for the tests and the sweep."""

from __future__ import annotations

from dataclasses import dataclass, replace

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.rule import (
    Division,
    DrawnRule,
    DrawnScale,
    Material,
    draw_rule,
    lay_rule,
    squared_paper,
)

LENGTHS_MM = {
    Division.MM: (3.5, 5.0, 6.5),
    Division.HALF_MM: (2.2, 3.2, 4.6, 6.0),
    Division.TENTH: (3.0, 4.5, 6.5),
    Division.SIXTEENTH: (2.2, 3.2, 4.4, 5.8, 8.0),
    Division.THIRTYSECOND: (1.8, 2.7, 3.6, 4.6, 5.8, 8.0),
    Division.SIXTYFOURTH: (1.6, 2.3, 3.0, 3.8, 4.8, 6.0, 8.0),
}
"""Of the lines, as rules in a drawer have them; a case makes all longer or shorter by a quarter."""

COARSEST_PX_PER_MM = {
    Division.MM: 5.5,
    Division.HALF_MM: 10.0,
    Division.TENTH: 5.0,
    Division.SIXTEENTH: 5.0,
    Division.THIRTYSECOND: 7.5,
    Division.SIXTYFOURTH: 14.0,
}
"""About five pixels a division, and four for the mm scale's inch neighbours."""


@dataclass(frozen=True, slots=True)
class RuleCase:
    """One drawn picture with its truth."""

    seed: int
    light: NDArray[np.float32]
    px_per_mm: float | None
    """None where there is no rule."""
    divisions: tuple[Division, ...]
    what: str


class Held:
    """An array of linear light that can be searched like a picture."""

    def __init__(self, light: NDArray[np.float32]) -> None:
        self.held = light
        self.rows, self.columns = light.shape

    def coarse(self, factor: int) -> NDArray[np.float32]:
        """Give means over blocks."""
        if factor == 1:
            return self.held
        size = (self.columns // factor, self.rows // factor)
        cut = self.held[: size[1] * factor, : size[0] * factor]
        return np.asarray(cv2.resize(cut, size, interpolation=cv2.INTER_AREA))


def woven(
    shape: tuple[int, int], *, thread_px: float, turn: float, generator: np.random.Generator
) -> NDArray[np.float32]:
    """Draw a simple woven ground: plain, twill or rib, uneven threads, hairs."""
    rows, columns = shape
    y, x = np.mgrid[0:rows, 0:columns].astype(np.float32)
    along = np.cos(turn) * x + np.sin(turn) * y
    across = (-np.sin(turn) * x + np.cos(turn) * y) * generator.uniform(0.8, 1.3)
    wander = cv2.GaussianBlur(generator.normal(0, 1, shape).astype(np.float32), (0, 0), 25)
    wander *= 0.08 * thread_px / max(float(wander.std()), 1e-6)
    u, v = (along + wander) / thread_px, (across + wander) / thread_px
    end, pick = np.floor(u), np.floor(v)
    kind = generator.integers(0, 4)
    up = [
        (end + pick) % 2 == 0,
        (end + pick) % 3 == 0,
        (end + pick) % 4 < 2,
        (end + np.floor(pick / 2)) % 2 == 0,
    ][kind]
    warp = np.sqrt(np.clip(1 - (2 * (u - end) - 1) ** 2, 0, 1))
    weft = np.sqrt(np.clip(1 - (2 * (v - pick) - 1) ** 2, 0, 1))
    tones = generator.uniform(0.1, 0.7, 2)
    picture = np.where(up, tones[0] * (0.3 + 0.7 * warp), tones[1] * (0.3 + 0.7 * weft))
    if generator.random() < 0.3:
        stripe = generator.integers(4, 13)
        picture = picture * np.where(end % stripe < stripe // 2, 1.0, generator.uniform(0.4, 0.9))
    picture *= 1 + generator.normal(0, 0.05, shape)
    return np.asarray(np.clip(picture, 0, 1), dtype=np.float32)


def rule_case(
    seed: int, *, divisions: tuple[Division, ...] | None = None, lean: float | None = None
) -> RuleCase:
    """Draw one picture with a rule: everything about it follows from the seed."""
    generator = np.random.default_rng([7, seed])
    if divisions is None:
        divisions = _divisions(generator)
    floor = max(COARSEST_PX_PER_MM[each] for each in divisions)
    px_per_mm = float(np.exp(generator.uniform(np.log(floor), np.log(max(26.0, floor * 1.3)))))
    shape = (int(generator.integers(900, 1500)), int(generator.integers(900, 1500)))
    rule = _rule(divisions, generator)
    turn = _turn(generator)
    tilt = generator.random() < 0.06 or lean is not None
    flat_scale = max(3.0 * px_per_mm, 40.0)
    rule = replace(rule, length=min(rule.length, 1.6 * float(np.hypot(*shape)) / px_per_mm))
    flat = draw_rule(rule, px_per_mm=flat_scale, generator=generator)
    place = _place(rule, shape, px_per_mm, turn, generator)
    if tilt:
        place = _tilted(place, shape, generator, lean or 2e-5)
    thread = generator.uniform(0.2, 0.7) * px_per_mm
    ground = woven(
        shape, thread_px=max(thread, 3.0), turn=generator.normal(0, 0.05), generator=generator
    )
    # what came later draws from a generator of its own, so that a seed's picture stays the same
    later = np.random.default_rng([13, seed])
    clear = rule.material is Material.PLASTIC and rule.body > 0.5 and later.random() < 0.3
    light = lay_rule(
        ground,
        np.clip(flat * 1.25, 0, 0.95).astype(np.float32) if clear else flat,
        px_per_mm=flat_scale,
        mm_to_picture=place,
        shadow=generator.choice([0.0, 0.5 * px_per_mm]),
        clear=clear,
    )
    if generator.random() < 0.25:
        light = _flap(light, ground, place, rule, generator)
    light = camera(light, generator)
    if later.random() < 0.3:
        light = compressed(light, int(later.integers(70, 96)))
    what = f"{'+'.join(divisions)} {rule.material} {px_per_mm:.2f} px/mm {np.degrees(turn):.1f}°"
    extras = (
        (" clear" if clear else "")
        + (f" wear {rule.wear:.1f}" if rule.wear else "")
        + (" dust" if rule.dust else "")
    )
    return RuleCase(
        seed, light, px_per_mm, divisions, what + extras + (" tilted away" if tilt else "")
    )


def bare_case(seed: int) -> RuleCase:
    """Draw one picture without a rule: cloth, squared paper, stripes, a comb, print."""
    generator = np.random.default_rng([11, seed])
    shape = (int(generator.integers(700, 1300)), int(generator.integers(700, 1300)))
    kind = seed % 5
    cloth = woven(
        shape,
        thread_px=generator.uniform(3, 20),
        turn=generator.uniform(-0.3, 0.3),
        generator=generator,
    )
    if kind == 1:
        half = shape[1] // 2
        paper = squared_paper(
            shape,
            px_per_mm=generator.uniform(5, 20),
            square_mm=float(generator.choice([1.0, 2.0, 5.0])),
            heavy_every=int(generator.choice([1, 5, 10])),
        )
        cloth[:, half:] = paper[:, half:]
    elif kind == 2:
        edge = int(generator.integers(shape[0] // 4, shape[0] // 2))
        _fringe(cloth, edge, generator)
    elif kind == 3:
        _print_words(cloth, generator)
    elif kind == 4:
        period = generator.integers(5, 11) * generator.uniform(6, 12)
        x = np.arange(shape[1])
        cloth *= np.where((x % period) < period * 0.15, 0.4, 1.0).astype(np.float32)
    what = ("cloth", "squared paper", "fringe", "print", "stripes")[kind]
    return RuleCase(seed, camera(cloth, generator), None, (), what)


def camera(light: NDArray[np.float32], generator: np.random.Generator) -> NDArray[np.float32]:
    """Blur, uneven light, noise and eight bits."""
    rows, columns = light.shape
    seen = cv2.GaussianBlur(light, (0, 0), generator.uniform(0.4, 1.0))
    slope = generator.uniform(-0.15, 0.15, 2)
    y, x = np.ogrid[-1 : 1 : rows * 1j, -1 : 1 : columns * 1j]  # type: ignore[misc]
    seen = seen * (0.8 + slope[0] * x + slope[1] * y)
    seen = seen + generator.normal(0, generator.uniform(0.002, 0.012), light.shape)
    levels = np.round(np.clip(seen, 0, 1) ** (1 / 2.2) * 255) / 255
    return np.asarray(levels**2.2, dtype=np.float32)


def compressed(light: NDArray[np.float32], quality: int) -> NDArray[np.float32]:
    """Store as JPEG and read back."""
    stored = np.round(light ** (1 / 2.2) * 255).astype(np.uint8)
    _, coded = cv2.imencode(".jpg", stored, [cv2.IMWRITE_JPEG_QUALITY, quality])
    return np.asarray((cv2.imdecode(coded, 0) / np.float32(255)) ** 2.2, dtype=np.float32)


def _divisions(generator: np.random.Generator) -> tuple[Division, ...]:
    kind = generator.choice(8, p=[0.38, 0.16, 0.04, 0.08, 0.08, 0.06, 0.12, 0.08])
    pairs: tuple[tuple[Division, ...], ...] = (
        (Division.MM,),
        (Division.HALF_MM,),
        (Division.TENTH,),
        (Division.SIXTEENTH,),
        (Division.THIRTYSECOND,),
        (Division.SIXTYFOURTH,),
        (Division.MM, Division.SIXTEENTH),
        (Division.HALF_MM, Division.THIRTYSECOND),
    )
    return pairs[int(kind)]


def _rule(divisions: tuple[Division, ...], generator: np.random.Generator) -> DrawnRule:
    scales = []
    foot = float(generator.choice([0.0, 0.0, 0.6]))
    baseline = bool(foot and generator.random() < 0.4)
    for division in divisions:
        stretch = generator.uniform(0.8, 1.25)
        scales.append(
            DrawnScale(
                division,
                tuple(stretch * each for each in LENGTHS_MM[division]),
                line_width=float(generator.uniform(0.12, 0.22))
                * (0.7 if division is Division.SIXTYFOURTH else 1.0),
                foot=foot,
                digits=float(generator.choice([0.0, 2.0, 2.8])),
                baseline=baseline,
            )
        )
    far = scales[1] if len(scales) > 1 else None
    material = Material(generator.choice(list(Material), p=[0.3, 0.25, 0.15, 0.2, 0.1]))
    light_body = generator.random() < 0.75
    body, ink = (0.7, 0.06) if light_body else (0.06, 0.6)
    if material is Material.STEEL:
        body, ink = 0.45, 0.1
    return DrawnRule(
        scales[0],
        far,
        length=float(generator.choice([100.0, 150.0, 310.0])),
        width=float(generator.uniform(22, 32)) if far else float(generator.uniform(16, 30)),
        material=material,
        body=body * generator.uniform(0.8, 1.2),
        ink=ink,
        wear=float(generator.choice([0.0, 0.0, 0.5, 0.8])),
        dust=float(generator.choice([0.0, 0.0, 1.0, 3.0])),
    )


def _turn(generator: np.random.Generator) -> float:
    near_axis = generator.random() < 0.6
    base = float(generator.choice([0, 90, 180, 270]))
    turned = base + generator.normal(0, 1.5) if near_axis else generator.uniform(0, 360)
    return float(np.radians(turned))


def _place(
    rule: DrawnRule,
    shape: tuple[int, int],
    px_per_mm: float,
    turn: float,
    generator: np.random.Generator,
) -> NDArray[np.float64]:
    """Return the homography that lays the rule's middle somewhere in the frame."""
    spread = generator.uniform(-0.22, 0.22, 2) * np.array(shape[::-1])
    middle = np.array(shape[::-1]) / 2 + spread
    c, s = px_per_mm * np.cos(turn), px_per_mm * np.sin(turn)
    slide = generator.uniform(-0.15, 0.15) * rule.length
    offset = middle - np.array([[c, -s], [s, c]]) @ [rule.length / 2 + slide, rule.width / 2]
    return np.array([[c, -s, offset[0]], [s, c, offset[1]], [0, 0, 1.0]])


def _tilted(
    place: NDArray[np.float64],
    shape: tuple[int, int],
    generator: np.random.Generator,
    most: float,
) -> NDArray[np.float64]:
    """Tilt the scene about the frame's middle, where its scale stays what it was."""
    x, y = shape[1] / 2, shape[0] / 2
    lean = generator.uniform(-most, most, 2)
    there = np.array([[1, 0, -x], [0, 1, -y], [0, 0, 1.0]])
    back = np.array([[1, 0, x], [0, 1, y], [0, 0, 1.0]])
    away = np.array([[1, 0, 0], [0, 1, 0], [lean[0], lean[1], 1.0]])
    return np.asarray(back @ away @ there @ place)


def _flap(
    light: NDArray[np.float32],
    ground: NDArray[np.float32],
    place: NDArray[np.float64],
    rule: DrawnRule,
    generator: np.random.Generator,
) -> NDArray[np.float32]:
    """Fold cloth over one end of the rule."""
    start = rule.length * generator.uniform(0.65, 0.9)
    corners = np.array([[start, -5], [rule.length + 5, -5], [rule.length + 5, 99], [start, 99.0]])
    corners[:, 1] = np.clip(corners[:, 1], -5, rule.width + 5)
    seen = cv2.perspectiveTransform(corners[None], place)[0]
    mask = np.zeros(light.shape, dtype=np.uint8)
    cv2.fillPoly(mask, [np.round(seen).astype(np.int32)], 1)
    return np.where(mask > 0, ground, light).astype(np.float32)


def _fringe(cloth: NDArray[np.float32], edge: int, generator: np.random.Generator) -> None:
    """Leave only loose ends above an edge: lines of equal pitch and unequal length."""
    pitch = generator.uniform(5, 14)
    bare = generator.uniform(0.6, 0.9)
    cloth[:edge] = bare
    for number in range(int(cloth.shape[1] / pitch)):
        reach = int(generator.uniform(0.3, 1.0) * edge)
        x = round((number + 0.5) * pitch)
        cloth[edge - reach : edge, max(0, x - 1) : x + 2] = 0.25


def _print_words(cloth: NDArray[np.float32], generator: np.random.Generator) -> None:
    """Lay a label with words and a bar code on the cloth."""
    rows, columns = cloth.shape
    label = np.full((rows // 3, columns // 2), 217, dtype=np.uint8)
    for line in range(4):
        words = "".join(generator.choice(list("ABC123 IIIlll|||"), 24))
        cv2.putText(label, words, (10, 25 + 30 * line), 0, 0.8, 13, 2)
    x = 10
    while x < label.shape[1] - 20:
        bar = int(generator.integers(2, 8))
        label[140:, x : x + bar] = 13
        x += bar + int(generator.integers(2, 8))
    cloth[: label.shape[0], : label.shape[1]] = label / np.float32(255)
