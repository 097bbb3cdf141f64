"""Sweep of drawn pictures with and without rules: prints what is held of rule finding.

    python tests/scale/sweep_rule.py [WITH_RULE] [WITHOUT] [FIRST_SEED]

Truth is drawn: `drawn_rules.rule_case` and `bare_case`, one seed a picture.
"""

from __future__ import annotations

import sys
import time
from collections import defaultdict

import numpy as np
from drawn_rules import Held, bare_case, rule_case

from imgcover.scale.rule import RuleSearch, find_rules


def say(line: str) -> None:
    """Write one line of the table."""
    sys.stdout.write(line + "\n")


def error(found: RuleSearch, truth: float) -> float | None:
    """Return the relative error of the first reading, or None where it was refused."""
    return found.readings[0].px_per_mm.value / truth - 1 if found.readings else None


def sweep(with_rule: int, without: int, first: int) -> None:
    """Measure them all and print the table."""
    table: dict[str, list[float | None]] = defaultdict(list)
    inside = taken = 0.0
    for seed in range(first, first + with_rule):
        case = rule_case(seed)
        start = time.perf_counter()
        found = find_rules(Held(case.light))
        taken += time.perf_counter() - start
        assert case.px_per_mm is not None
        wrong = error(found, case.px_per_mm)
        kind = next((k for k in ("tilted", "clear") if k in case.what), "+".join(case.divisions))
        table[kind].append(wrong)
        if wrong is None:
            say(f"refused {seed:4d}  {case.what}: {found.findings[0].message}")
        else:
            reading = found.readings[0]
            inside += abs(wrong) <= 2 * reading.px_per_mm.u / reading.px_per_mm.value
            if abs(wrong) > 0.001:
                say(f"{100 * wrong:+.3f} % {seed:4d}  {case.what}")
    alarms = 0
    for seed in range(first, first + without):
        case = bare_case(seed)
        start = time.perf_counter()
        found = find_rules(Held(case.light))
        taken += time.perf_counter() - start
        if found.readings or found.areas:
            alarms += 1
            say(f"FOUND {seed:4d}  {case.what}: {found.findings or found.readings}")
    say(f"{'kind':<18}{'n':>5}{'refused':>9}{'median':>11}{'worst':>11}{'> 0.3 %':>9}{'> 1 %':>7}")
    table = {**dict(sorted(table.items())), "all": [e for es in table.values() for e in es]}
    for kind, errors in table.items():
        read = np.abs([each for each in errors if each is not None]) * 100
        shown = (
            f"{np.median(read):>9.4f} %{read.max():>9.4f} %"
            f"{(read > 0.3).sum():>9}{(read > 1).sum():>7}"
            if len(read)
            else ""
        )
        say(f"{kind:<18}{len(errors):>5}{len(errors) - len(read):>9}{shown}")
    say(f"within 2 u: {inside:.0f}; without a rule: {alarms} of {without} taken for one")
    say(f"{taken / max(1, with_rule + without):.2f} s a picture")


if __name__ == "__main__":
    numbers = [int(each) for each in sys.argv[1:]]
    sweep(*(numbers + [200, 50, 0][len(numbers) :]))
