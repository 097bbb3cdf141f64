"""What a lot's page needs of one picture's record: a line of a table, not the whole."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

Number = Mapping[str, Any]
"""A measured number as the record holds it: value, u, unit."""


@dataclass(frozen=True, slots=True)
class Note:
    """A finding as the record holds it."""

    code: str
    severity: str
    message: str
    remedy: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Glance:
    """One picture of a lot.

    Parameters
    ----------
    name : str
        Of the picture.
    number : int or None
        Of its place in the lot; None where it was not counted as one.
    piece, place : str or None
        Where in the lot.
    remarks : str
        Who took it, how it was conditioned and what was noted, as the lot sheet says; may be empty.
    light : str or None
        backlit, reflected, or not stated.
    decision : str or None
        Of the swatch alone; None where nothing was declared or nothing measured.
    ends, picks, cover : mapping or None
        value, u and unit.
    scale : str
        Where its scale comes from; empty where it has none.
    notes : tuple of Note
        Its findings.
    row : int or None
        Of the ledger.
    thumbnail : Path or None
        Of a small picture with what was counted drawn over it (PNG or JPEG); it may be missing.
    """

    name: str
    number: int | None
    piece: str | None
    place: str | None
    remarks: str
    light: str | None
    decision: str | None
    ends: Number | None
    picks: Number | None
    cover: Number | None
    scale: str
    notes: tuple[Note, ...]
    row: int | None = None
    thumbnail: Path | None = None

    @property
    def measured(self) -> bool:
        """Whether anything was."""
        return any(each is not None for each in (self.ends, self.picks, self.cover))


def glance(
    record: Mapping[str, Any],
    *,
    number: int | None,
    row: int | None = None,
    thumbnail: Path | None = None,
) -> Glance:
    """Take from a record what a lot's page shows of it."""
    threads, cover, verdict = record["threads"] or {}, record["cover"] or {}, record["verdict"]
    scale = record["scale"]
    return Glance(
        name=record["picture"]["name"],
        number=number,
        piece=record["sample"]["piece"],
        place=record["sample"]["place"],
        remarks=_remarks(record["sample"]),
        light=record["light"],
        decision=None if verdict is None else verdict["decision"],
        ends=threads.get("ends"),
        picks=threads.get("picks"),
        cover=cover.get("optical"),
        scale="" if scale is None else scale["source"],
        notes=tuple(
            Note(each["code"], each["severity"], each["message"], each["remedy"])
            for each in record["findings"]
        ),
        row=row,
        thumbnail=thumbnail,
    )


def _remarks(sample: Mapping[str, Any]) -> str:
    conditioned = f"conditioned: {sample['conditioned']}" if sample["conditioned"] else None
    return "; ".join(filter(None, (sample["operator"], conditioned, sample["note"])))


__all__ = ["Glance", "Note", "Number", "glance"]
