"""`imgcover ledger`: truth is the ledger as the test filled it."""

import json
import sqlite3
from contextlib import closing

import pytest

from imgcover.cli.door import outcome
from imgcover.cli.exits import ExitCode
from imgcover.findings import Flag, found
from imgcover.inspection import refuse
from imgcover.ledger.canonical import canonical
from imgcover.ledger.chain import Entry
from imgcover.ledger.store import Ledger
from imgcover.request import Request

DAY = "2031-04-02T06:00:00Z"


def body(name):
    record = refuse(Request(source=b"", name=name), found(Flag.PICTURE_UNREADABLE)).record
    return canonical({key: value for key, value in record.items() if key != "envelope"})


@pytest.fixture
def ledger(tmp_path):
    path = tmp_path / "goods" / "ledger.sqlite"
    path.parent.mkdir()
    with Ledger.open(path) as opened:
        opened.append(
            Entry("imgcover/record/1", f"picture:{subject}", key, body(subject), DAY)
            for subject, key in (("a.png", "k1"), ("b\x1b[2J.png", "k1"), ("a.png", "k2"))
        )
    return path


def head(ledger):
    with Ledger.read(ledger) as opened:
        return opened.head()


def test_list_shows_every_row_and_what_superseded_it(ledger, capsys):
    assert outcome(["ledger", "list", str(ledger)]) == ExitCode.CONFORMS
    told = capsys.readouterr()
    lines = told.out.splitlines()
    assert len(lines) == 3
    assert lines[0].split() == ["1", DAY, "measured", "picture:a.png", "superseded", "by", "3"]
    assert "b\\x1b[2J.png" in lines[1]
    assert str(head(ledger)) in told.err


def test_list_current_leaves_out_what_was_superseded(ledger, capsys):
    outcome(["ledger", "list", "--current", str(ledger)])
    assert [line.split()[0] for line in capsys.readouterr().out.splitlines()] == ["2", "3"]


def test_show_tells_one_row_and_that_it_no_longer_holds(ledger, capsys):
    assert outcome(["ledger", "show", str(ledger), "1"]) == ExitCode.CONFORMS
    told = capsys.readouterr().out
    assert "a.png" in told and "superseded by row 3" in told
    outcome(["ledger", "show", str(ledger), "3", "-f", "json"])
    (record,) = json.loads(capsys.readouterr().out)
    assert record["picture"]["name"] == "a.png"


def test_show_of_no_row_is_refused(ledger, capsys):
    assert outcome(["ledger", "show", str(ledger), "9"]) == ExitCode.OUTPUT
    assert "it has rows 1 to 3" in capsys.readouterr().err


def test_export_holds_every_row(ledger, tmp_path):
    target = tmp_path / "kept.jsonl"
    assert outcome(["ledger", "export", str(ledger), "-o", str(target)]) == ExitCode.CONFORMS
    rows = [json.loads(line) for line in target.read_text().splitlines()]
    assert [row["n"] for row in rows] == [1, 2, 3]
    assert rows[2]["seal"] == head(ledger).seal


def test_verify_says_what_is_shown_and_what_is_not(ledger, capsys):
    assert outcome(["ledger", "verify", str(ledger)]) == ExitCode.CONFORMS
    assert "completeness is not shown" in capsys.readouterr().out
    named = str(head(ledger))
    assert outcome(["ledger", "verify", str(ledger), "--head", named]) == ExitCode.CONFORMS
    assert "complete up to row 3" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("order", "said"),
    [
        ("UPDATE entry SET body = '{}' WHERE n = 2", "row 2 was changed"),
        ("DELETE FROM entry WHERE n = 2", "row 2 was removed"),
        ("DELETE FROM entry WHERE n = 3", "rows after 2 were cut off: the head names row 3"),
    ],
)
def test_an_altered_ledger_ends_with_one(ledger, capsys, order, said):
    named = str(head(ledger))
    with closing(sqlite3.connect(ledger)) as raw, raw:
        raw.execute("DROP TRIGGER entry_is_never_changed")
        raw.execute("DROP TRIGGER entry_is_never_removed")
        raw.execute(order)
    code = outcome(["ledger", "verify", str(ledger), "--head", named])
    assert code == ExitCode.DOES_NOT_CONFORM
    assert said in capsys.readouterr().out


def test_what_is_no_ledger_ends_with_74_and_what_is_no_head_with_2(ledger, tmp_path, capsys):
    (tmp_path / "text").write_text("no ledger" * 1000)
    for path in (tmp_path / "text", tmp_path / "none"):
        assert outcome(["ledger", "list", str(path)]) == ExitCode.OUTPUT
    assert outcome(["ledger", "verify", str(ledger), "--head", "3:xyz"]) == ExitCode.USAGE
    assert "foot of a report" in capsys.readouterr().err


@pytest.mark.parametrize("command", [["ledger", "export"], ["predict"]])
def test_a_ledger_and_what_is_read_from_are_never_written_over(command, ledger, tmp_path, capsys):
    """Truth is the contract: a proof is only ever appended to."""
    article = tmp_path / "article.toml"
    article.write_text(
        '[article]\ncode = "T"\n[warp]\nthreads = "68 /in"\ncount = "32 Ne"\n'
        '[weft]\nthreads = "64 /in"\ncount = "32 Ne"\n'
    )
    read = article if command == ["predict"] else ledger
    before = ledger.read_bytes(), article.read_bytes()
    assert outcome([*command, str(read), "-o", str(ledger)]) == ExitCode.OUTPUT
    assert "it is a ledger" in capsys.readouterr().err
    if read == article:
        assert outcome([*command, str(read), "-o", str(article)]) == ExitCode.USAGE
        assert "also read from" in capsys.readouterr().err
    assert before == (ledger.read_bytes(), article.read_bytes())


def test_a_folder_of_reports_is_told_from_the_ledger_in_it(ledger, capsys):
    assert outcome(["ledger", "verify", str(ledger.parent)]) == ExitCode.OUTPUT
    assert "is a folder; name the ledger in it, ledger.sqlite" in capsys.readouterr().err
