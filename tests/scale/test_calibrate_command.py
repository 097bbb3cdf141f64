"""`imgcover calibrate sheet | read | check`, from files to exit codes.

Truth is drawn: two scans of one sheet at 3.95 × 4.01 px/mm, a quarter turn apart.
"""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from drawn_sheets import Scan, draw_scan
from PIL import Image

from imgcover.cli import run
from imgcover.cli.exits import ExitCode
from imgcover.scale.certificate import read_certificate
from imgcover.scale.sheet import BAR_A_MM, BAR_B_MM
from imgcover.tone import SRGB

X, Y = 3.95, 4.01
DPI = 101.6  # 4 px/mm: the axes are 1.2 and 0.2 % off
STRETCH = (1.004, 0.997)
BARS = f"{BAR_A_MM * STRETCH[0]:.2f},{BAR_B_MM * STRETCH[1]:.2f}"


def save(scan: Scan, path: Path, dpi: float | None = DPI) -> None:
    """Write a drawn scan as a PNG."""
    light = draw_scan(scan, fine=2).light()
    stored = np.round(255 * SRGB.from_linear(np.clip(light, 0, 1))).astype(np.uint8)
    Image.fromarray(stored).save(path, **({} if dpi is None else {"dpi": (dpi, dpi)}))


@pytest.fixture(scope="module")
def scans(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the scans and the certificate made of them."""
    folder = tmp_path_factory.mktemp("scans")
    for name, turn in (("a", 0.01), ("b", math.pi / 2 + 0.02)):
        save(Scan(x=X, y=Y, turn=turn, stretch=STRETCH), folder / f"{name}.png")
    save(Scan(x=X, y=Y, turn=0.02, stretch=STRETCH, seed=7), folder / "later.png")
    save(Scan(x=X * 1.003, y=Y, turn=0.02, stretch=STRETCH, seed=8), folder / "drifted.png")
    return folder


def called(*words: str) -> int:
    """Call the command line as a shell would."""
    with pytest.raises(SystemExit) as left:
        run(["calibrate", *words])
    assert isinstance(left.value.code, int)
    return left.value.code


@pytest.fixture(scope="module")
def made(scans: Path) -> Path:
    """The certificate."""
    path = scans / "bench.toml"
    names = (str(scans / "a.png"), str(scans / "b.png"))
    assert called("read", *names, "--bars", BARS, "--name", "bench", "-o", str(path)) == 0
    return path


def test_the_certificate_tells_the_pitch(made: Path) -> None:
    """Truth is drawn: both pitches within 0.02 %."""
    held = read_certificate(made, name="bench.toml")
    assert held.x.value == pytest.approx(X, rel=2e-4)
    assert held.y.value == pytest.approx(Y, rel=2e-4)
    assert held.resolution_dpi == pytest.approx((DPI, DPI), rel=1e-3)
    assert len(held.scans_sha256) == 2


def test_it_holds_or_does_not(scans: Path, made: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Truth is drawn: the same device holds; one whose x has drifted by 0.3 % does not."""
    assert called("check", str(scans / "later.png"), "--device", str(made)) == ExitCode.CONFORMS
    assert capsys.readouterr().out.startswith("bench: holds")
    drifted = called("check", str(scans / "drifted.png"), "--device", str(made))
    assert drifted == ExitCode.DOES_NOT_CONFORM
    assert "no longer holds" in capsys.readouterr().out


def test_without_measured_bars_there_is_none(
    scans: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Truth is theory: printers do not keep their scale."""
    assert called("read", str(scans / "a.png")) == ExitCode.USAGE
    assert "--bars" in capsys.readouterr().err


@pytest.mark.parametrize("bars", ["180", "180;260", "a,b", "100,260", "180,260,1", "nan,260"])
def test_impossible_bars_are_refused(scans: Path, bars: str) -> None:
    """Truth is theory: two lengths near those drawn, or nothing."""
    assert called("read", str(scans / "a.png"), "--bars", bars) == ExitCode.USAGE


def test_a_copy_read_by_the_original_is_refused(
    scans: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Truth is drawn: bars 3 % from the printed ones put the device 3 % off: nobody's device."""
    bars = f"{BAR_A_MM * 1.034:.2f},{BAR_B_MM * 1.027:.2f}"
    path = tmp_path / "x.toml"
    assert called("read", str(scans / "a.png"), "--bars", bars, "-o", str(path)) == 3
    assert "copy" in capsys.readouterr().err
    assert not path.exists()


def test_a_copy_at_99_per_cent_is_refused(
    scans: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Truth is theory: bars that put both axes 1 % below 4 px/mm are a copier's doing; those that
    put one axis there may be a carriage's, and are worth a word."""
    path = tmp_path / "x.toml"
    for x, y, ending in ((3.96, 3.96, ExitCode.UNDECIDED), (4.0, 3.96, ExitCode.CONFORMS)):
        bars = f"{BAR_A_MM * STRETCH[0] * X / x:.3f},{BAR_B_MM * STRETCH[1] * Y / y:.3f}"
        assert called("read", str(scans / "a.png"), "--bars", bars, "-o", str(path)) == ending
        assert "copy" in capsys.readouterr().err


def test_the_same_scan_twice_is_no_repeat(scans: Path) -> None:
    """Truth is theory: a file proves nothing about another scan."""
    name = str(scans / "a.png")
    assert called("read", name, name, "--bars", BARS) == ExitCode.USAGE


def test_a_picture_without_a_sheet_is_refused(tmp_path: Path) -> None:
    """Truth is theory: grey paper has no corners."""
    path = tmp_path / "grey.png"
    Image.fromarray(np.full((400, 400), 180, np.uint8)).save(path, dpi=(DPI, DPI))
    assert called("read", str(path), "--bars", BARS) == ExitCode.UNDECIDED


def test_the_sheet_is_drawn_alike_each_time(tmp_path: Path) -> None:
    """Truth is theory: the same sheet, byte for byte; another kind of file is refused."""
    drawn = []
    for name in ("one.pdf", "two.pdf"):
        assert called("sheet", "-o", str(tmp_path / name)) == ExitCode.CONFORMS
        drawn.append((tmp_path / name).read_bytes())
    assert drawn[0].startswith(b"%PDF")
    assert drawn[0] == drawn[1]
    assert called("sheet", "-o", str(tmp_path / "sheet.doc")) == ExitCode.OUTPUT
