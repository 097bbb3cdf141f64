"""A row's pitch over the rest of a picture seen aslant: places of lines, no picture."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.repeat.comb import fit_comb
from imgcover.scale.rule_fit import FittedRow
from imgcover.scale.rule_frame import Frame
from imgcover.scale.rule_hierarchy import Bend, Graduation, Pattern, bend_of
from imgcover.scale.rule_lines import Row
from imgcover.scale.rule_view import View
from imgcover.scale.rule_view import view_of as view_with

SIZE = (1000, 1400)
STRAIGHT = Bend(0.0, 1e-6, plain=False)
HALF_WIDTH = 80.0


def view_of(fitted: FittedRow, size: tuple[int, int], bend: Bend = STRAIGHT) -> View:
    """A row whose ends say that it is straight, if nothing else is said."""
    return view_with(fitted, size, bend=bend, half_width=HALF_WIDTH)


PITCH, LINES = 10.0, 101
FOOT = np.array([200.0, 150.0])


def seen(rule: NDArray[np.float64], lean: tuple[float, float]) -> NDArray[np.float64]:
    """Where a plane that leans shows points of the rule, pixels from its middle line's foot."""
    return rule * PITCH / (1 + rule @ np.array(lean) * PITCH)[:, None]


def row(
    lean: tuple[float, float], *, noise: float = 0.0, u_across: float = 2e-6, seed: int = 1
) -> FittedRow:
    """A row of lines along x, placed three pitches up from their foot."""
    numbers = np.arange(LINES) - LINES // 2
    generator = np.random.default_rng(seed)
    places = []
    for height in (3.0, 3.01):
        # where the line through (k, 0) and (k, 6) crosses the height in the picture
        ends = [seen(np.column_stack([numbers, np.full(LINES, h)]), lean) for h in (0.0, 6.0)]
        share = (height * PITCH - ends[0][:, 1]) / (ends[1][:, 1] - ends[0][:, 1])
        places.append(ends[0][:, 0] + share * (ends[1][:, 0] - ends[0][:, 0]))
    comb = fit_comb(numbers, places[0] + generator.normal(0, noise + 1e-9, LINES))
    assert comb is not None
    across = np.polyfit(numbers, places[1] - places[0], 1)[0] / (0.01 * PITCH) / PITCH
    frame = Frame(*FOOT, 0.0, math.pi / 2)
    return FittedRow(frame, numbers, comb, 3 * PITCH, float(across), u_across)


def truth(place: NDArray[np.float64], lean: tuple[float, float]) -> float:
    """Picture pixels to one pitch along x at a place: the homography inverted and differenced."""
    matrix = np.array([[PITCH, 0, 0], [0, PITCH, 0], [lean[0] * PITCH, lean[1] * PITCH, 1]])
    back = np.linalg.inv(matrix)
    ends = np.array([[-0.5, 0], [0.5, 0]]) + place - FOOT
    shown = np.column_stack([ends, np.ones(2)]) @ back.T
    return float(1 / np.ptp(shown[:, 0] / shown[:, 2]))


@pytest.mark.parametrize("lean", [(2e-5, 0.0), (0.0, 3e-5), (1.5e-5, -2e-5), (-1e-5, 2e-5)])
def test_a_tilt_is_followed_over_the_picture(lean: tuple[float, float]) -> None:
    """Truth is theory: a homography. A line is not upright where the plane leans, which moves
    the pitch by its slope squared, under 1e-4; the change to be followed is up to 6 %."""
    view = view_of(row(lean, noise=0.01), SIZE)
    assert view.change > 0.01
    for place in ([200.0, 150.0], [700.0, 500.0], [1300.0, 900.0]):
        pitch, u = view.pitch_at(np.array(place))
        # fitted at places that scatter by a thousandth of a pitch
        assert pitch == pytest.approx(truth(np.array(place), lean), rel=6e-4)
        assert abs(pitch / truth(np.array(place), lean) - 1) < 3 * u


