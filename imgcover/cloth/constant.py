"""How sure is each constant a prediction rests on, and what does that do to the result?

A prediction is a function of constants. Two threads that rest on the same constant (one name, one
value) go wrong together; so effects are added by name before they are squared.

References
----------
JCGM 100:2008, 5.1.3 note 2: the effect of an input is half the difference of the results with the
input one u up and one u down. Unlike a derivative it also sees where a result is capped.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

from imgcover.quantity import Measured


@dataclass(frozen=True, slots=True)
class Constant:
    """One input of a prediction.

    Parameters
    ----------
    name : str
        What it is; equal names are one and the same constant.
    value, u : float
        The best estimate and one standard uncertainty.
    source : str
        Where both come from.
    """

    name: str
    value: float
    u: float
    source: str

    def at(self, drawn: Mapping[str, float]) -> float:
        """Its value, or the one drawn or shifted under its name."""
        return drawn.get(self.name, self.value)


@dataclass(frozen=True, slots=True)
class Effect:
    """What one constant's u does to a result, in the result's unit, with its sign."""

    name: str
    source: str
    effect: float


def combined(
    result: Callable[[Mapping[str, float]], float], constants: Iterable[Constant], unit: str
) -> tuple[Measured, tuple[Effect, ...]]:
    """Combine the effects of all constants on a result.

    Parameters
    ----------
    result : callable
        The result for constants given by name; those left out keep their value.
    constants : iterable of Constant
        Those it may depend on; a name met twice counts once, with its larger u.
    unit : str
        Of the result.

    Returns
    -------
    tuple of (Measured, tuple of Effect)
        The result and its budget, largest effect first, without effects of exactly zero.
    """
    uncertain = {each.name: each for each in sorted(constants, key=lambda c: c.u) if each.u > 0}
    effects = [
        Effect(name, each.source, _half_difference(result, each))
        for name, each in uncertain.items()
    ]
    budget = sorted((e for e in effects if e.effect), key=lambda e: -abs(e.effect))
    u = sum(each.effect**2 for each in budget) ** 0.5
    return Measured(result({}), u, unit), tuple(budget)


def _half_difference(result: Callable[[Mapping[str, float]], float], constant: Constant) -> float:
    up = result({constant.name: constant.value + constant.u})
    down = result({constant.name: constant.value - constant.u})
    return (up - down) / 2


__all__ = ["Constant", "Effect", "combined"]
