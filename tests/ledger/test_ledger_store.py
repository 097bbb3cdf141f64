"""Truth is arithmetic: what was appended is there, in order, whatever happens around it."""

import json
import sqlite3
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from contextlib import closing

import pytest

from imgcover.errors import LedgerError
from imgcover.ledger.chain import Entry
from imgcover.ledger.export import exported
from imgcover.ledger.migrations import STEPS
from imgcover.ledger.store import Ledger
from imgcover.ledger.verify import verify

DAY = "2031-04-02T06:00:00Z"


def entry(subject: str, body: str = "{}", key: str = "k1") -> Entry:
    return Entry("imgcover/record/1", subject, key, body, DAY)


def test_rows_come_back_to_the_byte_and_in_order(tmp_path):
    bodies = ['{"name": "nœud \\ud800"}', "{}", '{"a":  1}']
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        assert ledger.append(entry(str(n), body) for n, body in enumerate(bodies)) == 3
    with Ledger.read(tmp_path / "l.sqlite") as ledger:
        assert [row.entry.body for row in ledger.rows()] == bodies
        assert verify(ledger.rows(), head=ledger.head()).holds


def test_a_correction_supersedes_and_leaves_what_was_said(tmp_path):
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        ledger.append([entry("a", "{}"), entry("b"), entry("a", "{ }", key="k2")])
        assert ledger.superseded() == {1: 3}
        assert ledger.last("a").entry.body == "{ }"
        assert ledger.row(1).entry.body == "{}"


def test_the_same_words_again_add_nothing_unless_asked(tmp_path):
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        assert ledger.append([entry("a")]) == 1
        assert ledger.append([entry("a")]) == 0
        assert ledger.append([entry("a")], again=True) == 1
        assert ledger.superseded() == {1: 2}


def test_what_waits_is_found_and_leaves_when_it_is_appended(tmp_path):
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        ledger.keep_waiting([entry("late")])
        assert ledger.find("late", "k1") == entry("late")
        assert ledger.knows("late") and not ledger.knows("other")
        assert ledger.head().n == 0
        ledger.append([entry("early"), entry("late")])
    with closing(sqlite3.connect(tmp_path / "l.sqlite")) as raw:
        assert raw.execute("SELECT count(*) FROM waiting").fetchone() == (0,)


def test_a_key_that_was_superseded_is_still_found(tmp_path):
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        ledger.append([entry("a", "{}", "k1"), entry("a", "{ }", "k2")])
        assert ledger.find("a", "k1").body == "{}"
        assert ledger.find("a", "k3") is None


def test_all_entries_of_one_call_or_none(tmp_path):
    def broken():
        yield entry("a")
        raise RuntimeError("the reader stumbled")

    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        with pytest.raises(RuntimeError):
            ledger.append(broken())
        assert ledger.head().n == 0
        assert ledger.append([entry("b")]) == 1


@pytest.mark.parametrize("order", ["UPDATE entry SET body = '[]'", "DELETE FROM entry"])
def test_the_file_itself_refuses_to_change_a_row(tmp_path, order):
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        ledger.append([entry("a")])
    refused = pytest.raises(sqlite3.IntegrityError, match="only appended to")
    with closing(sqlite3.connect(tmp_path / "l.sqlite")) as raw, refused:
        raw.execute(order)


def test_two_writers_at_once_lose_nothing_and_keep_one_chain(tmp_path):
    def write(who: int) -> None:
        with Ledger.open(tmp_path / "l.sqlite") as ledger:
            for n in range(40):
                ledger.append([entry(f"{who}/{n}")])

    with ThreadPoolExecutor(4) as pool:
        list(pool.map(write, range(4)))
    with Ledger.read(tmp_path / "l.sqlite") as ledger:
        assert {row.entry.subject for row in ledger.rows()} == {
            f"{who}/{n}" for who in range(4) for n in range(40)
        }
        assert verify(ledger.rows(), head=ledger.head()).holds


def test_a_writer_killed_at_any_moment_loses_no_acknowledged_row(tmp_path):
    path = tmp_path / "l.sqlite"
    writer = """
import sys
from pathlib import Path
from imgcover.ledger.chain import Entry
from imgcover.ledger.store import Ledger
with Ledger.open(Path(sys.argv[1])) as ledger:
    for n in range(int(sys.argv[2]), 10**6):
        ledger.append([Entry("s", str(n), "k", "x" * 4000, "")])
        print(n, flush=True)
"""
    acknowledged = -1
    for rows in (1, 7, 40, 3, 90):
        command = [sys.executable, "-c", writer, str(path), str(acknowledged + 1)]
        with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as process:
            for _ in range(rows):
                acknowledged = int(process.stdout.readline())
            process.kill()
            # what it still said before it died was acknowledged too
            acknowledged = max([acknowledged, *map(int, process.stdout.read().split("\n")[:-1])])
        with Ledger.open(path) as ledger:
            subjects = [int(row.entry.subject) for row in ledger.rows()]
            assert subjects[: acknowledged + 1] == list(range(acknowledged + 1))
            # written but not yet said: at most the one underway
            assert len(subjects) <= acknowledged + 2
            assert verify(ledger.rows(), head=None).holds
            acknowledged = len(subjects) - 1


def test_an_altered_row_shows_through_the_file(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append([entry("a", '{"ends": 26.1}'), entry("b")])
        head = ledger.head()
    with closing(sqlite3.connect(path)) as raw, raw:
        raw.execute("DROP TRIGGER entry_is_never_changed")
        raw.execute("UPDATE entry SET body = '{\"ends\": 26.8}' WHERE n = 1")
    with Ledger.read(path) as ledger:
        assert verify(ledger.rows(), head=head).faults == ("row 1 was changed",)


def test_the_export_holds_every_row_with_its_chain(tmp_path):
    with Ledger.open(tmp_path / "l.sqlite") as ledger:
        ledger.append([entry("a\n\x1b[2J"), entry("b"), entry("b", "{ }")])
        lines = list(exported(ledger.rows()))
        head = ledger.head()
    assert all(line.count("\n") == 1 and line.isascii() for line in lines)
    rows = [json.loads(line) for line in lines]
    assert [row["n"] for row in rows] == [1, 2, 3]
    assert rows[2]["supersedes"] == 2
    assert rows[2]["seal"] == head.seal


def test_an_older_ledger_is_moved_and_a_copy_kept(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append([entry("a")])
        head = ledger.head()
    later = (*STEPS, ("CREATE TABLE stamp (n INTEGER PRIMARY KEY) STRICT",))
    with pytest.raises(LedgerError, match="older version"):
        Ledger.read(path, steps=later)
    with Ledger.open(path, steps=later) as ledger:
        assert ledger.head() == head
        kept = ledger.moved_from
    assert kept is not None and kept.name == "l.sqlite.version-1"
    with Ledger.read(kept) as copy:
        assert copy.head() == head
    with Ledger.read(path, steps=later) as ledger:
        assert ledger.head() == head
    with pytest.raises(LedgerError, match="newer imgcover"):
        Ledger.open(path)


def test_a_move_that_fails_leaves_the_ledger_as_it_was(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append([entry("a")])
    bad = (
        *STEPS,
        ("CREATE TABLE stamp (n INTEGER) STRICT", "CREATE TABLE entry (n INTEGER) STRICT"),
    )
    with pytest.raises(LedgerError):
        Ledger.open(path, steps=bad)
    with Ledger.open(path) as ledger:
        assert ledger.head().n == 1
        assert ledger.append([entry("b")]) == 1
