"""Truth is the folder as it was laid: what was drawn, changed, copied or damaged is known.

Pictures are drawn here as crossing bars of exact number; how well cloth is counted is tested in
its own room.
"""

import hashlib
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


def seals(out):
    with closing(sqlite3.connect(out / "ledger.sqlite")) as raw:
        return raw.execute("SELECT seal FROM entry ORDER BY n").fetchall()


@pytest.fixture(scope="module")
def goods(tmp_path_factory):
    """Two lots of three places, audited once with two workers."""
    base = tmp_path_factory.mktemp("audit")
    lay(base / "goods", {"A": 3, "B": 2})
    done = audit(base / "goods", base / "two", "--jobs", "2")
    return base, done


def test_every_picture_and_every_lot_has_its_record(goods):
    base, done = goods
    told = records(base / "two")
    assert [r["picture"]["name"] for r in told[:5]] == [
        *(f"A-{n}.png" for n in (1, 2, 3)),
        *(f"B-{n}.png" for n in (1, 2)),
    ]
    assert [r["lot"] for r in told[5:]] == ["A", "B"]
    assert [r["n_places"] for r in told[5:]] == [3, 2]
    # drawn with exactly 25 and 20 a centimetre: what the article declares
    assert [r["decision"] for r in told[5:]] == ["conforms", "conforms"]
    assert done.returncode == 0, done.stderr
    assert "2 lots conform." in done.stderr
    for name in ("lots.csv", "report.xlsx", "report.html", "lots/A.html", "lots/B.html"):
        assert (base / "two" / name).stat().st_size > 0


def test_one_worker_gives_the_same_bytes_as_two_and_the_same_seals(goods):
    base, _ = goods
    audit(base / "goods", base / "one", "--jobs", "1")
    assert timeless(base / "one") == timeless(base / "two")
    assert seals(base / "one") == seals(base / "two")


def test_the_head_at_a_reports_foot_holds_against_the_ledger(goods):
    base, done = goods
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


def tree(folder: Path) -> dict[str, str]:
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in folder.rglob("*")
        if path.is_file()
    }


def test_nothing_is_written_elsewhere_and_nothing_is_fetched(tmp_path):
    lay(tmp_path / "goods", {"A": 1})
    before = tree(tmp_path / "goods")
    homes = {}
    for name in ("HOME", "TMPDIR", "XDG_CACHE_HOME", "XDG_CONFIG_HOME", "XDG_DATA_HOME"):
        homes[name] = str(tmp_path / "homes" / name)
        Path(homes[name]).mkdir(parents=True)
    # any attempt to look up or reach another machine ends the process that tries
    (tmp_path / "guard").mkdir()
    (tmp_path / "guard" / "sitecustomize.py").write_text(
        "import os, socket\n"
        "def refuse(*_):\n    os._exit(99)\n"
        "socket.socket.connect = refuse\nsocket.getaddrinfo = refuse\n"
    )
    paths = f"{tmp_path / 'guard'}:{audit_rig.ROOT}"
    done = audit(
        tmp_path / "goods",
        tmp_path / "out",
        env={**homes, "PYTHONPATH": paths, "PYTHONDONTWRITEBYTECODE": "1"},
    )
    # one place never decides a lot
    assert done.returncode == 3, done.stderr
    assert tree(tmp_path / "goods") == before
    assert tree(tmp_path / "homes") == {}
    assert {path.name for path in tmp_path.iterdir()} == {"goods", "guard", "homes", "out"}
    assert not list((tmp_path / "out").glob("**/*.part"))


def test_hostile_files_are_findings_and_nothing_else(tmp_path):
    folder = tmp_path / "goods" / "A"
    folder.mkdir(parents=True)
    count = hostile.lay_hostile(folder, count=110, seed=1)
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
