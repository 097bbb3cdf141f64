"""What does the supplier's sheet declare? Reads an article file (TOML) whole, or refuses it.

Every refusal names the key by its path, what was expected, and the nearest valid spelling. A figure
with an uncertainty is written as one text, "0.812 u 0.004", or as { value = 0.812, u = 0.004 }.

    [article]    code; description, weave, state ("grey" or "finished")
    [warp]       threads, count; plies, fibre, spinning, crimp, size, packing, yarn_density,
                 flattening
    [weft]       the same without size
    [tolerance]  ends, picks, cover, mass
    [cover]      declared
    [mass]       declared, finish_change
    [reference]  optical_cover, warp_cover, weft_cover, source

What stands before the semicolon must be there; so must the first three tables.
"""

from __future__ import annotations

import hashlib
import tomllib
from dataclasses import dataclass
from difflib import get_close_matches
from enum import StrEnum
from pathlib import Path
from typing import Annotated, Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, ValidationError, field_validator
from pydantic_core import ErrorDetails

from imgcover.cloth.constant import Constant
from imgcover.cloth.count import Count, read_count
from imgcover.cloth.diameter import read_flattening
from imgcover.cloth.fibre import Fibre, read_fibre, read_spinning
from imgcover.cloth.field import (
    read_code,
    read_cover,
    read_crimp,
    read_finish_change,
    read_mass,
    read_packing,
    read_plies,
    read_reference,
    read_size,
    read_text,
    read_weave,
    read_yarn_density,
)
from imgcover.cloth.sett import Sett, read_sett
from imgcover.cloth.stated import Stated, StatementError
from imgcover.cloth.tolerance import (
    Tolerance,
    read_cover_tolerance,
    read_mass_tolerance,
    read_sett_tolerance,
)
from imgcover.errors import DeclarationError
from imgcover.quantity import Measured

LARGEST_FILE = 1_000_000
"""Bytes: an article file is a page of text; anything larger is another file."""


class State(StrEnum):
    """In which state the declared figures hold."""

    GREY = "grey"
    FINISHED = "finished"


def _read_state(value: object) -> State:
    try:
        return State(str(value))
    except ValueError:
        raise StatementError(
            f'expected "grey" or "finished", got {value!r:.40}', 'write state = "grey"'
        ) from None


class _Table(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, arbitrary_types_allowed=True)


class Article(_Table):
    """What the cloth is called and how it interlaces."""

    code: Annotated[str, BeforeValidator(read_code)]
    description: Annotated[str, BeforeValidator(read_text)] = ""
    weave: Annotated[str | None, BeforeValidator(read_weave)] = None
    state: Annotated[State | None, BeforeValidator(_read_state)] = None


class WeftThreads(_Table):
    """The weft as declared; `plies` is already folded into `count`."""

    plies: Annotated[int | None, BeforeValidator(read_plies)] = None
    threads: Annotated[Sett, BeforeValidator(read_sett)]
    count: Annotated[Count, BeforeValidator(read_count)]
    fibre: Annotated[Fibre | None, BeforeValidator(read_fibre)] = None
    spinning: Annotated[str | None, BeforeValidator(read_spinning)] = None
    crimp: Annotated[Stated | None, BeforeValidator(read_crimp)] = None
    packing: Annotated[Stated | None, BeforeValidator(read_packing)] = None
    yarn_density: Annotated[Stated | None, BeforeValidator(read_yarn_density)] = None
    flattening: Annotated[Constant | None, BeforeValidator(read_flattening)] = None

    @field_validator("count", mode="after")
    @classmethod
    def _fold(cls, count: Count, info: Any) -> Count:
        plies = info.data.get("plies")
        return count if plies is None else count.folded(plies)

    @field_validator("yarn_density", mode="after")
    @classmethod
    def _one_way(cls, density: Stated | None, info: Any) -> Stated | None:
        if density is not None and (info.data.get("packing") or info.data.get("spinning")):
            raise StatementError(
                "a yarn density already holds the packing, which is declared too",
                "give yarn_density, or packing, or spinning",
            )
        return density


class WarpThreads(WeftThreads):
    """The warp as declared: the weft's keys, and the size it was woven with."""

    size: Annotated[Stated | None, BeforeValidator(read_size)] = None


class Tolerances(_Table):
    """How far each figure may stray; None where nothing was agreed."""

    ends: Annotated[Tolerance | None, BeforeValidator(read_sett_tolerance)] = None
    picks: Annotated[Tolerance | None, BeforeValidator(read_sett_tolerance)] = None
    cover: Annotated[Tolerance | None, BeforeValidator(read_cover_tolerance)] = None
    mass: Annotated[Tolerance | None, BeforeValidator(read_mass_tolerance)] = None


class DeclaredCover(_Table):
    """A declared optical cover, as a fraction."""

    declared: Annotated[float | None, BeforeValidator(read_cover)] = None


class DeclaredMass(_Table):
    """A declared mass in g/m2, and the share finishing adds or takes."""

    declared: Annotated[float | None, BeforeValidator(read_mass)] = None
    finish_change: Annotated[Stated | None, BeforeValidator(read_finish_change)] = None


class Reference(_Table):
    """What was measured on the approved swatch, as fractions with u."""

    optical_cover: Annotated[Measured | None, BeforeValidator(read_reference)] = None
    warp_cover: Annotated[Measured | None, BeforeValidator(read_reference)] = None
    weft_cover: Annotated[Measured | None, BeforeValidator(read_reference)] = None
    source: Annotated[str, BeforeValidator(read_text)] = ""


