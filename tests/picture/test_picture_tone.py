"""Is a transfer curve that the file states honoured or refused, never passed over in silence?"""

from __future__ import annotations

import io
import struct

import numpy as np
import picture_files as files
import pytest
from PIL import Image, ImageCms

from imgcover.errors import PictureError
from imgcover.findings import Flag, has
from imgcover.picture.profile import ProfileError, nearest_tone, same_curve, tone_of_profile
from imgcover.picture.reader import read_picture
from imgcover.tone import LINEAR, SRGB, Tone

RGB = files.grainy()
IMAGE = Image.fromarray(RGB)
STEPS = np.linspace(0, 1, 1024)
LIGHTNESS = np.where(STEPS <= 0.08, STEPS / 9.033, ((STEPS + 0.16) / 1.16) ** 3)
CURVES = {
    "linear": (files.linear_curve(), LINEAR),
    "linear table": (files.table_curve(STEPS), LINEAR),
    "1.8": (files.gamma_curve(1.8), Tone("gamma", 1.801)),
    "Adobe RGB": (files.gamma_curve(2.19921875), Tone("gamma", 2.199)),
    "gamma table": (files.table_curve(STEPS**2.2), Tone("gamma", 2.2)),
    "gamma function": (files.parametric_curve(0, 2.2), Tone("gamma", 2.2)),
    "sRGB table": (files.table_curve(SRGB.to_linear(STEPS)), SRGB),
    "sRGB function": (
        files.parametric_curve(3, 2.4, 1 / 1.055, 0.055 / 1.055, 1 / 12.92, 0.04045),
        SRGB,
    ),
}


@pytest.mark.parametrize("curve", CURVES)
@pytest.mark.parametrize("channels", [1, 3])
def test_a_profile_gives_its_curve(curve: str, channels: int) -> None:
    """Truth is published: the curve types of ICC.1:2022, 10.6 and 10.18."""
    data, tone = CURVES[curve]
    assert tone_of_profile(files.profile(*[data] * channels)) == tone


@pytest.mark.parametrize("curve", CURVES)
def test_a_profile_means_what_a_colour_engine_takes_it_for(curve: str) -> None:
    """Truth is a referee: LittleCMS takes each grey through the profile to sRGB.

    One level apart at most: the engine rounds to 8 bits on the way in and out, and curves count
    as one within 0.004 of light.
    """
    profile = files.profile(*[CURVES[curve][0]] * 3)
    engine = ImageCms.ImageCmsProfile(io.BytesIO(profile))
    ramp = Image.fromarray(np.repeat(np.arange(256, dtype=np.uint8)[None, :, None], 3, axis=2))
    taken = np.asarray(ImageCms.profileToProfile(ramp, engine, ImageCms.createProfile("sRGB")))
    light = tone_of_profile(profile).to_linear(np.arange(256) / 255)
    here = 255 * SRGB.from_linear(light)
    bright = light > 0.02  # in deep shadow a level of sRGB is less than 0.004 of light
    assert np.abs(here - taken[0, :, 1])[bright].max() <= 1.5


def test_the_engines_own_srgb_profile_is_srgb() -> None:
    """Truth is a referee: the sRGB profile that LittleCMS makes."""
    engine = ImageCms.ImageCmsProfile(ImageCms.createProfile("sRGB"))
    assert tone_of_profile(engine.tobytes()) == SRGB


@pytest.mark.parametrize(
    "profile",
    [
        b"",
        b"\0" * 200,
        files.profile(files.gamma_curve(2.2))[:140],
        files.profile(files.gamma_curve(2.2), files.gamma_curve(1.8), files.gamma_curve(2.2)),
        files.profile(files.table_curve(LIGHTNESS)),
        files.profile(files.table_curve(STEPS[::-1])),
        files.profile(files.parametric_curve(1, 2.2, 0.0, 0.0)),
        files.profile(files.parametric_curve(9)),
        files.profile(struct.pack(">4sII", b"curv", 0, 1 << 30)),
        files.profile(struct.pack(">4sII", b"mft2", 0, 0)),
        files.profile(),
    ],
    ids=range(11),
)
def test_a_profile_that_is_not_understood_is_refused(profile: bytes) -> None:
    """Truth is drawn: cut, empty, unequal, of another shape, or with tables for curves."""
    with pytest.raises(ProfileError):
        tone_of_profile(profile)
    with pytest.raises(PictureError, match="colour profile"):
        read_picture(files.pillow(IMAGE, "TIFF", icc_profile=profile or b"x"), name="x.tif")


