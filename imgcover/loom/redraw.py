"""Draws recorded pictures anew, to keep them or to see that they are still the same."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from imgcover.cloth.declaration import Declaration
from imgcover.errors import OutputError
from imgcover.loom.article import SIDE, Departure, draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.loom.keeping import DIGITS, decode, encode, truth_table, truth_toml
from imgcover.loom.order import Order, read_orders
from imgcover.loom.truth import Truth

TRUTH_FILE = "truth.toml"
"""Where the truth of all pictures of a folder is kept."""
TRUTH_HEAD = """\
# What was drawn, counted from the fine drawing of each picture; `imgcover draw` wrote this file.
# Densities at right angles to the threads, covers as fractions of the cloth inside the frame.

"""


@dataclass(frozen=True, slots=True)
class Compared:
    """One recorded picture beside the same drawn anew.

    Parameters
    ----------
    file : str
        As the orders name it.
    differs : str
        In which way; empty where it does not.
    """

    file: str
    differs: str

    @property
    def same(self) -> bool:
        """Whether nothing differs."""
        return not self.differs


def redraw(orders: Path, folder: Path) -> Iterator[Path]:
    """Draw all orders into a folder, with their truth, and name each picture when it is written.

    Parameters
    ----------
    orders : Path
        The file of orders; articles lie beside it.
    folder : Path
        Where pictures and truth go; made where it is missing.

    Raises
    ------
    DeclarationError
        When orders or an article are wrong.
    OutputError
        When something cannot be written.
    """
    told = TRUTH_HEAD
    for order in read_orders(orders):
        content, truth = _drawn(order, orders.parent)
        path = folder / order.file
        _write(path, content)
        told += truth_toml(order.file, truth) + "\n"
        yield path
    _write(folder / TRUTH_FILE, told.encode())


def compare(orders: Path) -> Iterator[Compared]:
    """Draw all orders and hold each against the picture kept beside them, pixel by pixel.

    A picture that was broken on purpose is compared byte by byte. The truth is compared to the
    last digit written.

    Raises
    ------
    DeclarationError
        When orders or an article are wrong.
    """
    kept = _kept_truth(orders.parent / TRUTH_FILE)
    for order in read_orders(orders):
        content, truth = _drawn(order, orders.parent)
        differs = _against(orders.parent / order.file, content, broken=order.keep < 1)
        differs = differs or _truth_against(kept.get(order.file), truth)
        yield Compared(order.file, differs)


def draw_into(
    folder: Path,
    declaration: Declaration,
    camera: CameraSpec,
    *,
    seed: int,
    width: int = SIDE,
    height: int = SIDE,
    departure: Departure | None = None,
    suffix: str = ".png",
) -> tuple[Path, Path]:
    """Draw one article into a folder, its truth beside it.

    Parameters
    ----------
    folder : Path
        Where both go; made where it is missing.
    suffix : str
        ".png", ".jpg" or ".tif".

    Returns
    -------
    tuple of Path
        The picture, named by the article's code, the light and the seed; and its truth.

    Raises
    ------
    ValueError
        When the file kind is unknown, or cannot hold the camera's depth.
    OutputError
        When something cannot be written.
    """
    drawn = draw_article(
        declaration, camera, seed=seed, width=width, height=height, departure=departure
    )
    code = re.sub(r"[^A-Za-z0-9._-]+", "-", declaration.article.code).strip("-.") or "article"
    path = folder / f"{code}-{camera.light}-{seed}{suffix}"
    _write(path, encode(drawn, camera, path.name))
    beside = path.with_suffix(".truth.toml")
    _write(beside, (TRUTH_HEAD + truth_toml(path.name, drawn.truth)).encode())
    return path, beside


def _drawn(order: Order, folder: Path) -> tuple[bytes, Truth]:
    """Draw an order as a file's bytes, cut short where it is to be broken."""
    drawn = order.draw(folder)
    content = encode(drawn, order.camera, order.file)
    return content[: round(len(content) * order.keep)], drawn.truth


def _against(path: Path, content: bytes, *, broken: bool) -> str:
    """Say how a kept picture differs from the one drawn; empty where it does not."""
    try:
        kept = path.read_bytes()
    except OSError as fault:
        return f"cannot be read ({fault.strerror})"
    if kept == content:
        return ""
    if broken:
        return f"{len(kept)} bytes instead of {len(content)}, or others"
    old, new = decode(kept), decode(content)
    if old is None or new is None:
        return "is not a whole picture"
    if old.shape != new.shape or old.dtype != new.dtype:
        return f"{old.shape} of {old.dtype} instead of {new.shape} of {new.dtype}"
    apart = np.abs(old.astype(np.int64) - new.astype(np.int64))
    changed = int(np.count_nonzero(apart))
    return f"{changed} of {apart.size} values differ, by up to {apart.max()}" if changed else ""


def _kept_truth(path: Path) -> dict[str, dict[str, object]]:
    """Read the truth kept beside the orders, by picture; empty where there is none."""
    try:
        tables = tomllib.loads(path.read_text(encoding="utf-8")).get("picture", [])
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError):
        return {}
    return {str(each.get("file")): each for each in tables if isinstance(each, dict)}


def _truth_against(kept: dict[str, object] | None, truth: Truth) -> str:
    """Say which kept figure differs from the one counted, by more than its last digit."""
    if kept is None:
        return f"has no truth in {TRUTH_FILE}"
    for key, value in truth_table(truth).items():
        told = kept.get(key)
        if not isinstance(told, int | float) or abs(told - value) > abs(value) * 10 ** (1 - DIGITS):
            return f"truth: {key} is {value!r}, kept as {told!r}"
    return ""


def _write(path: Path, content: bytes) -> None:
    """Write a file, whole."""
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)
    except OSError as fault:
        raise OutputError(
            str(path), f"cannot be written ({fault.strerror})", "choose another folder"
        ) from None


__all__ = ["TRUTH_FILE", "Compared", "compare", "draw_into", "redraw"]
