"""How long `imgcover measure` takes beside decoding the picture: an A4 colour scan at 600 dpi.

    python tests/bench_measure.py                   draws a backlit and a reflected scan, and times
    python tests/bench_measure.py --keep FOLDER     keeps the scans there, and takes them if it can
    python tests/bench_measure.py --profile         says in which functions the time goes, too

Everything is timed in turn, `--rounds` times over, and the median ratio of a round is what counts:
other work on the machine slows both sides of a ratio. Processor seconds are of all threads, wall
seconds of an idle machine only worth reading. Linux and macOS. Leaves with 1 where a bound is not
kept, by the wall clock.
"""

from __future__ import annotations

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from multiprocessing import get_context
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
ARTICLE = ROOT / "samples-synthetic" / "articles" / "ML-110.toml"
WIDTH, HEIGHT, DPI = 4960, 7016, 600
"""A4 at 600 dpi: 35 million pixels, 104 MB as they are stored."""
LIGHTS = ("backlit", "reflected")
MOST_WHOLE, MOST_THREADS, MOST_HELP, MOST_MB = 2.0, 1.0, 3.0, 1000.0
"""Times the decoding, times the decoding, times `import typer`, and MB."""
DECODING = """
import sys, time
from pathlib import Path
import cv2, numpy
content = numpy.frombuffer(Path(sys.argv[1]).read_bytes(), numpy.uint8)
wall, used = time.perf_counter(), time.process_time()
cv2.imdecode(content, cv2.IMREAD_UNCHANGED)
print(time.perf_counter() - wall, time.process_time() - used)
"""
THREADS_ALONE = """
import sys, time
from pathlib import Path
from imgcover.picture.reader import read_picture
from imgcover.threads.reader import read_threads
picture = read_picture(Path(sys.argv[1]), name="a4.png")
wall, used = time.perf_counter(), time.process_time()
read_threads(picture)
print(time.perf_counter() - wall, time.process_time() - used)
"""


@dataclass(frozen=True, slots=True)
class Took:
    """Seconds by the wall clock and of the processor, and the most memory, MB."""

    wall: float
    cpu: float
    mb: float = 0.0


def say(line: str) -> None:
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def scan(folder: Path, light: str) -> Path:
    """Draw a scan where none is kept.

    In a process of its own, as everything here: the most memory of a process that is started begins
    with what the one that starts it holds.
    """
    path = folder / f"a4-{light}.png"
    if not path.exists():
        with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as pool:
            pool.submit(draw, path, light).result()
    return path


def draw(path: Path, light: str) -> None:
    """Draw a scan: an 8-bit RGB PNG packed as scanning programs pack them."""
    from PIL import Image

    from imgcover.cloth.declaration import read_declaration
    from imgcover.loom.article import draw_article
    from imgcover.loom.camera import CameraSpec

    camera = CameraSpec(px_per_mm=DPI / 25.4, light=light, colour=True, rotation_deg=0.7)
    declared = read_declaration(ARTICLE)
    drawn = draw_article(declared, camera, seed=1, width=WIDTH, height=HEIGHT)
    Image.fromarray(drawn.stored).save(path, "PNG", dpi=(DPI, DPI), compress_level=6)


def decoded(path: Path) -> Took:
    """Decode as OpenCV does, from memory."""
    return told(DECODING, path)


def ran(*arguments: str) -> Took:
    """Run Python to its end, its start included."""
    wall = time.perf_counter()
    # wait4 tells the memory of this child alone
    process = subprocess.Popen(
        [sys.executable, *arguments], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
    )
    _, status, used = os.wait4(process.pid, 0)
    took = time.perf_counter() - wall
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode not in (0, 1, 3):
        raise SystemExit(f"{arguments} ended with {process.returncode}")
    kilobytes = used.ru_maxrss / (1024 if sys.platform == "darwin" else 1)
    return Took(took, used.ru_utime + used.ru_stime, kilobytes / 1024)


def options(light: str) -> tuple[str, ...]:
    """What the scan is measured with."""
    return ("--pitch", f"{DPI}dpi", "--light", light)


def measured(path: Path, light: str, *more: str) -> Took:
    """`imgcover measure`, as a user types it."""
    return ran("-m", "imgcover", "measure", str(path), *options(light), *more)


