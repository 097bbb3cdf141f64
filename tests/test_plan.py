"""What a plan promises must hold when one scans.

Truth is theory (arithmetic of pixels, closed forms of the guard band), simulation (JCGM 101: the
planned field and places do decide as often as said), and drawn: loom, seeds the plan never saw.
"""

from __future__ import annotations

import math
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from test_device_road import certificate

from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.errors import OptionError
from imgcover.inspection import inspect
from imgcover.loom.article import draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.loom.keeping import encode
from imgcover.plan.planning import plan, scale_for
from imgcover.plan.proof import Room, proof, room_of
from imgcover.plan.sight import Standing, resolution_for, sight
from imgcover.plan.telling import plan_record, to_do
from imgcover.plan.trial import FAR, FieldError, Trial, _Reading, _told, try_out
from imgcover.quantity import Measured
from imgcover.request import Request, read_options
from imgcover.verdict.decision import Decision, Limits, decide, guard_band
from imgcover.verdict.pooled import pooled

SHEET = """
[article]
code = "FELL-9"
weave = "plain"
[warp]
threads = "28 /cm"
count = "20 tex"
[weft]
threads = "24 /cm"
count = "20 tex"
[tolerance]
ends = "2 %"
picks = "3 %"
"""
PX_PER_MM = 22.4
"""Eight pixels an end."""


def sheet(*changes: tuple[str, str], more: str = "") -> Declaration:
    text = SHEET
    for old, new in changes:
        text = text.replace(old, new)
    return read_declaration((text + more).encode(), name="fell.toml")


@pytest.fixture(scope="module")
def trial() -> Trial:
    return try_out(sheet(), PX_PER_MM, detail_mm=0.05)


@pytest.mark.parametrize(
    ("pixels", "standing"),
    [
        (2.99, Standing.REFUSED),
        (3.0, Standing.FLAGGED),
        (4.99, Standing.FLAGGED),
        (5.0, Standing.ENOUGH),
        (8.0, Standing.COMFORTABLE),
    ],
)
def test_standing_goes_by_pixels_a_thread(pixels: float, standing: Standing) -> None:
    assert sight(2.0, 2.0 * pixels, detail_mm=0.01).standing is standing


def test_no_resolution_shows_threads_finer_than_the_optics() -> None:
    # 120 threads a centimetre: 83 µm from thread to thread, less than two details of 50 µm
    assert sight(12.0, 500.0, detail_mm=0.05).standing is Standing.REFUSED
    assert resolution_for(12.0, detail_mm=0.05).usual is None
    assert resolution_for(12.0, detail_mm=0.005).usual == 3200


def test_the_field_follows_from_the_spacing_alone_where_nothing_else_errs() -> None:
    # 2 · spacing/√n = half of the tolerance, so n = (4 · spacing / tolerance)²
    asked = proof(
        2.8, error=FieldError(0.0, 0.04), scale_u=0.0, room=Room(0.02, math.inf), between=0.005
    )
    assert asked.needed_mm == pytest.approx((4 * 0.04 / 0.02) ** 2 / 2.8, rel=1e-6)
    assert asked.standard_mm == 30.0
    assert asked.field_mm == 30.0
    assert asked.places == 5
    assert asked.better is None


def test_a_weak_scale_defeats_any_field_and_a_better_one_is_named() -> None:
    error, room = FieldError(0.03, 0.03), Room(0.02, 0.04)
    weak = proof(2.8, error=error, scale_u=0.006, room=room)
    assert weak.needed_mm is None
    assert weak.places is None
    assert weak.possible
    assert weak.better is not None
    good = proof(2.8, error=error, scale_u=weak.better.u, room=room)
    assert good.places == weak.better.places
    hopeless = proof(2.8, error=error, scale_u=0.011, room=room)
    assert hopeless.possible is False


def test_the_nearest_limit_decides() -> None:
    assert room_of(None, 10.0, relative=True) is None
    one_sided = room_of(Limits(9.8, None), 10.0, relative=True)
    assert one_sided is not None
    assert (one_sided.nearest, one_sided.width) == (pytest.approx(0.02), math.inf)
    uneven = room_of(Limits(9.8, 10.5), 10.0, relative=True)
    assert uneven is not None
    assert uneven.nearest == pytest.approx(0.02)


def test_a_lot_as_declared_is_proved_at_the_planned_places() -> None:
    """Truth is simulation: lots exactly as declared, their places scattered as was assumed."""
    scale_u, between, error = 0.002, 0.009, FieldError(0.03, 0.03)
    room, per_cm = Room(0.02, 0.04), 28.0
    asked = proof(2.8, error=error, scale_u=scale_u, room=room, between=between)
    assert asked.places is not None
    assert asked.places > 5
    rng = np.random.default_rng(8)
    own = error.u(2.8 * asked.field_mm)
    limits, conform = Limits(0.98 * per_cm, 1.02 * per_cm), 0
    lots = 1500
    for _ in range(lots):
        values = per_cm * (
            1 + rng.normal(0, scale_u) + rng.normal(0, math.hypot(own, between), asked.places)
        )
        told = [Measured(float(value), own * per_cm, "1/cm") for value in values]
        mean = pooled(told, common_u=scale_u * per_cm, field_u=own * per_cm)
        guard = guard_band(mean.mean.u, freedom=mean.freedom, width=limits.width)
        conform += decide(mean.mean.value, limits, guard) is Decision.CONFORMS
    # said: nineteen in twenty; the scatter of few places is itself uncertain, which costs a little
    assert conform / lots > 0.92


