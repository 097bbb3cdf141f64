"""A record told to a person: the decision first, then the numbers, then why, then what to do."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from imgcover.report.headline import headline, seen_in
from imgcover.report.layout import Units, brief, facts, figure, near, shown_as, table, wrapped
from imgcover.report.plain import plain

SUSPECTS_SHOWN = 3
"""Causes named in the text; the record holds them all."""


def record_text(record: Mapping[str, Any], *, units: Units) -> str:
    """Tell a picture's record.

    Parameters
    ----------
    record : mapping
        Schema imgcover/record/1.
    units : {"inch", "cm"}
        Of the densities; the record itself stays SI.

    Returns
    -------
    str
        Lines of at most 80 columns, ended by a newline.
    """
    lines = [headline(record, units=units), *_circumstances(record), ""]
    lines += _numbers(record, units)
    lines += _why(record["verdict"], units)
    lines += _diagnosis(record["verdict"])
    lines += findings_text(record["findings"])
    return "\n".join(lines).rstrip() + "\n"


def lot_text(record: Mapping[str, Any], *, units: Units) -> str:
    """Tell a lot's record, schema imgcover/lot/1, as `record_text` does a picture's."""
    places = f"{record['n_places']} of {record['required']} places"
    lines = [headline(record, units=units), f"  {places}", ""]
    lines += _judged(record["lines"], units) if record["lines"] else _bare(record, units)
    mean = weighed(record)
    lines += ["", *facts(mean)] if mean else []
    lines += _why(record, units)
    lines += _diagnosis(record)
    lines += findings_text(record["findings"])
    return "\n".join(lines).rstrip() + "\n"


def _circumstances(record: Mapping[str, Any]) -> list[str]:
    sample = record["sample"]
    said = [
        *(f"{key} {sample[key]}" for key in ("article", "lot", "piece", "place") if sample[key]),
        f"light {record['light'] or 'not stated'}",
        f"warp {record['warp']}",
    ]
    return wrapped(plain(", ".join(said)))


def _numbers(record: Mapping[str, Any], units: Units) -> list[str]:
    verdict = record["verdict"]
    lines = _judged(verdict["lines"], units) if verdict is not None else _bare(record, units)
    also = [*_counted(record["threads"], units), *_seen(record, units), *weighed(verdict)]
    return [*lines, "", *facts(also)] if also else lines


def _bare(record: Mapping[str, Any], units: Units) -> list[str]:
    """The measured figures alone, where nothing was declared."""
    seen = seen_in(record)
    return table([(key, figure(seen.get(key), units)) for key in ("ends", "picks", "cover")])


def _judged(judged: Sequence[Mapping[str, Any]], units: Units) -> list[str]:
    rows = [("", "measured", "held against", "limits", "decision")]
    for line in judged:
        how = shown_as(line["unit"], units)
        measured = None
        if line["measured"] is not None:
            measured = {"value": line["measured"], "u": line["u"], "unit": line["unit"]}
        rows.append(
            (
                line["quantity"],
                figure(measured, units),
                f"{brief(line['declared'] * how.factor)} {line['basis']}",
                _limits(line, how.factor),
                line["decision"],
            )
        )
    return table(rows)


def _limits(line: Mapping[str, Any], factor: float) -> str:
    lower, upper = (
        None if line[key] is None else brief(line[key] * factor) for key in ("lower", "upper")
    )
    if lower is None and upper is None:
        return "none"
    if lower is None:
        return f"up to {upper}"
    return f"from {lower}" if upper is None else f"{lower} to {upper}"


def _counted(threads: Mapping[str, Any] | None, units: Units) -> list[tuple[str, str]]:
    if threads is None:
        return []
    rows = []
    how = shown_as("1/cm", units)
    for one, many in (("end", "ends"), ("pick", "picks")):
        if threads[f"counted_{many}"] is None:
            continue
        length = threads[f"length_{many}_mm"]
        over = "" if length is None else f" over {length:.4g} mm"
        said = f"{threads[f'counted_{many}']:.2f}{over}, {threads[f'pixels_per_{one}']:.3g} px each"
        if threads[f"{many}_range"] is not None:
            low, high = (each * how.factor for each in threads[f"{many}_range"])
            said += f"; {low:.4g} to {high:.4g} {how.unit} over the field"
        rows.append((f"{many} counted", said))
    total = threads["tiles_used"] + threads["tiles_left_out"]
    rows.append(("field", f"{threads['tiles_used']} of {total} tiles counted"))
    return rows


def _seen(record: Mapping[str, Any], units: Units) -> list[tuple[str, str]]:
    rows = []
    cover, scale, predicted = record["cover"], record["scale"], record["predicted"]
    if cover is not None:
        witnesses = (("by its edge", "threshold"), ("by its light", "two_level"))
        said = [f"{figure(cover[key], units)} {how}" for how, key in witnesses if cover[key]]
        rows.append(("cover two ways", ", ".join(said)))
        systems = [f"{key} {figure(cover[key], units)}" for key in ("warp", "weft") if cover[key]]
        rows += [("each system's share", ", ".join(systems))] if systems else []
    if predicted is not None:
        said_model = f"{figure(predicted['cover'], units)} from the declared counts"
        rows.append(("cover expected", f"{said_model} ({predicted['model']})"))
    if scale is not None:
        x, y = (figure(scale[axis], units) for axis in "xy")
        rows.append(("scale", f"{x} across, {y} down"))
        rows.append(("scale from", plain(scale["source"])))
    return rows


def weighed(verdict: Mapping[str, Any] | None) -> list[tuple[str, str]]:
    """The mean count that mass and threads lead to, where there was a weighing."""
    mean = None if verdict is None else verdict.get("mean_count")
    if mean is None:
        return []
    said = (
        f"{figure(mean['tex'], 'cm')} = {figure(mean['ne'], 'cm')} by mass and threads, declared "
        f"{brief(mean['declared_tex'])} tex"
    )
    if mean["only_indicates"]:
        said += "; it only indicates, since size or the change in finishing was not declared"
    return [("mean count used", said)]


def _why(verdict: Mapping[str, Any] | None, units: Units) -> list[str]:
    """Reasons for every line that does not simply conform."""
    if verdict is None:
        return []
    said = [reason(line, units) for line in verdict["lines"] if line["decision"] != "conforms"]
    return (
        [
            "",
            "  Why",
            *(line for text in said for line in wrapped(plain(text), first="    ", then="      ")),
        ]
        if said
        else []
    )


def reason(line: Mapping[str, Any], units: Units) -> str:
    """Say why a line that does not simply conform ended as it did, in the shown units."""
    if line["measured"] is None:
        return str(line["reason"])
    return f"{line['quantity']}: {_because(line, units)}"


def _because(line: Mapping[str, Any], units: Units) -> str:
    how = shown_as(line["unit"], units)
    if line["holds"]:
        return "left undecided: " + "; ".join(line["holds"])
    if line["guard"] is None:
        return f"no tolerance declared; write [tolerance] {line['quantity']}"
    guard = f"{near(line['guard'] * how.factor, line['u'] * how.factor)} {how.unit}"
    if line["decision"] == "does not conform":
        return f"outside its limits by more than the guard band of {guard}"
    crossed = (
        line["accept_lower"] is not None
        and line["accept_upper"] is not None
        and line["accept_lower"] >= line["accept_upper"]
    )
    if crossed:
        return f"the limits lie closer together than the guard bands of {guard} can tell apart"
    return f"closer to a limit than the guard band of {guard}: it cannot be proved either way"


def _diagnosis(verdict: Mapping[str, Any] | None) -> list[str]:
    if verdict is None or not verdict.get("diagnosis"):
        return []
    lines = ["", "  What this indicates (it does not prove)"]
    for suspect in verdict["diagnosis"][:SUSPECTS_SHOWN]:
        lines += wrapped(
            plain(f"{suspect['weight']:.0%}  {suspect['cause']}"), first="    ", then="         "
        )
        for word, key in (("for", "for"), ("against", "against")):
            lines += [
                each
                for text in suspect[key]
                for each in wrapped(plain(f"{word}: {text}"), first="         ", then="           ")
            ]
        if suspect.get("tied_with"):
            tied = plain(f"not to be told from: {'; '.join(suspect['tied_with'])}")
            lines += wrapped(tied, first="         ", then="           ")
        lines += wrapped(
            plain(f"to settle it: {suspect['settle']}"), first="         ", then="           "
        )
    return lines


def findings_text(findings: Sequence[Mapping[str, str]]) -> list[str]:
    """Tell what was noticed, as the last lines of any report."""
    if not findings:
        return []
    lines = ["", "  Findings"]
    for each in findings:
        text = f"{each['severity']} {each['code']}: {each['message']}. To do: {each['remedy']}."
        lines += wrapped(plain(text), first="    ", then="      ")
    return lines


__all__ = ["findings_text", "lot_text", "reason", "record_text", "weighed"]
