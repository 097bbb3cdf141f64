"""What a declared construction leads to: the sheet an inspector would file, one cloth or several.

Setts are shown by the inch and by the centimetre, counts in every system, so that the sheet can be
held against any other. Numbers taken from a table carry their u; sums on declared figures do not.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any

from imgcover.cloth.comparison import Comparison, ComparisonLine
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import Prediction, YarnPrediction
from imgcover.cloth.weaving_limit import WeavingLimit
from imgcover.ledger.canonical import Record
from imgcover.ledger.sections import findings_section, laid, predicted_section, quantity, tidied
from imgcover.quantity import Measured
from imgcover.report.layout import WIDTH, facts, figure, shown_as, table, wrapped
from imgcover.report.plain import columns, plain, shortened
from imgcover.report.rows import csv_line
from imgcover.report.text import findings_text

SCHEMA = "imgcover/prediction/1"
CSV_COLUMNS = (
    *("article", "weave", "model", "ends_per_cm", "picks_per_cm", "warp_tex", "weft_tex"),
    *("warp_factor", "weft_factor", "cloth_factor", "warp_fraction", "warp_fraction_u"),
    *("weft_fraction", "weft_fraction_u", "cover_fraction", "cover_u", "mass_g_per_m2", "mass_u"),
)
COLUMN = 26
"""Columns of the sheet a cloth takes when several stand side by side: two fit, more are stacked."""


def prediction_record(
    prediction: Prediction,
    *,
    declaration: Declaration,
    comparison: Comparison | None = None,
    index: int = 0,
) -> Record:
    """Lay a prediction out for machines.

    Parameters
    ----------
    prediction : Prediction
    declaration : Declaration
        What it was made from.
    comparison : Comparison or None
        Of this cloth with others.
    index : int
        Which of them it is.
    """
    article = declaration.article
    limit = prediction.limit
    return {
        "schema": SCHEMA,
        "article": {
            "code": article.code,
            "description": article.description,
            "weave": article.weave,
            "state": None if article.state is None else article.state.value,
            "sha256": declaration.sha256,
        },
        "predicted": predicted_section(prediction),
        "warp": _yarn_section(prediction.ends),
        "weft": _yarn_section(prediction.picks),
        "limit": None if limit is None else _limit_section(limit),
        "budget": {
            result: [
                {"constant": each.name, "source": each.source, "effect": tidied(each.effect)}
                for each in effects
            ]
            for result, effects in prediction.budget.items()
        },
        "comparison": None if comparison is None else _comparison_section(comparison, index),
        "findings": findings_section(prediction.findings),
    }


def _comparison_section(comparison: Comparison, index: int) -> Record:
    """Lay out how one cloth stands among several, respect by respect."""
    return {
        line.respect: {
            "value": quantity(line.values[index]),
            "rank": line.order.index(index) + 1 if line.order else None,
            "of": len(line.values),
            "ahead": _ahead_section(comparison, line, index),
            "reason": line.reason,
        }
        for line in comparison.lines
    }


def _ahead_section(comparison: Comparison, line: ComparisonLine, index: int) -> Record | None:
    """How far a cloth is ahead of the next; null for the last, and where there is no order."""
    place = line.order.index(index) if line.order else len(line.ahead)
    if place == len(line.ahead):
        return None
    return {
        "of": comparison.label(line.order[place + 1]),
        "by": quantity(line.ahead[place]),
        "told_apart": line.apart[place],
    }


def prediction_text(prediction: Prediction, *, description: str, weave: str | None) -> str:
    """Tell one prediction in at most 80 columns."""
    cover, mass = _said(prediction.cover), _said(prediction.mass)
    name = shortened(plain(prediction.code), 24)
    lines = [f"{name} as declared: cover {cover}, mass {mass}"]
    lines += wrapped(plain(", ".join(part for part in (description, weave) if part)))
    lines += ["", *table([("", "warp", "weft"), *_yarn_rows(prediction)]), ""]
    lines += facts(_whole_rows(prediction))
    lines += ["", "  Counts", *table([("", "warp", "weft"), *_count_rows(prediction)], indent=4)]
    lines += ["", "  Read as", *_listed(prediction.read_as)]
    lines += ["", "  Where the uncertainty comes from", *_budget_lines(prediction)]
    lines += findings_text(findings_section(prediction.findings))
    return "\n".join(lines).rstrip() + "\n"


def _order_alone(reason: str) -> str:
    """Leave the figures out; they stand in the table. A code, too, may hold a colon."""
    return reason.rpartition(": ")[0] or reason


def comparison_text(comparison: Comparison) -> str:
    """Set several predictions side by side, and say which is the closer cloth and why."""
    predictions = comparison.predictions
    whole = next(line for line in comparison.lines if line.respect == "whole")
    lines = [*wrapped(plain(_order_alone(whole.reason)), first="", then="  "), ""]
    fitting = max(1, (WIDTH - 22) // COLUMN)
    for first in range(0, len(predictions), fitting):
        shown = predictions[first : first + fitting]
        heads = [shortened(plain(each.code), COLUMN - 2) for each in shown]
        sides = [dict(_side_rows(each)) for each in shown]
        rows = [(name, *(side.get(name, "–") for side in sides)) for name in sides[0]]
        lines += [*table([("", *heads), *rows]), ""]
    for line in comparison.lines:
        lines += wrapped(f"{line.respect}: {plain(line.reason)}")
    return "\n".join(lines).rstrip() + "\n"


def prediction_csv(records: Iterable[Mapping[str, Any]]) -> Iterator[str]:
    """Write predictions as a table, one row an article; SI but for the factors."""
    yield csv_line(CSV_COLUMNS)
    for record in records:
        predicted = record["predicted"]
        row = [record["article"]["code"], record["article"]["weave"], predicted["model"]]
        row += [record[side]["threads"]["per_cm"] for side in ("warp", "weft")]
        row += [record[side]["tex"] for side in ("warp", "weft")]
        row += [predicted[f"{factor}_factor"]["value"] for factor in ("warp", "weft", "cloth")]
        for key in ("warp", "weft", "cover", "mass"):
            row += [predicted[key]["value"], predicted[key]["u"]]
        yield csv_line(row)


def _said(measured: Measured | None) -> str:
    return figure(quantity(measured), "cm")


def _cut(text: str) -> str:
    return text if columns(text) <= WIDTH else shortened(text, WIDTH)


def _listed(texts: Sequence[str]) -> list[str]:
    return [line for text in texts for line in wrapped(plain(text), first="    ", then="      ")]


def _yarn_rows(prediction: Prediction) -> list[tuple[str, ...]]:
    sides = (prediction.ends, prediction.picks)
    factors, shares = (
        (prediction.warp_factor, prediction.weft_factor),
        (prediction.warp, prediction.weft),
    )
    rows = [
        (
            "threads",
            *(_cut(f"{each.sett.per_inch:.4g} /in = {each.sett.per_cm:.4g} /cm") for each in sides),
        ),
        ("yarn", *(f"{each.count.tex:.4g} tex = {each.count.ne:.4g}s Ne" for each in sides)),
        ("diameter", *(_said(each.diameter) for each in sides)),
        ("width in the cloth", *(_said(each.width) for each in sides)),
        ("factor K, /in over √Ne", *(f"{each.value:.2f}" for each in factors)),
    ]
    if all(each.k is not None for each in sides):
        rows.append(("k = K/28", *(_fraction(each.k) for each in sides)))
    return [
        *rows,
        ("share covered, d/p", *(_said(each) for each in shares)),
        ("mass", *(_said(each.mass) for each in sides)),
    ]


def _fraction(measured: Measured | None) -> str:
    return "–" if measured is None else f"{measured.value:.3f} ± {measured.u:.3f}"


def _whole_rows(prediction: Prediction) -> list[tuple[str, str]]:
    model = "d = 1/(28 √Ne) in" if prediction.model == "peirce" else "d from fibre and packing"
    rows = [
        ("cloth factor", f"{prediction.cloth_factor.value:.2f}"),
        ("cover", f"{_said(prediction.cover)} ({prediction.model}: {model})"),
        ("mass", _said(prediction.mass)),
    ]
    limit = prediction.limit
    if limit is None:
        return [*rows, ("limit of weaving", "not known: no weave is declared")]
    rows.append(("tightness", f"{_said(limit.tightness)} of the jammed sett"))
    for rule, ends, picks in (
        ("Ashenhurst", limit.ashenhurst_ends, limit.ashenhurst_picks),
        ("Brierley", limit.brierley_ends, limit.brierley_picks),
    ):
        if ends is not None and picks is not None:
            rows.append((f"firm sett, {rule}", f"ends {_said(ends)}, picks {_said(picks)}"))
    return rows


def _count_rows(prediction: Prediction) -> list[tuple[str, str, str]]:
    warp, weft = (each.count.in_all_systems() for each in (prediction.ends, prediction.picks))
    return [(name, f"{warp[name]:.5g}", f"{weft[name]:.5g}") for name in warp]


def _budget_lines(prediction: Prediction) -> list[str]:
    texts = []
    for result, unit in (("cover", "1"), ("mass", "g/m2")):
        how = shown_as(unit, "cm")
        texts += [
            f"{result}: {abs(each.effect) * how.factor:.2g} {how.unit} from {each.name} "
            f"({each.source})"
            for each in prediction.budget[result]
        ]
    return _listed(texts) or ["    nothing that was declared or taken has one"]


def _side_rows(prediction: Prediction) -> list[tuple[str, str]]:
    ends, picks = prediction.ends, prediction.picks
    rows = [
        ("ends × picks /in", f"{ends.sett.per_inch:.4g} × {picks.sett.per_inch:.4g}"),
        ("ends × picks /cm", f"{ends.sett.per_cm:.4g} × {picks.sett.per_cm:.4g}"),
        ("yarns, Ne", f"{ends.count.ne:.4g} × {picks.count.ne:.4g}"),
        ("yarns, tex", f"{ends.count.tex:.4g} × {picks.count.tex:.4g}"),
        ("K warp, weft", f"{prediction.warp_factor.value:.2f}, {prediction.weft_factor.value:.2f}"),
        ("cloth factor", f"{prediction.cloth_factor.value:.2f}"),
        ("d/p warp", _said(prediction.warp)),
        ("d/p weft", _said(prediction.weft)),
        ("cover", _said(prediction.cover)),
        ("mass", _said(prediction.mass)),
    ]
    if prediction.limit is not None:
        rows.append(("tightness", _said(prediction.limit.tightness)))
    return rows


def _yarn_section(yarn: YarnPrediction) -> Record:
    return laid(
        {
            "threads": {"per_cm": yarn.sett.per_cm, "per_inch": yarn.sett.per_inch},
            "tex": yarn.count.tex,
            "counts": yarn.count.in_all_systems(),
            "read_as": yarn.count.said,
            "model": yarn.model,
            "diameter": quantity(yarn.diameter),
            "width": quantity(yarn.width),
            "height": quantity(yarn.height),
            "k": quantity(yarn.k),
            "mass": quantity(yarn.mass),
        }
    )


def _limit_section(limit: WeavingLimit) -> Record:
    return {
        "tightness": quantity(limit.tightness),
        "ashenhurst_ends": quantity(limit.ashenhurst_ends),
        "ashenhurst_picks": quantity(limit.ashenhurst_picks),
        "brierley_ends": quantity(limit.brierley_ends),
        "brierley_picks": quantity(limit.brierley_picks),
    }


__all__ = [
    *("SCHEMA", "comparison_text", "prediction_csv"),
    *("prediction_record", "prediction_text"),
]
