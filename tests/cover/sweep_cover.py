"""Measures drawn backlit cloth of counted cover, beside plainer methods, and prints the table.

    python tests/cover/sweep_cover.py --cases 400 --jobs 2

Truth is drawn: the share of the frame that yarn covers in the loom's fine drawing, seeds stated;
hairs are not counted as cover. Cloths are `imgcover.loom.cases.COVER`: all weaves, 5 to 25 px a
thread, transmittance 0.01 to 0.25, blur to 1.4 px, falloff to 30 %, hairs, glare to 3 %, 8 and
16 bit. The lattice handed over is the drawn one, so that nothing but the cover room is tried.
"""

from __future__ import annotations

import argparse
import math
import pickle
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import cv2
import numpy as np
from numpy.typing import NDArray
from skimage.filters import threshold_otsu

from imgcover.cover.reader import read_cover
from imgcover.cover.reading import CoverReading, Lattice
from imgcover.cover.surface import open_pore_light
from imgcover.cover.windows import Sheet, spread
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cases import COVER, Case, ordinary
from imgcover.loom.truth import Truth

SEED = 14142
"""Of the cloths whose figures DEVELOPERS.md reports; 40417 and 61803 have been tuned on."""
METHODS = ("this room", "Otsu, stored grey", "Otsu, linear light", "half level")


@dataclass(frozen=True)
class Measure:
    """One cloth: what it is, and what each method said of it.

    Parameters
    ----------
    errors : dict of str to float or None
        Measured less true cover by method; None where it was refused.
    u : float or None
        The room's own standard uncertainty.
    systems : list of (error, u)
        Of warp and weft.
    """

    seed: int
    weave: str
    pixels: float
    blurs: float
    tau: float
    cover: float
    hairs: float
    errors: dict[str, float | None]
    u: float | None
    systems: list[tuple[float, float]]
    codes: tuple[str, ...]
    seconds: float


def lattice_of(truth: Truth, camera: CameraSpec) -> Lattice:
    """Give the drawn lattice in the pixel frame."""
    turn = math.radians(truth.angle)
    skewed = math.radians(truth.angle + truth.skew)
    x, y = camera.px_per_mm, camera.y_per_mm
    ends = (truth.ends * math.cos(turn) / x, truth.ends * math.sin(turn) / y)
    picks = (-truth.picks * math.sin(skewed) / x, truth.picks * math.cos(skewed) / y)
    return Lattice(ends, picks)


def light_of(stored: NDArray[Any], camera: CameraSpec) -> NDArray[np.float32]:
    """Give the linear light of a stored grey picture."""
    depth = 255 if stored.dtype == np.uint8 else 65535
    return camera.tone.to_linear(stored.astype(np.float32) / depth).astype(np.float32)


def plainer(stored: NDArray[Any], light: NDArray[np.float32]) -> dict[str, float]:
    """Measure the cover as one would without this room."""
    rows, columns = light.shape
    surface, _ = open_pore_light(
        spread(Sheet(light), field=None), rows=rows, columns=columns, block=48
    )
    share = light / surface.over(spread(Sheet(light), field=None, pixels=light.size)[0])
    yarn = float(np.median(share[share < 0.5])) if (share < 0.5).any() else 0.0
    return {
        "Otsu, stored grey": float((stored <= threshold_otsu(stored)).mean()),
        "Otsu, linear light": float((light <= threshold_otsu(light)).mean()),
        "half level": float((share <= (1 + yarn) / 2).mean()),
    }


def measure_one(job: tuple[int, int]) -> Measure:
    """Draw one cloth and measure it."""
    cv2.setNumThreads(1)
    base, seed = job
    rng = np.random.default_rng([base, seed])
    case: Case = ordinary(rng, reach=COVER)
    drawn = case.draw(rng)
    truth, camera = drawn.truth, case.camera
    light = light_of(drawn.stored, camera)
    start = time.process_time()
    reading = read_cover(light, light="backlit", lattice=lattice_of(truth, camera))
    seconds = time.process_time() - start
    errors: dict[str, float | None] = {
        name: value - truth.cover for name, value in plainer(drawn.stored, light).items()
    }
    errors[METHODS[0]] = None if reading.optical is None else reading.optical.value - truth.cover
    pixels = min(truth.pixels_per_end, truth.pixels_per_pick)
    pore = min(
        truth.pixels_per_end * (1 - truth.warp_cover),
        truth.pixels_per_pick * (1 - truth.weft_cover),
    )
    return Measure(
        seed=seed,
        weave=case.cloth.weave,
        pixels=pixels,
        blurs=pore / math.hypot(camera.blur_px, 0.29),
        tau=case.cloth.tau,
        cover=truth.cover,
        hairs=truth.cover_with_hairs - truth.cover,
        errors=errors,
        u=None if reading.optical is None else reading.optical.u,
        systems=_systems(reading, truth),
        codes=tuple(each.code for each in reading.findings),
        seconds=seconds,
    )


