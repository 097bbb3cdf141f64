"""The mean over several places of a lot, and how far it can be trusted."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from imgcover.quantity import Measured


@dataclass(frozen=True, slots=True)
class Pooled:
    """A mean over places.

    Parameters
    ----------
    mean : Measured
        u holds the scatter of the mean and what is common to all places.
    n : int
        Number of places.
    scatter : float or None
        Standard deviation between places; None for one place.
    freedom : float
        Effective degrees of freedom of the mean's u (Welch–Satterthwaite).
    """

    mean: Measured
    n: int
    scatter: float | None
    freedom: float


def pooled(places: Sequence[Measured], *, common_u: float, field_u: float = 0.0) -> Pooled:
    """Average the values of several places.

    Parameters
    ----------
    places : sequence of Measured
        One value a place, one unit.
    common_u : float
        The part of their u that is the same for all and does not average out: the scale of one
        device, the levels of one light table.
    field_u : float
        Each place's own u. Scatter between places contains it, so the scatter of the mean is taken
        from the larger of the two: few places may agree by chance better than each can be read.

    Raises
    ------
    ValueError
        When there is no place, or the units differ.

    Examples
    --------
    >>> two = pooled([Measured(10.0, 0.1, "1/cm"), Measured(10.4, 0.1, "1/cm")], common_u=0.0)
    >>> round(two.mean.u, 3), two.freedom
    (0.2, 1.0)
    """
    if not places or len({each.unit for each in places}) > 1:
        raise ValueError(f"expected places of one unit, got {list(places)}")
    n = len(places)
    mean = math.fsum(each.value for each in places) / n
    if n == 1:
        u = math.hypot(common_u, field_u)
        return Pooled(Measured(mean, u, places[0].unit), 1, None, math.inf)
    scatter = math.sqrt(math.fsum((each.value - mean) ** 2 for each in places) / (n - 1))
    of_mean = max(scatter, field_u) / math.sqrt(n)
    u = math.hypot(of_mean, common_u)
    freedom = effective_freedom([(of_mean, n - 1), (common_u, math.inf)])
    return Pooled(Measured(mean, u, places[0].unit), n, scatter, freedom)


def effective_freedom(parts: Iterable[tuple[float, float]]) -> float:
    """Effective degrees of freedom of a combined u (JCGM 100 G.4.1, Welch–Satterthwaite).

    Parameters
    ----------
    parts : iterable of (float, float)
        Each component's u, already in the result's unit, and its degrees of freedom.

    Examples
    --------
    >>> effective_freedom([(3.0, 4.0), (0.0, math.inf)])
    4.0
    """
    listed = list(parts)
    total = math.fsum(u**2 for u, _ in listed)
    spent = math.fsum(u**4 / freedom for u, freedom in listed)
    return math.inf if spent == 0 else total**2 / spent


__all__ = ["Pooled", "effective_freedom", "pooled"]