def counted(path: Path) -> Took:
    """Threads alone, in a process that has read the picture."""
    return told(THREADS_ALONE, path)


def told(program: str, path: Path) -> Took:
    """Run a program that times itself."""
    done = subprocess.run(
        [sys.executable, "-c", program, str(path)], capture_output=True, text=True, check=True
    )
    wall, cpu = (float(word) for word in done.stdout.split())
    return Took(wall, cpu)


def ratio(name: str, over: list[Took], under: list[Took], most: float) -> bool:
    """Say the median ratio of a round, by both clocks, and whether it is within the bound."""
    by_wall = statistics.median(a.wall / b.wall for a, b in zip(over, under, strict=True))
    by_cpu = statistics.median(a.cpu / b.cpu for a, b in zip(over, under, strict=True))
    wall, cpu = statistics.median(a.wall for a in over), statistics.median(a.cpu for a in over)
    say(f"{name:<26}{wall:6.2f} s {by_wall:6.2f} ×{cpu:8.2f} s {by_cpu:6.2f} ×   at most {most:g}")
    return by_wall <= most


def timed(rounds: int, *what: Callable[[], Took]) -> list[list[Took]]:
    """Time everything in turn, round after round; the first round warms the disk's cache."""
    turns = [[each() for each in what] for _ in range(rounds + 1)][1:]
    return [list(column) for column in zip(*turns, strict=True)]


def profile(path: Path, light: str) -> None:
    """Print where the time of one `measure` goes."""
    text = (
        "import cProfile, pstats, sys; sys.stdout = open(sys.argv[1], 'w');"
        "from imgcover.cli.door import outcome; p = cProfile.Profile();"
        "p.runcall(outcome, sys.argv[2:]);"
        "pstats.Stats(p, stream=sys.stderr).sort_stats('cumulative').print_stats(45)"
    )
    command = [sys.executable, "-c", text, os.devnull, "measure", str(path), *options(light)]
    done = subprocess.run(command, stderr=subprocess.PIPE, text=True, check=True)
    say(done.stderr)


def bench(folder: Path, rounds: int, profiled: bool) -> bool:
    """Time all of it."""
    kept = []
    say(f"{'median of ' + str(rounds):<26}{'wall':>8} {'ratio':>8}{'processor':>10} {'ratio':>8}")
    for light in LIGHTS:
        path = scan(folder, light)
        decode, whole, judged, threads = timed(
            rounds,
            lambda path=path: decoded(path),
            lambda path=path, light=light: measured(path, light),
            lambda path=path, light=light: measured(path, light, "--article", str(ARTICLE)),
            lambda path=path: counted(path),
        )
        ratio(f"{light}: cv2.imdecode", decode, decode, 1.0)
        kept.append(ratio(f"{light}: measure", whole, decode, MOST_WHOLE))
        ratio(f"{light}: with an article", judged, decode, MOST_WHOLE)
        kept.append(ratio(f"{light}: threads alone", threads, decode, MOST_THREADS))
        peak = max(each.mb for each in whole)
        say(f"{light + ': memory':<26}{peak:6.0f} MB  at most {MOST_MB:g}")
        kept.append(peak <= MOST_MB)
        if profiled:
            profile(path, light)
    typer, help_ = timed(
        rounds, lambda: ran("-c", "import typer"), lambda: ran("-m", "imgcover", "--help")
    )
    kept.append(ratio("imgcover --help", help_, typer, MOST_HELP))
    return all(kept)


def main() -> int:
    """Draw, time, tell."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--keep", type=Path)
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--profile", action="store_true")
    asked = parser.parse_args()
    os.environ.update(dict.fromkeys(("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"), "1"))
    os.environ["PYTHONPATH"] = str(ROOT)
    with tempfile.TemporaryDirectory() as place:
        # an installed program is compiled already
        os.environ.pop("PYTHONDONTWRITEBYTECODE", None)
        os.environ["PYTHONPYCACHEPREFIX"] = str(Path(place) / "compiled")
        folder = asked.keep or Path(place)
        folder.mkdir(parents=True, exist_ok=True)
        kept = bench(folder, asked.rounds, asked.profile)
    say("kept" if kept else "NOT KEPT")
    return 0 if kept else 1


if __name__ == "__main__":
    sys.exit(main())
