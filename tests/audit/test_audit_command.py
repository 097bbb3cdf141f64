"""Truth is the folder as it was laid: what was drawn, changed, copied or damaged is known.

Pictures are drawn here as crossing bars of exact number; how well cloth is counted is tested in
its own room.
"""

import hashlib
import os
import re
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import audit_rig
import hostile
import pytest
from audit_rig import audit, lay, records, timeless


def tree(folder: Path) -> dict[str, str]:
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in folder.rglob("*")
        if path.is_file()
    }


def seals(out):
    with closing(sqlite3.connect(out / "ledger.sqlite")) as raw:
        return raw.execute("SELECT seal FROM entry ORDER BY n").fetchall()


HOMES = ("HOME", "TMPDIR", "XDG_CACHE_HOME", "XDG_CONFIG_HOME", "XDG_DATA_HOME")
GUARD = """
import os, socket
def refuse(*_):
    os._exit(99)
socket.socket.connect = refuse
socket.getaddrinfo = refuse
"""
"""Loaded by every Python before anything else: an attempt to reach or look up another machine ends
the process that tries."""


@pytest.fixture(scope="module")
def goods(tmp_path_factory):
    """Two lots, audited with two workers where nothing may be written or fetched elsewhere."""
    base = tmp_path_factory.mktemp("audit")
    lay(base / "goods", {"A": 2, "B": 1})
    laid = tree(base / "goods")
    for name in HOMES:
        (base / "homes" / name).mkdir(parents=True)
    (base / "guard").mkdir()
    (base / "guard" / "sitecustomize.py").write_text(GUARD)
    environment = {name: str(base / "homes" / name) for name in HOMES}
    environment["PYTHONPATH"] = f"{base / 'guard'}{os.pathsep}{audit_rig.ROOT}"
    environment["PYTHONDONTWRITEBYTECODE"] = "1"
    done = audit(base / "goods", base / "two", "--jobs", "2", env=environment)
    written = {path.name for path in base.iterdir()}
    return base, done, laid, written


def test_every_picture_and_every_lot_has_its_record(goods):
    base, done, _, _ = goods
    told = records(base / "two")
    names = ["A-1.png", "A-2.png", "B-1.png"]
    assert [r["picture"]["name"] for r in told[:3]] == names
    assert [r["lot"] for r in told[3:]] == ["A", "B"]
    assert [r["n_places"] for r in told[3:]] == [2, 1]
    # drawn with exactly 25 and 20 a centimetre, as declared; one place never decides a lot
    assert [r["decision"] for r in told[3:]] == ["conforms", "undecided"]
    assert done.returncode == 3, done.stderr
    assert "1 lot conforms, 1 lot undecided." in done.stderr
    for name in ("lots.csv", "report.xlsx", "report.html", "lots/A.html", "lots/B.html"):
        assert (base / "two" / name).stat().st_size > 0


def test_one_worker_gives_the_same_bytes_as_two_and_the_same_seals(goods):
    base, _, _, _ = goods
    audit(base / "goods", base / "one", "--jobs", "1")
    assert timeless(base / "one") == timeless(base / "two")
    assert seals(base / "one") == seals(base / "two")


def test_the_head_at_a_reports_foot_holds_against_the_ledger(goods):
    base, done, _, _ = goods
    (head,) = re.findall(r"ledger head (\d+:[0-9a-f]{64})", done.stderr)
    verify = [sys.executable, "-m", "imgcover", "ledger", "verify", "--head"]
    ledger = str(base / "two" / "ledger.sqlite")
    held = subprocess.run([*verify, head, ledger], capture_output=True, text=True, check=False)
    assert held.returncode == 0, held.stdout
    for name in ("report.html", "lots/A.html", "lots.csv"):
        text = (base / "one" / name).read_text()
        assert re.search(r"[0-9a-f]{64}", text)
    odd = head[:-1] + ("0" if head[-1] != "0" else "1")
    cut = subprocess.run([*verify, odd, ledger], capture_output=True, text=True, check=False)
    assert cut.returncode == 1 and "written anew" in cut.stdout


def test_nothing_is_written_elsewhere_and_nothing_is_fetched(goods):
    base, _, laid, written = goods
    assert tree(base / "goods") == laid
    assert tree(base / "homes") == {}
    assert written == {"goods", "guard", "homes", "two"}
    assert not list((base / "two").glob("**/*.part"))


def test_hostile_files_are_findings_and_nothing_else(tmp_path):
    folder = tmp_path / "goods" / "A"
    folder.mkdir(parents=True)
    count = hostile.lay_hostile(folder, count=60, seed=1)
    done = audit(tmp_path / "goods", tmp_path / "out", "--pitch", "24px/mm", "--time-limit", "5")
    told = records(tmp_path / "out")
    pictures = [record for record in told if "picture" in record]
    assert len(pictures) == count
    codes = [{each["code"] for each in record["findings"]} for record in pictures]
    # none hangs for five seconds, none kills its process, none finds a bug
    assert not {"measuring-died", "measuring-took-too-long", "program-fault"} & set().union(*codes)
    refused = [
        any(each["severity"] == "refusal" for each in record["findings"]) for record in pictures
    ]
    assert sum(refused) >= 0.9 * count
    # a turned bit may leave a picture whole; then it must be read as what it now is
    assert all(refused[n] or pictures[n]["picture"]["pixels_sha256"] for n in range(count))
    # open, unless five of the damaged ones could still be read
    assert done.returncode in (0, 3), done.stderr
    assert "\x1b" not in done.stderr + done.stdout
    assert "\x1b" not in (tmp_path / "out" / "lots" / "A.html").read_text()
