"""The `[reference]` of an approved swatch: what later swatches of the article are held against."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from imgcover.cloth.reference import reference_table
from imgcover.findings import Severity
from imgcover.ledger.canonical import digest
from imgcover.quantity import Measured


def reference_toml(record: Mapping[str, Any]) -> str:
    """Write the table that goes into the article's declaration.

    Parameters
    ----------
    record : mapping
        Of the approved swatch, schema imgcover/record/1.

    Raises
    ------
    ValueError
        When the record holds no cover: there is then nothing to approve.
    """
    cover = record["cover"]
    if cover is None or cover["optical"] is None:
        raise ValueError("the record holds no optical cover")
    optical, warp, weft = (
        None if cover[name] is None else Measured(**cover[name])
        for name in ("optical", "warp", "weft")
    )
    return reference_table(
        optical_cover=optical,
        warp_cover=warp,
        weft_cover=weft,
        source=f"imgcover record {digest(record)[:16]}",
    )


def reasons_against(record: Mapping[str, Any]) -> str:
    """Say why a record holds no cover, in the findings' words."""
    findings = record["findings"]
    said = [each["message"] for each in findings if "cover" in each["message"]] or [
        each["message"] for each in findings if each["severity"] == Severity.REFUSAL
    ]
    return "; ".join(said) or "cover was not measured"


__all__ = ["reasons_against", "reference_toml"]
