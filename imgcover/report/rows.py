"""Records as a table for spreadsheets: one row a picture, and one a lot; SI; nothing computes."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from imgcover.report.plain import cell

MEASURED = ("ends", "picks", "cover", "mass")
"""The quantities that have a group of columns each."""
UNITS = {"ends": "per_cm", "picks": "per_cm", "cover": "fraction", "mass": "g_per_m2"}
JUDGED = ("declared", "lower", "upper", "decision")
COLUMNS = (
    *("record", "picture", "lot", "article", "place", "decision"),
    *(
        column
        for quantity in MEASURED
        for column in (
            f"{quantity}_{UNITS[quantity]}",
            f"{quantity}_u",
            *(f"{quantity}_{key}" for key in JUDGED),
        )
    ),
    *("cover_predicted", "cover_predicted_u"),
    *("px_per_mm_x", "px_per_mm_y", "scale_from", "light", "warp"),
    *("findings", "picture_sha256"),
)
"""The header; numbers carry their unit in it."""


def csv_lines(records: Iterable[Mapping[str, Any]]) -> Iterator[str]:
    """Write a header and one line a record; text that a spreadsheet would compute is quoted."""
    yield csv_line(COLUMNS)
    for record in records:
        row = _row(record)
        yield csv_line(row.get(column) for column in COLUMNS)


def _row(record: Mapping[str, Any]) -> dict[str, Any]:
    return _picture_row(record) if "picture" in record else _lot_row(record)


def _picture_row(record: Mapping[str, Any]) -> dict[str, Any]:
    sample, scale, predicted = record["sample"], record["scale"], record["predicted"]
    verdict = record["verdict"]
    row: dict[str, Any] = {
        "record": "picture",
        "picture": record["picture"]["name"],
        "picture_sha256": record["picture"]["sha256"],
        "decision": None if verdict is None else verdict["decision"],
        "light": record["light"],
        "warp": record["warp"],
        "findings": _codes(record),
        **{key: sample[key] for key in ("lot", "article", "place")},
        **_bare("ends", record["threads"], "ends"),
        **_bare("picks", record["threads"], "picks"),
        **_bare("cover", record["cover"], "optical"),
    }
    if predicted is not None:
        row["cover_predicted"] = predicted["cover"]["value"]
        row["cover_predicted_u"] = predicted["cover"]["u"]
    if scale is not None:
        row |= {f"px_per_mm_{axis}": scale[axis]["value"] for axis in "xy"}
        row["scale_from"] = scale["source"]
    return row | _judged([] if verdict is None else verdict["lines"])


def _lot_row(record: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "record": "lot",
        "lot": record["lot"],
        "article": record["article"],
        "decision": record["decision"],
        "findings": _codes(record),
        **_judged(record["lines"]),
    }


def _bare(name: str, section: Mapping[str, Any] | None, key: str) -> dict[str, Any]:
    measured = None if section is None else section[key]
    if measured is None:
        return {}
    return {f"{name}_{UNITS[name]}": measured["value"], f"{name}_u": measured["u"]}


def _judged(lines: Iterable[Mapping[str, Any]]) -> dict[str, Any]:
    """What the verdict's lines add; their u holds the variation between places too."""
    row: dict[str, Any] = {}
    for line in lines:
        name = line["quantity"]
        row |= {f"{name}_{key}": line[key] for key in JUDGED}
        if line["measured"] is not None:
            row |= {f"{name}_{UNITS[name]}": line["measured"], f"{name}_u": line["u"]}
    return row


def _codes(record: Mapping[str, Any]) -> str:
    return " ".join(dict.fromkeys(each["code"] for each in record["findings"]))


def csv_line(cells: Iterable[Any]) -> str:
    """Write one row: numbers as numbers, null as nothing, text so that nothing computes it."""
    written = io.StringIO()
    csv.writer(written).writerow([_cell(each) for each in cells])
    return written.getvalue()


def _cell(value: Any) -> str:
    if value is None:
        return ""
    return cell(value) if isinstance(value, str) else str(value)


__all__ = ["COLUMNS", "csv_line", "csv_lines"]
