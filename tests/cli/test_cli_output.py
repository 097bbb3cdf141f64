"""Output appears whole or not at all, and no reader or disk can turn a decision into a crash.

Truth is the promise of the option: `-o` writes beside and renames.
"""

from __future__ import annotations

import os
import stat
import threading
from pathlib import Path

import pytest

from imgcover.cli.output import opened, tell
from imgcover.errors import OutputError


def test_a_file_appears_whole(tmp_path: Path) -> None:
    target = tmp_path / "out.jsonl"
    target.write_text("old")
    with opened(target) as write:
        write("new ± µ\n")
        assert target.read_text() == "old"
    assert target.read_text(encoding="utf-8") == "new ± µ\n"
    assert [each.name for each in tmp_path.iterdir()] == ["out.jsonl"]


def test_a_fault_on_the_way_leaves_the_old_file_and_no_other(tmp_path: Path) -> None:
    target = tmp_path / "out.jsonl"
    target.write_text("old")
    with pytest.raises(RuntimeError), opened(target) as write:
        write("half")
        raise RuntimeError
    assert target.read_text() == "old"
    assert [each.name for each in tmp_path.iterdir()] == ["out.jsonl"]


def test_an_existing_file_keeps_its_mode_and_a_link_stays_a_link(tmp_path: Path) -> None:
    real, link = tmp_path / "real.csv", tmp_path / "link.csv"
    real.write_text("old")
    real.chmod(0o640)
    link.symlink_to(real)
    with opened(link) as write:
        write("new")
    assert link.is_symlink()
    assert real.read_text() == "new"
    assert stat.S_IMODE(real.stat().st_mode) == 0o640


def test_a_pipe_named_as_output_is_written_to_and_not_replaced(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    got: list[str] = []
    reader = threading.Thread(target=lambda: got.append(pipe.read_text()))
    reader.start()
    with opened(pipe) as write:
        write("through")
    reader.join(timeout=10)
    assert got == ["through"]
    assert stat.S_ISFIFO(pipe.stat().st_mode)


@pytest.mark.parametrize("place", ["missing/out.csv", "."])
def test_a_place_that_cannot_be_written_is_told_by_name(tmp_path: Path, place: str) -> None:
    with pytest.raises(OutputError) as told, opened(tmp_path / place):
        pytest.fail("it must not open")
    assert str(tmp_path) in told.value.where


def test_talk_is_plain(capsys: pytest.CaptureFixture[str]) -> None:
    tell("one\x1b[31m\ntwo")
    assert capsys.readouterr().err == "one\\x1b[31m\\ntwo\n"
