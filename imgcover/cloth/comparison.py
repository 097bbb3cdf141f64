"""Of several declared cloths, which is the closer: in warp, in weft, as a whole, and why?

Two cloths that rest on the same constant go wrong together, so it is the difference that is
predicted, with its own uncertainty; what lies within two u of it is a tie and is called one.
"""

from __future__ import annotations

import itertools
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
    order : tuple of int
        The cloths from the closest (or the heaviest) on; empty where one cannot be predicted.
    ahead : tuple of Measured
        How far each in that order is ahead of the next.
    apart : tuple of bool
        Whether that tells the two apart.
    reason : str
        Why, in a sentence.
    """

    respect: str
    values: tuple[Measured | None, ...]
    order: tuple[int, ...]
    ahead: tuple[Measured, ...]
    apart: tuple[bool, ...]
    reason: str

    @property
    def closest(self) -> int | None:
        """Which of them is the closest (or the heaviest); None where it cannot be told."""
        return self.order[0] if self.apart and self.apart[0] else None


@dataclass(frozen=True, slots=True)
class Comparison:
    """Several predictions side by side."""

    predictions: tuple[Prediction, ...]
    lines: tuple[ComparisonLine, ...]

    def label(self, index: int) -> str:
        """The article's code; with its place where several sheets carry the same."""
        return _label(self.predictions, index)


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
        return ComparisonLine(respect, values, (), (), (), "not every sheet declares a weave")
    ranked = sorted(known, key=lambda pair: -pair[0])
    order = tuple(index for _, index in ranked)
    ahead = tuple(
        _difference(quantity, cloths[first], cloths[second], unit)
        for first, second in itertools.pairwise(order)
    )
    apart = tuple(
        each.value > max(COVERAGE * each.u, SAME * abs(most))
        for each, (most, _) in zip(ahead, ranked, strict=False)
    )
    words = _ranked(respect, [_label(predictions, index) for index in order], apart)
    reason = f"{words}: {_REASONS[respect]([predictions[index] for index in order])}"
    return ComparisonLine(respect, values, order, ahead, apart, reason)


def _ranked(respect: str, names: Sequence[str], apart: Sequence[bool]) -> str:
    """Say the order of two or more cloths, and who cannot be told apart."""
    if len(names) == 2 and apart[0]:
        return f"{names[0]} {_COMPARATIVE[respect]} than {names[1]}"
    if not any(apart):
        listed = f"{', '.join(names[:-1])} and {names[-1]}"
        return f"{listed} cannot be told apart within the uncertainty"
    words = names[0]
    for name, tells in zip(names[1:], apart, strict=True):
        words += f", then {name}" if tells else f" or {name}"
    unsure = "" if all(apart) else " (or: not told apart within the uncertainty)"
    return f"{_SUPERLATIVE[respect]} {words}{unsure}"


def _label(predictions: Sequence[Prediction], index: int) -> str:
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


_SUPERLATIVE = {
    "warp": "the closest warp is that of",
    "weft": "the closest weft is that of",
    "whole": "the closest cloth is",
    "tightness": "nearest to its limit of weaving is",
    "mass": "the heaviest is",
}
_COMPARATIVE = {
    "warp": "has the closer warp",
    "weft": "has the closer weft",
    "whole": "is the closer cloth",
    "tightness": "is nearer to its limit of weaving",
    "mass": "is heavier",
}


def _warp_reason(these: Sequence[Prediction]) -> str:
    return _threads_reason([(each.warp_factor, each.ends.k, each.warp) for each in these])


def _weft_reason(these: Sequence[Prediction]) -> str:
    return _threads_reason([(each.weft_factor, each.picks.k, each.weft) for each in these])


Figures = tuple[Measured, Measured | None, Measured]


def _threads_reason(these: Sequence[Figures]) -> str:
    factors = f"K {_against([f'{factor.value:.2f}' for factor, _, _ in these])}"
    known = [k for _, k, _ in these if k is not None]
    if len(known) == len(these):
        return f"{factors}, k = K/28 {_against([f'{k.value:.3f}' for k in known])}"
    shares = _against([f"{share.value:.3f}" for _, _, share in these])
    return f"{factors}, width over spacing {shares}"


def _whole_reason(these: Sequence[Prediction]) -> str:
    covers = _against([f"{each.cover.value:.1%}" for each in these])
    factors = _against([f"{each.cloth_factor.value:.2f}" for each in these])
    return f"predicted cover {covers}, cloth factor {factors}"


def _tightness_reason(these: Sequence[Prediction]) -> str:
    shares = [f"{each.limit.tightness.value:.0%}" for each in these if each.limit]
    return f"{_against(shares)} of the jammed sett"


def _mass_reason(these: Sequence[Prediction]) -> str:
    return f"{_against([f'{each.mass.value:.4g}' for each in these])} g/m²"


def _against(figures: Sequence[str]) -> str:
    """Two figures against each other; more one after another, in the order that was said."""
    if len(figures) == 2:
        return " against ".join(figures)
    return f"{', '.join(figures[:-1])} and {figures[-1]}"


_REASONS = {
    "warp": _warp_reason,
    "weft": _weft_reason,
    "whole": _whole_reason,
    "tightness": _tightness_reason,
    "mass": _mass_reason,
}

__all__ = ["Comparison", "ComparisonLine", "compare"]
