"""Truth is the sheet as it was written, by csv and openpyxl; every refusal names row and column."""

import datetime
import zipfile

import pytest
from openpyxl import Workbook

from imgcover.audit.lot_sheet import COLUMNS, find_sheet, read_sheet
from imgcover.errors import LotSheetError


def sheet(tmp_path, text, encoding="utf-8"):
    path = tmp_path / "lots.csv"
    path.write_bytes(text.encode(encoding))
    return path


@pytest.mark.parametrize("mark", [",", ";", "\t"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
def test_a_sheet_is_read_as_spreadsheets_save_it(tmp_path, mark, encoding):
    lines = [["Picture", "LOT", "pitch_y", "Note"], ["å 1.png", "7", "600dpi", "a b"]]
    text = "\r\n".join(mark.join(line) for line in lines)
    (row,) = read_sheet(sheet(tmp_path, text, encoding))
    assert row.cells == {"picture": "å 1.png", "lot": "7", "pitch-y": "600dpi", "note": "a b"}
    assert row.where == "lots.csv row 2"


def test_quotes_blank_rows_and_empty_cells(tmp_path):
    text = 'picture,lot,note,place\n\n"a,1.png",7,"two\nlines",\n,,,\nb.png,7,,3\n'
    first, second = read_sheet(sheet(tmp_path, text))
    assert first.cells == {"picture": "a,1.png", "lot": "7", "note": "two\nlines"}
    assert second.get("place") == "3" and second.get("note") is None


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty"),
        ("picture,lot\n", "lists no picture"),
        ("picture,lott\na,1\n", 'unknown column "lott"; nearest valid column: "lot"'),
        ("picture,Lot,LOT\na,1,1\n", 'column "lot" stands twice'),
        ("picture,note\na,1\n", 'column "lot" is missing'),
        ("picture,lot\na,\n", "row 2, lot: is empty"),
        (
            "picture,lot,light\na,1,back\n",
            'row 2, light: expected backlit or reflected, got "back"',
        ),
        ("picture,lot,\na,1,stray\n", "row 2: a cell stands under no column name"),
        ("picture,lot\na,1,2\n", "row 2: has more cells"),
        ('picture,lot\n"a,1\n', "is not CSV"),
        ("picture,lot\na\0b,1\n", "is not text"),
    ],
)
def test_a_wrong_sheet_is_refused_with_its_place(tmp_path, text, said):
    with pytest.raises(LotSheetError) as refused:
        read_sheet(sheet(tmp_path, text))
    assert said in str(refused.value)


def test_an_old_code_page_is_refused_not_guessed(tmp_path):
    with pytest.raises(LotSheetError, match="not UTF-8"):
        read_sheet(sheet(tmp_path, "picture,lot\nå.png,1\n", "cp1252"))


def book(tmp_path, *sheets):
    made = Workbook()
    made.remove(made.active)
    for title, lines in sheets:
        page = made.create_sheet(title)
        for line in lines:
            page.append(line)
    made.save(tmp_path / "lots.xlsx")
    return tmp_path / "lots.xlsx"


def test_a_workbook_gives_the_words_one_sees_in_it(tmp_path):
    day = datetime.datetime(2031, 4, 2)
    lines = [
        ["picture", "lot", "place", "gsm", "conditioned", "note"],
        ["a.png", 4711, 3.0, 118.5, day, True],
    ]
    (row,) = read_sheet(book(tmp_path, ("anything", lines)))
    assert row.cells == {
        **{"picture": "a.png", "lot": "4711", "place": "3", "gsm": "118.5"},
        **{"conditioned": "2031-04-02", "note": "yes"},
    }
    assert row.where == "lots.xlsx row 2"


def test_of_several_sheets_the_one_called_lots_is_read(tmp_path):
    lines = [["picture", "lot"], ["a.png", "1"]]
    assert len(read_sheet(book(tmp_path, ("notes", [["x"]]), ("lots", lines)))) == 1
    with pytest.raises(LotSheetError, match="holds 2 sheets"):
        read_sheet(book(tmp_path, ("notes", lines), ("more", lines)))


def test_what_is_no_workbook_is_refused(tmp_path):
    path = tmp_path / "lots.xlsx"
    path.write_bytes(b"picture,lot\na,1\n")
    with pytest.raises(LotSheetError, match="not a workbook"):
        read_sheet(path)
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("xl/workbook.xml", "<nonsense")
    with pytest.raises(LotSheetError, match="not a readable workbook"):
        read_sheet(path)


def test_a_workbook_that_unpacks_to_a_disk_full_is_refused(tmp_path):
    path = tmp_path / "lots.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/workbook.xml", bytes(201_000_000))
    with pytest.raises(LotSheetError, match="unpacks to more"):
        read_sheet(path)


def test_two_sheets_are_refused(tmp_path):
    assert find_sheet(tmp_path) is None
    sheet(tmp_path, "picture,lot\na,1\n")
    assert find_sheet(tmp_path).name == "lots.csv"
    book(tmp_path, ("lots", [["picture", "lot"], ["a", "1"]]))
    with pytest.raises(LotSheetError, match="both"):
        find_sheet(tmp_path)


def test_the_columns_are_those_of_the_design():
    assert len(COLUMNS) == 20 and len(set(COLUMNS)) == 20


@pytest.mark.parametrize("stated", ["sep=;\r\n", "SEP=;\n"])
def test_a_line_that_states_the_mark_is_no_row(tmp_path, stated):
    (row,) = read_sheet(sheet(tmp_path, f"{stated}picture;lot;note\na;1;b,c,d\n"))
    assert row.cells == {"picture": "a", "lot": "1", "note": "b,c,d"}
    assert row.where == "lots.csv row 2"


def test_a_capital_that_a_spreadsheet_put_there_changes_no_word(tmp_path):
    (row,) = read_sheet(sheet(tmp_path, "picture,lot,light,Warp\na,1,Backlit,HORIZONTAL\n"))
    assert row.cells["light"] == "backlit" and row.cells["warp"] == "horizontal"


def test_a_formula_that_was_never_worked_out_is_no_empty_cell(tmp_path):
    path = book(tmp_path, ("Lots", [["picture", "lot", "place"], ["a.png", 7, "=1+1"]]))
    with pytest.raises(LotSheetError, match="row 2: a formula has no value yet"):
        read_sheet(path)


def test_a_formula_whose_value_is_an_empty_text_is_an_empty_cell(tmp_path):
    """Truth is the format: ECMA-376 part 1, 18.18.11, cell type "str" is a formula's text."""
    path = book(tmp_path, ("Lots", [["picture", "lot", "place"], ["a.png", 7, "=1+1"]]))
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    name = "xl/worksheets/sheet1.xml"
    said = parts[name].replace(b'<c r="C2"', b'<c r="C2" t="str"')
    assert said != parts[name]
    with zipfile.ZipFile(path, "w") as archive:
        for each, content in {**parts, name: said}.items():
            archive.writestr(each, content)
    (row,) = read_sheet(path)
    assert row.get("place") is None


def test_the_sheet_is_found_however_its_name_is_written(tmp_path):
    (tmp_path / "Lots.CSV").write_text("picture,lot\na,1\n")
    assert find_sheet(tmp_path) == tmp_path / "Lots.CSV"
    (tmp_path / "lots.xlsx").write_bytes(b"")
    with pytest.raises(LotSheetError, match=r"holds both Lots.CSV and lots.xlsx"):
        find_sheet(tmp_path)