class _File(_Table):
    article: Article
    warp: WarpThreads
    weft: WeftThreads
    tolerance: Tolerances = Tolerances()
    cover: DeclaredCover = DeclaredCover()
    mass: DeclaredMass = DeclaredMass()
    reference: Reference = Reference()


@dataclass(frozen=True, slots=True)
class Declaration:
    """One article as declared.

    Parameters
    ----------
    article : Article
        Code, description, weave and state.
    warp, weft : WarpThreads, WeftThreads
        Setts, counts and what else was said of the yarns.
    tolerance : Tolerances
        How far figures may stray.
    cover, mass, reference : DeclaredCover, DeclaredMass, Reference
        Figures to hold a measurement against; each None inside where not declared.
    name : str
        The file's name, for messages.
    sha256 : str
        Of the file's bytes.
    """

    article: Article
    warp: WarpThreads
    weft: WeftThreads
    tolerance: Tolerances
    cover: DeclaredCover
    mass: DeclaredMass
    reference: Reference
    name: str
    sha256: str


def read_declaration(source: Path | bytes, *, name: str | None = None) -> Declaration:
    """Read an article file.

    Parameters
    ----------
    source : Path or bytes
        The file, or what it holds.
    name : str or None
        How messages call it; the file's name where None.

    Raises
    ------
    DeclarationError
        When the file cannot be read, is not TOML, or says something unknown or impossible.
    """
    shown = name or (source.name if isinstance(source, Path) else "declaration")
    content = source if isinstance(source, bytes) else _read_bytes(source, shown)
    table = _parse(content, shown)
    try:
        read = _File.model_validate(table)
    except ValidationError as error:
        raise _refused(error.errors(), shown) from None
    return Declaration(
        **{key: getattr(read, key) for key in _File.model_fields},
        name=shown,
        sha256=hashlib.sha256(content).hexdigest(),
    )


def _read_bytes(path: Path, shown: str) -> bytes:
    try:
        if not path.is_file() and path.exists():
            raise DeclarationError(shown, "is not a file", "name the TOML file")
        with path.open("rb") as file:
            content = file.read(LARGEST_FILE + 1)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise DeclarationError(
            shown, f"cannot be read ({reason})", "check the path and its permissions"
        ) from None
    if len(content) > LARGEST_FILE:
        raise DeclarationError(shown, "too large for an article file", "name the TOML file")
    return content


def _parse(content: bytes, shown: str) -> dict[str, Any]:
    try:
        return tomllib.loads(content.decode("utf-8-sig"))
    except UnicodeDecodeError:
        raise DeclarationError(shown, "is not UTF-8 text", "save it as UTF-8") from None
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        raise DeclarationError(
            shown, f"is not valid TOML: {error}", 'write text in quotes: threads = "68 /in"'
        ) from None


def _refused(errors: list[ErrorDetails], shown: str) -> DeclarationError:
    # a misspelled key is also a missing one: what was written tells more than what was not
    first = min(errors, key=lambda error: error["type"] != "extra_forbidden")
    path = ".".join(_plain(str(part)) for part in first["loc"])
    fault, remedy = _words(first)
    if len(errors) > 1:
        fault += f" (and {len(errors) - 1} more)"
    return DeclarationError(f"{shown}: {path}", fault, remedy)


def _plain(key: str) -> str:
    """A key from the file as it may be shown: it could hold terminal codes."""
    return key if key.isprintable() else ascii(key)


def _words(error: ErrorDetails) -> tuple[str, str]:
    cause = error.get("ctx", {}).get("error")
    if isinstance(cause, StatementError):
        return cause.fault, cause.remedy
    location = [str(part) for part in error["loc"]]
    if error["type"] == "extra_forbidden":
        return "unknown key", _nearest_key(location)
    if error["type"] == "missing":
        example = _EXAMPLES.get(location[-1], f"the table [{location[-1]}]")
        return "is missing", f"add {example}"
    return f"expected a table of keys, got {error['input']!r:.40}", f"write [{location[0]}]"


_EXAMPLES = {
    "code": 'code = "A-100"',
    "threads": 'threads = "68 /in"',
    "count": 'count = "32 Ne"',
}


def _keys() -> dict[str, list[str]]:
    tables: dict[str, list[str]] = {"": list(_File.model_fields)}
    for key, field in _File.model_fields.items():
        model: Any = field.annotation
        tables[key] = list(model.model_fields)
    return tables


def _nearest_key(location: list[str]) -> str:
    tables = _keys()
    table, key = (location[0] if len(location) > 1 else ""), location[-1]
    valid = tables.get(table, [])
    close = get_close_matches(key.lower(), valid, n=1, cutoff=0.6)
    if close:
        return f'nearest valid key: "{close[0]}"'
    elsewhere = [name for name, keys in tables.items() if key in keys and name]
    if elsewhere:
        return f'"{key}" belongs in [{"] or [".join(elsewhere)}]'
    return f"valid keys here: {', '.join(valid)}"


__all__ = [
    "Article",
    "Declaration",
    "DeclaredCover",
    "DeclaredMass",
    "Reference",
    "State",
    "Tolerances",
    "WarpThreads",
    "WeftThreads",
    "read_declaration",
]
