"""Truth is the folder as it was laid: what changed between two audits is known, and what did not.

Audited in this process, with no workers: how work is spread is tested elsewhere.
"""

import sqlite3
from contextlib import closing
from datetime import date, timedelta

import audit_rig
import pytest
from audit_rig import audit_inline, certified, lay, records, timeless

from imgcover.audit.outcome import Loss, Lost
from imgcover.audit.work import Answer
from imgcover.cli.auditing import audited
from imgcover.cli.exits import ExitCode
from imgcover.errors import LotSheetError, OptionError


def rows(out):
    with closing(sqlite3.connect(out / "ledger.sqlite")) as raw:
        return raw.execute("SELECT n, subject, supersedes FROM entry ORDER BY n").fetchall()


def test_a_second_run_measures_only_what_changed(tmp_path, capsys):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 1, "B": 2})
    audit_inline(goods, out)
    before = (out / "records.jsonl").read_bytes()
    audit_inline(goods, out)
    assert "3 pictures: 3 known from before" in capsys.readouterr().err
    assert (out / "records.jsonl").read_bytes() == before
    sheet = goods / "lots.csv"
    whole = sheet.read_text()
    # a pitch of half: that picture is measured again, and its lot with it
    sheet.write_text(whole.replace("2,24px/mm", "2,12px/mm"))
    audit_inline(goods, out)
    assert "3 pictures: 1 measured, 2 known from before" in capsys.readouterr().err
    assert records(out)[2]["threads"]["ends"]["value"] == pytest.approx(12.5, rel=0.01)
    assert [(subject, supersedes) for _, subject, supersedes in rows(out)[5:]] == [
        ("picture:goods/B/B-2.png", 3),
        ("lot:goods/B/G-1.toml", 5),
    ]
    # put right again: the first measurement is still known, and holds once more
    sheet.write_text(whole)
    audit_inline(goods, out)
    assert "3 known from before" in capsys.readouterr().err
    assert (out / "records.jsonl").read_bytes() == before


def test_pictures_that_cannot_be_read_are_named_and_not_counted_as_measured(tmp_path, capsys):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 3})
    (goods / "A-2.png").write_bytes((goods / "A-2.png").read_bytes()[:400])
    (goods / "A-3.png").unlink()
    audit_inline(goods, out)
    said = capsys.readouterr().err
    assert "3 pictures: 1 measured, 2 could not be read" in said
    assert "A-2.png: the PNG is truncated" in said
    assert "A-3.png: there is no such file" in said


@pytest.mark.parametrize("what", ["picture", "declaration", "sample"])
def test_every_part_of_the_key_is_noticed(tmp_path, capsys, what):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 1, "B": 1})
    audit_inline(goods, out)
    article, sheet = goods / "articles" / "G-1.toml", goods / "lots.csv"
    if what == "picture":
        (goods / "B-1.png").write_bytes((goods / "A-1.png").read_bytes())
    elif what == "declaration":
        article.write_text(article.read_text().replace("2 %", "3 %"))
    else:
        sheet.write_text(sheet.read_text().replace("B-1.png,B,G-1,1", "B-1.png,B,G-1,7"))
    capsys.readouterr()
    audit_inline(goods, out)
    measured = 2 if what == "declaration" else 1
    assert f"{measured} measured" in capsys.readouterr().err


def test_fresh_measures_everything_again_and_supersedes(tmp_path, capsys):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 2})
    audit_inline(goods, out)
    before = timeless(out)
    audit_inline(goods, out, fresh=True)
    assert "2 pictures: 2 measured" in capsys.readouterr().err
    assert timeless(out) == before
    assert [supersedes for _, _, supersedes in rows(out)[3:5]] == [1, 2]


def test_a_wrong_declaration_stops_only_its_own_lots(tmp_path, capsys):
    lay(tmp_path / "goods", {"A": 2, "B": 2})
    bad = tmp_path / "goods" / "articles" / "bad.toml"
    bad.write_text(
        audit_rig.ARTICLE.format(code="bad", ends=25, picks=20).replace("ends =", "ens =")
    )
    sheet = tmp_path / "goods" / "lots.csv"
    sheet.write_text(sheet.read_text().replace("B,G-1", "B,bad"))
    assert audit_inline(tmp_path / "goods", tmp_path / "out") is ExitCode.USAGE
    assert "tolerance.ens" in capsys.readouterr().err
    told = records(tmp_path / "out")
    assert told[-2]["decision"] == "conforms"
    assert told[-1]["decision"] is None
    assert told[2]["findings"][0]["code"] == "declaration-unreadable"
    assert told[2]["threads"] is not None


@pytest.mark.parametrize(
    ("cell", "said"),
    [
        ("24px", "lots.csv row 2, pitch"),
        ("0dpi", "lots.csv row 2, pitch"),
    ],
)
def test_a_wrong_cell_is_refused_before_anything_is_measured(tmp_path, cell, said):
    lay(tmp_path / "goods", {"A": 1})
    sheet = tmp_path / "goods" / "lots.csv"
    sheet.write_text(sheet.read_text().replace("24px/mm", cell))
    with pytest.raises(LotSheetError) as refused:
        audit_inline(tmp_path / "goods", tmp_path / "out")
    assert said in str(refused.value)
    assert not (tmp_path / "out" / "records.jsonl").exists()


def test_a_copy_of_a_picture_is_not_another_place(tmp_path):
    lay(tmp_path / "goods", {"A": 1})
    first = tmp_path / "goods" / "A-1.png"
    (tmp_path / "goods" / "A-2.png").write_bytes(first.read_bytes())
    with (tmp_path / "goods" / "lots.csv").open("a") as sheet:
        sheet.write("A-2.png,A,G-1,2,24px/mm\n")
    code = audit_inline(tmp_path / "goods", tmp_path / "out")
    lot = records(tmp_path / "out")[-1]
    assert lot["n_places"] == 1
    assert "same-picture-twice" in {each["code"] for each in lot["findings"]}
    assert code is ExitCode.UNDECIDED


