"""Textiles that are not woven: knits, nets, nonwovens and pile, to be refused by the counter."""

from __future__ import annotations

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.noise import Rng, over_field

Floats = NDArray[np.float32]


def jersey(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Knit the face of a jersey: columns of V-shaped stitches."""
    wale, course = _gauge(rng)
    return _legs(rng, x / wale, y / course, width=0.2)


def rib(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Knit a rib: columns of stitches stand up, those between sink and show purl arcs."""
    wale, course = _gauge(rng)
    number = int(rng.integers(1, 3))
    over = np.floor(x / wale / number) % 2 == 0
    face = _legs(rng, x / wale, y / course, width=0.22)
    back = 0.45 * _arcs(x / wale, y / course)
    ridge = 0.6 + 0.4 * np.abs(np.sin(np.pi * x / wale / number))
    return np.asarray(np.where(over, face, back) * ridge, dtype=np.float32)


def purl(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Knit the back of a jersey: rows of interlocking arcs."""
    wale, course = _gauge(rng)
    return _arcs(x / wale, y / course)


def moss(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Knit plain and purl stitches in turn: a chequer of bumps."""
    wale, course = _gauge(rng)
    turn = (np.floor(x / wale) + np.floor(y / course)) % 2 == 0
    face = _legs(rng, x / wale, y / course, width=0.2)
    return np.asarray(np.where(turn, face, 0.8 * _arcs(x / wale, y / course)), dtype=np.float32)


def _gauge(rng: Rng) -> tuple[float, float]:
    """Choose pixels a wale and a course."""
    wale = float(rng.uniform(8, 26))
    return wale, wale * float(rng.uniform(0.6, 0.95))


def _legs(rng: Rng, u: Floats, v: Floats, *, width: float) -> Floats:
    """Draw the two slanting legs of each stitch."""
    jitter = _own(rng, u, v, 0.08)
    light = np.full(u.shape, 0.12, dtype=np.float32)
    for side in (-1, 1):
        along = v + jitter + side * 0.55 * (u % 1 - 0.5)
        across = (u % 1) - 0.5 - side * (0.25 - 0.12 * (along % 1 - 0.5))
        leg = np.clip(1 - (across / width) ** 2, 0, 1) ** 0.5
        round_ = np.sin(np.pi * (along % 1)) ** 0.4
        light = np.maximum(light, 0.2 + 0.6 * leg * round_ * (leg > 0))
    return np.asarray(light, dtype=np.float32)


def _arcs(u: Floats, v: Floats) -> Floats:
    """Draw the heads of the stitches, every second row reversed."""
    light = np.full(u.shape, 0.15, dtype=np.float32)
    for shift, sign in ((0.0, 1.0), (0.5, -1.0)):
        wave = v + 0.28 * sign * np.cos(2 * np.pi * (u + shift)) + shift
        light = np.maximum(light, 0.2 + 0.6 * np.clip(1 - ((wave % 1 - 0.5) / 0.2) ** 2, 0, 1))
    return np.asarray(light, dtype=np.float32)


def _own(rng: Rng, u: Floats, v: Floats, amount: float) -> Floats:
    """Give each cell of the lattice a value of its own."""
    table = rng.standard_normal((64, 64)).astype(np.float32) * np.float32(amount)
    return np.asarray(table[np.floor(v).astype(int) % 64, np.floor(u).astype(int) % 64])


def net(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Twist a hexagonal net, backlit."""
    pitch = float(rng.uniform(12, 34))
    return np.asarray(0.08 + 0.85 * (_to_hexagon(x / pitch, y / pitch) > 0.11), dtype=np.float32)


def lace(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Put flowers of dense work on a fine net."""
    pitch = float(rng.uniform(8, 16))
    ground = _to_hexagon(x / pitch, y / pitch) > 0.13
    span = pitch * float(rng.uniform(9, 14))
    radius = np.hypot(x % span - span / 2, y % span - span / 2) / span
    petals = 0.3 + 0.1 * np.cos(6 * np.arctan2(y % span - span / 2, x % span - span / 2))
    flower = (radius < petals) & ~((radius > 0.1) & (radius < 0.13))
    return np.asarray(np.where(flower, 0.12, 0.1 + 0.8 * ground), dtype=np.float32)


def _to_hexagon(u: Floats, v: Floats) -> Floats:
    """Give the distance to the nearest side of a honeycomb, in cells."""
    height = np.float32(np.sqrt(3))
    best = np.full(u.shape, np.inf, dtype=np.float32)
    second = best.copy()
    for shift in ((0.0, 0.0), (0.5, 0.5)):
        a = u - shift[0] - np.rint(u - shift[0])
        b = (v / height - shift[1] - np.rint(v / height - shift[1])) * height
        for du, dv in ((0.0, 0.0), (1.0, 0.0), (-1.0, 0.0)):
            away = np.hypot(a + du, b + dv)
            second = np.minimum(np.maximum(best, away), second)
            best = np.minimum(best, away)
    return np.asarray(second - best, dtype=np.float32)


def nonwoven(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Lay fibres at random, lit from behind."""
    return np.asarray(np.exp(-_fibres(rng, x.shape, 900, 1.6)), dtype=np.float32)


def spunbond(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Lay fibres at random and weld them by a lattice of points."""
    pitch = float(rng.uniform(14, 30))
    u, v = x / pitch, y / pitch
    shifted = u + 0.5 * (np.floor(v) % 2)
    point = np.hypot(shifted % 1 - 0.5, v % 1 - 0.5) < 0.2
    web = np.exp(-_fibres(rng, x.shape, 2400, 1.0))
    return np.asarray(np.where(point, 0.8 + 0.1 * web, 0.7 * web), dtype=np.float32)


def felt(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Mat short fibres until no order is left."""
    web = _fibres(rng, x.shape, 2600, 0.7)
    return np.asarray(0.35 + 0.3 * web / (1 + web), dtype=np.float32)


def _fibres(rng: Rng, shape: tuple[int, ...], per_megapixel: int, opacity: float) -> Floats:
    """Draw curved fibres and add up how much light they stop."""
    rows, columns = shape
    total = np.zeros((rows, columns), dtype=np.float32)
    for _ in range(6):
        sheet = np.zeros((rows, columns), dtype=np.uint8)
        for _ in range(max(4, rows * columns * per_megapixel // 6_000_000)):
            start = rng.uniform((-60, -60), (columns + 60, rows + 60))
            heading = rng.uniform(0, 2 * np.pi) + np.cumsum(rng.normal(0, 0.12, 24))
            step = rng.uniform(8, 22)
            path = start + step * np.stack([np.cos(heading), np.sin(heading)], 1).cumsum(axis=0)
            cv2.polylines(
                sheet,
                [np.rint(path).astype(np.int32)],
                False,
                255,
                int(rng.integers(1, 4)),
                cv2.LINE_AA,
            )
        total += sheet.astype(np.float32) / 255
    return total * np.float32(opacity / 2)


def terry(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Pull loops of pile out of a ground: rows of them, each leaning its own way."""
    pitch = float(rng.uniform(10, 22))
    rows, columns = x.shape
    light = np.full((rows, columns), 0.12, dtype=np.float32)
    for top in np.arange(-pitch, rows + pitch, pitch * 0.8):
        for left in np.arange(-pitch, columns + pitch, pitch):
            cx, cy = left + rng.normal(0, pitch * 0.28), top + rng.normal(0, pitch * 0.28)
            size = (round(pitch * 0.3), round(pitch * rng.uniform(0.4, 0.75)))
            lean = float(rng.normal(0, 35))
            shade = float(rng.uniform(0.4, 0.85))
            cv2.ellipse(
                light, (round(cx), round(cy)), size, lean, 0, 360, shade * 0.55, -1, cv2.LINE_AA
            )
            cv2.ellipse(light, (round(cx), round(cy)), size, lean, 0, 360, shade, 2, cv2.LINE_AA)
    return light


def fleece(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Raise a nap: soft tufts without order."""
    tufts = over_field(rng, (x.shape[0], x.shape[1]), length=float(rng.uniform(2.5, 7)))
    return np.asarray(0.45 + 0.12 * np.tanh(tufts), dtype=np.float32)


__all__ = [
    "felt",
    "fleece",
    "jersey",
    "lace",
    "moss",
    "net",
    "nonwoven",
    "purl",
    "rib",
    "spunbond",
    "terry",
]
