"""Every way a command can end has its own exit code, and a crash never reads as a decision.

Truth is the exit-code table of the README and the shell's own conventions.
"""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest
import typer

from imgcover.cli import door, run
from imgcover.cli.exits import ExitCode, gravest
from imgcover.errors import DeclarationError, OutputError

PROGRAM = [sys.executable, "-m", "imgcover"]


def ending(monkeypatch: pytest.MonkeyPatch, fault: BaseException) -> int:
    """Run a command line whose only command ends with the fault."""

    def broken() -> None:
        raise fault

    app = typer.Typer(pretty_exceptions_enable=False)
    app.command()(broken)
    monkeypatch.setattr("imgcover.cli.app.assembled", lambda: app)
    return door.outcome([])


@pytest.mark.parametrize(
    ("fault", "code", "said"),
    [
        (RuntimeError("boom"), 70, "internal fault: RuntimeError: boom"),
        (MemoryError(), 70, "internal fault: MemoryError"),
        (ModuleNotFoundError("No module named 'cv2'"), 70, "No module named 'cv2'"),
        (KeyboardInterrupt(), 130, "interrupted"),
        (DeclarationError("a.toml: warp.threads", "no unit", "write one"), 2, "warp.threads"),
        (OutputError("out.csv", "disk full", "make room"), 74, "out.csv"),
    ],
)
def test_each_fault_has_its_code_and_one_line(
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    fault: BaseException,
    code: int,
    said: str,
) -> None:
    monkeypatch.delenv("IMGCOVER_DEBUG", raising=False)
    assert ending(monkeypatch, fault) == code
    out, err = capsys.readouterr()
    assert out == ""
    assert said in err
    assert err.count("\n") == 1
    assert "Traceback" not in err


def test_debug_shows_where_and_keeps_the_code(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("IMGCOVER_DEBUG", "1")
    assert ending(monkeypatch, RuntimeError("boom")) == 70
    assert "Traceback" in capsys.readouterr().err


def test_a_fault_cannot_write_to_the_terminal(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    ending(monkeypatch, DeclarationError("\x1b]0;owned\x07.toml", "it lies", "look"))
    err = capsys.readouterr().err
    assert "\x1b" not in err
    assert r"\x1b]0;owned\x07.toml" in err


def test_an_import_failure_of_the_door_itself_is_a_bug_not_a_decision() -> None:
    lines = "import sys; sys.modules['typer'] = None\nfrom imgcover.cli import run; run(['--help'])"
    ended = subprocess.run([sys.executable, "-c", lines], capture_output=True, text=True)
    assert ended.returncode == 70
    assert "internal fault" in ended.stderr
    assert ended.stderr.count("\n") == 1


@pytest.mark.parametrize(
    "arguments",
    [
        [],
        ["frobnicate"],
        ["measure"],
        ["measure", "--light", "moon", "a.png"],
        ["measure", "--nope"],
    ],
)
def test_usage_faults_exit_2_and_print_no_data(
    arguments: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit) as left:
        run(arguments)
    assert left.value.code == ExitCode.USAGE
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("imgcover: ")


def test_a_group_of_commands_named_alone_answers_with_its_help(
    capsys: pytest.CaptureFixture[str],
) -> None:
    with pytest.raises(SystemExit) as left:
        run(["calibrate"])
    assert left.value.code == ExitCode.USAGE
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("Usage: imgcover calibrate")
    assert "Commands:" in err.splitlines()


def test_a_closed_pipe_is_no_error() -> None:
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "wb") as deaf:
        ended = subprocess.run([*PROGRAM, "--help"], stdout=deaf, stderr=subprocess.PIPE)
    assert ended.returncode == 0
    assert ended.stderr == b""


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
def test_a_full_disk_is_told() -> None:
    with Path("/dev/full").open("wb") as full:
        ended = subprocess.run([*PROGRAM, "--help"], stdout=full, stderr=subprocess.PIPE)
    assert ended.returncode == ExitCode.OUTPUT
    assert b"cannot be written" in ended.stderr


def test_the_gravest_code_speaks_for_all() -> None:
    codes = [ExitCode.CONFORMS, ExitCode.UNDECIDED, ExitCode.DOES_NOT_CONFORM]
    assert gravest(codes) is ExitCode.DOES_NOT_CONFORM
    for fault in (ExitCode.USAGE, ExitCode.OUTPUT, ExitCode.BUG):
        assert gravest([*codes, fault]) is fault
    assert gravest([ExitCode.CONFORMS, ExitCode.UNDECIDED]) is ExitCode.UNDECIDED
    assert gravest([]) is ExitCode.CONFORMS