class Unlucky(audit_rig.Inline):
    """A crew that loses its second picture."""

    def __init__(self, loss):
        self._loss = loss

    def run(self, work, loads):
        for done in super().run(work, loads):
            lost = done.index == 1 and isinstance(done.answer, Answer)
            yield Lost(1, self._loss, "line one\nplanted") if lost else done


@pytest.mark.parametrize(
    ("loss", "flag", "code"),
    [
        (Loss.DIED, "measuring-died", ExitCode.UNDECIDED),
        (Loss.HUNG, "measuring-took-too-long", ExitCode.UNDECIDED),
        (Loss.FAULT, "program-fault", ExitCode.BUG),
    ],
)
def test_a_lost_picture_has_its_record_and_is_tried_again(tmp_path, capsys, loss, flag, code):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 2})
    # one of two places is left, and one place never decides a lot
    assert audit_inline(goods, out, crew=Unlucky(loss)) is code
    assert "A-2.png: planted" in capsys.readouterr().err
    lost = records(out)[1]
    assert [each["code"] for each in lost["findings"] if each["severity"] == "refusal"] == [flag]
    assert lost["threads"] is None and lost["sample"]["place"] == "2"
    assert audit_inline(goods, out) is ExitCode.CONFORMS
    assert "1 measured, 1 known from before" in capsys.readouterr().err
    assert records(out)[1]["threads"] is not None


def test_a_file_that_an_option_names_and_cannot_be_used_is_said(tmp_path, capsys):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 1})
    (goods / "blank.png").write_bytes(b"no picture")
    sheet = goods / "lots.csv"
    sheet.write_text(
        sheet.read_text().replace("pitch\n", "pitch,blank\n").replace("/mm", "/mm,blank.png")
    )
    assert audit_inline(goods, out) is ExitCode.USAGE
    assert "blank" in capsys.readouterr().err
    assert records(out)[0]["findings"][0]["code"] == "option-unusable"


def test_a_certificate_made_anew_or_expired_measures_again(tmp_path, capsys):
    goods, out, today = tmp_path / "goods", tmp_path / "out", date.today()
    lay(goods, {"A": 1})
    sheet = goods / "lots.csv"
    sheet.write_text(
        sheet.read_text().replace("pitch\n", "device\n").replace("24px/mm", "bench.toml")
    )
    year = timedelta(365)
    certified(goods, pitch=24.0, made=today - year, valid_until=today + year)
    audit_inline(goods, out)
    first = records(out)[0]
    assert first["provenance"]["device"] is not None
    assert first["threads"]["ends"]["value"] == pytest.approx(25.0, rel=0.01)
    audit_inline(goods, out)
    assert "1 known from before" in capsys.readouterr().err
    certified(goods, pitch=12.0, made=today - year, valid_until=today + year)
    audit_inline(goods, out)
    assert "1 measured" in capsys.readouterr().err
    assert records(out)[0]["threads"]["ends"]["value"] == pytest.approx(12.5, rel=0.01)
    certified(goods, pitch=24.0, made=today - 2 * year, valid_until=today - year)
    audit_inline(goods, out)
    assert "certificate-expired" in {each["code"] for each in records(out)[0]["findings"]}


def test_a_certificate_that_is_none_is_refused_before_anything_is_measured(tmp_path):
    goods = tmp_path / "goods"
    lay(goods, {"A": 1})
    sheet = goods / "lots.csv"
    sheet.write_text(
        sheet.read_text().replace("pitch\n", "device\n").replace("24px/mm", "bench.toml")
    )
    (goods / "bench.toml").write_text("[device]\n")
    with pytest.raises(LotSheetError, match=r"row 2, device: bench\.toml"):
        audit_inline(goods, tmp_path / "out")


def test_reports_never_take_the_place_of_a_lot_sheet(tmp_path):
    """Truth is the folder as it was laid: an audit's own table is called lots.csv, too."""
    goods, other = tmp_path / "goods", tmp_path / "other"
    lay(goods, {"A": 1})
    lay(other, {"B": 1})
    before = (goods / "lots.csv").read_bytes()
    mine = tmp_path / "mine"
    mine.mkdir()
    (mine / "report.xlsx").write_bytes(b"my own")
    for folder, out in ((goods, goods), (other, goods), (goods, mine)):
        with pytest.raises(OptionError, match="--out"):
            audited(audit_rig.asked(folder, out))
    assert (goods / "lots.csv").read_bytes() == before
    assert (mine / "report.xlsx").read_bytes() == b"my own"
    assert not (goods / "ledger.sqlite").exists()


def test_pages_of_lots_that_are_listed_no_more_are_told_and_kept(tmp_path, capsys):
    goods, out = tmp_path / "goods", tmp_path / "out"
    lay(goods, {"A": 1, "B": 1})
    audit_inline(goods, out)
    assert "earlier" not in capsys.readouterr().err
    sheet = goods / "lots.csv"
    sheet.write_text(sheet.read_text().replace(",B,", ",C,"))
    audit_inline(goods, out)
    said = "pages of earlier audits, not of this one: lots/B.html"
    assert said in capsys.readouterr().err
    assert said in (out / "report.html").read_text()
    assert (out / "lots" / "B.html").exists()


def test_reports_inside_the_goods_are_no_goods(tmp_path, capsys):
    goods = tmp_path / "goods"
    lay(goods, {"A": 1})
    audit_inline(goods, goods / "reports")
    audit_inline(goods, tmp_path / "out")
    assert "in the folder" not in capsys.readouterr().err