def test_the_drawn_cloth_is_told_as_well_as_said(trial: Trial) -> None:
    """Truth is drawn: loom, seeds 31 and 32."""
    assert trial.ends.right
    assert trial.picks.right
    assert trial.cover.right
    assert trial.cover.u is not None
    assert trial.ends.u is not None
    assert 0.001 < trial.cover.u < 0.02
    camera = CameraSpec(px_per_mm=PX_PER_MM, blur_px=0.76)
    for seed in (31, 32):
        drawn = draw_article(sheet(), camera, seed=seed, width=320, height=370)
        answers = inspect(
            Request(
                source=encode(drawn, camera, "x.png"),
                name="x.png",
                options=read_options({"light": "backlit", "pitch": f"{PX_PER_MM}px/mm"}),
            )
        ).answers
        assert answers.cover is not None
        assert answers.density is not None
        assert answers.cover.optical is not None
        assert answers.density.ends is not None
        # two pictures leave u itself uncertain: three u, not two
        assert abs(answers.cover.optical.value - drawn.truth.cover) < 3 * trial.cover.u
        ends = answers.density.ends.value / 10
        assert abs(ends / drawn.truth.ends - 1) < 3 * trial.ends.u


def test_more_than_comfortable_pixels_tell_cover_no_better(trial: Trial) -> None:
    """Truth is drawn: the same seeds at eight and at ten pixels an end; twelve are refused."""
    finer = try_out(sheet(), 1.25 * PX_PER_MM, detail_mm=0.05)
    assert trial.cover.u is not None
    assert finer.cover.u is not None
    # u of two pictures is itself known to a third or so
    assert trial.cover.u < 1.5 * finer.cover.u


def test_a_reading_far_from_the_drawing_is_called_wrong_however_sure() -> None:
    near = _Reading(0.601, 0.004, 0.6, ())
    sure = _Reading(0.6 + 1.1 * FAR * 0.004, 0.004, 0.6, ())
    refused = _Reading(None, 0.0, 0.6, ("the yarn is too dense",))
    assert _told([near, near], relative=False).right
    told = _told([near, sure], relative=False)
    assert not told.right
    assert "far beyond its u" in told.reasons[0]
    part = _told([near, refused], relative=False)
    assert not part.right
    assert "1 of 2" in part.reasons[0]
    assert _told([refused, refused], relative=True).reasons == ("the yarn is too dense",)


def test_a_coarse_device_is_told_what_would_do_and_nothing_is_drawn() -> None:
    planned = plan(sheet(), scale_for(sheet(), {"pitch": "150dpi"}))
    record = plan_record(planned)
    assert record["drawn"] == 0
    assert record["ends"]["standing"] == "refused"
    assert not record["ends"]["told"]
    assert record["places"] is None
    assert "600dpi" in next(to_do(planned))


def test_a_cover_tolerance_narrower_than_the_model_asks_for_a_swatch() -> None:
    """Truth is theory: Peirce's constant alone leaves U of 4 points, whatever the device."""
    declaration = sheet(more='cover = "3 points"\n')
    cover = plan(declaration, scale_for(declaration, {"pitch": "600dpi"})).cover
    assert cover.u is not None
    assert cover.u > cover.expected.u
    assert cover.possible is False
    approved = sheet(more='cover = "3 points"\n[reference]\noptical_cover = "0.65 u 0.004"\n')
    planned = plan(approved, scale_for(approved, {"pitch": "600dpi"}))
    assert planned.cover.possible
    assert not any("--as-reference" in text for text in to_do(planned))


def test_the_scale_is_the_devices_the_stated_one_or_chosen(tmp_path: Path) -> None:
    chosen = scale_for(sheet(), {})
    assert chosen.x.value == pytest.approx(600 / 25.4)
    tomorrow = datetime.now(UTC).date() + timedelta(days=1)
    device = str(certificate(tmp_path, until=tomorrow))
    held = scale_for(sheet(), {"device": device})
    assert held.source == "certificate"
    assert (held.x.value, held.y.value) == (39.2, 39.6)
    assert held.findings == ()
    carried = scale_for(sheet(), {"device": device, "pitch": "500dpi"})
    assert carried.x.value == pytest.approx(19.6)
    assert "certificate-other-resolution" in {each.code for each in carried.findings}
    fine = sheet(("28 /cm", "130 /cm"), ("20 tex", "2 tex"))
    with pytest.raises(OptionError, match="no flatbed shows 130"):
        scale_for(fine, {})
