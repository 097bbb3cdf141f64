"""An audited folder for tests, and the command run on it as a user would."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from PIL import Image

from imgcover.audit.folder import list_folder
from imgcover.audit.out_folder import OutFolder
from imgcover.audit.outcome import Crew, Done
from imgcover.cli.auditing import Audit, AuditAsked
from imgcover.cli.exits import ExitCode
from imgcover.ledger.store import Ledger
from imgcover.quantity import Measured
from imgcover.scale.certificate import write_certificate
from imgcover.scale.sheet import SHEET_NAME, Bars
from imgcover.scale.sheet_bed import BedMap
from imgcover.scale.sheet_device import DeviceReading

ROOT = Path(__file__).resolve().parent.parent.parent
ARTICLE = """
[article]
code = "{code}"
weave = "plain"
[warp]
threads = "{ends} /cm"
count = "20 tex"
[weft]
threads = "{picks} /cm"
count = "20 tex"
[tolerance]
ends = "2 %"
picks = "2 %"
"""
PX_PER_MM = 24.0


def grid(*, ends: float = 25.0, picks: float = 20.0, side: int = 360, seed: int = 0) -> np.ndarray:
    """A gauze seen before light, 1/cm, at 24 px/mm: crossing dark bars with a little noise."""
    chance = np.random.default_rng(seed)
    across, down = np.arange(side) / PX_PER_MM / 10, np.arange(side) / PX_PER_MM / 10
    bars = [
        1 / (1 + np.exp(-8 * (np.cos(2 * np.pi * n * where + 0.3 * seed) - 0.2)))
        for n, where in ((ends, across), (picks, down))
    ]
    light = 0.06 + 0.85 * (1 - bars[0][None, :]) * (1 - bars[1][:, None])
    noisy = light + chance.normal(0, 0.01, light.shape)
    return (255 * noisy.clip(0, 1) ** (1 / 2.2)).astype(np.uint8)


def lay(folder: Path, lots: dict[str, int], **grids: float) -> None:
    """Lay a folder with an article, a lot sheet and `lots` pictures a lot."""
    (folder / "articles").mkdir(parents=True)
    article = ARTICLE.format(code="G-1", ends=25, picks=20)
    (folder / "articles" / "G-1.toml").write_text(article)
    # without a word on the light cover is not measured, which takes half the time
    rows = ["picture,lot,article,place,pitch"]
    n = 0
    for lot, places in lots.items():
        for place in range(1, places + 1):
            n += 1
            name = f"{lot}-{place}.png"
            Image.fromarray(grid(seed=n, **grids)).save(folder / name)
            rows.append(f"{name},{lot},G-1,{place},24px/mm")
    (folder / "lots.csv").write_text("\n".join(rows) + "\n")


def certified(folder: Path, *, pitch: float, made: date, valid_until: date) -> None:
    """Write a device's certificate with this pitch, px/mm, and these dates."""
    there = np.zeros((16, 2))
    reading = DeviceReading(
        Measured(pitch, pitch * 1e-4, "px/mm"),
        Measured(pitch, pitch * 1e-4, "px/mm"),
        1e-4,
        Measured(0.0, 1e-5, "rad"),
        BedMap(there, there, 0.004),
        True,
        16,
        (0.0, 0.0, 0.0),
        (1e-4, 1e-4),
    )
    (folder / "bench.toml").write_text(
        write_certificate(
            reading,
            name="bench",
            resolution_dpi=(pitch * 25.4, pitch * 25.4),
            tone="srgb",
            made=made,
            valid_until=valid_until,
            sheet=SHEET_NAME,
            bars=Bars(180.0, 260.0, 0.3),
            scans_sha256=("ab" * 32,),
        )
    )


def command(folder: Path, out: Path, *options: str) -> list[str]:
    """What a user types."""
    audit = ["audit", str(folder), "--out", str(out)]
    return [sys.executable, "-m", "imgcover", *audit, *options]


def hearing_ctrl_c() -> None:
    """Let a child hear Ctrl-C also where the tests were started in the background, which ignores it
    and hands that on."""
    signal.signal(signal.SIGINT, signal.SIG_DFL)


def audit(
    folder: Path, out: Path, *options: str, env: dict[str, str] | None = None
) -> subprocess.CompletedProcess[str]:
    """Run an audit to its end."""
    return subprocess.run(
        command(folder, out, *options),
        capture_output=True,
        text=True,
        check=False,
        timeout=300,
        cwd=out.parent,
        env={**os.environ, "PYTHONPATH": str(ROOT), **(env or {})},
    )


class Inline:
    """A crew of this one process: what is told about workers is tested with real ones."""

    def run(self, work, loads):
        for index, load in loads:
            yield Done(index, work(load))


class NoPages:
    """A crew that leaves pages empty: they are drawn in the command's tests."""

    def run(self, work, loads):
        for index, _ in loads:
            yield Done(index, "")


def asked(folder: Path, out: Path, *, fresh: bool = False, send: bool = False) -> AuditAsked:
    """What the command line asks for when it names nothing but folders."""
    return AuditAsked(
        folder=folder,
        articles=None,
        out=out,
        ledger=None,
        words={},
        jobs=1,
        time_limit=60.0,
        cluster="given" if send else None,
        cluster_tls=None,
        cluster_send="bytes",
        watch=False,
        fresh=fresh,
    )


def audit_inline(
    folder: Path,
    out: Path,
    *,
    fresh: bool = False,
    crew: Crew | None = None,
    send: bool = False,
) -> ExitCode:
    """Run an audit to its end in this process."""
    place = OutFolder(out)
    with Ledger.open(place.ledger) as ledger:
        audit_ = Audit(
            asked(folder, out, fresh=fresh, send=send),
            place,
            ledger,
            crew or Inline(),
            NoPages(),
            None,
        )
        return audit_.round(list_folder(folder, articles=None, left_out=[out]))


def records(out: Path) -> list[dict[str, Any]]:
    """Every record of an audit."""
    lines = (out / "records.jsonl").read_text(encoding="utf-8").splitlines()
    return [json.loads(line) for line in lines]


def timeless(out: Path) -> list[str]:
    """Every record of an audit, to the byte, but for when it was made."""
    kept = []
    for record in records(out):
        record.pop("envelope", None)
        kept.append(json.dumps(record))
    return kept
