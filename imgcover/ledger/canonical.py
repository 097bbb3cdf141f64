"""One way to write a record down, so that equal records are equal bytes and equal hashes."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping
from typing import Any

DIGITS = 8
"""Significant digits of a number in a record: a thousand times finer than any u met, and coarse
enough that the order in which a library sums does not show."""
UNHASHED = "envelope"
"""The one section that says when a record was made, not what was found."""

Record = dict[str, Any]
"""A record as JSON holds it: dict, list, str, int, float, bool and None, nothing else."""


def number(value: float) -> float:
    """Round a number to the digits a record keeps.

    Examples
    --------
    >>> number(26.771653543307087)
    26.771654
    """
    if value == 0 or not math.isfinite(value):
        return value
    return float(f"{value:.{DIGITS}g}")


def canonical(record: Mapping[str, Any]) -> str:
    """Write a record on one line: keys as they stand, numbers as short as they can be.

    Raises
    ------
    ValueError
        When a number is not finite: what could not be measured is null.
    """
    return json.dumps(record, ensure_ascii=False, allow_nan=False, separators=(",", ":"))


def digest(record: Mapping[str, Any]) -> str:
    """SHA-256 of the canonical line without its envelope, in hexadecimal."""
    hashed = {key: value for key, value in record.items() if key != UNHASHED}
    return hashlib.sha256(canonical(hashed).encode("utf-8")).hexdigest()


__all__ = ["DIGITS", "UNHASHED", "Record", "canonical", "digest", "number"]
