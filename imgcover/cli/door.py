"""From arguments to an exit code: every way a command can end, in one place."""

from __future__ import annotations

import errno
import os
import sys
import traceback
from collections.abc import Sequence

import typer

from imgcover.cli.exits import ExitCode
from imgcover.cli.output import finish, silence, tell
from imgcover.errors import ImgcoverError, LedgerError, OutputError

NO_ROOM = frozenset({errno.ENOSPC, errno.EDQUOT, errno.EIO, errno.EROFS, errno.EFBIG})
"""What a disk says when it cannot take what is written: no fault of ours."""


def outcome(arguments: Sequence[str]) -> int:
    """Run the command that the arguments name and say how it ended.

    Parameters
    ----------
    arguments : sequence of str
        What follows `imgcover` on the command line.

    Returns
    -------
    int
        A value of `ExitCode`; faults have been told on stderr in one line.
    """
    try:
        from imgcover.cli.app import assembled

        command = typer.main.get_command(assembled())
        code = command.main(list(arguments), prog_name="imgcover", standalone_mode=False)
        finish()
        if code == ExitCode.INTERRUPTED:  # typer makes a return value of Ctrl-C
            raise KeyboardInterrupt
        return int(code or ExitCode.CONFORMS)
    except typer.TyperException as refused:
        message = refused.format_message()
        if "\n" in message:  # a group of commands named alone answers with its help
            for line in message.splitlines():
                tell(line)
            return int(ExitCode.USAGE)
        return _told(f"{message} (imgcover --help)", ExitCode.USAGE)
    except ImgcoverError as fault:
        _trace()
        unwritten = isinstance(fault, OutputError | LedgerError)
        return _told(str(fault), ExitCode.OUTPUT if unwritten else ExitCode.USAGE)
    except (KeyboardInterrupt, typer.Abort):
        return _told("interrupted", ExitCode.INTERRUPTED)
    except SystemExit as left:
        # typer leaves with 1 when help meets a closed pipe; nobody is there to read, no fault
        return int(ExitCode.CONFORMS if isinstance(left.__context__, OSError) else ExitCode.BUG)
    except OSError as fault:
        _trace()
        silence()
        full = fault.errno in NO_ROOM
        said = (
            f"stdout: cannot be written ({fault.strerror})"
            if full
            else f"internal fault: OSError: {fault}"
        )
        return _told(said, ExitCode.OUTPUT if full else ExitCode.BUG)
    except Exception as bug:
        _trace()
        said = f"internal fault: {type(bug).__name__}: {bug} (IMGCOVER_DEBUG=1 shows where)"
        return _told(said, ExitCode.BUG)


def _told(line: str, code: ExitCode) -> int:
    tell(f"imgcover: {line}")
    return int(code)


def _trace() -> None:
    if os.environ.get("IMGCOVER_DEBUG") and sys.stderr is not None:
        traceback.print_exc()


__all__ = ["outcome"]
