"""Truth is what openpyxl and csv read back: types, limits, and text that stays text."""

import csv
import io

import pytest
from lot_example import lot_record
from openpyxl import load_workbook

from imgcover.report.lots_csv import COLUMNS, lots_csv_lines
from imgcover.report.workbook import AuditWorkbook

FORMULAS = ["=1+1", "+1", "-1", "@SUM(1)", "\t=1", '=HYPERLINK("http://x")', "＝1+1"]
RECORD = {
    "picture": {"name": "=cmd|' /C calc'!A0", "sha256": "ab" * 32},
    "sample": {"lot": "@SUM(1)", "piece": "-1", "place": "+1"}
    | {"operator": "=2", "conditioned": None, "note": "feels loose"},
    "light": "backlit",
    "threads": {
        "ends": {"value": 26.77, "u": 0.06, "unit": "1/cm"},
        "picks": None,
    },
    "cover": None,
    "verdict": None,
    "scale": {"source": "stated pitch"},
    "findings": [{"code": "a", "severity": "info", "message": "=1", "remedy": "\x1b[2J"}],
}


@pytest.fixture
def book(tmp_path):
    lots = [lot_record("good"), {**lot_record("short"), "lot": "=1+1"}]
    file = io.BytesIO()
    with AuditWorkbook(file, scratch=tmp_path) as made:
        for lot in lots:
            made.lot(lot)
        made.picture(RECORD, row=3)
        made.about([("ledger head", "3:abc"), ("folder", "=1")])
    assert list(tmp_path.iterdir()) == []
    return load_workbook(io.BytesIO(file.getvalue()))


def column(sheet, title):
    heads = [cell.value for cell in sheet[1]]
    return [row[heads.index(title)] for row in sheet.iter_rows(min_row=2)]


def test_numbers_are_numbers_and_limits_stand_beside_them(book):
    lots = book["Lots"]
    short = lot_record("short")
    picks = next(line for line in short["lines"] if line["quantity"] == "picks")
    assert column(lots, "picks /cm")[1].value == pytest.approx(short["means"]["picks"]["value"])
    for key in ("lower", "upper", "accept lower", "accept upper", "declared"):
        cell = column(lots, f"picks {key}")[1]
        assert cell.data_type == "n"
        assert cell.value == pytest.approx(picks[key.replace(" ", "_")])
    assert column(book["Pictures"], "ends /cm")[0].value == 26.77
    assert column(book["Pictures"], "picks /cm")[0].value is None


def test_text_is_never_a_formula(book):
    for sheet in book:
        for row in sheet.iter_rows():
            assert all(cell.data_type in ("s", "n") and cell.hyperlink is None for cell in row)
    assert column(book["Lots"], "lot")[1].value == "=1+1"
    assert column(book["Pictures"], "picture")[0].value == "=cmd|' /C calc'!A0"
    assert column(book["Pictures"], "operator")[0].value == "=2"
    assert column(book["Pictures"], "note")[0].value == "feels loose"
    assert column(book["Findings"], "remedy")[-1].value == "\\x1b[2J"


def test_marks_follow_the_decisions_and_the_limits(book):
    rules = book["Lots"].conditional_formatting
    said = [rule.formula for each in rules for rule in each.rules]
    assert ['"does not conform"'] in said
    assert any("OR(AND(" in formula for (formula,) in said)


def test_the_last_sheet_holds_the_ledgers_head(book):
    assert [cell.value for cell in book["About"][1]] == ["ledger head", "3:abc"]


def test_the_table_of_lots_reads_back_and_ends_with_the_head():
    lots = [({**lot_record("short"), "lot": text}, "lots/a.html", 7) for text in FORMULAS]
    lines = "".join(lots_csv_lines(lots, head=(9, "cd" * 32)))
    rows = list(csv.DictReader(io.StringIO(lines)))
    assert len(rows) == len(FORMULAS) + 1
    assert tuple(rows[0]) == COLUMNS
    assert all(row["lot"].startswith("'") for row in rows[:-1])
    picks = next(line for line in lots[0][0]["lines"] if line["quantity"] == "picks")
    assert float(rows[0]["picks_upper"]) == picks["upper"]
    assert float(rows[0]["picks_per_cm"]) == lots[0][0]["means"]["picks"]["value"]
    assert rows[0]["ledger_row"] == "7"
    assert (rows[-1]["record"], rows[-1]["ledger_row"]) == ("head", "9")
    assert rows[-1]["ledger_seal"] == "cd" * 32
