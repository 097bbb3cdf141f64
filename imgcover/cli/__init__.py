"""The command line's outer door: what a crash, a closed pipe or Ctrl-C says to the shell.

Python exits 1 on a crash, an import error and a closed pipe, and 1 here means "does not conform".
So everything, the import of the commands included, happens inside `run`.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence


def run(arguments: Sequence[str] | None = None) -> None:
    """Run the command line and leave with its exit code.

    Parameters
    ----------
    arguments : sequence of str, optional
        What follows `imgcover`; the process's own arguments when not given.

    Raises
    ------
    SystemExit
        Always, with a code of `imgcover.cli.exits.ExitCode`.
    """
    try:
        from imgcover.cli.door import outcome

        code = outcome(sys.argv[1:] if arguments is None else arguments)
    except KeyboardInterrupt:
        code = 130
    except BaseException as fault:  # the door itself could not be imported, or broke
        _tell(f"imgcover: internal fault: {type(fault).__name__}: {fault}")
        code = 70
    sys.exit(code)


def _tell(line: str) -> None:
    if sys.stderr is not None:
        sys.stderr.write(line + "\n")


__all__ = ["run"]
