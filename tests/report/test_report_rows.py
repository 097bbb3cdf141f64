"""Records for machines: valid json and csv, one row a record, nothing that computes.

Truth is the record that is told, read back with the standard library.
"""

from __future__ import annotations

import csv
import io
import json

from report_records import per_cm, record, unreadable

from imgcover.quantity import Measured
from imgcover.report.data import json_array, json_lines
from imgcover.report.plain import FORMULA
from imgcover.report.rows import COLUMNS, csv_lines

RECORDS = [
    record(ends=per_cm(26.8), picks=per_cm(22.8), cover=Measured(0.66, 0.005, "1")),
    record(ends=per_cm(26.8), declared=False),
    unreadable(),
]


def rows(records: list[dict]) -> list[dict[str, str]]:  # type: ignore[type-arg]
    return list(csv.DictReader(io.StringIO("".join(csv_lines(records)), newline="")))


def test_json_lines_are_one_record_each() -> None:
    lines = "".join(json_lines(RECORDS)).splitlines()
    assert [json.loads(line) for line in lines] == RECORDS


def test_a_json_array_holds_the_same_records() -> None:
    assert json.loads("".join(json_array(RECORDS))) == RECORDS
    assert json.loads("".join(json_array([]))) == []


def test_csv_has_a_row_a_record_and_keeps_its_numbers() -> None:
    first, bare, torn = rows(RECORDS)
    assert list(first) == list(COLUMNS)
    assert float(first["picks_per_cm"]) == 22.8
    assert first["decision"] == first["picks_decision"] == "does not conform"
    # 64 /in and its limits, in 1/cm
    assert abs(float(first["picks_declared"]) - 64 / 2.54) < 1e-6
    assert abs(float(first["picks_lower"]) - 0.98 * 64 / 2.54) < 1e-6
    assert (bare["decision"], bare["ends_per_cm"], bare["picks_per_cm"]) == ("", "26.8", "")
    assert torn["ends_per_cm"] == ""
    assert torn["findings"].split()[0] == "picture-unreadable"


def test_no_cell_computes_and_none_breaks_its_row() -> None:
    hostile = ['=cmd|"/c calc"!A1', "@SUM(A1)", "+1", "-2+3", "\t=1", 'a","=1+1', "a\n=1", "＝1"]
    told = rows([record(name=name, lot=name) for name in hostile])
    assert len(told) == len(hostile)
    for row in told:
        for column in ("picture", "lot"):
            assert not row[column].startswith(FORMULA)
