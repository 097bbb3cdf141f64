"""From a file, or the bytes of one, to a picture: whole, upright, its tone known; or refused."""

from __future__ import annotations

import hashlib
import logging
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import cast

import cv2
import numpy as np

from imgcover.errors import PictureError
from imgcover.findings import Finding, Flag, found
from imgcover.picture.channel import choose_channel
from imgcover.picture.clipping import clipped_shares
from imgcover.picture.header import Header, Stored, damaged
from imgcover.picture.orientation import TURNS, turned, turned_pair
from imgcover.picture.picture import Channel, Picture
from imgcover.picture.profile import same_curve
from imgcover.picture.source import fetch, is_misnamed, read_header
from imgcover.tone import SRGB, Tone

MOST_PIXELS = 300_000_000
"""Two A4 scans at 1200 dpi; what claims more is a mistake or an attack."""
LOSSY = frozenset({"JPEG", "WebP"})
"""Formats that mostly drop what is fine and faint; a lossless WebP is not told from the others."""
CLIPPED_SHARE = 0.01
"""One pixel in a hundred at the end of the scale moves a mean of light by a noticeable amount."""
logging.getLogger("imagecodecs").addHandler(logging.NullHandler())
# decoders' remarks on odd but whole files would else reach stderr


def read_picture(source: Path | bytes, *, name: str, tone: Tone | None = None) -> Picture:
    """Read one picture.

    Parameters
    ----------
    source : Path or bytes
        A file, or the bytes of one.
    name : str
        What to call it in messages and records; its suffix is held against the content.
    tone : Tone, optional
        What the user says about the transfer curve. Without it the file's own claim counts, and
        sRGB where there is none. A stated tone outranks a claim of sRGB, which programs attach
        unasked, with a finding; against any other claim the picture is refused.

    Returns
    -------
    Picture

    Raises
    ------
    PictureError
        When the file is missing, empty, damaged, truncated, too large, no picture, or of a sort
        that cannot be measured rightly.
    """
    data = source if isinstance(source, bytes) else fetch(source, name)
    header = read_header(data, name)
    _check_size(header, name)
    used_tone, tone_findings = _tone(header, tone, name)
    with ThreadPoolExecutor(2) as beside:  # hashing releases the interpreter while it runs
        file_hash = beside.submit(lambda: hashlib.sha256(data).hexdigest())
        decoded = _without_alpha(_decode(header, name), name)
        pixel_hash = beside.submit(_pixels_hash, decoded)
        stored = _without_idle_colour(decoded)
        choice = choose_channel(stored, used_tone)
        low, high = clipped_shares(stored, choice.channel)
        return Picture(
            name=name,
            stored=turned(stored, header.orientation),
            tone=used_tone,
            channel=choice.channel,
            sha256=file_hash.result(),
            pixels_sha256=pixel_hash.result(),
            bits=header.bits,
            dpi=turned_pair(header.dpi, header.orientation),
            orientation=header.orientation,
            clipped_low=low,
            clipped_high=high,
            findings=(
                *_named(header, name),
                *header.findings,
                *_turn(header),
                *tone_findings,
                *_chosen(choice.channel, choice.reason),
                *_clipping(low, high),
            ),
            lossy=header.kind in LOSSY,
        )


def _check_size(header: Header, name: str) -> None:
    """Refuse by the header's claim, before anything of that size is made."""
    pixels = header.width * header.height
    if pixels < 1:
        raise damaged(name, f"the {header.kind} has no pixels ({header.width} × {header.height})")
    if pixels > MOST_PIXELS:
        raise PictureError(
            name,
            f"the {header.kind} claims {header.width} × {header.height} pixels, more than the "
            f"{MOST_PIXELS // 1_000_000} million accepted",
            "scan a part of the cloth, or at a lower resolution",
        )


