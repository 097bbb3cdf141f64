"""Rules as bad photographs show them: worn, wandering print, glare, grain, bend, blur, strong tilt.

Harsher than `drawn_rules`, and drawn by other code, so that neither the finder nor its constants
can have been fitted to it. The truth is the homography, and the division each rule was given.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import cv2
import harsh_drawing as drawing
import numpy as np
from drawn_rules import woven
from harsh_drawing import Edge, Look
from numpy.typing import NDArray

from imgcover.loom.rule import INCH_MM, STEP_MM, STEPS, Division, lay_rule, squared_paper

KINDS = (
    "print",
    "steel",
    "wood",
    "tape",
    "defocus",
    "phone",
    "dim",
    "short",
    "on squares",
    "half hidden",
    "oblique",
    "odd",
)
ODD = {
    "pica": (INCH_MM / 72, (1, 6, 12)),
    "1/8 in": (INCH_MM / 8, (1, 2, 4, 8)),
    "1/12 in": (INCH_MM / 12, (1, 3, 6, 12)),
    "1/20 in": (INCH_MM / 20, (1, 2, 10, 20)),
    "1/50 in": (INCH_MM / 50, (1, 5, 10, 50)),
    "1/100 in": (INCH_MM / 100, (1, 5, 10, 50)),
    "2 mm": (2.0, (1, 5)),
}
"""Scales that are not looked for: to be refused, or read right."""
HEIGHTS = {
    Division.MM: (3.2, 4.8, 6.4),
    Division.HALF_MM: (2.4, 3.4, 4.9, 6.4),
    Division.TENTH: (3.2, 4.8, 6.8),
    Division.SIXTEENTH: (2.4, 3.5, 4.8, 6.4, 9.0),
    Division.THIRTYSECOND: (2.0, 2.9, 3.9, 5.0, 6.6, 9.0),
    Division.SIXTYFOURTH: (1.6, 2.3, 3.1, 4.0, 5.1, 6.6, 9.0),
}


@dataclass(frozen=True, slots=True)
class Harsh:
    """One picture: its light, pixels a millimetre along the rule at the picture's middle (as a
    function of the angle read), and what it is."""

    seed: int
    light: NDArray[np.float32]
    homography: NDArray[np.float64]
    step_mm: float
    what: str

    def truth(self, angle: float, place: NDArray[np.float64] | None = None) -> float:
        """Pixels a millimetre in the direction `angle`, at a place or the picture's middle."""
        middle = np.array(self.light.shape[::-1]) / 2 - 0.5 if place is None else place
        reach = np.array([np.cos(angle), np.sin(angle)])
        ends = np.stack([middle - reach, middle + reach])
        on_rule = cv2.perspectiveTransform(ends[None], np.linalg.inv(self.homography))[0]
        return float(2 / np.hypot(*(on_rule[1] - on_rule[0])))


def harsh_case(seed: int) -> Harsh:
    """Draw one; everything about it follows from the seed."""
    generator = np.random.default_rng([23, seed])
    kind = KINDS[seed % len(KINDS)]
    look = _look(kind, generator)
    flat_scale = max(2.5 * look.px_per_mm, 40.0)
    flat = drawing.flat(look, flat_scale, generator)
    if look.bend:
        flat = drawing.bent(flat, look.bend * flat_scale)
    place = drawing.place(look, generator)
    thread = max(3.0, generator.uniform(0.2, 0.7) * look.px_per_mm)
    ground = woven(look.shape, thread_px=thread, turn=generator.normal(0, 0.1), generator=generator)
    under = ground
    if look.paper:
        under = squared_paper(
            look.shape, px_per_mm=look.px_per_mm, square_mm=look.paper, heavy_every=5
        )
    light = lay_rule(under, flat, px_per_mm=flat_scale, mm_to_picture=place, shadow=3.0)
    light = drawing.hidden(light, ground, place, look, generator)
    light = drawing.seen(light, look, generator)
    edge = look.edges[0]
    steps = "+".join(f"{each.step:.4g}" for each in look.edges)
    what = f"{kind}: {steps} mm, {look.px_per_mm:.2f} px/mm {' '.join(look.notes)}"
    return Harsh(seed, light, place, edge.step, what)


