"""Where words go: data to stdout or beside-and-rename into a file, talk to stderr."""

from __future__ import annotations

import contextlib
import io
import os
import shutil
import sys
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path

from imgcover.errors import OptionError, OutputError
from imgcover.report.plain import plain

Write = Callable[[str], None]
SQLITE = b"SQLite format 3\0"
"""How every SQLite file begins (sqlite.org/fileformat2.html, section 1.3)."""


def tell(line: str) -> None:
    """Say one line on stderr; names from outside cannot steer the terminal."""
    if sys.stderr is None:
        return
    with contextlib.suppress(OSError, ValueError):
        # nobody listens to stderr: the exit code still tells
        encoding = sys.stderr.encoding or "ascii"
        sys.stderr.write(plain(line).encode(encoding, "replace").decode(encoding) + "\n")
        sys.stderr.flush()


@contextlib.contextmanager
def opened(output: Path | None, *, encoding: str | None = "utf-8") -> Iterator[Write]:
    """Open where a command's data goes: stdout, or a file that appears whole or not at all.

    Parameters
    ----------
    output : Path or None
        The file; None is stdout.
    encoding : str or None
        Of what is written to stdout; None keeps the terminal's own.

    Yields
    ------
    callable
        Takes text and writes it. A reader who closed the pipe is no error: the rest is dropped.

    Raises
    ------
    OutputError
        When it cannot be opened, written or put in its place.
    """
    if output is None:
        yield _stdout(encoding)
        return
    place = output.resolve()
    _refuse_ledger(place, output)
    # a device or pipe named as output is written to; renaming over it would destroy it
    beside = place.exists() and not place.is_file()
    path = place if beside else place.with_name(f".{place.name}.{os.getpid()}.part")
    try:
        file = path.open("w", encoding="utf-8", newline="")
    except OSError as fault:
        raise _unwritten(str(output), fault) from fault
    try:
        with file:
            yield _guarded(file, str(output))
            file.flush()
            if not beside:
                os.fsync(file.fileno())
        if not beside:
            if place.exists():
                shutil.copymode(place, path)
            path.replace(place)
    except OSError as fault:
        raise _unwritten(str(output), fault) from fault
    finally:
        if not beside:
            path.unlink(missing_ok=True)


def finish() -> None:
    """Flush stdout, so that a full disk is told and a closed pipe is not.

    Raises
    ------
    OutputError
        When what was written cannot reach its place.
    """
    if sys.stdout is None:
        return
    try:
        sys.stdout.flush()
    except BrokenPipeError:
        silence()
    except OSError as fault:
        silence()
        raise _unwritten("stdout", fault) from fault


def silence() -> None:
    """Send what is still to come on stdout nowhere: the interpreter flushes once more at exit."""
    with contextlib.suppress(OSError, ValueError, AttributeError):
        # stdout without a file of its own behind it has nothing left to flush
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
        os.close(nowhere)


def keep_apart(option: str, output: Path | None, inputs: Iterable[Path]) -> None:
    """Refuse to write over a file that is read from, before anything is done.

    Raises
    ------
    OptionError
        When `output` is one of `inputs`.
    """
    if output is not None and output.resolve() in {path.resolve() for path in inputs}:
        raise OptionError(option, f"{output} is also read from", "write to another file")


def _refuse_ledger(place: Path, output: Path) -> None:
    """Nothing is ever written over a ledger: it is the proof, and there is no other copy."""
    with contextlib.suppress(OSError):
        if place.is_file():
            with place.open("rb") as file:
                if file.read(len(SQLITE)) == SQLITE:
                    raise OutputError(str(output), "it is a ledger", "write to another file")


def _stdout(encoding: str | None) -> Write:
    if sys.stdout is None:
        raise OutputError("stdout", "it is closed", "redirect it, or write with -o FILE")
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(encoding=encoding or sys.stdout.encoding, errors="replace")

    def write(text: str) -> None:
        try:
            sys.stdout.write(text)
            sys.stdout.flush()
        except BrokenPipeError:
            silence()
        except OSError as fault:
            silence()
            raise _unwritten("stdout", fault) from fault

    return write


def _guarded(file: io.TextIOWrapper, name: str) -> Write:
    def write(text: str) -> None:
        try:
            file.write(text)
        except OSError as fault:
            raise _unwritten(name, fault) from fault

    return write


def _unwritten(name: str, fault: OSError) -> OutputError:
    reason = fault.strerror or type(fault).__name__
    return OutputError(name, f"cannot be written ({reason})", "choose another place, or make room")


__all__ = ["Write", "finish", "keep_apart", "opened", "silence", "tell"]
