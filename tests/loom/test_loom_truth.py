"""The loom's truth is what it drew.

Truth is theory: an even cloth has the sett it was ordered with and Peirce's covered share
k1 + k2 − k1 k2; and a count of the drawn picture itself, made here without the loom's own count.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import ndimage

from imgcover.loom import drawing
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec, Fault
from imgcover.loom.drawing import draw
from imgcover.tone import LINEAR

EVEN = ClothSpec(
    ends_per_mm=2.5,
    picks_per_mm=2.0,
    end_diameter_mm=0.2,
    pick_diameter_mm=0.3,
    diameter_cv=0.0,
    spacing_cv=0.0,
    wander=0.0,
    waviness=0.0,
    twist=0.0,
    float_cv=0.0,
)
CLEAN = CameraSpec(
    px_per_mm=20.0, blur_px=0.0, falloff=0.0, read_noise=0.0, shot_noise=0.0, tone=LINEAR, bits=16
)


def rng(seed: int = 4) -> np.random.Generator:
    return np.random.default_rng(seed)


def test_even_cloth_has_the_sett_and_cover_it_was_ordered_with() -> None:
    # 240 px at 20 px/mm: 12 mm, that is 30 whole ends and 24 whole picks
    truth = draw(EVEN, CLEAN, 240, 240, rng()).truth
    assert truth.ends == pytest.approx(2.5, rel=1e-5)
    assert truth.picks == pytest.approx(2.0, rel=1e-5)
    assert truth.pixels_per_end == pytest.approx(8, rel=1e-5)
    assert truth.pixels_per_pick == pytest.approx(10, rel=1e-5)
    assert abs(truth.angle) < 1e-3
    assert abs(truth.skew) < 1e-3
    assert abs(truth.bow) < 1e-5
    # 0.02 points: edges fade over a 24th of a pitch, which leaves the mean alone
    assert truth.warp_cover == pytest.approx(0.5, abs=2e-4)
    assert truth.weft_cover == pytest.approx(0.6, abs=2e-4)
    assert truth.cover == pytest.approx(0.5 + 0.6 - 0.5 * 0.6, abs=2e-4)
    assert truth.cover_with_hairs == truth.cover
    assert truth.open_width == pytest.approx(0.2, abs=2e-4)
    assert truth.open_height == pytest.approx(0.2, abs=2e-4)
    # a pore in every cell of 0.4 mm × 0.5 mm; those the frame cuts count half: within a rim's share
    assert truth.pores_per_cm2 == pytest.approx(2.5 * 2.0 * 100, rel=0.03)
    assert truth.pore_area == pytest.approx(0.2 * 0.2, rel=0.02)


@pytest.mark.parametrize("turn", [0.0, -3.0, 25.0, 90.0, 97.0])
@pytest.mark.parametrize("skew", [0.0, 6.0])
def test_turn_and_skew_leave_the_sett_at_right_angles_alone(turn: float, skew: float) -> None:
    camera = replace(CLEAN, rotation_deg=turn, skew_deg=skew)
    truth = draw(EVEN, camera, 200, 220, rng(), fineness=2).truth
    # a thousandth of a pitch at each end of some twenty threads
    assert truth.ends == pytest.approx(2.5, rel=2e-4)
    assert truth.picks == pytest.approx(2.0, rel=2e-4)
    assert truth.angle == pytest.approx(90 - (90 - turn) % 180, abs=0.02)
    assert truth.skew == pytest.approx(skew, abs=0.02)
    assert truth.upright == ((truth.picks, truth.ends) if turn > 45 else (truth.ends, truth.picks))


def test_unequal_pitch_is_in_the_pixels_and_not_in_the_sett() -> None:
    camera = replace(CLEAN, px_per_mm_y=20.2, rotation_deg=10.0)
    truth = draw(EVEN, camera, 240, 240, rng()).truth
    assert truth.ends == pytest.approx(2.5, rel=2e-4)
    assert truth.picks == pytest.approx(2.0, rel=2e-4)
    assert truth.angle == pytest.approx(10.0, abs=0.02)
    assert truth.pixels_per_pick > 10.05


@pytest.mark.parametrize("bow", [0.02, -0.01])
def test_bow_is_found_with_its_sign(bow: float) -> None:
    truth = draw(EVEN, replace(CLEAN, bow=bow), 240, 240, rng()).truth
    assert truth.bow == pytest.approx(bow, rel=0.02)


def test_threads_counted_here_are_those_the_loom_counted() -> None:
    cloth = replace(EVEN, spacing_cv=0.02, wander=0.05, diameter_cv=0.05, tau=0.001, section=8.0)
    drawn = draw(cloth, CLEAN, 400, 400, rng(9))
    dark = drawn.stored < 0.3 * drawn.stored.max()
    # in rows that no pick covers, each end is one dark run
    between = dark.mean(axis=1) < 0.6
    runs = [threads(row) for row in dark[between]]
    assert len(runs) > 50
    gaps = np.mean([count for count, _ in runs]) - 1
    # a thread cut by the frame is no whole run here, though its centre may lie inside
    assert drawn.truth.ends_counted - 2 <= gaps <= drawn.truth.ends_counted
    spacing = np.median([(last) / (count - 1) for count, last in runs])
    # half a pixel at each end of 400
    assert 20.0 / spacing == pytest.approx(drawn.truth.ends, rel=2.5e-3)


def threads(row: NDArray[np.bool_]) -> tuple[int, float]:
    """Count whole dark runs, and the distance from the first one's middle to the last one's."""
    label, count = ndimage.label(row)
    whole = [k for k in range(1, count + 1) if not (label[0] == k or label[-1] == k)]
    middle = ndimage.center_of_mass(row, label, whole)
    return len(whole), middle[-1][0] - middle[0][0]


def test_paired_threads_are_counted_over_whole_pairs() -> None:
    cloth = replace(EVEN, reed=2, reed_gap=0.5, paired_picks=2, pair_gap=0.3)
    truth = draw(cloth, CLEAN, 210, 230, rng()).truth
    assert truth.ends == pytest.approx(2.5, rel=2e-4)
    assert truth.picks == pytest.approx(2.0, rel=2e-4)


@pytest.mark.parametrize("blur", [0.0, 1.2])
def test_cover_is_what_opaque_threads_take_from_the_light(blur: float) -> None:
    # opaque, square-edged threads: the mean of linear light is the open share and nothing else
    cloth = replace(EVEN, tau=1e-9, section=60.0, diameter_cv=0.1, spacing_cv=0.04, wander=0.1)
    camera = replace(CLEAN, blur_px=blur, rotation_deg=2.0)
    drawn = draw(cloth, camera, 300, 300, rng())
    seen = drawn.stored.mean() / 65535 / camera.exposure
    # 0.1 point: what a lens spreads over the frame's edge, and thread edges a fine point wide
    assert 1 - seen == pytest.approx(drawn.truth.cover, abs=1e-3)


def test_fine_drawing_is_fine_enough() -> None:
    cloth = replace(EVEN, diameter_cv=0.1, spacing_cv=0.04, wander=0.1)
    coarse = draw(cloth, CLEAN, 200, 200, rng()).truth
    fine = draw(cloth, CLEAN, 200, 200, rng(), fineness=9).truth
    assert coarse.cover == pytest.approx(fine.cover, abs=2e-4)
    # the counting lines lie a little otherwise, so that one more meets a thread at the rim
    assert coarse.ends == pytest.approx(fine.ends, rel=1e-3)
    assert coarse.pore_area == pytest.approx(fine.pore_area, rel=0.01)


def test_a_part_of_the_picture_can_be_counted_by_itself() -> None:
    drawn = draw(replace(EVEN, wander=0.3, spacing_cv=0.05), CLEAN, 400, 360, rng(2))
    everywhere = np.ones((360, 400), dtype=bool)
    assert drawn.within(everywhere) == pytest.approx((drawn.truth.ends, drawn.truth.picks))
    left = everywhere.copy()
    left[:, 200:] = False
    right = ~left
    halves = [drawn.within(half)[0] for half in (left, right)]
    # the whole lies between its halves; a gap at the seam belongs to neither
    assert min(halves) < drawn.truth.ends < max(halves)
    turned = replace(CLEAN, rotation_deg=90.0)
    even = draw(EVEN, turned, 300, 300, rng())
    assert even.within(np.indices((300, 300))[0] < 150) == pytest.approx((2.5, 2.0), rel=1e-3)


def test_thicker_yarn_never_covers_less() -> None:
    covers = [
        draw(replace(EVEN, end_diameter_mm=d, diameter_cv=0.1), CLEAN, 120, 120, rng()).truth.cover
        for d in (0.1, 0.2, 0.3, 0.39, 0.45)
    ]
    assert covers == sorted(covers)
    assert covers[-1] <= 1


def test_a_missing_end_leaves_its_place_and_opens_the_cloth() -> None:
    whole = draw(EVEN, CLEAN, 240, 240, rng()).truth
    gone = draw(
        replace(EVEN, faults=(Fault("missing end", 0.5, 0.5),)), CLEAN, 240, 240, rng()
    ).truth
    assert gone.ends == pytest.approx(whole.ends, rel=1e-6)
    # one of 30 ends, over the gaps that the picks leave
    assert whole.cover - gone.cover == pytest.approx(0.5 / 30 * 0.4, abs=3e-4)


def test_hairs_are_told_apart_from_yarn() -> None:
    bald = draw(EVEN, CLEAN, 200, 200, rng()).truth
    hairy = draw(replace(EVEN, hairs_per_mm=2.0), CLEAN, 200, 200, rng()).truth
    assert hairy.cover == bald.cover
    assert hairy.cover_with_hairs > hairy.cover + 0.005


def test_a_swatch_with_bare_bed_round_it_is_measured_inside() -> None:
    camera = replace(CLEAN, margin=(0.2, 0.2, 0.2, 0.2))
    truth = draw(EVEN, camera, 400, 400, rng()).truth
    assert truth.ends == pytest.approx(2.5, rel=1e-3)
    assert truth.cover == pytest.approx(0.8, abs=0.01)
    assert truth.ends_counted < 0.6 * 400 / 8
    xs, ys = zip(*truth.corners, strict=True)
    assert min(xs) > 80
    assert max(ys) < 320


def test_same_seed_same_picture_whatever_the_bands(monkeypatch: pytest.MonkeyPatch) -> None:
    cloth = replace(EVEN, diameter_cv=0.1, hairs_per_mm=1.0, wander=0.1)
    camera = replace(CLEAN, blur_px=0.8, read_noise=0.002)
    one = draw(cloth, camera, 150, 130, rng())
    again = draw(cloth, camera, 150, 130, rng())
    assert (one.stored == again.stored).all()
    assert one.truth == again.truth
    other = draw(cloth, camera, 150, 130, rng(5))
    assert (one.stored != other.stored).mean() > 0.9
    monkeypatch.setattr(drawing, "BAND_POINTS", 30_000)
    monkeypatch.setattr(drawing, "STRIP_POINTS", 1)  # one fine row at a time
    banded = draw(cloth, camera, 150, 130, rng())
    # one level of 65535: sums of floats in another order
    assert np.abs(banded.stored.astype(int) - one.stored.astype(int)).max() <= 1
    assert banded.truth.cover == pytest.approx(one.truth.cover, abs=1e-6)
    assert banded.truth.ends == pytest.approx(one.truth.ends, rel=1e-6)
