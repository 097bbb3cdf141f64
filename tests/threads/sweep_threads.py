"""Counts drawn cloth of every family and drawn pictures that are not cloth, and prints the table.

    python tests/threads/sweep_threads.py --each 20 --not-woven 10 --jobs 2

Truth is drawn: threads counted by the loom inside the tiles that the reader used, seeds stated.
`--each` is cloths a family (two counts each), `--not-woven` pictures a kind.
"""

from __future__ import annotations

import argparse
import pickle
import sys
import time
from collections import defaultdict
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import cv2
import numpy as np
from numpy.typing import NDArray

from imgcover.loom.cases import Reach
from imgcover.loom.families import FAMILIES, random_case
from imgcover.loom.patterns import PATTERNS, draw_pattern
from imgcover.threads.reader import Plain, read_threads
from imgcover.threads.reading import ThreadReading
from imgcover.tone import SRGB, Tone

SEED = 20261
REACH = Reach(px=(4.0, 24.0))
WRONG = 0.02


@dataclass(frozen=True)
class Counted:
    """One count beside its truth: err and u relative, None where it was refused."""

    family: str
    seed: int
    name: str
    pixels: float
    err: float | None
    u: float | None
    codes: tuple[str, ...]
    seconds: float


def light_of(stored: NDArray[Any], tone: Tone = SRGB) -> NDArray[np.float32]:
    """Linear light of a stored picture."""
    depth = 255 if stored.dtype == np.uint8 else 65535
    light = tone.to_linear(stored.astype(np.float32) / depth).astype(np.float32)
    return light if light.ndim == 2 else light @ np.array([0.2126, 0.7152, 0.0722], np.float32)


def used_mask(reading: ThreadReading, shape: tuple[int, int]) -> NDArray[np.bool_]:
    """The pixels of the tiles that were counted."""
    mask = np.zeros(shape, bool)
    for tile in reading.tiles:
        if tile.used:
            mask[tile.y : tile.y + tile.height, tile.x : tile.x + tile.width] = True
    return mask


def count_one(job: tuple[str, int], reach: Reach = REACH) -> list[Counted]:
    """Draw one cloth, read it, and hold both counts against the threads in the tiles used."""
    cv2.setNumThreads(1)
    family, seed = job
    rng = np.random.default_rng([SEED, seed, list(FAMILIES).index(family)])
    case = random_case(rng, family=family, reach=reach)
    drawn = case.draw(rng)
    start = time.process_time()
    reading = read_threads(Plain(light_of(drawn.stored, case.camera.tone)))
    seconds = time.process_time() - start
    turned = abs(drawn.truth.angle) > 45
    mask = used_mask(reading, drawn.stored.shape[:2])
    truth = drawn.within(mask) if mask.any() else (drawn.truth.ends, drawn.truth.picks)
    scale = np.array([case.camera.px_per_mm, case.camera.y_per_mm])
    out = []
    for name, threads, true in zip(
        ("ends", "picks"), (reading.ends, reading.picks), truth[:: -1 if turned else 1], strict=True
    ):
        pixels = float(np.sqrt(np.prod(scale))) / true
        codes = tuple(each.code for each in reading.findings)
        if threads is None:
            out.append(Counted(family, seed, name, pixels, None, None, codes, seconds))
            continue
        density = float(np.hypot(*(np.array(threads.frequency) * scale)))
        err = density / true - 1
        out.append(Counted(family, seed, name, pixels, err, threads.u_relative, codes, seconds))
    return out


def look_at_one(job: tuple[str, int]) -> tuple[str, int, bool]:
    """Draw one picture that is not woven; say whether anything in it was counted."""
    cv2.setNumThreads(1)
    kind, seed = job
    rng = np.random.default_rng([SEED, seed, list(PATTERNS).index(kind)])
    reading = read_threads(Plain(light_of(draw_pattern(kind, rng, width=500, height=500))))
    return kind, seed, reading.ends is not None or reading.picks is not None


def summary(counts: list[Counted]) -> str:
    """One row of the table."""
    done = [each for each in counts if each.err is not None]
    err = np.array([abs(each.err or 0.0) for each in done])
    z = np.array([abs(each.err or 0.0) / max(each.u or 0.0, 1e-9) for each in done])
    fine = [each for each in counts if each.pixels >= 6]
    refused_fine = sum(each.err is None for each in fine) / max(1, len(fine))
    if not done:
        return f"{len(counts):6d} {len(counts):8d}"
    right = err[err <= WRONG]
    return (
        f"{len(counts):6d} {len(counts) - len(done):8d} {100 * refused_fine:9.1f} "
        f"{int((err > WRONG).sum()):6d} {100 * np.median(right):7.3f} "
        f"{100 * np.quantile(right, 0.95):7.3f} {100 * err.max():7.2f} {100 * (z < 2).mean():6.1f}"
    )


def main() -> None:
    """Run the sweep and print its table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--each", type=int, default=20)
    parser.add_argument("--not-woven", type=int, default=10)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--jobs", type=int, default=2)
    parser.add_argument("--families", nargs="*", default=list(FAMILIES))
    parser.add_argument("--keep", type=Path, default=None)
    asked = parser.parse_args()
    seeds = range(asked.first, asked.first + asked.each)
    jobs = [(family, seed) for family in asked.families for seed in seeds]
    blanks = [(kind, seed) for kind in PATTERNS for seed in range(asked.not_woven)]
    say = sys.stdout.write
    with ProcessPoolExecutor(asked.jobs) as pool:
        counts = [each for both in pool.map(count_one, jobs, chunksize=2) for each in both]
        looked = list(pool.map(look_at_one, blanks, chunksize=4))
    rows: dict[str, list[Counted]] = defaultdict(list)
    for each in counts:
        rows[each.family].append(each)
    say(f"{'family':15s} counts  refused  of>=6px%  wrong  median%    p95%   worst%   2u%\n")
    for family, of_family in rows.items():
        say(f"{family:15s} {summary(of_family)}\n")
    say(f"{'all':15s} {summary(counts)}\n")
    say(f"seconds a picture (this processor): {np.mean([e.seconds for e in counts]):.2f}\n")
    for each in counts:
        if each.err is None or abs(each.err) > WRONG:
            what = "refused" if each.err is None else f"WRONG {100 * each.err:+.1f} %"
            codes = " ".join(each.codes)
            say(f"  {each.family} {each.seed} {each.name} {each.pixels:.1f} px {what} {codes}\n")
    counted = [f"{kind} {seed}" for kind, seed, hit in looked if hit]
    say(f"not woven: {len(looked)} pictures of {len(PATTERNS)} kinds, counted {len(counted)}: ")
    say(f"{', '.join(counted)}\n")
    if asked.keep:
        asked.keep.write_bytes(pickle.dumps(counts))


if __name__ == "__main__":
    main()
