"""Damaged and hostile files, made by the hundred: what a folder may hold, and must not stop it."""

from __future__ import annotations

import io
import os
import random
import struct
import zipfile
import zlib
from pathlib import Path

import numpy as np
from PIL import Image

SIDE = 240
NAMES = (
    *("space name", "trailing ", "-dash", "ünïcode", "日本", "e\u0301", "a\nb", "tab\tname"),
    *("\x1b[31mred", "quote\"'", "semi;colon", "<b>bold</b>", "=SUM(A1)", "@name", "$(reboot)"),
    *("%00", "..png", "\u202egnp.exe", "\ufeffbom", "long" * 50, "{{7*7}}", "`id`", "*", "?", "#"),
)
"""Names that steer terminals, shells, spreadsheets or pages if they are let."""


def weave() -> np.ndarray:
    """A picture that has something to count."""
    rows, columns = np.mgrid[0:SIDE, 0:SIDE]
    light = 130 + 60 * np.cos(2 * np.pi * rows / 9) + 60 * np.cos(2 * np.pi * columns / 8)
    return light.clip(0, 255).astype(np.uint8)


def saved(kind: str, **options: object) -> bytes:
    written = io.BytesIO()
    Image.fromarray(weave()).save(written, kind, **options)
    return written.getvalue()


def bomb_png(side: int) -> bytes:
    """A few hundred bytes that claim a wall of pixels."""

    def chunk(name: bytes, content: bytes) -> bytes:
        sealed = struct.pack(">I", zlib.crc32(name + content))
        return struct.pack(">I", len(content)) + name + content + sealed

    header = struct.pack(">IIBBBBB", side, side, 8, 0, 0, 0, 0)
    body = zlib.compress(bytes(200_000), 9)
    return (
        b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", header) + chunk(b"IDAT", body) + chunk(b"IEND", b"")
    )


def zipped() -> bytes:
    written = io.BytesIO()
    with zipfile.ZipFile(written, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("a.png", bytes(10_000_000))
    return written.getvalue()


def lay_hostile(folder: Path, *, count: int, seed: int) -> int:
    """Fill a folder with `count` files, none of which is a sound picture of cloth.

    Parameters
    ----------
    folder : Path
    count : int
    seed : int
        Of the damage.

    Returns
    -------
    int
        How many things lie there.
    """
    chance = random.Random(seed)
    sound = {
        "png": saved("PNG"),
        "jpg": saved("JPEG", quality=90),
        "tif": saved("TIFF", compression="tiff_lzw"),
        "bmp": saved("BMP"),
        "webp": saved("WEBP", lossless=True),
    }
    fixed = _fixed(sound)
    made = _special(folder)
    for n in range(count - made):
        if n < len(fixed):
            name, content = fixed[n]
        else:
            ending = chance.choice(sorted(sound))
            content = _damaged(sound[ending], chance)
            name = f"{n:04}-{chance.choice(NAMES)[:60]}.{ending}"
        (folder / f"{n:04}-{name}"[:120].replace("/", "_")).write_bytes(content)
    return count


def _fixed(sound: dict[str, bytes]) -> list[tuple[str, bytes]]:
    return [
        ("empty.png", b""),
        ("one-byte.jpg", b"\xff"),
        ("zeros.tif", bytes(100_000)),
        ("text.png", b"not a picture\n" * 100),
        ("page.jpg", b"<html><script>alert(1)</script></html>"),
        ("drawing.png", b"<svg xmlns='http://www.w3.org/2000/svg'/>"),
        ("archive.png", zipped()),
        ("archive.zip", zipped()),
        ("bomb.png", bomb_png(60_000)),
        ("bomb2.png", bomb_png(2**31 - 1)),
        ("no-width.png", bomb_png(0)),
        ("jpeg-called.png", sound["jpg"][: len(sound["jpg"]) // 2]),
        ("no-ending", sound["png"][:50]),
        ("scan.heic", b"\x00\x00\x00\x18ftypheic"),
        *((name, sound["png"][:100]) for name in NAMES),
    ]


def _damaged(content: bytes, chance: random.Random) -> bytes:
    """Cut off, or turn bits over in the header or the body, until it is not what it was."""
    if chance.random() < 0.5:
        return content[: chance.randrange(1, len(content) - 8)]
    turned = bytearray(content)
    for _ in range(chance.choice((1, 5, 50, 500))):
        at = chance.randrange(2, min(len(turned), chance.choice((64, len(turned)))))
        turned[at] ^= 1 << chance.randrange(8)
    return bytes(turned)


def _special(folder: Path) -> int:
    """Links, pipes and folders with picture names."""
    (folder / "loop.png").symlink_to(folder / "loop.png")
    (folder / "out.png").symlink_to("/etc/hostname")
    (folder / "device.png").symlink_to("/dev/zero")
    (folder / "nowhere.png").symlink_to(folder / "nothing-here.png")
    os.mkfifo(folder / "pipe.png")
    (folder / "up").symlink_to(folder.parent)
    with (folder / "huge.tif").open("wb") as file:
        file.truncate(50 * 10**9)
    (folder / os.fsdecode(b"\xff\xfe.png")).write_bytes(b"\x89PNG")
    return 8