def test_a_scanner_has_no_tilt() -> None:
    """Truth is theory: none is invented from noise, and little is left to the uncertainty."""
    views = [view_of(row((0.0, 0.0), noise=0.02, seed=seed), SIZE) for seed in range(30)]
    assert sum(view.change == 0 for view in views) >= 29
    corner = np.array([1300.0, 900.0])
    us = [view.pitch_at(corner)[1] for view in views if view.change == 0]
    assert np.median(us) < 5e-4


def test_what_a_poor_row_cannot_see_is_left_uncertain() -> None:
    """Truth is theory: lines too short to tell foot from tip leave the pitch far from them
    open, in proportion to the distance; beside them they do not."""
    sure, poor = (view_of(row((0.0, 2e-5), noise=0.05, u_across=u), SIZE) for u in (1e-6, 4e-5))

    def u_at(view: View, y: float) -> float:
        return view.pitch_at(np.array([200.0, y]))[1]

    assert sure.change > 0 and poor.change == 0
    # a tenth of the cameras lean so that only foot and tip could tell: 1.4e-5 a pixel, half of them
    assert u_at(poor, 950.0) == pytest.approx(770 * 1.4e-5 * math.sqrt(0.1 / 2), rel=0.5)
    assert u_at(poor, 200.0) < u_at(poor, 950.0) / 4
    blind = view_of(row((0.0, 0.0), noise=0.05, u_across=math.inf), SIZE)
    assert u_at(blind, 950.0) > u_at(sure, 950.0)


@pytest.mark.parametrize("bend", [(2e-5, 2e-6, True), (2e-5, 8e-6, False), (0.0, 3e-5, False)])
def test_a_bent_row_says_nothing_of_what_lies_beside_it(bend: tuple[float, float, bool]) -> None:
    """Truth is theory: on a bend of radius R the pitch grows by 1/R a pixel from foot to tip, as
    under a tilt; beside the row it may go on so or not, and where across the rule it kept its
    length is not known. So it is where the ends cannot tell bent from straight."""
    fitted = row((0.0, 2e-5), noise=0.02)
    value, u, plain = bend
    view = view_of(fitted, SIZE, Bend(math.copysign(value, fitted.across), u, plain))
    beside, far = (view.pitch_at(np.array([200.0, y])) for y in (180.0, 950.0))
    assert far[0] == pytest.approx(beside[0], rel=1e-6)
    least = math.hypot(770, HALF_WIDTH) * 2e-5
    assert least * 0.9 < far[1] < 1.6 * least
    assert beside[1] == pytest.approx(HALF_WIDTH * 2e-5, rel=0.15)


def test_a_bend_is_seen_in_the_lines_ends() -> None:
    """Truth is theory: a row of radius 20 000 px, its lines' ends uneven by half a pixel, against
    a straight one."""
    numbers = np.arange(100)
    long = numbers % 5 == 0
    uneven = np.random.default_rng(4).normal(0, 0.5, 100)
    for radius, seen_bend in ((20_000.0, 1 / 20_000.0), (math.inf, 0.0)):
        ends = np.where(long, 50.0, 35.0) + uneven + ((numbers - 50) * PITCH) ** 2 / 2 / radius
        held = Row(
            Frame(0, 0, 0, math.pi / 2),
            PITCH,
            numbers,
            numbers * PITCH,
            ends,
            ends,
            ends,
            tip=np.ones(100),
            faint_tip=np.ones(100),
            wide=np.zeros(100),
            strength=np.ones(100),
            light=False,
            zone=30.0,
        )
        pattern = Pattern((1, 5), (Graduation.MM,), 0, (float(np.median(ends)) / PITCH, 5.0), 0, 1)
        bend = bend_of(held, pattern)
        assert bend.value == pytest.approx(seen_bend, rel=0.15, abs=3 * bend.u)
        assert bend.plain == (seen_bend > 0)
