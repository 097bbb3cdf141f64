"""Truth is arithmetic, by eye; and SciPy's prominence as a referee, which means the same."""

import numpy as np
import pytest
from scipy.signal import find_peaks

from imgcover.threads.profile import ridges_in

PLACES = np.arange(96) / 96


def wave(times: int, turned: float = 0.0) -> np.ndarray:
    return np.cos(2 * np.pi * times * (PLACES - turned))


@pytest.mark.parametrize("times", [1, 2, 3, 7])
def test_as_many_ridges_are_counted_as_there_are(times):
    assert ridges_in(wave(times), share=0.1) == times


def test_a_ridge_counts_from_its_share_of_the_range_on():
    # two ridges of one range with a dip of a tenth between them
    two = np.interp(PLACES, [0, 0.25, 0.5, 0.75, 1], [0, 1, 0.9, 1, 0])
    assert [ridges_in(two, share=share) for share in (0.05, 0.15)] == [2, 1]


def test_where_the_period_begins_does_not_matter():
    profile = wave(1) + 0.7 * wave(3, 0.1)
    counts = {ridges_in(np.roll(profile, by), share=0.1) for by in range(96)}
    assert len(counts) == 1


def test_nothing_has_no_ridge():
    assert ridges_in(np.full(96, 0.3), share=0.1) == 0


def test_the_referee_counts_the_same():
    chance = np.random.default_rng(8)
    for _ in range(200):
        size = chance.normal(size=8) * chance.random(8) ** 3
        profile = sum(each * wave(k + 1, chance.random()) for k, each in enumerate(size))
        closed = np.roll(profile, -int(profile.argmin()))
        closed = np.append(closed, closed[0])
        for share in (0.03, 0.12):
            peaks, _ = find_peaks(closed, prominence=share * np.ptp(profile))
            assert ridges_in(profile, share=share) == len(peaks)