def _look(kind: str, generator: np.random.Generator) -> Look:
    """Choose the faults of one kind of picture; all kinds share a little of each."""
    divisions = _divisions(generator)
    finest = min(STEP_MM[each] for each in divisions)
    px_per_mm = float(np.exp(generator.uniform(np.log(5.5 / finest), np.log(14 / finest))))
    px_per_mm = min(px_per_mm, 30.0) if finest > 0.45 else min(px_per_mm, 36.0)
    edges = [_edge(each, generator) for each in divisions]
    look = Look(edges, px_per_mm=px_per_mm)
    look.length = float(generator.choice([100.0, 150.0, 200.0]))
    look.turn = float(np.radians(90 * generator.integers(4) + generator.normal(0, 2)))
    if generator.random() < 0.4:
        look.turn = generator.uniform(0, 2 * np.pi)
    if generator.random() < 0.25:
        look.body, look.ink = 0.07, 0.55
    look.jpeg = int(generator.integers(60, 96)) if generator.random() < 0.6 else 0
    u = generator.uniform
    if kind == "print":
        # within a class II interval: 0.2 mm is the limit
        look.edges = [
            replace(e, wander=u(0.02, 0.06), ragged=u(0.1, 0.25), touching=True, digits=u(2.5, 4.0))
            for e in edges
        ]
    elif kind == "steel":
        look.body, look.ink = u(0.3, 0.5), u(0.08, 0.2)
        look.grain, look.glare, look.worn = u(0.05, 0.15), u(0.2, 0.6), u(0.0, 0.6)
    elif kind == "wood":
        look.body, look.ink, look.grain = u(0.3, 0.5), u(0.05, 0.12), u(0.15, 0.3)
        look.worn = u(0.2, 0.8)
        look.edges = [replace(e, lost=u(0.0, 0.06), ragged=0.15) for e in edges]
    elif kind == "tape":
        look.width, look.bend, look.length = 16.0, u(-2.5, 2.5), 200.0
        look.edges = [replace(e, wander=0.03, touching=True) for e in edges[:1]]
        look.notes.append(f"bend {look.bend:.1f} mm")
    elif kind == "defocus":
        look.defocus, look.noise = u(0.1, 0.3) * finest * px_per_mm, 0.01
        look.notes.append(f"defocus {look.defocus:.1f} px")
    elif kind == "phone":
        look.lean = (np.radians(u(-8, 8)), np.radians(u(-8, 8)))
    elif kind == "oblique":
        look.lean = (np.radians(u(10, 50) * generator.choice([-1, 1])), np.radians(u(-10, 10)))
        look.lean = look.lean if generator.random() < 0.5 else look.lean[::-1]
        look.focal = u(1.2, 6.0)
    elif kind == "dim":
        contrast = u(0.12, 0.35)
        look.ink = look.body * (1 - contrast)
        look.uneven, look.noise, look.jpeg = 0.7, u(0.005, 0.015), int(generator.integers(50, 80))
    elif kind == "short":
        look.hide = "ends"
    elif kind == "on squares":
        look.paper = float(generator.choice([1.0, 5.0, INCH_MM / 10, INCH_MM / 8, 4.0]))
        look.notes.append(f"on {look.paper:.3g} mm squares")
    elif kind == "half hidden":
        look.hide = str(generator.choice(["feet", "tips", "patches"]))
    elif kind == "odd":
        name = str(generator.choice(list(ODD)))
        step, steps = ODD[name]
        tall = u(1.6, 3.2) * max(0.8, min(1.0, step) ** 0.3)
        edge = replace(
            edges[0],
            step=step,
            steps=steps,
            heights=tuple(tall * 1.4**i for i in range(len(steps))),
            wander=0.0,
            width=min(0.18, 0.25 * step),
        )
        look.edges, look.px_per_mm = [edge], float(min(40.0, u(6, 12) / step))
        look.notes.append(name)
    if any(look.lean):
        lean = np.degrees(look.lean)
        look.notes.append(f"lean {lean[0]:.0f}° {lean[1]:.0f}° focal {look.focal:.1f}")
    look.notes += [look.hide] if look.hide else []
    return look


def _divisions(generator: np.random.Generator) -> tuple[Division, ...]:
    pairs: tuple[tuple[Division, ...], ...] = (
        *(((Division.MM,),) * 3),
        *(((Division.HALF_MM,),) * 2),
        (Division.SIXTEENTH,),
        (Division.THIRTYSECOND,),
        (Division.SIXTYFOURTH,),
        (Division.MM, Division.SIXTEENTH),
        (Division.MM, Division.HALF_MM),
        (Division.HALF_MM, Division.THIRTYSECOND),
        (Division.MM, Division.THIRTYSECOND),
    )
    return pairs[int(generator.integers(len(pairs)))]


def _edge(division: Division, generator: np.random.Generator) -> Edge:
    stretch = generator.uniform(0.75, 1.3)
    step = STEP_MM[division]
    return Edge(
        step,
        STEPS[division],
        tuple(stretch * each for each in HEIGHTS[division]),
        width=float(min(generator.uniform(0.1, 0.3), 0.4 * step)),
        wander=float(generator.choice([0.0, 0.01, 0.02])),
        ragged=float(generator.choice([0.0, 0.05, 0.1])),
        digits=float(generator.choice([0.0, 2.2, 3.2])),
        touching=bool(generator.random() < 0.4),
        foot=float(generator.choice([0.0, 0.0, 0.5, 1.0])),
    )
