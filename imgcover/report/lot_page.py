"""The page of one lot: what an inspector files, signs and sends to the supplier."""

from __future__ import annotations

import base64
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from imgcover.report.glance import Glance, Note
from imgcover.report.headline import headline
from imgcover.report.layout import Units, figure, near, shown_as
from imgcover.report.pages import decision_class, limits_text, page, said_decision
from imgcover.report.plain import plain
from imgcover.report.plot import Panel, Point, places_drawing
from imgcover.report.text import reason, weighed

MOST_THUMBNAILS = 40
"""Small pictures on one page; the first that need looking at, then the first of the others."""
SUSPECTS_SHOWN = 5
LONGEST_LEAD = 240
"""Letters of the first sentence: three lines of the page, room for every figure of a lot."""
QUANTITIES = {"ends": "Ends", "picks": "Picks", "cover": "Cover", "mass": "Mass"}


@dataclass(frozen=True, slots=True, kw_only=True)
class About:
    """What stands round the numbers on every page of a report.

    Parameters
    ----------
    units : {"inch", "cm"}
        Of densities.
    head : str
        Of the ledger, as `imgcover.ledger.chain.Head` writes it.
    made_at : str
        When the report was made, UTC.
    versions : mapping of str to str
        Of the program and its libraries.
    description : str
        Of the article; empty where nothing was declared.
    article_sha256 : str
        Of the declaration; empty where nothing was declared.
    unread : str
        Name of a declaration that could not be read; else empty.
    """

    units: Units
    head: str
    made_at: str
    versions: Mapping[str, str]
    description: str = ""
    article_sha256: str = ""
    unread: str = ""


def lot_page(lot: Mapping[str, Any], glances: Sequence[Glance], *, about: About) -> str:
    """Write a lot's page, whole in itself: styles, drawing and pictures are inside.

    Parameters
    ----------
    lot : mapping
        Schema imgcover/lot/1.
    glances : sequence of Glance
        Its pictures in order, numbered by the lot's places.
    about : About

    Returns
    -------
    str
        HTML.
    """
    shown = _worth_showing(glances)
    return page(
        "lot.html.j2",
        lot=lot,
        title=f"Lot {plain(str(lot['lot']))}",
        article=plain(str(lot["article"] or "")),
        description=plain(about.description),
        unread=plain(about.unread),
        headline=headline(lot, units=about.units, most=LONGEST_LEAD),
        decision=said_decision(lot["decision"]),
        tone=decision_class(lot["decision"]),
        lines=[_line(line, lot, about.units) for line in lot["lines"]],
        bare=[] if lot["lines"] else _bare(lot, about.units),
        reasons=[
            plain(reason(line, about.units))
            for line in lot["lines"]
            if line["decision"] != "conforms"
        ],
        weighed=[f"{name}: {said}" for name, said in weighed(lot)],
        suspects=[_suspect(each) for each in lot["diagnosis"][:SUSPECTS_SHOWN]],
        drawing=_drawing(lot, about.units),
        rows=[_row(each, about.units) for each in glances],
        thumbnails=[_thumbnail(each) for each in shown],
        thumbnails_left_out=sum(map(_is_drawn, glances)) - len(shown),
        findings=_gathered(lot, glances),
        scales=sorted({plain(each.scale) for each in glances if each.scale}),
        lights=sorted({each.light or "not stated" for each in glances}),
        about=about,
        density_unit=shown_as("1/cm", about.units).unit,
    )


def _line(line: Mapping[str, Any], lot: Mapping[str, Any], units: Units) -> dict[str, str]:
    how = shown_as(line["unit"], units)
    u = None if line["u"] is None else line["u"] * how.factor
    measured = None
    if line["measured"] is not None:
        measured = {"value": line["measured"], "u": line["u"], "unit": line["unit"]}
    mean = lot["means"].get(line["quantity"])
    scatter = None if mean is None else mean["scatter"]
    return {
        "name": QUANTITIES[line["quantity"]],
        "unit": how.unit,
        "declared": near(line["declared"] * how.factor, u),
        "basis": line["basis"],
        "limits": limits_text(line["lower"], line["upper"], how.factor, u),
        "accepts": _accepted(line, how.factor, u),
        "measured": figure(measured, units).removesuffix(f" {how.unit}"),
        "n": str(line["n"]),
        "scatter": "–" if scatter is None else near(scatter * how.factor, u),
        "decision": said_decision(line["decision"]),
        "tone": decision_class(line["decision"]),
    }


def _accepted(line: Mapping[str, Any], factor: float, u: float | None) -> str:
    """What the guard band leaves of the limits; nothing where it is as wide as they are."""
    lower, upper = line["accept_lower"], line["accept_upper"]
    if lower is not None and upper is not None and lower >= upper:
        return "nothing left"
    return limits_text(lower, upper, factor, u)


