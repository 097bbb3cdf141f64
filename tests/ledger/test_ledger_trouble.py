"""Truth is the system's: real full files, locks, denied folders and foreign databases."""

import os
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest

from imgcover.errors import LedgerError
from imgcover.ledger.chain import Entry
from imgcover.ledger.place import network_kind
from imgcover.ledger.store import Ledger
from imgcover.ledger.verify import verify


def entry(subject: str, body: str = "{}") -> Entry:
    return Entry("imgcover/record/1", subject, "k1", body, "")


def test_a_full_disk_is_told_and_what_was_written_stays(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append([entry("a")])
        # SQLite meets its own page limit exactly as it meets the end of a disk: SQLITE_FULL
        ledger._connection.execute("PRAGMA max_page_count = 20")
        with pytest.raises(LedgerError, match="the disk is full"):
            ledger.append(entry(str(n), "x" * 9000) for n in range(40))
        assert ledger.head().n == 1
        assert ledger.append([entry("b")]) == 1
        assert verify(ledger.rows(), head=ledger.head()).holds


def test_a_disk_that_refuses_to_grow_is_told(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append([entry("a")])
    script = """
import resource, signal, sys
from pathlib import Path
from imgcover.errors import LedgerError
from imgcover.ledger.chain import Entry
from imgcover.ledger.store import Ledger
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
with Ledger.open(Path(sys.argv[1])) as ledger:
    resource.setrlimit(resource.RLIMIT_FSIZE, (120_000, 120_000))
    try:
        ledger.append(Entry("s", str(n), "k", "x" * 9000, "") for n in range(40))
    except LedgerError as fault:
        print(fault.fault)
"""
    done = subprocess.run(
        [sys.executable, "-c", script, str(path)], capture_output=True, text=True, check=True
    )
    assert "disk" in done.stdout
    with Ledger.open(path) as ledger:
        assert ledger.head().n == 1
        assert verify(ledger.rows(), head=ledger.head()).holds


def test_a_locked_ledger_is_told_after_patience(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger, closing(sqlite3.connect(path)) as other:
        other.execute("BEGIN IMMEDIATE")
        locked = pytest.raises(LedgerError, match="holds it locked")
        with locked, Ledger.open(path, patience_s=0.1) as second:
            second.append([entry("a")])
        other.rollback()
        assert ledger.append([entry("a")]) == 1


def test_a_folder_that_may_only_be_read_can_be_looked_into_but_not_written(tmp_path):
    room = tmp_path / "room"
    room.mkdir()
    path = room / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append([entry("a")])
    script = """
import os, sys
from pathlib import Path
from imgcover.errors import LedgerError
from imgcover.ledger.chain import Entry
from imgcover.ledger.store import Ledger
if os.geteuid() == 0:
    os.setegid(65534)
    os.seteuid(65534)  # root may write anywhere; nobody may not
path = Path(sys.argv[1])
with Ledger.read(path) as ledger:
    print(ledger.head().n)
try:
    with Ledger.open(path) as ledger:
        ledger.append([Entry("s", "b", "k", "{}", "")])
except LedgerError as fault:
    print(fault.fault)
"""
    path.chmod(0o444)
    room.chmod(0o555)
    if os.geteuid() == 0:  # let nobody reach the room; these folders are pytest's own
        for above in (tmp_path, *tmp_path.parents):
            if "pytest-" in str(above):
                above.chmod(above.stat().st_mode | 0o005)
    try:
        done = subprocess.run(
            [sys.executable, "-c", script, str(path)], capture_output=True, text=True, check=True
        )
    finally:
        room.chmod(0o755)
    said = done.stdout.splitlines()
    assert said[0] == "1"
    assert "cannot be written" in said[1] or "cannot be opened" in said[1]


def test_a_missing_folder_and_a_missing_ledger_are_told(tmp_path):
    with pytest.raises(LedgerError, match="cannot be opened"):
        Ledger.open(tmp_path / "nowhere" / "l.sqlite")
    with pytest.raises(LedgerError, match="no such ledger"):
        Ledger.read(tmp_path / "l.sqlite")


def test_what_is_no_ledger_is_not_touched(tmp_path):
    text = tmp_path / "notes.txt"
    text.write_text("not a database, " * 100)
    with pytest.raises(LedgerError, match="not a ledger"):
        Ledger.open(text)
    assert text.read_text() == "not a database, " * 100
    other = tmp_path / "other.sqlite"
    with closing(sqlite3.connect(other)) as raw, raw:
        raw.execute("CREATE TABLE stock (n INTEGER)")
    before = other.read_bytes()
    for opening in (Ledger.open, Ledger.read):
        with pytest.raises(LedgerError, match="another program"):
            opening(other)
    assert other.read_bytes() == before


def test_a_damaged_file_is_told(tmp_path):
    path = tmp_path / "l.sqlite"
    with Ledger.open(path) as ledger:
        ledger.append(entry(str(n), "x" * 3000) for n in range(60))
    whole = bytearray(path.read_bytes())
    whole[8192:40960] = bytes(32768)
    path.write_bytes(whole)
    with pytest.raises(LedgerError, match="damaged"), Ledger.read(path) as ledger:
        list(ledger.rows())


MOUNTS = """22 27 0:21 / /proc rw - proc proc rw
27 1 254:0 / / rw,relatime - ext4 /dev/vda rw
40 27 0:40 / /mnt/goods\\040in rw - nfs4 mill:/goods rw
41 40 0:41 / /mnt/goods\\040in/local rw - ext4 /dev/vdb rw
42 27 0:42 / /media rw shared:3 - cifs //mill/media rw
43 27 0:43 / /media rw - ext4 /dev/vdc rw
44 27 0:44 / /mnt/far rw master:1 - fuse.sshfs mill: rw
"""
"""In the form of proc(5), section /proc/[pid]/mountinfo, with optional fields and an escape."""


@pytest.mark.parametrize(
    ("path", "kind"),
    [
        ("/mnt/goods in/ledger.sqlite", "nfs4"),
        ("/mnt/goods in/local/ledger.sqlite", None),
        ("/mnt/goods inn/ledger.sqlite", None),
        ("/media/ledger.sqlite", None),
        ("/mnt/far/a/b", "fuse.sshfs"),
        ("/home/ledger.sqlite", None),
    ],
)
def test_the_deepest_mount_decides_whether_a_ledger_may_lie_there(path, kind):
    assert network_kind(Path(path), mounts=MOUNTS) == kind


def test_a_ledger_on_a_network_share_is_refused(tmp_path, monkeypatch):
    table = tmp_path / "mountinfo"
    table.write_text(f"1 0 0:1 / {tmp_path} rw - smb3 //mill/goods rw\n")
    monkeypatch.setattr("imgcover.ledger.place.MOUNTS", table)
    with pytest.raises(LedgerError, match="network share \\(smb3\\)"):
        Ledger.open(tmp_path / "l.sqlite")
    assert not (tmp_path / "l.sqlite").exists()
