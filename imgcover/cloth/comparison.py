"""Of several declared cloths, which is the closer: in warp, in weft, as a whole, and why?

Two cloths that rest on the same constant go wrong together, so it is the difference that is
predicted, with its own uncertainty; what lies within two u of it is a tie and is called one.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

from imgcover.cloth.constant import Constant, combined
from imgcover.cloth.construction import Construction, Threads
from imgcover.cloth.prediction import Prediction
from imgcover.cloth.weaving_limit import tightness_of
from imgcover.quantity import Measured

COVERAGE = 2.0
"""A cloth is only called closer when the difference passes two u."""
SAME = 1e-9
"""Relative: below this two figures are one figure, written in two systems."""

Quantity = Callable[[Construction, Mapping[str, float]], float | None]


@dataclass(frozen=True, slots=True)
class ComparisonLine:
    """One respect in which the cloths are set side by side.

    Parameters
    ----------
    respect : str
        "warp", "weft", "whole", "tightness" or "mass".
    values : tuple of (Measured or None)
        One a cloth, in the order given; None where it cannot be predicted.
    closest : int or None
        Which of them is the closest (or the heaviest); None where it cannot be told.
    difference : Measured or None
        How far the closest, or the first of a tie, is ahead of the next.
    reason : str
        Why, in a sentence.
    """

    respect: str
    values: tuple[Measured | None, ...]
    closest: int | None
    difference: Measured | None
    reason: str


@dataclass(frozen=True, slots=True)
class Comparison:
    """Several predictions side by side."""

    predictions: tuple[Prediction, ...]
    lines: tuple[ComparisonLine, ...]


def compare(predictions: Sequence[Prediction]) -> Comparison:
    """Set predictions side by side.

    Parameters
    ----------
    predictions : sequence of Prediction
        Two or more.

    Raises
    ------
    ValueError
        When there are fewer than two.
    """
    if len(predictions) < 2:
        raise ValueError(f"predictions must be two or more, got {len(predictions)}")
    cloths = [_apart(each.construction, index) for index, each in enumerate(predictions)]
    lines = tuple(
        _line(respect, quantity, unit, predictions, cloths) for respect, quantity, unit in _RESPECTS
    )
    return Comparison(tuple(predictions), lines)


def _apart(cloth: Construction, index: int) -> Construction:
    """Give a cloth its own crimp, size and finish: only yarn constants are shared by cloths."""

    def own(constant: Constant) -> Constant:
        return replace(constant, name=f"{constant.name} ({index + 1})")

    def own_threads(threads: Threads) -> Threads:
        return replace(threads, crimp=own(threads.crimp), size=own(threads.size))

    return replace(
        cloth, warp=own_threads(cloth.warp), weft=own_threads(cloth.weft), finish=own(cloth.finish)
    )


def _warp(cloth: Construction, drawn: Mapping[str, float]) -> float:
    return cloth.warp.closeness(drawn)


def _weft(cloth: Construction, drawn: Mapping[str, float]) -> float:
    return cloth.weft.closeness(drawn)


def _cover(cloth: Construction, drawn: Mapping[str, float]) -> float:
    return cloth.cover(drawn)


def _tightness(cloth: Construction, drawn: Mapping[str, float]) -> float | None:
    return tightness_of(cloth, drawn)


def _mass(cloth: Construction, drawn: Mapping[str, float]) -> float:
    return cloth.mass(drawn)


_RESPECTS: tuple[tuple[str, Quantity, str], ...] = (
    ("warp", _warp, "1"),
    ("weft", _weft, "1"),
    ("whole", _cover, "1"),
    ("tightness", _tightness, "1"),
    ("mass", _mass, "g/m2"),
)


def _line(
    respect: str,
    quantity: Quantity,
    unit: str,
    predictions: Sequence[Prediction],
    cloths: Sequence[Construction],
) -> ComparisonLine:
    values = tuple(_value(quantity, each, unit) for each in cloths)
    known = [(value.value, index) for index, value in enumerate(values) if value is not None]
    if len(known) < len(cloths):
        return ComparisonLine(respect, values, None, None, "not every sheet declares a weave")
    ranked = sorted(known, key=lambda pair: -pair[0])
    (most, first), (_, second) = ranked[:2]
    difference = _difference(quantity, cloths[first], cloths[second], unit)
    tells = difference.value > max(COVERAGE * difference.u, SAME * abs(most))
    one, other = _label(predictions, first), _label(predictions, second)
    words = f"{one} {_COMPARATIVE[respect]} than {other}"
    if not tells:
        words = f"{one} and {other} cannot be told apart within the uncertainty"
    reason = f"{words}: {_REASONS[respect](predictions[first], predictions[second])}"
    return ComparisonLine(respect, values, first if tells else None, difference, reason)


def _label(predictions: Sequence[Prediction], index: int) -> str:
    """The article's code; with its place where several sheets carry the same."""
    code = predictions[index].code
    alike = [each for each in predictions if each.code == code]
    return code if len(alike) == 1 else f"{code} ({index + 1})"


def _value(quantity: Quantity, cloth: Construction, unit: str) -> Measured | None:
    if quantity(cloth, {}) is None:
        return None
    return combined(lambda drawn: quantity(cloth, drawn) or 0.0, cloth.constants, unit=unit)[0]


def _difference(
    quantity: Quantity, first: Construction, second: Construction, unit: str
) -> Measured:
    def ahead(drawn: Mapping[str, float]) -> float:
        return (quantity(first, drawn) or 0.0) - (quantity(second, drawn) or 0.0)

    return combined(ahead, (*first.constants, *second.constants), unit=unit)[0]


_COMPARATIVE = {
    "warp": "has the closer warp",
    "weft": "has the closer weft",
    "whole": "is the closer cloth",
    "tightness": "is nearer to its limit of weaving",
    "mass": "is heavier",
}


def _warp_reason(first: Prediction, second: Prediction) -> str:
    return _threads_reason(
        (first.warp_factor, first.ends.k, first.warp),
        (second.warp_factor, second.ends.k, second.warp),
    )


def _weft_reason(first: Prediction, second: Prediction) -> str:
    return _threads_reason(
        (first.weft_factor, first.picks.k, first.weft),
        (second.weft_factor, second.picks.k, second.weft),
    )


Figures = tuple[Measured, Measured | None, Measured]


def _threads_reason(first: Figures, second: Figures) -> str:
    factors = f"K {first[0].value:.2f} against {second[0].value:.2f}"
    if first[1] is not None and second[1] is not None:
        return f"{factors}, k = K/28 {first[1].value:.3f} against {second[1].value:.3f}"
    return f"{factors}, width over spacing {first[2].value:.3f} against {second[2].value:.3f}"


def _whole_reason(first: Prediction, second: Prediction) -> str:
    return (
        f"predicted cover {first.cover.value:.1%} against {second.cover.value:.1%}, "
        f"cloth factor {first.cloth_factor.value:.2f} against {second.cloth_factor.value:.2f}"
    )


def _tightness_reason(first: Prediction, second: Prediction) -> str:
    shares = [each.limit.tightness.value for each in (first, second) if each.limit]
    return " against ".join(f"{share:.0%}" for share in shares) + " of the jammed sett"


def _mass_reason(first: Prediction, second: Prediction) -> str:
    return f"{first.mass.value:.4g} against {second.mass.value:.4g} g/m²"


_REASONS = {
    "warp": _warp_reason,
    "weft": _weft_reason,
    "whole": _whole_reason,
    "tightness": _tightness_reason,
    "mass": _mass_reason,
}

__all__ = ["Comparison", "ComparisonLine", "compare"]
