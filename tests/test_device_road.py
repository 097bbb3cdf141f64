"""A device's certificate, from `--device` to the record: its axes turn with the picture.

Truth is theory: a certificate with unequal pitches, and one picture stored upright and turned.
"""

from __future__ import annotations

import io
from datetime import UTC, date, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from PIL import Image

from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.errors import CertificateError
from imgcover.inspection import inspect
from imgcover.loom.article import draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.request import Request, read_options

X, Y = 39.2, 39.6
"""px/mm along the stored file's columns and rows: one per cent apart, as flatbeds are."""
SHEET = b"""
[article]
code = "CRAG"
[warp]
threads = "60 /in"
count = "24 Ne"
[weft]
threads = "52 /in"
count = "24 Ne"
[tolerance]
ends = "4 %"
picks = "4 %"
"""
CERTIFICATE = """\
certificate = "imgcover/certificate/1"
tone = "srgb"

[device]
name = "bench-2"
resolution_dpi = [1000.0, 1000.0]

[pitch]
x = 39.2
x_u = 0.02
y = 39.6
y_u = 0.02
ratio_u = 0.0005
x_own_u = 0.01
y_own_u = 0.01

[shear]
rad = 0.0
u = 0.0002

[distortion]
largest_mm = 0.03
places_mm = [[0.0, 0.0]]
shifts_mm = [[0.0, 0.0]]

[dates]
made = {made}
valid_until = {until}

[evidence]
sheet = "imgcover/sheet/1"
bars_mm = [180.0, 260.0]
bars_u_mm = 0.2
scans_sha256 = ["{sha}"]
turned = true
corners = 400
sheet_errors = [0.0, 0.0, 0.0]
"""


def declaration() -> Declaration:
    return read_declaration(SHEET, name="crag.toml")


def certificate(folder: Path, *, until: date) -> Path:
    path = folder / "bench-2.toml"
    made = until - timedelta(days=400)
    path.write_text(CERTIFICATE.format(made=made, until=until, sha="ab" * 32), "utf-8")
    return path


@pytest.fixture(scope="module")
def swatch() -> Any:
    """Drawn: loom, seed 41, 430 × 460 px."""
    camera = CameraSpec(px_per_mm=X, px_per_mm_y=Y, light="reflected")
    return draw_article(declaration(), camera, seed=41, width=430, height=460)


def stored(pixels: Any, *, orientation: int = 1) -> bytes:
    exif = Image.Exif()
    exif[274] = orientation
    file = io.BytesIO()
    Image.fromarray(pixels).save(file, "PNG", dpi=(1000, 1000), exif=exif)
    return file.getvalue()


def record(content: bytes, device: Path) -> dict[str, Any]:
    options = read_options({"device": str(device)})
    request = Request(source=content, name="crag.png", options=options, declaration=declaration())
    return inspect(request).record


TOMORROW = datetime.now(UTC).date() + timedelta(days=1)


def test_the_certificate_is_the_scale_and_is_kept_by_its_hash(swatch: Any, tmp_path: Path) -> None:
    told = record(stored(swatch.stored), certificate(tmp_path, until=TOMORROW))
    assert told["scale"]["source"] == "certificate"
    assert told["scale"]["x"]["value"] == X
    assert told["scale"]["y"]["value"] == Y
    assert len(told["provenance"]["device"]) == 64
    for key, per_mm in (("ends", swatch.truth.ends), ("picks", swatch.truth.picks)):
        measured = told["threads"][key]
        assert abs(measured["value"] - 10 * per_mm) < 3 * measured["u"]


def test_its_axes_turn_with_the_picture(swatch: Any, tmp_path: Path) -> None:
    """The same light, stored a quarter turn round and marked so, gives the same densities."""
    device = certificate(tmp_path, until=TOMORROW)
    upright = record(stored(swatch.stored), device)
    # orientation 6: shown by turning the stored rows a quarter clockwise (TIFF 6.0, tag 274);
    # a device whose columns and rows are exchanged stored it, so pitches are exchanged with it
    turned = record(stored(swatch.stored[:, ::-1].T.copy(), orientation=6), device)
    assert turned["picture"]["orientation"] == 6
    assert turned["picture"]["width"] == upright["picture"]["width"]
    assert turned["scale"]["x"]["value"] == Y
    assert turned["scale"]["y"]["value"] == X
    ratio = turned["threads"]["ends"]["value"] / upright["threads"]["ends"]["value"]
    assert ratio == pytest.approx(Y / X, rel=1e-5)


def test_an_expired_certificate_leaves_the_decision_open(swatch: Any, tmp_path: Path) -> None:
    yesterday = TOMORROW - timedelta(days=2)
    told = record(stored(swatch.stored), certificate(tmp_path, until=yesterday))
    assert "certificate-expired" in {each["code"] for each in told["findings"]}
    assert told["verdict"]["decision"] == "undecided"


def test_a_certificate_that_is_none_is_refused(swatch: Any, tmp_path: Path) -> None:
    (tmp_path / "bench-2.toml").write_text("[device]\nname = 'x'\n", "utf-8")
    with pytest.raises(CertificateError):
        record(stored(swatch.stored), tmp_path / "bench-2.toml")
