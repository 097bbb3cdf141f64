"""Truth is an audit that nobody disturbed: after any number of kills the ledger is the same.

Ten kills here; fifty, and with real measuring: see tests/audit/bench_audit.py.
"""

import os
import signal
import sqlite3
import subprocess
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from contextlib import closing
from pathlib import Path

import pytest
from audit_rig import ROOT, command, hearing_ctrl_c, lay, records

from imgcover.ledger.store import Ledger
from imgcover.ledger.verify import verify

DRIVER = Path(__file__).parent / "kill_driver.py"


def driven(folder, out, kills, *, whole=True):
    done = subprocess.run(
        [sys.executable, str(DRIVER), str(folder), str(out), str(kills), "3"],
        capture_output=True,
        text=True,
        check=True,
        timeout=200,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )
    with Ledger.read(out / "ledger.sqlite") as ledger:
        assert verify(ledger.rows(), head=ledger.head()).holds
    with closing(sqlite3.connect(out / "ledger.sqlite")) as raw:
        rows = raw.execute("SELECT n, subject, key, body, seal FROM entry ORDER BY n").fetchall()
        left = raw.execute("SELECT count(*) FROM waiting").fetchone()
        # another audit may still be at work on the same ledger
        assert left == (0,) or not whole
    return rows, int(done.stdout)


@pytest.fixture(scope="module")
def goods(tmp_path_factory):
    """Sixty small pictures, and the ledger of an audit that nobody disturbed."""
    base = tmp_path_factory.mktemp("kill")
    lay(base / "goods", {"A": 20, "B": 20, "C": 20}, side=64)
    calm, _ = driven(base / "goods", base / "calm", 0)
    assert len(calm) == 63
    return base / "goods", calm


def test_kills_at_random_moments_leave_the_same_ledger(goods, tmp_path):
    folder, calm = goods
    killed, in_the_middle = driven(folder, tmp_path / "killed", 10)
    assert killed == calm
    # most kills must have met an audit at work, or this shows nothing
    assert in_the_middle >= 5


def test_two_audits_at_once_keep_one_ledger(goods, tmp_path):
    folder, calm = goods
    with ThreadPoolExecutor(2) as pool:
        both = [pool.submit(driven, folder, tmp_path / "both", 0, whole=False) for _ in range(2)]
        rows = [each.result()[0] for each in both][-1]
    # the same words about the same subjects, each once, whoever came first
    assert sorted(row[1:4] for row in rows[:60]) == sorted(row[1:4] for row in calm[:60])


def test_ctrl_c_leaves_what_is_finished_and_the_next_run_goes_on(tmp_path):
    lay(tmp_path / "goods", {"A": 6})
    with subprocess.Popen(
        command(tmp_path / "goods", tmp_path / "out", "--jobs", "1"),
        stderr=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        preexec_fn=hearing_ctrl_c,
    ) as process:
        ledger = tmp_path / "out" / "ledger.sqlite"
        until = time.monotonic() + 120
        while _count(ledger) < 2 and time.monotonic() < until:
            time.sleep(0.02)
        process.send_signal(signal.SIGINT)
        begun = time.monotonic()
        _, said = process.communicate(timeout=60)
    assert process.returncode == 130, said
    assert time.monotonic() - begun < 10
    assert "interrupted" in said
    finished = _count(ledger)
    assert 2 <= finished < 6
    again = subprocess.run(
        command(tmp_path / "goods", tmp_path / "out", "--jobs", "1"),
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )
    assert f"{finished} known from before" in again.stderr
    assert len(records(tmp_path / "out")) == 7


def _count(ledger: Path) -> int:
    if not ledger.exists():
        return 0
    try:
        with closing(sqlite3.connect(ledger)) as raw:
            return raw.execute("SELECT count(*) FROM entry").fetchone()[0]
    except sqlite3.Error:
        return 0
