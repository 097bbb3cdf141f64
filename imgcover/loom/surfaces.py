"""Things that are no textile at all, to be refused by the counter."""

from __future__ import annotations

import cv2
import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from imgcover.loom.noise import Rng, over_field

Floats = NDArray[np.float32]


def paper(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Press paper: a cloudy sheet with a rough tooth."""
    cloud = over_field(rng, _shape(x), length=9.0)
    tooth = over_field(rng, _shape(x), length=1.2)
    return np.asarray(0.75 + 0.03 * cloud + 0.03 * tooth, dtype=np.float32)


def laid_paper(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Press paper on a laid mould: close wires one way, a few chains the other."""
    wire = float(rng.uniform(5, 10))
    chain = wire * float(rng.uniform(18, 26))
    marks = 0.05 * np.cos(2 * np.pi * y / wire) + 0.06 * (np.abs(x % chain - chain / 2) < 1.5)
    return np.asarray(paper(rng, x, y) + marks, dtype=np.float32)


def gravel(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Spread stones, each rounded and of its own shade."""
    near, far, which = _cells(rng, x, y, float(rng.uniform(10, 40)), jitter=0.45)
    shade = rng.uniform(0.2, 0.8, which.max() + 1)[which]
    return np.asarray(shade * np.clip((far - near) / (0.4 * far), 0, 1) ** 0.5, dtype=np.float32)


def leather(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Grain leather: small plates between creases."""
    near, far, _ = _cells(rng, x, y, float(rng.uniform(6, 16)), jitter=0.4)
    return np.asarray(0.2 + 0.35 * np.clip((far - near) / far, 0, 0.5), dtype=np.float32)


def _cells(
    rng: Rng, x: Floats, y: Floats, pitch: float, *, jitter: float
) -> tuple[Floats, Floats, NDArray[np.int64]]:
    """Give the distances to the nearest and second seed of a jittered lattice, and which it is."""
    rows, columns = x.shape
    grid = np.mgrid[-2 : rows / pitch + 2, -2 : columns / pitch + 2].reshape(2, -1).T
    seeds = (grid + rng.uniform(-jitter, jitter, grid.shape)) * pitch
    place = np.indices((rows, columns)).reshape(2, -1).T
    found = cKDTree(seeds).query(place, k=2)
    away, which = np.asarray(found[0]), np.asarray(found[1])
    shape = (rows, columns)
    return (
        away[:, 0].reshape(shape).astype(np.float32),
        away[:, 1].reshape(shape).astype(np.float32),
        which[:, 0].reshape(shape),
    )


def brick(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Lay bricks in running bond."""
    high = float(rng.uniform(12, 30))
    wide = high * float(rng.uniform(1.9, 3.2))
    course = np.floor(y / high)
    u = x / wide + 0.5 * (course % 2)
    joint = (np.abs(u % 1 - 0.5) > 0.46) | (np.abs(y / high % 1 - 0.5) > 0.42)
    shade = _own(rng, u, y / high, 0.3, 0.55)
    return np.asarray(np.where(joint, 0.7, shade), dtype=np.float32)


def tiles(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Lay square tiles with grout, each of its own shade."""
    pitch = float(rng.uniform(24, 60))
    joint = (np.abs(x / pitch % 1 - 0.5) > 0.46) | (np.abs(y / pitch % 1 - 0.5) > 0.46)
    return np.asarray(
        np.where(joint, 0.75, _own(rng, x / pitch, y / pitch, 0.15, 0.6)), dtype=np.float32
    )


def _own(rng: Rng, u: Floats, v: Floats, low: float, high: float) -> Floats:
    """Give each cell of the lattice a shade of its own."""
    table = rng.uniform(low, high, (64, 64)).astype(np.float32)
    return np.asarray(table[np.floor(v).astype(int) % 64, np.floor(u).astype(int) % 64])


def text(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Print lines of words."""
    sheet = np.full(x.shape, 235, dtype=np.uint8)
    scale = float(rng.uniform(0.3, 0.8))
    for base in np.arange(20, x.shape[0] + 20, 34 * scale):
        words = " ".join(
            "".join(chr(97 + int(c)) for c in rng.integers(0, 26, int(rng.integers(2, 10))))
            for _ in range(60)
        )
        cv2.putText(
            sheet, words, (6, int(base)), cv2.FONT_HERSHEY_SIMPLEX, scale, 20, 1, cv2.LINE_AA
        )
    return np.asarray(sheet / 255, dtype=np.float32)


def stripes(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Draw one set of stripes and nothing across them."""
    pitch = float(rng.uniform(6, 24))
    return np.asarray(0.45 + 0.3 * np.tanh(3 * np.cos(2 * np.pi * x / pitch)), dtype=np.float32)


def corrugated(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Bend a sheet into waves, with rust."""
    pitch = float(rng.uniform(8, 30))
    rust = over_field(rng, _shape(x), length=12.0)
    return np.asarray(0.4 + 0.25 * np.sin(2 * np.pi * y / pitch) + 0.05 * rust, dtype=np.float32)


def white_noise(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Show nothing but noise."""
    return np.asarray(0.5 + 0.15 * rng.standard_normal(x.shape), dtype=np.float32)


def cloudy_noise(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Add up noise of all sizes."""
    parts = [over_field(rng, _shape(x), length=2.0**k) * 2.0 ** (k / 2) for k in range(6)]
    return np.asarray(0.45 + 0.035 * sum(parts), dtype=np.float32)


def blank(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Show an empty table."""
    return np.full(x.shape, rng.uniform(0.1, 0.9), dtype=np.float32)


def gradient(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Let the light fall off over an empty table."""
    slope = x / x.shape[1] * float(rng.uniform(-0.4, 0.4)) + y / x.shape[0] * 0.3
    return np.asarray(0.5 + slope - slope.mean(), dtype=np.float32)


def screen(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Photograph a display: three bars in each cell, beating with the camera's own grid."""
    cell = float(rng.uniform(2.15, 2.9))
    bars = 0.4 + 0.3 * np.cos(6 * np.pi * x / cell) + 0.2 * np.cos(2 * np.pi * x / cell)
    beat = 0.1 * np.cos(2 * np.pi * x * (1 / cell - 0.42)) * np.cos(2 * np.pi * y * 0.013)
    return np.asarray(bars * (0.8 + 0.2 * np.cos(2 * np.pi * y / cell)) + beat, dtype=np.float32)


def dots(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Print dots on a square lattice."""
    pitch = float(rng.uniform(9, 24))
    away = np.hypot(x / pitch % 1 - 0.5, y / pitch % 1 - 0.5)
    return np.asarray(0.15 + 0.7 * (away > rng.uniform(0.18, 0.36)), dtype=np.float32)


def perforated(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Punch round holes in a plate, rows half a pitch apart."""
    pitch = float(rng.uniform(10, 24))
    v = y / (pitch * np.float32(np.sqrt(0.75)))
    u = x / pitch + 0.5 * (np.floor(v) % 2)
    away = np.hypot(u % 1 - 0.5, (v % 1 - 0.5) * np.float32(np.sqrt(0.75)))
    return np.asarray(0.1 + 0.75 * (away < rng.uniform(0.2, 0.36)), dtype=np.float32)


def halftone(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Screen a picture into dots that grow where it is dark."""
    pitch = float(rng.uniform(6, 14))
    u, v = (x + y) / pitch * np.float32(np.sqrt(0.5)), (x - y) / pitch * np.float32(np.sqrt(0.5))
    tone = 0.5 + 0.35 * np.clip(over_field(rng, _shape(x), length=60.0), -1, 1)
    spot = 0.5 + 0.25 * (np.cos(2 * np.pi * u) + np.cos(2 * np.pi * v))
    return np.asarray(0.1 + 0.8 / (1 + np.exp(-14 * (spot - tone))), dtype=np.float32)


def checkerboard(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Paint squares in turn."""
    pitch = float(rng.uniform(8, 30))
    turn = (np.floor(x / pitch) + np.floor(y / pitch)) % 2
    return np.asarray(0.12 + 0.75 * turn, dtype=np.float32)


def wood(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Saw a board: rings cut lengthwise."""
    bend = 14 * over_field(rng, _shape(x), length=50.0)
    ring = np.cos(2 * np.pi * (x + bend) / float(rng.uniform(9, 24)))
    pore = cv2.GaussianBlur(
        rng.standard_normal(x.shape).astype(np.float32), (0, 0), 0.8, sigmaY=9.0
    )
    return np.asarray(0.4 + 0.1 * ring + 0.25 * pore, dtype=np.float32)


def bark(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Crack bark along the trunk."""
    ridge = over_field(rng, _shape(x), length=4.0)
    long = cv2.GaussianBlur(ridge, (0, 0), 0.8, sigmaY=16.0)
    return np.asarray(0.3 + 0.22 * np.tanh(3 * long / long.std() * 0.5), dtype=np.float32)


def pickets(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Nail pales to two rails."""
    pitch = float(rng.uniform(14, 40))
    pale = np.abs(x / pitch % 1 - 0.5) < 0.3
    rail = np.abs(y / x.shape[0] % 0.5 - 0.25) < 0.03
    shade = _own(rng, x / pitch, y * 0, 0.45, 0.75)
    return np.asarray(np.where(pale, shade, np.where(rail, 0.4, 0.1)), dtype=np.float32)


def foliage(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Let leaves overlap."""
    light = np.full(x.shape, 0.1, dtype=np.float32)
    for _ in range(max(60, x.size // 400)):
        place = (int(rng.integers(-20, x.shape[1] + 20)), int(rng.integers(-20, x.shape[0] + 20)))
        size = (int(rng.integers(8, 30)), int(rng.integers(4, 12)))
        cv2.ellipse(
            light,
            place,
            size,
            float(rng.uniform(0, 180)),
            0,
            360,
            float(rng.uniform(0.1, 0.6)),
            -1,
            cv2.LINE_AA,
        )
    return light


def scales(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Overlap rounded shingles."""
    pitch = float(rng.uniform(14, 36))
    light = np.full(x.shape, 0.2, dtype=np.float32)
    for row in (1, 0):
        v = y / pitch + 0.5 * row
        u = x / pitch + 0.5 * row
        away = np.hypot(u % 1 - 0.5, (v % 1) * 1.0)
        light = np.where(away < 0.55, 0.25 + 0.6 * away, light)
    return np.asarray(light, dtype=np.float32)


def water(rng: Rng, x: Floats, y: Floats) -> Floats:
    """Let waves run over each other."""
    light = np.full(x.shape, 0.4, dtype=np.float32)
    for _ in range(9):
        angle, length = rng.normal(0.4, 0.35), float(rng.uniform(10, 60))
        run = x * np.float32(np.cos(angle)) + y * np.float32(np.sin(angle))
        light += np.float32(0.05) * np.cos(2 * np.pi * run / length + rng.uniform(0, 6.28))
    return np.asarray(light, dtype=np.float32)


def _shape(x: Floats) -> tuple[int, int]:
    """Give rows and columns."""
    return int(x.shape[0]), int(x.shape[1])


__all__ = [
    "bark",
    "blank",
    "brick",
    "checkerboard",
    "cloudy_noise",
    "corrugated",
    "dots",
    "foliage",
    "gradient",
    "gravel",
    "halftone",
    "laid_paper",
    "leather",
    "paper",
    "perforated",
    "pickets",
    "scales",
    "screen",
    "stripes",
    "text",
    "tiles",
    "water",
    "white_noise",
    "wood",
]
