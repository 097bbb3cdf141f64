"""Sweep of drawn pictures with and without rules: prints what is held of rule finding.

    python tests/scale/sweep_rule.py [WITH_RULE] [WITHOUT] [FIRST_SEED] [plain|harsh]

Truth is drawn, one seed a picture: `drawn_rules` (plain), or `harsh_rules` and `harsh_bare`, which
are drawn by other code. A drawn rule is exact but for its wandering print, so an error is held
against the uncertainty of the fit alone; the rule's class comes on top in what is reported.
"""

from __future__ import annotations

import sys
import time
from collections import defaultdict
from collections.abc import Iterator

import numpy as np
from drawn_rules import Held, bare_case, rule_case
from harsh_bare import harsh_bare
from harsh_rules import harsh_case

from imgcover.scale.rule import RuleReading, find_rules

Right = dict[str, list[tuple[float, float] | None]]
"""For each kind the relative errors and their ratios to u of the fit; None for a refusal."""


def say(line: str) -> None:
    """Write one line of the table."""
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def with_rule(
    count: int, first: int, *, harsh: bool
) -> Iterator[tuple[int, str, str, float | None, RuleReading | None, str]]:
    """Give seed, kind, what, error, reading and refusal of each picture with a rule."""
    for seed in range(first, first + count):
        if harsh:
            bad = harsh_case(seed)
            light, what, kind = bad.light, bad.what, bad.what.split(":")[0]
        else:
            case = rule_case(seed)
            light, what = case.light, case.what
            kind = next((k for k in ("tilted", "clear") if k in what), "+".join(case.divisions))
        search = find_rules(Held(light))
        if not search.readings:
            yield seed, kind, what, None, None, search.findings[0].message
            continue
        reading = search.readings[0]
        truth = bad.truth(reading.angle) if harsh else case.px_per_mm
        assert truth is not None
        yield seed, kind, what, reading.px_per_mm.value / truth - 1, reading, ""


def sweep(count: int, without: int, first: int, *, harsh: bool) -> None:
    """Measure them all and print the table."""
    table: Right = defaultdict(list)
    start = time.perf_counter()
    for seed, kind, what, wrong, reading, refusal in with_rule(count, first, harsh=harsh):
        if wrong is None or reading is None:
            table[kind].append(None)
            say(f"refused {seed:4d}  {what}: {refusal}")
            continue
        table[kind].append((wrong, wrong / reading.u_fit))
        if abs(wrong) > 0.001 or abs(wrong) > 3 * reading.u_fit:
            say(f"{100 * wrong:+.3f} % {seed:4d}  {what}, u {100 * reading.u_fit:.3f} %")
    alarms = 0
    for seed in range(first, first + without):
        bare = harsh_bare(seed) if harsh else bare_case(seed)
        found = find_rules(Held(bare.light))
        right = [
            bare.px_per_mm is not None and abs(each.px_per_mm.value / bare.px_per_mm - 1) < 0.003
            for each in found.readings
        ]
        if found.areas and not (right and all(right)):
            alarms += bool(found.readings)
            said = "TAKEN" if found.readings else "open"
            say(f"{said} {seed:4d}  {bare.what}: {[each.message for each in found.findings]}")
    say(f"{'kind':<16}{'n':>5}{'refused':>9}{'median':>11}{'worst':>11}{'> 0.3 %':>9}{'> 1 %':>7}")
    every = [each for errors in table.values() for each in errors]
    for kind, errors in {**dict(sorted(table.items())), "all": every}.items():
        read = np.abs([each[0] for each in errors if each is not None]) * 100
        shown = (
            f"{np.median(read):>9.4f} %{read.max():>9.4f} %"
            f"{(read > 0.3).sum():>9}{(read > 1).sum():>7}"
            if len(read)
            else ""
        )
        say(f"{kind:<16}{len(errors):>5}{len(errors) - len(read):>9}{shown}")
    ratios = np.abs([each[1] for each in every if each is not None])
    if len(ratios):
        quantiles = np.quantile(ratios, (0.5, 0.95, 1.0))
        say(
            f"within 2 u of the fit alone: {100 * (ratios <= 2).mean():.1f} %; |error| over it: "
            "median {:.2f}, 95th percentile {:.2f}, largest {:.1f}".format(*quantiles)
        )
    say(f"without a rule: {alarms} of {without} taken for one")
    say(
        f"{(time.perf_counter() - start) / max(1, count + without):.2f} s a picture, drawn and read"
    )


if __name__ == "__main__":
    words = sys.argv[1:]
    hard = "harsh" in words
    numbers = [int(each) for each in words if each.isdigit()]
    counts = numbers + [200, 50, 0][len(numbers) :]
    sweep(*counts, harsh=hard)
