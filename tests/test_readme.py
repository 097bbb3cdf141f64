"""The README shows the program as it is: commands with their output, exit codes, findings.

Truth is the live program. When a difference is meant: `python tests/readme_pasting.py`.
"""

from __future__ import annotations

import re

import pytest
from readme_pasting import CONSOLE, README, TABLE, TABLES, told

TEXT = README.read_text("utf-8")
SHOWN = [(block["command"], block["shown"]) for block in CONSOLE.finditer(TEXT)]


def test_the_readme_shows_help_prediction_and_measurement() -> None:
    commands = {command.split()[1] for command, _ in SHOWN}
    assert {"--help", "measure", "predict"} <= commands


@pytest.mark.parametrize(("command", "shown"), SHOWN, ids=[command for command, _ in SHOWN])
def test_a_shown_command_tells_what_is_shown(command: str, shown: str) -> None:
    assert told(command) == shown


@pytest.mark.parametrize("name", TABLES)
def test_a_table_is_the_registrys(name: str) -> None:
    (shown,) = [block["shown"] for block in TABLE.finditer(TEXT) if block["name"] == name]
    assert shown == TABLES[name]()


def test_a_changed_table_would_be_seen() -> None:
    """The comparison above can fail: a planted word in the README is told apart."""
    for name, make in TABLES.items():
        planted = TEXT.replace(make(), make().replace("picture", "painting", 1))
        (shown,) = [block["shown"] for block in TABLE.finditer(planted) if block["name"] == name]
        assert (shown != make()) == ("picture" in make())


def test_both_one_line_commands_are_there_and_make_their_own_environment() -> None:
    for heading in ("Run it on the samples", "Run the tests"):
        found = re.search(
            rf"^## {heading}\n.*?```sh\n([^\n]+)\n```", TEXT, re.DOTALL | re.MULTILINE
        )
        assert found is not None
        assert found[1].startswith("python3 -m venv .venv && .venv/bin/pip install ")


def test_every_named_file_exists() -> None:
    root = README.parent
    for name in re.findall(r"`((?:samples-synthetic|calibration|tests|imgcover)/[\w./-]*)`", TEXT):
        assert (root / name).exists(), name
