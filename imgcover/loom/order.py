"""Orders to the loom: a file that records how each picture was drawn, so that it can be again.

[[picture]]
file = "pictures/4711-1.png"      where it is kept, beside the orders
article = "articles/sheet.toml"   the declaration, beside the orders
seed = 11
width, height                     pixels; keep: share of the file's bytes, of a broken one
note                              what an inspector would say of it
[picture.departs]                 ends, picks, warp_tex, weft_tex: factors
[picture.cloth]                   fields of ClothSpec; faults are tables of their own
[picture.camera]                  fields of CameraSpec; dpi (and dpi_y) instead of px_per_mm
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, fields
from difflib import get_close_matches
from pathlib import Path, PurePosixPath
from typing import Any

from imgcover.cloth.declaration import read_declaration
from imgcover.errors import DeclarationError
from imgcover.loom.article import SIDE, Departure, draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec, Fault
from imgcover.loom.drawing import Drawn
from imgcover.tone import Tone

MM_PER_INCH = 25.4
LARGEST_SIDE = 20_000
"""Pixels: an A4 at 1200 dpi is 14,000 high; beyond it a slip of the pen fills the memory."""
FROM_ARTICLE = {"weave", "ends_per_mm", "picks_per_mm", "end_diameter_mm", "pick_diameter_mm"}
"""What the declaration says of the cloth; an order may only depart from it."""


@dataclass(frozen=True, slots=True)
class Order:
    """One picture to be drawn.

    Parameters
    ----------
    file, article : str
        Where it is kept, and what is drawn: paths beside the orders, with forward slashes.
    seed : int
        Of the generator.
    camera : CameraSpec
        How it is seen.
    look : dict
        Fields of `ClothSpec` that differ from its defaults.
    departure : Departure
        How the cloth differs from its declaration.
    width, height : int
        Pixels.
    keep : float
        Share of the file's bytes that is kept; below 1 the picture is broken on purpose.
    note : str
        What an inspector would say of it.
    """

    file: str
    article: str
    seed: int
    camera: CameraSpec
    look: dict[str, Any]
    departure: Departure
    width: int = SIDE
    height: int = SIDE
    keep: float = 1.0
    note: str = ""

    def draw(self, folder: Path) -> Drawn:
        """Draw it; the article is read from the folder.

        Raises
        ------
        DeclarationError
            When the article cannot be read.
        """
        return draw_article(
            read_declaration(folder / self.article),
            self.camera,
            seed=self.seed,
            width=self.width,
            height=self.height,
            departure=self.departure,
            look=self.look,
        )


def read_orders(path: Path) -> tuple[Order, ...]:
    """Read a file of orders.

    Raises
    ------
    DeclarationError
        When it cannot be read, or an order holds an unknown key or an impossible value.
    """
    try:
        content = tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as fault:
        raise DeclarationError(
            path.name, f"cannot be read ({fault.strerror})", "check the path"
        ) from None
    except (UnicodeDecodeError, tomllib.TOMLDecodeError) as fault:
        raise DeclarationError(path.name, f"is not TOML: {fault}", "check the file") from None
    tables = content.get("picture")
    if not isinstance(tables, list) or not tables:
        raise DeclarationError(path.name, "lists no picture", "add a [[picture]]")
    return tuple(_order(each, f"{path.name}: picture {n}") for n, each in enumerate(tables, 1))


def _order(table: Any, where: str) -> Order:
    """Check one order and make it."""
    plain = {each.name for each in fields(Order)} - {"camera", "look", "departure"}
    known = _only(table, plain | {"camera", "cloth", "departs"}, where)
    for key in ("file", "article", "seed"):
        if key not in known:
            raise DeclarationError(where, f"{key} is missing", f"add {key} = …")
    for key in ("file", "article"):
        inside = PurePosixPath(str(known[key]))
        if inside.is_absolute() or ".." in inside.parts or "\\" in str(known[key]):
            raise DeclarationError(f"{where}, {key}", "leads out of the folder", "keep it inside")
    try:
        order = Order(
            camera=_camera(known.get("camera", {}), f"{where}, camera"),
            look=_look(known.get("cloth", {}), f"{where}, cloth"),
            departure=_made(Departure, known.get("departs", {}), f"{where}, departs"),
            **{key: known[key] for key in plain & known.keys()},
        )
        _sized(order)
    except (ValueError, TypeError) as fault:
        raise DeclarationError(where, str(fault), "correct it") from None
    return order


def _sized(order: Order) -> None:
    """Refuse pictures of no size, or of one that no memory holds."""
    for side in (order.width, order.height):
        if not isinstance(side, int) or not 16 <= side <= LARGEST_SIDE:
            raise ValueError(f"width and height are 16 to {LARGEST_SIDE} px, got {side!r}")
    if not isinstance(order.seed, int) or order.seed < 0:
        raise ValueError(f"seed must be a whole number from 0, got {order.seed!r}")
    if not 0 < order.keep <= 1:
        raise ValueError(f"keep must lie above 0 and up to 1, got {order.keep!r}")


def _camera(table: Any, where: str) -> CameraSpec:
    """Make a camera: resolution in dots an inch, tone as on the command line."""
    names = {each.name for each in fields(CameraSpec)} - {"px_per_mm", "px_per_mm_y"}
    known = _only(table, names | {"dpi", "dpi_y"}, where)
    if "dpi" not in known:
        raise DeclarationError(where, "dpi is missing", "add dpi = 1200")
    made = {key: _frozen(value) for key, value in known.items() if key in names}
    if "tone" in made:
        made["tone"] = Tone.parse(str(made["tone"]))
    down = known.get("dpi_y")
    return CameraSpec(
        px_per_mm=known["dpi"] / MM_PER_INCH,
        px_per_mm_y=None if down is None else down / MM_PER_INCH,
        **made,
    )


def _look(table: Any, where: str) -> dict[str, Any]:
    """Collect what is said of the cloth beyond its declaration."""
    known = _only(table, {each.name for each in fields(ClothSpec)} - FROM_ARTICLE, where)
    made = {key: _frozen(value) for key, value in known.items()}
    if "faults" in made:
        made["faults"] = tuple(_made(Fault, each, f"{where}, faults") for each in known["faults"])
    return made


def _made(kind: type[Any], table: Any, where: str) -> Any:
    """Make a record of some kind from a table of its fields."""
    return kind(**_only(table, {each.name for each in fields(kind)}, where))


def _only(table: Any, known: set[str], where: str) -> dict[str, Any]:
    """Let only known keys pass."""
    if not isinstance(table, dict):
        raise DeclarationError(where, "expected a table", "see the head of drawn.toml")
    for key in table:
        if key not in known:
            near = get_close_matches(key, sorted(known), n=1) or sorted(known)
            raise DeclarationError(where, f"unknown key {key!r}", f"valid: {', '.join(near)}")
    return table


def _frozen(value: Any) -> Any:
    """Turn lists into tuples."""
    return tuple(_frozen(each) for each in value) if isinstance(value, list) else value


__all__ = ["Order", "read_orders"]
