"""Half-level edges against scikit-image's threshold on a sharp two-level picture.

Truth is published: Otsu 1979 as scikit-image implements it; on a picture of two levels any
threshold between them gives the same area. Difference of meaning: Otsu splits grey levels by
variance, the cover room reads the edge half-way between the open and the yarn level.
"""

import numpy as np
import pytest
from skimage.filters import threshold_otsu

from imgcover.cover.reader import read_cover
from imgcover.cover.reading import Lattice


def test_on_two_sharp_levels_every_threshold_gives_the_same_area():
    period, bar = 20, 12
    across = np.arange(400) % period < bar
    covered = across[:, None] | across[None, :]
    light = np.where(covered, 0.05, 0.8).astype(np.float32)
    reading = read_cover(light, light="backlit", lattice=Lattice((1 / period, 0), (0, 1 / period)))
    otsu = float((light <= threshold_otsu(light)).mean())
    assert otsu == pytest.approx(covered.mean())
    assert reading.optical is not None
    # a pixel's aperture is all the blur there is; the sweep's RMS is 0.003
    assert reading.optical.value == pytest.approx(otsu, abs=0.006)