def _tone(header: Header, stated: Tone | None, name: str) -> tuple[Tone, tuple[Finding, ...]]:
    """Settle the transfer curve between the user's word and the file's claim."""
    claimed = header.tone
    if claimed is None:
        return stated or SRGB, ()
    if stated is None:
        if claimed == SRGB:
            return SRGB, ()
        message = f"tone {claimed}, as {header.tone_from} says"
        return claimed, (found(Flag.TONE_FROM_FILE, message),)
    if same_curve(stated, claimed):
        return stated, ()
    if claimed == SRGB:
        message = f"tone {stated} was used, as stated, although {header.tone_from} says sRGB"
        return stated, (found(Flag.TONE_AGAINST_FILE, message),)
    raise PictureError(
        name,
        f"{header.tone_from} says tone {claimed}, and --tone says {stated}",
        "leave --tone out to follow the file, or save the picture without that note",
    )


def _decode(header: Header, name: str) -> Stored:
    """Decode, and hold what came against what the header promised."""
    array = header.decode()
    shape = (header.height, header.width, header.samples)
    if array.shape != (shape if header.samples > 1 else shape[:2]):
        raise damaged(name, f"the {header.kind} does not decode to the size it promises")
    if array.dtype != (np.uint8 if header.bits == 8 else np.uint16):
        raise damaged(name, f"the {header.kind} does not decode to its {header.bits} bits")
    return array


def _without_alpha(array: Stored, name: str) -> Stored:
    """Drop an alpha channel that is opaque everywhere; transparency leaves cloth unseen."""
    samples = array.shape[2] if array.ndim == 3 else 1
    if samples in (1, 3):
        return array
    lowest, _, _, _ = cv2.minMaxLoc(cv2.extractChannel(array, samples - 1))
    if lowest < np.iinfo(array.dtype).max:
        raise PictureError(
            name,
            "parts of the picture are transparent, and what lies behind them is not known",
            "save it flattened, without transparency",
        )
    if samples == 2:
        return cast("Stored", cv2.extractChannel(array, 0))
    return cast("Stored", cv2.cvtColor(array, cv2.COLOR_RGBA2RGB))


def _without_idle_colour(array: Stored) -> Stored:
    """Keep one channel of a grey picture that was saved in colour: a third of the work after."""
    if array.ndim == 2:
        return array
    step = max(1, len(array) // 64)
    for rows in (array[::step], array):  # most colour pictures show it in the first few rows
        red = cv2.extractChannel(np.ascontiguousarray(rows), 0)
        for other in (1, 2):
            if not np.array_equal(red, rows[..., other]):
                return array
    return cast("Stored", red)


def _pixels_hash(array: Stored) -> str:
    samples = array.shape[2] if array.ndim == 3 else 1
    told = f"{array.shape[0]}x{array.shape[1]}x{samples} uint{8 * array.dtype.itemsize}\n"
    digest = hashlib.sha256(told.encode())
    little = array.astype(array.dtype.newbyteorder("<"), copy=False)
    digest.update(np.ascontiguousarray(little).data)
    return digest.hexdigest()


def _named(header: Header, name: str) -> tuple[Finding, ...]:
    if not is_misnamed(name, header.kind):
        return ()
    return (found(Flag.MISNAMED_PICTURE, f"the file is a {header.kind} whatever its name says"),)


def _turn(header: Header) -> tuple[Finding, ...]:
    if header.orientation == 1:
        return ()
    told = TURNS[header.orientation][0]
    message = f"shown as its orientation mark {header.orientation} says: {told}"
    return (found(Flag.PICTURE_TURNED, message),)


def _chosen(channel: Channel, reason: str) -> tuple[Finding, ...]:
    if channel == "grey":
        return ()
    message = f"measured in {channel}" + (f": {reason}" if reason else "")
    return (found(Flag.CHANNEL_CHOSEN, message),)


def _clipping(low: float, high: float) -> tuple[Finding, ...]:
    findings = []
    if high > CLIPPED_SHARE:
        message = f"{100 * high:.1f} % of the pixels are at the largest value the file can hold"
        findings.append(found(Flag.CLIPPED_LIGHT, message))
    if low > CLIPPED_SHARE:
        message = f"{100 * low:.1f} % of the pixels are at zero, the darkest the file can hold"
        findings.append(found(Flag.CLIPPED_DARK, message))
    return tuple(findings)


__all__ = ["MOST_PIXELS", "read_picture"]
