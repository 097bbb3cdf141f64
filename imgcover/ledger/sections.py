"""The pieces that records are laid out from: numbers, findings, predictions."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING, Any

from imgcover.findings import Finding
from imgcover.ledger.canonical import Record, number
from imgcover.quantity import Measured

if TYPE_CHECKING:
    from imgcover.cloth.prediction import Prediction


def quantity(measured: Measured | None) -> dict[str, Any] | None:
    """Lay a measured number out; null stays null."""
    if measured is None:
        return None
    return {"value": number(measured.value), "u": number(measured.u), "unit": measured.unit}


def tidied(value: Any) -> Any:
    """Round every float, and turn tuples and mappings into what JSON holds."""
    if isinstance(value, float):
        return number(value)
    if isinstance(value, str):
        # a file name that is not Unicode carries lone surrogates, which no JSON file can hold
        return value.encode("utf-8", "backslashreplace").decode("utf-8")
    if isinstance(value, Mapping):
        return {key: tidied(each) for key, each in value.items()}
    if isinstance(value, list | tuple):
        return [tidied(each) for each in value]
    return value


def laid(section: Mapping[str, Any]) -> Record:
    """Tidy a whole section."""
    done: Record = tidied(section)
    return done


def findings_section(findings: Iterable[Finding]) -> list[dict[str, str]]:
    """Lay findings out in the order they were made."""
    return [
        {
            "code": each.code,
            "severity": each.severity.value,
            "message": each.message,
            "remedy": each.remedy,
        }
        for each in findings
    ]


def predicted_section(prediction: Prediction | None) -> Record | None:
    """Lay out what the declared construction leads to."""
    if prediction is None:
        return None
    return {
        "model": prediction.model,
        "warp_factor": quantity(prediction.warp_factor),
        "weft_factor": quantity(prediction.weft_factor),
        "cloth_factor": quantity(prediction.cloth_factor),
        "warp": quantity(prediction.warp),
        "weft": quantity(prediction.weft),
        "cover": quantity(prediction.cover),
        "mass": quantity(prediction.mass),
        "read_as": list(prediction.read_as),
    }


__all__ = ["findings_section", "laid", "predicted_section", "quantity", "tidied"]
