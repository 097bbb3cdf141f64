"""A lot as the verdict lays it out, for the pages' tests: made by the room itself, not by hand."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from PIL import Image

from imgcover.cloth.declaration import read_declaration
from imgcover.cloth.prediction import predict
from imgcover.quantity import Measured
from imgcover.report.glance import Glance, Note
from imgcover.report.lot_page import About
from imgcover.verdict.lot import judge_lot
from imgcover.verdict.observed import Observed, Spread

HOSTILE = "<img src=x onerror=alert(1)>\"'&{{7*7}}\x1b[2J\u202egnp"
ARTICLE = """
[article]
code = "HARROW-68"
description = "plain sheeting, {0}"
weave = "plain"
state = "finished"
[warp]
threads = "68 /in"
count = "32 Ne"
[weft]
threads = "64 /in"
count = "32 Ne"
[tolerance]
ends = "2 %"
picks = "3 %"
cover = "4 points"
"""
PICKS = {"good": (25.2, 25.3, 25.1, 25.25, 25.2), "short": (23.1, 23.4, 23.2, 23.0, 23.3)}


def lot_record(kind: str, *, lot: str = "4711", places: int = 5) -> dict[str, Any]:
    """Judge a lot of `places` places, `good` or `short` of picks."""
    declaration = read_declaration(ARTICLE.format("made for this test").encode(), name="a.toml")
    seen = [
        Observed(
            ends=Measured(26.77 + 0.05 * (n % 3 - 1), 0.06, "1/cm"),
            picks=Measured(PICKS[kind][n % 5], 0.06, "1/cm"),
            cover=Measured(0.61 + 0.004 * (n % 4), 0.006, "1"),
            ends_spread=Spread(0.004, 4),
            scale_u=0.001,
            ends_length_mm=52.0,
            picks_length_mm=51.0,
            place=str(n + 1),
        )
        for n in range(places)
    ]
    return judge_lot(declaration, predict(declaration), seen, lot=lot).record()


def glances_of(
    lot: dict[str, Any], *, name: str = "scan", small: Path | None = None
) -> list[Glance]:
    """One picture a place, and one more that could not be read."""
    note = Note("few-pixels-a-thread", "warning", "only 4.2 pixels a thread", "scan finer")
    return [
        Glance(
            name=f"{name}-{n}.png",
            number=n,
            piece="A",
            place=place["place"],
            remarks=f"Hanne; conditioned: yes; {name}",
            light="backlit",
            decision="conforms",
            ends=place["ends"],
            picks=place["picks"],
            cover=place["cover"],
            scale="stated pitch 600 dpi",
            notes=(note,) if n == 2 else (),
            row=n,
            thumbnail=None if small is None else kept(small, n),
        )
        for n, place in enumerate(lot["places"], start=1)
    ] + [
        Glance(
            name=f"{name}-torn.png",
            number=None,
            piece=None,
            place=None,
            remarks="",
            light=None,
            decision=None,
            ends=None,
            picks=None,
            cover=None,
            scale="",
            notes=(Note("picture-unreadable", "refusal", "the file is cut off", "scan again"),),
            row=99,
        )
    ]


def kept(folder: Path, seed: int) -> Path:
    """Keep a small woven-looking picture."""
    rows, columns = np.mgrid[0:180, 0:240]
    weave = 128 + 50 * np.sin(rows * 0.9 + seed) + 50 * np.sin(columns * 0.8)
    path = folder / f"{seed}.jpg"
    Image.fromarray(weave.clip(0, 255).astype(np.uint8)).save(path, "JPEG", quality=80)
    return path


ABOUT = About(
    units="inch",
    head="12:" + "9f3a" * 16,
    made_at="2031-04-02 06:00 UTC",
    versions={"imgcover": "0.1.0", "numpy": "2.4.6"},
    description="plain sheeting",
    article_sha256="ab" * 32,
)