@pytest.mark.parametrize("kind", ["PNG", "JPEG", "TIFF", "WEBP"])
@pytest.mark.parametrize("curve", ["linear", "Adobe RGB", "sRGB table"])
def test_an_embedded_profile_is_followed_in_every_kind_of_file(kind: str, curve: str) -> None:
    """Truth is drawn: the profile that Pillow embedded."""
    data, tone = CURVES[curve]
    picture = read_picture(
        files.pillow(IMAGE, kind, icc_profile=files.profile(*[data] * 3)), name="x"
    )
    assert picture.tone == tone
    assert has(picture.findings, Flag.TONE_FROM_FILE) == (tone != SRGB)
    np.testing.assert_allclose(picture.light(), _luminance(tone, picture.stored), rtol=0, atol=2e-6)


def _luminance(tone: Tone, stored: np.ndarray) -> np.ndarray:
    return tone.to_linear(stored / 255) @ [0.2126, 0.7152, 0.0722]


PNG = files.pillow(IMAGE, "PNG")


@pytest.mark.parametrize(
    ("kind", "body", "tone"),
    [
        (b"gAMA", struct.pack(">I", 100000), LINEAR),
        (b"gAMA", struct.pack(">I", 45455), SRGB),
        (b"gAMA", struct.pack(">I", 55556), Tone("gamma", 1.8)),
        (b"sRGB", b"\0", SRGB),
        (b"cICP", bytes([1, 13, 0, 1]), SRGB),
        (b"cICP", bytes([1, 8, 0, 1]), LINEAR),
        (b"cICP", bytes([1, 16, 0, 1]), None),
        (b"cICP", bytes([1, 1, 0, 1]), None),
        (b"gAMA", struct.pack(">I", 0), None),
        (b"gAMA", struct.pack(">I", 1), None),
    ],
)
def test_png_chunks_that_state_a_curve(kind: bytes, body: bytes, tone: Tone | None) -> None:
    """Truth is published: PNG 3rd ed., 11.3.2, and ITU-T H.273, table 3. None is refused."""
    data = files.with_chunk(PNG, kind, body)
    if tone is None:
        with pytest.raises(PictureError, match="states"):
            read_picture(data, name="x.png")
    else:
        assert read_picture(data, name="x.png").tone == tone


def test_png_chunks_have_an_order() -> None:
    """Truth is published: PNG 3rd ed., table of precedence: cICP, iCCP, sRGB, gAMA."""
    data = files.with_chunk(PNG, b"gAMA", struct.pack(">I", 100000))
    data = files.with_chunk(data, b"sRGB", b"\0")
    assert read_picture(data, name="x").tone == SRGB
    data = files.with_chunk(data, b"cICP", bytes([1, 8, 0, 1]))
    assert read_picture(data, name="x").tone == LINEAR


@pytest.mark.parametrize(("space", "tone"), [(1, SRGB), (2, Tone("gamma", 2.19921875))])
def test_an_exif_colour_space_is_followed(space: int, tone: Tone) -> None:
    """Truth is published: EXIF 2.32 ColorSpace, and Adobe RGB (1998), 4.3.4.2."""
    data = files.pillow(IMAGE, "JPEG", exif=files.exif(space=space))
    assert read_picture(data, name="x.jpg").tone == tone


def test_a_tiff_transfer_function_is_followed() -> None:
    """Truth is drawn: the table that tifffile wrote."""
    table = np.round(65535 * (np.arange(256) / 255) ** 1.8).astype(int).tolist()
    data = files.tiff(RGB, extratags=[(301, "H", 256, table, True)])
    assert read_picture(data, name="x.tif").tone == Tone("gamma", 1.8)


def test_without_a_word_the_curve_is_srgb_or_what_the_user_says() -> None:
    """Truth is the contract: sRGB by default."""
    assert read_picture(PNG, name="x.png").tone == SRGB
    assert read_picture(PNG, name="x.png", tone=LINEAR).tone == LINEAR


def test_the_users_word_against_the_files() -> None:
    """Truth is the contract: a claim of sRGB gives way with a finding, any other refuses."""
    srgb = files.with_chunk(PNG, b"sRGB", b"\0")
    picture = read_picture(srgb, name="x.png", tone=LINEAR)
    assert picture.tone == LINEAR
    assert has(picture.findings, Flag.TONE_AGAINST_FILE)
    linear = files.pillow(IMAGE, "PNG", icc_profile=files.profile(*[files.linear_curve()] * 3))
    assert read_picture(linear, name="x.png", tone=LINEAR).findings[-1].flag is Flag.CHANNEL_CHOSEN
    for stated in (SRGB, Tone("gamma", 2.2)):
        with pytest.raises(PictureError, match="says tone linear, and --tone says"):
            read_picture(linear, name="x.png", tone=stated)


def test_curves_that_are_one_and_two() -> None:
    """Truth is theory: sRGB and a plain 2.2 differ by 0.0085 of light at most (computed)."""
    assert same_curve(Tone("gamma", 2.2), Tone("gamma", 2.199))
    assert not same_curve(SRGB, Tone("gamma", 2.2))
    with pytest.raises(ProfileError):
        nearest_tone(LIGHTNESS)
