"""Every family of cloth and every kind of other picture can be drawn, from its seed alone.

Truth is drawn: loom, seeds 0…; a family shows what its name says, told by the truth or the picture.
"""

from __future__ import annotations

import numpy as np
import pytest

from imgcover.loom.cases import COVER, Reach
from imgcover.loom.families import FAMILIES, random_case
from imgcover.loom.patterns import PATTERNS, draw_pattern

SMALL = Reach(px=(7.0, 8.0), threads=(24.0, 28.0), frame_px=(180, 220))


@pytest.mark.parametrize("family", FAMILIES)
def test_a_family_draws_what_was_ordered(family: str) -> None:
    number = list(FAMILIES).index(family)
    case = random_case(np.random.default_rng([1, number]), family=family, reach=SMALL)
    drawn = case.draw(np.random.default_rng([2, number]))
    assert case.family == family
    assert drawn.stored.shape == (case.height, case.width)
    assert drawn.stored.std() > 0
    # few threads, each straying: within what spacing and straying of both ends can do
    assert drawn.truth.ends == pytest.approx(case.cloth.ends_per_mm, rel=0.05)
    assert drawn.truth.picks == pytest.approx(case.cloth.picks_per_mm, rel=0.05)
    assert 0 < drawn.truth.cover <= 1
    again = random_case(np.random.default_rng([1, number]), family=family, reach=SMALL)
    assert again == case


def test_families_are_what_their_names_say() -> None:
    def one(family: str, seed: int = 0) -> object:
        return random_case(np.random.default_rng(seed), family=family, reach=SMALL)

    assert one("reed").cloth.reed >= 2
    assert one("paired").cloth.paired_picks == 2
    assert one("denim").camera.light == "reflected"
    assert one("denim").cloth.end_lightness[0] < one("denim").cloth.pick_lightness[0]
    assert len(set(one("checks").cloth.pick_lightness)) > 1
    assert all(side > 0 for side in one("bare bed").camera.margin)
    assert sum(side > 0 for side in one("swatch edge").camera.margin) == 1
    assert abs(one("skewed").camera.skew_deg) >= 3
    assert one("jpeg").camera.jpeg is not None
    turns = [one("rotated", k).camera.rotation_deg for k in range(40)]
    assert max(turns) > 60
    assert min(turns) < -20


def test_reaches_are_kept() -> None:
    for k in range(30):
        case = random_case(np.random.default_rng(k), reach=COVER)
        finest = max(case.cloth.ends_per_mm, case.cloth.picks_per_mm)
        assert 5.0 <= case.camera.px_per_mm / finest <= 25.0
        assert case.camera.light == "backlit"
        assert 0.01 <= case.cloth.tau <= 0.25
        assert case.camera.blur_px <= 1.4
        assert case.camera.glare <= 0.03


def test_unknown_names_are_refused() -> None:
    with pytest.raises(ValueError, match="family must be one of ordinary"):
        random_case(np.random.default_rng(0), family="tartan")
    with pytest.raises(ValueError, match="name must be one of jersey knit"):
        draw_pattern("tartan", np.random.default_rng(0))


@pytest.mark.parametrize("name", PATTERNS)
def test_a_pattern_is_drawn_from_its_seed_and_no_two_alike(name: str) -> None:
    one = draw_pattern(name, np.random.default_rng(3), width=150, height=130)
    assert one.shape == (130, 150)
    assert one.dtype == np.uint8
    assert (one == draw_pattern(name, np.random.default_rng(3), width=150, height=130)).all()
    other = draw_pattern(name, np.random.default_rng(4), width=150, height=130)
    assert (one != other).mean() > 0.3
    if name != "blank":
        assert one.std() > 1


def test_there_are_enough_kinds_to_refuse() -> None:
    assert len(PATTERNS) >= 20
