"""What a lot's verdict takes from one picture, as text that is kept beside the picture's record.

A record is rounded and laid out for people; a lot summed from it would not be the lot summed from
the measurements. So the values go along, whole, and a lot can be summed again from the ledger.
"""

from __future__ import annotations

import json
from dataclasses import fields
from typing import Any

from imgcover.findings import Flag
from imgcover.quantity import Measured
from imgcover.verdict.observed import Observed, Spread


def evidence_text(observed: Observed) -> str:
    """Write an observation as one line of JSON.

    Examples
    --------
    >>> observed_from(evidence_text(Observed(place="3"))).place
    '3'
    """
    line = {field.name: _plain(getattr(observed, field.name)) for field in fields(observed)}
    return json.dumps(line, separators=(",", ":"), allow_nan=False)


def observed_from(text: str) -> Observed:
    """Read an observation back, equal to what was written; an empty text is an empty place.

    Raises
    ------
    ValueError
        When it is not what `evidence_text` wrote.
    """
    if not text:
        return Observed()
    try:
        line: dict[str, Any] = json.loads(text)
        return Observed(**{name: _read(name, value) for name, value in line.items()})
    except (TypeError, KeyError, AttributeError) as fault:
        raise ValueError(f"no evidence of a picture: {fault}") from None


def _plain(value: Any) -> Any:
    match value:
        case Measured():
            return {"value": value.value, "u": value.u, "unit": value.unit}
        case Spread():
            return {"scatter": value.scatter, "parts": value.parts}
        case frozenset():
            return sorted(flag.name for flag in value)
        case _:
            return value


def _read(name: str, value: Any) -> Any:
    match value:
        case {"unit": _}:
            return Measured(**value)
        case {"parts": _}:
            return Spread(**value)
        case list() if name == "flags":
            return frozenset(Flag[each] for each in value)
        case list():
            return tuple(value)
        case _:
            return value


__all__ = ["evidence_text", "observed_from"]
