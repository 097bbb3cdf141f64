"""An audit's lots as a table for other programs: one row a lot, SI, and the ledger's head last."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from imgcover.report.plain import cell

QUANTITIES = {"ends": "per_cm", "picks": "per_cm", "cover": "fraction", "mass": "g_per_m2"}
JUDGED = ("basis", "declared", "lower", "upper", "accept_lower", "accept_upper", "decision")
COLUMNS = (
    *("record", "lot", "article", "decision", "risk", "places", "required"),
    *(
        f"{quantity}_{column}"
        for quantity, unit in QUANTITIES.items()
        for column in (unit, "u", "n", "scatter", *JUDGED)
    ),
    *("findings", "page", "ledger_row", "ledger_seal"),
)
"""The header; a number's unit is in it. `record` is "lot", and "head" in the last row, whose
ledger_row and ledger_seal are where the ledger stood."""


def lots_csv_lines(
    lots: Iterable[tuple[Mapping[str, Any], str, int]], *, head: tuple[int, str]
) -> Iterator[str]:
    """Write a header, one line a lot, and the ledger's head.

    Parameters
    ----------
    lots : iterable of (mapping, str, int)
        The lot's record, its page, and its row in the ledger.
    head : (int, str)
        Number and seal of the ledger's last row.
    """
    yield _line(dict(zip(COLUMNS, COLUMNS, strict=True)))
    for lot, page, row in lots:
        yield _line(lot_values(lot) | {"page": page, "ledger_row": row})
    yield _line({"record": "head", "ledger_row": head[0], "ledger_seal": head[1]})


def lot_values(lot: Mapping[str, Any]) -> dict[str, Any]:
    """Take a lot's record apart into the columns, each value in its own type."""
    values: dict[str, Any] = {
        "record": "lot",
        "lot": lot["lot"],
        "article": lot["article"],
        "decision": lot["decision"],
        "risk": lot["risk"],
        "places": lot["n_places"],
        "required": lot["required"],
        "findings": " ".join(dict.fromkeys(each["code"] for each in lot["findings"])),
    }
    for quantity, mean in lot["means"].items():
        values |= {
            f"{quantity}_{QUANTITIES[quantity]}": mean["value"],
            **{f"{quantity}_{key}": mean[key] for key in ("u", "n", "scatter")},
        }
    for line in lot["lines"]:
        values |= {f"{line['quantity']}_{key}": line[key] for key in JUDGED}
    return values


def _line(values: Mapping[str, Any]) -> str:
    written = io.StringIO()
    csv.writer(written).writerow([_cell(values.get(column)) for column in COLUMNS])
    return written.getvalue()


def _cell(value: Any) -> str:
    if value is None:
        return ""
    return cell(value) if isinstance(value, str) else str(value)


__all__ = ["COLUMNS", "QUANTITIES", "lot_values", "lots_csv_lines"]
