"""Records to be told: made by the verdict room from values given here, without any picture."""

from __future__ import annotations

from typing import Any

from imgcover.cloth.declaration import Declaration, read_declaration
from imgcover.cloth.prediction import predict
from imgcover.findings import Finding, Flag, found
from imgcover.ledger.sections import findings_section, laid, predicted_section, quantity
from imgcover.quantity import Measured
from imgcover.verdict.observed import Observed, Spread
from imgcover.verdict.swatch import judge

HARROW = b"""
[article]
code = "HARROW-68"
description = "plain cotton, finished"
weave = "plain"
state = "finished"
[warp]
threads = "68 /in"
count = "32 Ne"
crimp = "6 %"
[weft]
threads = "64 /in"
count = "32 Ne"
crimp = "8 %"
[tolerance]
ends = "2 %"
picks = "-2 % +5 %"
cover = "4 points"
[cover]
declared = 0.66
"""


def harrow() -> Declaration:
    return read_declaration(HARROW, name="harrow.toml")


def per_cm(value: float, u: float = 0.05) -> Measured:
    return Measured(value, u, "1/cm")


def record(
    *,
    name: str = "harrow-02.png",
    ends: Measured | None = None,
    picks: Measured | None = None,
    cover: Measured | None = None,
    declared: bool = True,
    findings: tuple[Finding, ...] = (),
    scatter: float = 0.002,
    lot: str | None = None,
) -> dict[str, Any]:
    """Lay out the record of a picture in which these values were measured."""
    declaration = harrow()
    prediction = predict(declaration)
    observed = Observed(
        ends=ends,
        picks=picks,
        cover=cover,
        ends_spread=Spread(scatter, 9),
        picks_spread=Spread(scatter, 9),
        flags=frozenset(each.flag for each in findings),
    )
    verdict = judge(declaration, prediction, observed) if declared else None
    noticed = (*findings, *(verdict.findings if verdict else ()))
    return {
        "schema": "imgcover/record/1",
        "picture": {"name": name, "sha256": "ab" * 32},
        "sample": {
            **dict.fromkeys(("piece", "place", "operator", "conditioned", "note")),
            "lot": lot,
            "article": declaration.article.code if declared else None,
        },
        "light": "backlit" if cover else None,
        "warp": "vertical",
        "scale": {
            "x": quantity(Measured(23.622, 0.047, "px/mm")),
            "y": quantity(Measured(23.622, 0.047, "px/mm")),
            "source": "stated pitch 600dpi",
            "compared": [],
        },
        "threads": _threads(ends, picks),
        "cover": _cover(cover),
        "predicted": predicted_section(prediction) if declared else None,
        "verdict": None if verdict is None else laid(verdict.record()),
        "findings": findings_section(noticed),
        "provenance": {},
        "envelope": {"made_at": "2031-05-04T08:00:00Z"},
    }


def unreadable(*, name: str = "torn.jpg", declared: bool = True) -> dict[str, Any]:
    """Lay out the record of a picture that could not be read."""
    refusal = found(Flag.PICTURE_UNREADABLE, f"{name}: the JPEG ends before its last line")
    told = record(name=name, declared=declared, findings=(refusal,))
    return told | {"threads": None, "cover": None, "scale": None}


def _threads(ends: Measured | None, picks: Measured | None) -> dict[str, Any] | None:
    if ends is None and picks is None:
        return None
    section: dict[str, Any] = {"tiles_used": 15, "tiles_left_out": 1, "repeat": [1, 1]}
    for one, many, value in (("end", "ends", ends), ("pick", "picks", picks)):
        section[many] = quantity(value)
        section[f"counted_{many}"] = None if value is None else value.value * 6.79
        section[f"length_{many}_mm"] = None if value is None else 67.9
        section[f"pixels_per_{one}"] = None if value is None else 236.22 / value.value
        section[f"{many}_range"] = (
            None if value is None else [value.value * 0.99, value.value * 1.01]
        )
    return section | dict.fromkeys(("angle", "skew", "bow"))


def _cover(cover: Measured | None) -> dict[str, Any] | None:
    if cover is None:
        return None
    keys = ("upper_bound_open", "warp", "weft", "yarn_transmittance", "pores")
    return {
        "optical": quantity(cover),
        "threshold": quantity(Measured(cover.value + 0.002, cover.u, "1")),
        "two_level": quantity(Measured(cover.value - 0.002, cover.u, "1")),
        **dict.fromkeys(keys),
    }
