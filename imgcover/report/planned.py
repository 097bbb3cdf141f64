"""A plan told to a person: what can be told, over which field, at how many places, what to do."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from imgcover.report.layout import CM_PER_INCH, Units, facts, figure, shown_as, table, wrapped
from imgcover.report.plain import plain, shortened
from imgcover.report.text import findings_text


def planned_text(record: Mapping[str, Any], *, units: Units) -> str:
    """Tell a plan in at most 80 columns.

    Parameters
    ----------
    record : mapping
        Schema imgcover/plan/1.
    units : {"inch", "cm"}
        Of the densities.
    """
    article = record["article"]
    code = shortened(plain(article["code"]), 24)
    lines = [f"{code}: {_headline(record)}"]
    lines += wrapped(
        plain(", ".join(each for each in (article["description"], article["weave"]) if each))
    )
    lines += ["", *table([("", "ends", "picks"), *_threads_rows(record, units)])]
    lines += ["", *facts(_whole_rows(record))]
    for heading, key in (("To do", "to_do"), ("Assumed", "assumed")):
        if record[key]:
            lines += ["", f"  {heading}", *_listed(record[key])]
    lines += findings_text(record["findings"])
    return "\n".join(lines).rstrip() + "\n"


def _headline(record: Mapping[str, Any]) -> str:
    told = [name for name in ("ends", "picks") if record[name]["told"]]
    threads = f"{' and '.join(told)} can be told" if told else "neither ends nor picks can be told"
    cover = record["cover"]
    if not cover["told"]:
        return f"{threads}, cover cannot" if told else threads
    return f"{threads}, cover to ± {100 * cover['u_reading']:.2g} points"


def _threads_rows(record: Mapping[str, Any], units: Units) -> list[tuple[str, ...]]:
    how = shown_as("1/cm", units)
    both = (record["ends"], record["picks"])

    def row(name: str, cells: Sequence[str | None]) -> tuple[str, ...]:
        return (name, *(cell or "–" for cell in cells))

    return [
        row("declared", [f"{each['per_cm'] * how.factor:.4g} {how.unit}" for each in both]),
        row("pixels a thread", [f"{each['pixels']:.3g}, {each['standing']}" for each in both]),
        row("drawn and read", [_read(each) for each in both]),
        row("tolerance", [_percent(each["tolerance"]) for each in both]),
        row("shortest, ISO 7211-2", [_mm(each["standard_mm"]) for each in both]),
        row("shortest for tolerance", [_mm(each["needed_mm"]) for each in both]),
        row("count over", [_mm(each["field_mm"]) for each in both]),
        row("u of that, with scale", [_percent(each["u"]) for each in both]),
        row("guard band", [_guard(each) for each in both]),
        row("places of a lot", [_places(each) for each in both]),
    ]


def _read(system: Mapping[str, Any]) -> str | None:
    if system["off"] is None:
        return None
    return f"{'right' if system['told'] else 'wrong'}, {100 * system['off']:.2f} % off"


def _percent(share: float | None) -> str | None:
    return None if share is None else f"{100 * share:.2g} %"


def _mm(length: float | None) -> str | None:
    return None if length is None else f"{length:.0f} mm"


def _guard(system: Mapping[str, Any]) -> str | None:
    if system["guard"] is None:
        return None
    if system["tolerance"] is None:
        return _percent(system["guard"])
    spent = system["guard"] / system["tolerance"] if system["tolerance"] else float("inf")
    return f"{100 * system['guard']:.2g} %, {100 * spent:.0f} % of tolerance"


def _places(system: Mapping[str, Any]) -> str | None:
    if system["field_mm"] is None:
        return None
    return "none will do" if system["places"] is None else str(system["places"])


def _whole_rows(record: Mapping[str, Any]) -> list[tuple[str, str]]:
    device, needed, cover = record["device"], record["resolution"], record["cover"]
    x, y = (figure(device[axis], "cm") for axis in "xy")
    dpi = 10 * CM_PER_INCH * min(device[axis]["value"] for axis in "xy")
    usual = "" if needed["usual_dpi"] is None else f"; {needed['usual_dpi']}dpi is usual"
    said = [
        ("scale", f"{x} across, {y} down ({device['scale_from']}, {dpi:.0f}dpi)"),
        (
            "resolution needed",
            f"{needed['least_dpi']:.0f}dpi to be counted, {needed['unflagged_dpi']:.0f} without a "
            f"flag, {needed['comfortable_dpi']:.0f} in comfort{usual}; detail ends at "
            f"{needed['detail_dpi']:.0f}dpi",
        ),
        ("cover expected", f"{figure(cover['expected'], 'cm')} from the declared counts"),
    ]
    if cover["off"] is not None:
        said.append(
            ("cover, drawn and read", f"{100 * cover['off']:.2g} points off at most"),
        )
    if cover["guard"] is not None and cover["tolerance"] is not None:
        said.append(
            (
                "cover, judged",
                f"guard band {100 * cover['guard']:.2g} points of the tolerance of "
                f"{100 * cover['tolerance']:.2g}, against the {_BASIS[cover['basis']]}",
            )
        )
    return said


_BASIS = {
    "declared": "declared cover",
    "reference": "approved swatch",
    "model": "model",
}


def _listed(texts: Sequence[str]) -> list[str]:
    return [line for text in texts for line in wrapped(plain(text), first="    ", then="      ")]


__all__ = ["planned_text"]
