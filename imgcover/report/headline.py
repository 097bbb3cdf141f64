"""The inspector's question, answered in one line: is this the cloth on the paper?"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from imgcover.report.layout import WIDTH, Units, brief, near, shown_as
from imgcover.report.plain import columns, plain, shortened

LONGEST_NAME = 30
"""Columns a picture's or lot's name may take of the first line."""
LONGEST_WORD = 20
"""Letters; a line that is longer without a space is not written in words."""
MISSING = " not judged: "
"""What the verdict writes between a quantity without a value and the reason."""
Short = Callable[[Mapping[str, Any], Units], str]
NAMES = {"ends": "ends", "picks": "picks", "cover": "cover", "mass": "mass"}


def headline(record: Mapping[str, Any], *, units: Units, most: int = WIDTH) -> str:
    """Say the decision and what it rests on, within one line.

    Parameters
    ----------
    record : mapping
        A picture's record, or a lot's.
    units : {"inch", "cm"}
        Of the densities.
    most : int
        Columns of the line; a terminal's where nothing is said.
    """
    name = shortened(plain(_name(record)), LONGEST_NAME)
    for short in (_short, _shorter):
        decision, why = _decided(record, units, short)
        for each in (*_common_reason(record), why):
            line = f"{name} {decision}: {each}"
            if columns(line) <= most:
                return line
    return _cut(line, most)


def _common_reason(record: Mapping[str, Any]) -> list[str]:
    """What alone keeps everything open that is open, whatever the figures say."""
    verdict = record["verdict"] if "picture" in record else record
    if verdict is None or verdict.get("decision") != "undecided":
        return []
    held = {tuple(line["holds"]) for line in verdict["lines"] if line["decision"] == "undecided"}
    return ["; ".join(each) for each in held if each and len(held) == 1]


def _cut(line: str, most: int) -> str:
    """Cut a line before the word that would leave the terminal."""
    kept = line
    while columns(kept) > most - 1:
        kept = kept[:-1]
    whole, _, torn = kept.rpartition(" ")
    return (whole if len(torn) <= LONGEST_WORD else kept).rstrip(" ,;:") + "…"


def _name(record: Mapping[str, Any]) -> str:
    if "picture" in record:
        return str(record["picture"]["name"])
    return f"lot {record['lot']}"


def _decided(record: Mapping[str, Any], units: Units, short: Short) -> tuple[str, str]:
    verdict = record["verdict"] if "picture" in record else record
    if verdict is None or verdict.get("decision") is None:
        return _measured(record, units)
    if verdict["decision"] != "conforms" and _nothing_measured(record):
        return "undecided", _refusal(record)
    lines: Sequence[Mapping[str, Any]] = verdict["lines"]
    deciding = [line for line in lines if line["decision"] == verdict["decision"]]
    if verdict["decision"] == "conforms":
        return "conforms", f"{_listed([NAMES[line['quantity']] for line in lines])} as declared"
    if deciding and all(line["measured"] is None for line in deciding):
        missing = dict.fromkeys(line["reason"].partition(MISSING)[2] for line in deciding)
        return str(verdict["decision"]), "; ".join(missing)
    said = [short(line, units) for line in deciding]
    return str(verdict["decision"]), "; ".join(said) or "nothing could be judged"


def _nothing_measured(record: Mapping[str, Any]) -> bool:
    return "picture" in record and record["threads"] is None and record["cover"] is None


def _measured(record: Mapping[str, Any], units: Units) -> tuple[str, str]:
    """What was seen, where nothing was declared to hold it against."""
    seen = seen_in(record)
    parts = [f"{_density(seen[key], units)} {key}" for key in ("ends", "picks") if seen.get(key)]
    said = " × ".join(parts) + (f" {shown_as('1/cm', units).unit}" if parts else "")
    cover = seen.get("cover")
    if cover is not None:
        percent = near(100 * cover["value"], 100 * cover["u"])
        said = f"{said}, cover {percent} %" if said else f"cover {percent} %"
    return ("measured", said) if said else ("not measured", _refusal(record))


def seen_in(record: Mapping[str, Any]) -> Mapping[str, Any]:
    """The figures of a picture, or the means of a lot, by quantity."""
    if "picture" not in record:
        means: Mapping[str, Any] = record["means"]
        return means
    threads, cover = record["threads"] or {}, record["cover"] or {}
    return {**{key: threads.get(key) for key in ("ends", "picks")}, "cover": cover.get("optical")}


def _density(value: Mapping[str, Any], units: Units) -> str:
    factor = shown_as("1/cm", units).factor
    return near(value["value"] * factor, value["u"] * factor)


def _refusal(record: Mapping[str, Any]) -> str:
    findings: Sequence[Mapping[str, str]] = record["findings"]
    refused = [each["message"] for each in findings if each["severity"] == "refusal"]
    return plain(refused[0]) if refused else "neither ends nor picks could be read"


def _short(line: Mapping[str, Any], units: Units) -> str:
    """One judged figure in a few words."""
    name = NAMES[line["quantity"]]
    how = shown_as(line["unit"], units)
    if line["measured"] is None:
        return f"{name} not measured"
    seen = f"{name} {near(line['measured'] * how.factor, line['u'] * how.factor)} {how.unit}"
    against = f"{line['basis']} {brief(line['declared'] * how.factor)}"
    if line["decision"] == "does not conform":
        return f"{seen}, {against}"
    if line["holds"]:
        return f"{seen}, held open"
    if line["lower"] is None and line["upper"] is None:
        return f"{seen}, {against}, no tolerance declared"
    return f"{seen} too near its limits to prove"


def _shorter(line: Mapping[str, Any], units: Units) -> str:
    """The same in fewer words, for several at once."""
    name, how = NAMES[line["quantity"]], shown_as(line["unit"], units)
    if line["measured"] is None:
        return f"no {name}"
    seen = near(line["measured"] * how.factor, line["u"] * how.factor)
    if line["decision"] == "does not conform":
        return f"{name} {seen} not {brief(line['declared'] * how.factor)} {how.unit}"
    return f"{name} {seen} {how.unit} open"


def _listed(names: Sequence[str]) -> str:
    if len(names) == 1:
        return names[0]
    return f"{', '.join(names[:-1])} and {names[-1]}"


__all__ = ["headline", "seen_in"]