def _bare(lot: Mapping[str, Any], units: Units) -> list[tuple[str, str, str]]:
    """The means alone, where nothing was declared."""
    return [
        (QUANTITIES[quantity], figure(mean, units), str(mean["n"]))
        for quantity, mean in lot["means"].items()
    ]


def _suspect(suspect: Mapping[str, Any]) -> dict[str, Any]:
    return {
        "cause": plain(suspect["cause"]),
        "weight": f"{suspect['weight']:.0%}",
        "speaks_for": [plain(each) for each in suspect["for"]],
        "speaks_against": [plain(each) for each in suspect["against"]],
        "settle": plain(suspect["settle"]),
        "tied_with": [plain(each) for each in suspect["tied_with"]],
    }


def _drawing(lot: Mapping[str, Any], units: Units) -> str:
    """Draw the quantities that were measured at one place at least; empty where none was."""
    panels = [
        _panel(quantity, lot, units)
        for quantity in QUANTITIES
        if any(place[quantity] is not None for place in lot["places"])
    ]
    return places_drawing(panels, places=len(lot["places"])) if panels else ""


def _panel(quantity: str, lot: Mapping[str, Any], units: Units) -> Panel:
    line = next((each for each in lot["lines"] if each["quantity"] == quantity), None)
    places = [(n, place[quantity]) for n, place in enumerate(lot["places"], start=1)]
    how = shown_as(next(value["unit"] for _, value in places if value is not None), units)
    mean = lot["means"].get(quantity)
    held = {} if line is None else line
    scaled = {
        key: held[key] * how.factor if held.get(key) is not None else None
        for key in ("declared", "lower", "upper", "accept_lower", "accept_upper")
    }
    return Panel(
        title=QUANTITIES[quantity],
        unit=how.unit,
        points=tuple(
            Point(n, value["value"] * how.factor, value["u"] * how.factor)
            for n, value in places
            if value is not None
        ),
        mean=None if mean is None else mean["value"] * how.factor,
        mean_u=None if mean is None else mean["u"] * how.factor,
        **scaled,
    )


def _row(each: Glance, units: Units) -> dict[str, Any]:
    return {
        "number": "–" if each.number is None else str(each.number),
        "name": plain(each.name),
        "place": plain(", ".join(filter(None, (each.piece, each.place)))),
        "remarks": plain(each.remarks),
        "light": each.light or "not stated",
        "ends": figure(each.ends, units),
        "picks": figure(each.picks, units),
        "cover": figure(each.cover, units),
        "codes": sorted({note.code for note in each.notes if note.severity != "info"}),
        "row": "" if each.row is None else str(each.row),
    }


def _worth_showing(glances: Sequence[Glance]) -> list[Glance]:
    """Choose the pictures to show small, in the lot's order."""
    drawn = [each for each in glances if _is_drawn(each)]
    urgent = [each for each in drawn if each.decision != "conforms" or not each.measured]
    calm = [each for each in drawn if each.decision == "conforms" and each.measured]
    chosen = {id(each) for each in (urgent + calm)[:MOST_THUMBNAILS]}
    return [each for each in drawn if id(each) in chosen]


def _is_drawn(each: Glance) -> bool:
    return each.thumbnail is not None and each.thumbnail.is_file()


def _thumbnail(each: Glance) -> dict[str, str]:
    content = b"" if each.thumbnail is None else each.thumbnail.read_bytes()
    kind = "png" if content.startswith(b"\x89PNG") else "jpeg"
    return {
        "source": f"data:image/{kind};base64,{base64.b64encode(content).decode()}",
        "name": plain(each.name),
        "number": "" if each.number is None else str(each.number),
    }


def _gathered(lot: Mapping[str, Any], glances: Iterable[Glance]) -> list[dict[str, Any]]:
    """Tell each finding once, with the pictures it was made on; those that weigh most first."""
    weight = {"refusal": 0, "warning": 1, "info": 2}
    gathered: dict[Note, list[str]] = {
        Note(each["code"], each["severity"], each["message"], each["remedy"]): []
        for each in lot["findings"]
    }
    for each in glances:
        for note in each.notes:
            gathered.setdefault(note, []).append(plain(each.name))
    return [
        {
            "code": note.code,
            "severity": note.severity,
            "message": plain(note.message),
            "remedy": plain(note.remedy),
            "pictures": names[:6],
            "more": max(0, len(names) - 6),
        }
        for note, names in sorted(gathered.items(), key=lambda pair: weight[pair[0].severity])
    ]


__all__ = ["About", "lot_page"]
