"""Are the transfer curves the published ones?"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from skimage.color import rgb2lab

from imgcover.tone import LINEAR, SRGB, Tone

GAMMAS = st.floats(0.3, 4.0)
SHARES = st.floats(0.0, 1.0)


@pytest.mark.parametrize(
    ("light", "stored"),
    [(0.0, 0.0), (0.18, 0.4613561), (1.0, 1.0), (0.0031308, 0.04045), (0.001, 0.01292)],
)
def test_srgb_at_published_points(light: float, stored: float) -> None:
    """Truth is published: IEC 61966-2-1:1999, 5.2, constants 0.04045, 12.92, 1.055, 2.4.

    4e-7 is the rounding of the published 0.0031308 and of the value at 0.18.
    """
    assert SRGB.from_linear(light) == pytest.approx(stored, abs=4e-7)
    assert SRGB.to_linear(stored) == pytest.approx(light, abs=4e-7)


def test_srgb_against_a_referee() -> None:
    """Truth is a referee: scikit-image's CIE lightness of sRGB greys, turned back into light.

    Lightness is f(Y) of CIE 15; 2e-4 covers scikit-image's rounding of the white point.
    """
    stored = np.linspace(0, 1, 1001)
    lightness = rgb2lab(np.repeat(stored[None, :, None], 3, axis=2))[0, :, 0]
    dark = lightness <= 8
    light = np.where(dark, lightness / 903.3, ((lightness + 16) / 116) ** 3)
    np.testing.assert_allclose(SRGB.to_linear(stored), light, atol=2e-4)


@settings(deadline=None)  # a busy machine is no fault
@given(share=SHARES)
def test_srgb_there_and_back_is_nothing(share: float) -> None:
    """Truth is symmetry."""
    assert SRGB.from_linear(SRGB.to_linear(share)) == pytest.approx(share, abs=1e-12)


@settings(deadline=None)  # a busy machine is no fault
@given(share=SHARES, gamma=GAMMAS)
def test_gamma_there_and_back_is_nothing(share: float, gamma: float) -> None:
    """Truth is symmetry; near zero the root of a rounded power loses digits."""
    tone = Tone("gamma", gamma)
    assert tone.to_linear(tone.from_linear(share)) == pytest.approx(share, abs=1e-12)


def test_linear_is_nothing() -> None:
    """Truth is theory."""
    shares = np.linspace(0, 1, 11)
    np.testing.assert_array_equal(LINEAR.to_linear(shares), shares)
    np.testing.assert_array_equal(LINEAR.from_linear(shares), shares)


@pytest.mark.parametrize("bits", [8, 16])
@pytest.mark.parametrize("tone", [SRGB, LINEAR, Tone("gamma", 1.8)])
def test_a_table_is_the_curve(tone: Tone, bits: int) -> None:
    """Truth is theory: stored value over the largest one, to float32."""
    table = tone.lut(bits)
    assert table.dtype == np.float32 and len(table) == 1 << bits
    stored = np.arange(1 << bits) / ((1 << bits) - 1)
    np.testing.assert_allclose(table, tone.to_linear(stored), rtol=1e-6)
    with pytest.raises(ValueError, match="read-only"):
        table[0] = 1


@pytest.mark.parametrize(
    ("text", "tone"),
    [
        ("srgb", SRGB),
        (" sRGB ", SRGB),
        ("linear", LINEAR),
        ("gamma:2.2", Tone("gamma", 2.2)),
        ("gamma: 2", Tone("gamma", 2.0)),
        ("GAMMA:.45", Tone("gamma", 0.45)),
    ],
)
def test_a_tone_is_read_as_it_is_written(text: str, tone: Tone) -> None:
    """Truth is the contract of the command line."""
    assert Tone.parse(text) == tone
    assert Tone.parse(str(tone)) == tone


@pytest.mark.parametrize(
    "text", ["", "gamma", "gamma:", "gamma:-2", "gamma:0", "gamma:99", "gamma:1e9", "rec709", "2.2"]
)
def test_what_is_no_tone_is_a_wrong_call(text: str) -> None:
    """Truth is the contract: srgb, linear, gamma:G with a sensible G."""
    with pytest.raises(ValueError, match=r"tone must be|gamma must lie"):
        Tone.parse(text)


def test_lut_depths() -> None:
    """Truth is the contract: files hold 8 or 16 bits."""
    with pytest.raises(ValueError, match="bits must be 8 or 16"):
        SRGB.lut(12)
