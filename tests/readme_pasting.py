"""What the README shows of the program, made from the program: run this to paste it anew.

    python tests/readme_pasting.py

Blocks that begin with `$ imgcover` hold a command and what it tells; blocks between
`<!-- exits -->` or `<!-- findings -->` and the next blank comment hold a table of the registry.
"""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
import tempfile
from pathlib import Path

from imgcover.cli.exits import MEANING, ExitCode
from imgcover.findings import Flag

ROOT = Path(__file__).resolve().parent.parent
README = ROOT / "README.md"
CONSOLE = re.compile(r"```console\n\$ (?P<command>imgcover[^\n]*)\n(?P<shown>.*?)```", re.DOTALL)
TABLE = re.compile(r"<!-- (?P<name>\w+) -->\n(?P<shown>.*?)<!-- -->", re.DOTALL)
FAULTS = {ExitCode.USAGE, ExitCode.BUG, ExitCode.OUTPUT}
"""No README shows a command that ends so: what it said then is not to be pasted."""


def told(command: str) -> str:
    """Run a command of the README in the project's folder and give what it says on stdout."""
    environment = {**os.environ, "COLUMNS": "80", "PYTHONPATH": str(ROOT), "PYTHONUTF8": "1"}
    arguments = [
        each
        for word in shlex.split(command)[1:]
        for each in (
            [str(path.relative_to(ROOT)) for path in sorted(ROOT.glob(word))]
            if "*" in word
            else [word]
        )
    ]
    with tempfile.TemporaryDirectory() as place:
        # some commands write beside them, and the project's folder is no place for that
        for each in ("samples-synthetic", "calibration"):
            (Path(place) / each).symlink_to(ROOT / each)
        ended = subprocess.run(
            [sys.executable, "-m", "imgcover", *arguments],
            cwd=place,
            env=environment,
            capture_output=True,
            text=True,
            encoding="utf-8",
        )
    if ended.returncode in FAULTS:
        raise RuntimeError(f"{command}: exit {ended.returncode}: {ended.stderr}")
    return ended.stdout


def exits() -> str:
    """The table of exit codes."""
    rows = [f"| {code.value} | {meaning} |" for code, meaning in MEANING.items()]
    return "\n".join(["| exit | means |", "|---|---|", *rows]) + "\n"


def findings() -> str:
    """The table of everything a record can say beside its numbers."""
    rows = [f"| `{f.code}` | {f.severity} | {f.message} | {f.remedy} |" for f in Flag]
    return "\n".join(["| code | weighs | says | to do |", "|---|---|---|---|", *rows]) + "\n"


TABLES = {"exits": exits, "findings": findings}


def pasted_anew(text: str) -> str:
    """Give the README with every block made from the program."""
    text = CONSOLE.sub(
        lambda block: f"```console\n$ {block['command']}\n{told(block['command'])}```", text
    )
    return TABLE.sub(
        lambda block: f"<!-- {block['name']} -->\n{TABLES[block['name']]()}<!-- -->", text
    )


if __name__ == "__main__":
    README.write_text(pasted_anew(README.read_text("utf-8")), "utf-8")
