"""A small goods-in of drawn swatches, made once for all tests of the command line.

Truth is drawn: loom, seeds 11 to 13, counted from the fine drawing.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from imgcover.cli import run
from imgcover.cloth.declaration import read_declaration
from imgcover.loom.article import Departure
from imgcover.loom.camera import CameraSpec
from imgcover.loom.redraw import draw_into

ARTICLE = """\
[article]
code = "TARN-60"
description = "plain cotton"
weave = "plain"
state = "finished"
[warp]
threads = "60 /in"
count = "24 Ne"
crimp = "6 %"
[weft]
threads = "52 /in"
count = "24 Ne"
crimp = "7 %"
[tolerance]
ends = "4 %"
picks = "4 %"
cover = "8 points"
"""
SEEDS = (11, 12, 13)
SIDE = 460
"""Pixels: some twenty threads at 1000 dpi, drawn in a second and enough for a decision at 4 %."""
PITCH = "1000dpi"

WRITING = frozenset({"-", "-o", "--ledger", "--overlay", "--as-reference"})
"""Options whose effect is not only what is told."""

Ended = tuple[int, str, str]


@pytest.fixture(scope="session")
def goods(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with `tarn.toml`, three good swatches `good-1.png` … and `short.png`."""
    folder = tmp_path_factory.mktemp("goods")
    (folder / "tarn.toml").write_text(ARTICLE, encoding="utf-8")
    declaration = read_declaration(folder / "tarn.toml")
    camera = CameraSpec(px_per_mm=1000 / 25.4)
    for number, seed in enumerate(SEEDS, 1):
        drawn, _ = draw_into(folder, declaration, camera, seed=seed, width=SIDE, height=SIDE)
        drawn.rename(folder / f"good-{number}.png")
    drawn, _ = draw_into(
        folder,
        declaration,
        camera,
        seed=14,
        width=SIDE,
        height=SIDE,
        departure=Departure(picks=0.8),
    )
    drawn.rename(folder / "short.png")
    whole = (folder / "good-1.png").read_bytes()
    (folder / "torn.png").write_bytes(whole[: len(whole) // 2])
    return folder


@pytest.fixture(scope="session")
def known() -> dict[tuple[str, ...], Ended]:
    """How calls that write nothing ended: the same call need not measure again."""
    return {}


@pytest.fixture
def ended(
    goods: Path,
    known: dict[tuple[str, ...], Ended],
    monkeypatch: pytest.MonkeyPatch,
    capsysbinary: pytest.CaptureFixture[bytes],
) -> Callable[..., Ended]:
    """Run `imgcover …` in the folder and give exit code, stdout and stderr."""
    monkeypatch.chdir(goods)

    def call(*arguments: str) -> Ended:
        if WRITING.isdisjoint(arguments):
            if arguments not in known:
                known[arguments] = run_once(*arguments)
            return known[arguments]
        return run_once(*arguments)

    def run_once(*arguments: str) -> Ended:
        with pytest.raises(SystemExit) as left:
            run(arguments)
        out, err = capsysbinary.readouterr()
        assert isinstance(left.value.code, int)
        return left.value.code, out.decode("utf-8"), err.decode("utf-8")

    return call
