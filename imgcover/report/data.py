"""Records for machines: one line each, or one array."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from imgcover.ledger.canonical import canonical


def json_lines(records: Iterable[Mapping[str, Any]]) -> Iterator[str]:
    """Write each record on a line of its own, as soon as it is there."""
    for record in records:
        yield canonical(record) + "\n"


def json_array(records: Iterable[Mapping[str, Any]]) -> Iterator[str]:
    """Write records as one array, each as soon as it is there, indented for reading."""
    opening = "[\n"
    for record in records:
        yield opening + _indented(record)
        opening = ",\n"
    yield "\n]\n" if opening != "[\n" else "[]\n"


def _indented(record: Mapping[str, Any]) -> str:
    text = json.dumps(record, ensure_ascii=False, allow_nan=False, indent=2)
    return "\n".join(f"  {line}" for line in text.split("\n"))


__all__ = ["json_array", "json_lines"]
