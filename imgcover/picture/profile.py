"""Which transfer curve does an embedded colour profile, or a table, stand for?

A profile that is not understood is refused: cover taken through the wrong curve is a wrong
number that looks like any other.

References
----------
ICC.1:2022, 7.2 (header), 7.3 (tag table), 10.6 (curveType), 10.18 (parametricCurveType).
"""

from __future__ import annotations

import struct

import numpy as np
from numpy.typing import NDArray

from imgcover.tone import HIGHEST_GAMMA, LINEAR, LOWEST_GAMMA, SRGB, Tone

SAME_CURVE = 0.004
"""Two curves that stay this close in linear light are one: a quarter of an 8-bit scan's noise, and
less than a thirtieth of a point of cover. sRGB and a plain 2.2 differ by 0.008."""
CURVE_TAGS = (b"rTRC", b"gTRC", b"bTRC", b"kTRC")
"""Tone curves of red, green, blue and grey (ICC.1:2022, 9.2)."""
PARAMETERS = {0: 1, 1: 3, 2: 4, 3: 5, 4: 7}
"""Numbers that each parametric function takes (ICC.1:2022, table 68)."""

_STORED = np.linspace(0.0, 1.0, 257)


class ProfileError(ValueError):
    """A profile that cannot be read, or whose curve is none this program knows."""


def tone_of_profile(profile: bytes) -> Tone:
    """Find the transfer curve of an ICC profile.

    Parameters
    ----------
    profile : bytes
        The profile as embedded.

    Returns
    -------
    Tone
        sRGB, linear, or the nearest plain gamma.

    Raises
    ------
    ProfileError
        When the profile is damaged, holds no curves, holds different curves for its channels, or
        a curve that is neither sRGB, linear nor a gamma.
    """
    if len(profile) < 132 or profile[36:40] != b"acsp":
        raise ProfileError("is damaged")
    try:
        curves = [_curve(profile, at, size) for at, size in _curve_tags(profile)]
    except struct.error as error:
        raise ProfileError("is cut short") from error
    if not curves:
        raise ProfileError("holds look-up tables instead of a tone curve")
    tones = {nearest_tone(curve) for curve in curves}
    if len(tones) > 1:
        told = ", ".join(sorted(map(str, tones)))
        raise ProfileError(f"has a different tone curve for each colour ({told})")
    return tones.pop()


def nearest_tone(light: NDArray[np.float64]) -> Tone:
    """Name the tone whose curve runs as the sampled one does.

    Parameters
    ----------
    light : ndarray, shape (n,), float64
        Linear light 0…1 at stored values spread evenly over 0…1.

    Raises
    ------
    ProfileError
        When neither sRGB, linear nor any plain gamma stays within `SAME_CURVE` of it.
    """
    stored = np.linspace(0.0, 1.0, len(light))
    for tone in (SRGB, LINEAR):
        if _apart(tone, stored, light) <= SAME_CURVE:
            return tone
    middle = (light > 0.02) & (light < 0.98) & (stored > 0) & (stored < 1)
    if middle.any():
        gamma = float(np.median(np.log(light[middle]) / np.log(stored[middle])))
        if LOWEST_GAMMA <= gamma <= HIGHEST_GAMMA:
            tone = Tone("gamma", round(gamma, 3))
            if _apart(tone, stored, light) <= SAME_CURVE:
                return tone
    raise ProfileError("has a tone curve that is neither sRGB, linear nor a plain gamma")


def same_curve(one: Tone, other: Tone) -> bool:
    """Whether two tones stay within `SAME_CURVE` of each other in linear light."""
    return _apart(one, _STORED, other.to_linear(_STORED)) <= SAME_CURVE


def _apart(tone: Tone, stored: NDArray[np.float64], light: NDArray[np.floating]) -> float:
    return float(np.abs(tone.to_linear(stored) - light).max())


def _curve_tags(profile: bytes) -> list[tuple[int, int]]:
    (count,) = struct.unpack_from(">I", profile, 128)
    if count > 1000:
        raise ProfileError("is damaged")
    entries = [struct.unpack_from(">4sII", profile, 132 + 12 * index) for index in range(count)]
    return [(at, size) for signature, at, size in entries if signature in CURVE_TAGS]


def _curve(profile: bytes, at: int, size: int) -> NDArray[np.float64]:
    kind, _, count = struct.unpack_from(">4sII", profile, at)
    if kind == b"curv":
        if count == 0:
            return _STORED
        if at + 12 + 2 * count > len(profile):
            raise ProfileError("is cut short")
        values = np.frombuffer(profile, ">u2", count, at + 12).astype(np.float64)
        if count == 1:
            return np.asarray(_STORED ** (values[0] / 256))
        return np.interp(_STORED, np.linspace(0, 1, count), values / 65535)
    if kind == b"para":
        (function,) = struct.unpack_from(">H", profile, at + 8)
        if function not in PARAMETERS:
            raise ProfileError("is damaged")
        fixed = struct.unpack_from(f">{PARAMETERS[function]}i", profile, at + 12)
        return _parametric(function, [each / 65536 for each in fixed])
    raise ProfileError("holds a tone curve of an unknown type")


def _parametric(function: int, given: list[float]) -> NDArray[np.float64]:
    """Sample Y = (aX + b)^g + e above d, cX + f below it (ICC.1:2022, table 68)."""
    g, a, b, c, d, e, f = 1.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0
    if function == 0:
        (g,) = given
    elif function in (1, 2):
        g, a, b = given[:3]
        if a == 0:
            raise ProfileError("is damaged")
        d = -b / a
        e = f = given[3] if function == 2 else 0.0
    elif function == 3:
        g, a, b, c, d = given
    else:
        g, a, b, c, d, e, f = given
    if not -20 < g < 20:
        raise ProfileError("is damaged")
    power = np.maximum(a * _STORED + b, 1e-12) ** g + e
    return np.clip(np.where(d <= _STORED, power, c * _STORED + f), 0, 1)


__all__ = ["ProfileError", "nearest_tone", "same_curve", "tone_of_profile"]