def _systems(reading: CoverReading, truth: Truth) -> list[tuple[float, float]]:
    pairs = ((reading.warp, truth.warp_cover), (reading.weft, truth.weft_cover))
    return [(measured.value - true, measured.u) for measured, true in pairs if measured]


def row(name: str, errors: list[float | None], us: list[float | None] | None = None) -> str:
    """Write one row of the table, in points."""
    done = np.array([each for each in errors if each is not None])
    if done.size == 0:
        return f"{name:28s} {len(errors):5d} {len(errors):8d}"
    refused = len(errors) - done.size
    rms, worst = float(np.sqrt(np.mean(done**2))), float(np.abs(done).max())
    line = (
        f"{name:28s} {len(errors):5d} {refused:8d} {100 * rms:7.2f} "
        f"{100 * np.median(np.abs(done)):7.2f} {100 * worst:7.2f} {100 * done.mean():+7.2f}"
    )
    if us is not None:
        held = np.array([abs(e) < 2 * u for e, u in zip(errors, us, strict=True) if e is not None])
        line += f" {100 * held.mean():7.1f}"
    return line


def table(measures: list[Measure]) -> str:
    """Write the whole table."""
    head = f"{'points of cover':28s} {'n':>5s} {'refused':>8s} {'RMS':>7s} {'median':>7s}"
    lines = [head + f" {'worst':>7s} {'bias':>7s} {'in 2u':>7s}"]
    us = [each.u for each in measures]
    for method in METHODS:
        own = us if method == METHODS[0] else None
        lines.append(row(method, [each.errors[method] for each in measures], own))
    parts = (
        ("pore under 1.5 blurs", lambda m: m.blurs < 1.5),
        ("1.5 to 3 blurs", lambda m: 1.5 <= m.blurs < 3),
        ("3 to 6 blurs", lambda m: 3 <= m.blurs < 6),
        ("6 blurs and more", lambda m: m.blurs >= 6),
        ("5 to 8 px a thread", lambda m: m.pixels < 8),
        ("8 to 14 px", lambda m: 8 <= m.pixels < 14),
        ("14 px and more", lambda m: m.pixels >= 14),
        ("transmittance over 0.1", lambda m: m.tau > 0.1),
        ("hairs over 0.5 points", lambda m: m.hairs > 0.005),
    )
    for name, belongs in parts:
        some = [each for each in measures if belongs(each)]
        lines.append(row(f"  {name}", [m.errors[METHODS[0]] for m in some], [m.u for m in some]))
    for k, name in enumerate(("warp", "weft")):
        pairs = [each.systems[k] for each in measures if each.systems]
        lines.append(row(f"{name} alone", [e for e, _ in pairs], [u for _, u in pairs]))
    seconds = [each.seconds for each in measures]
    lines.append(f"seconds a cloth: mean {np.mean(seconds):.2f}, most {max(seconds):.2f}")
    return "\n".join(lines) + "\n"


def main() -> None:
    """Run the sweep and print its table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cases", type=int, default=400)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--seed", type=int, default=SEED)
    parser.add_argument("--jobs", type=int, default=2)
    parser.add_argument("--worst", type=int, default=12, help="cloths listed one by one")
    parser.add_argument("--keep", type=Path, default=None, help="pickle the measures here")
    asked = parser.parse_args()
    jobs = [(asked.seed, k) for k in range(asked.first, asked.first + asked.cases)]
    with ProcessPoolExecutor(asked.jobs) as pool:
        measures = list(pool.map(measure_one, jobs, chunksize=4))
    if asked.keep is not None:
        asked.keep.write_bytes(pickle.dumps(measures))
    say = sys.stdout.write
    say(table(measures))
    done = [each for each in measures if each.errors[METHODS[0]] is not None]
    done.sort(key=lambda each: -abs(each.errors[METHODS[0]] or 0))
    for each in done[: asked.worst]:
        error = 100 * (each.errors[METHODS[0]] or 0)
        say(
            f"seed {each.seed:4d} {each.weave:16s} {each.pixels:5.1f} px, pore {each.blurs:4.1f} "
            f"blurs, tau {each.tau:.3f}, cover {each.cover:.3f}, hairs {100 * each.hairs:.1f}: "
            f"{error:+.2f} with u {100 * (each.u or 0):.2f}\n"
        )


if __name__ == "__main__":
    main()
