"""Does a measured value conform to its limits? JCGM 106 and ISO 14253-1, with guard bands.

A value conforms when it lies inside the tolerance by the guard band, does not conform when it lies
outside by the guard band, and is undecided in between: neither can then be proved.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from statistics import NormalDist

COVERAGE = 2.0
"""The default guard band is the expanded uncertainty U = 2 u (ISO 14253-1, JCGM 106 8.3.2)."""
DEFAULT_RISK = NormalDist().cdf(-COVERAGE)
"""What U = 2 u leaves on one side: 2.28 %."""

NEGLIGIBLE = 1e-9
"""Share of the risk that the far limit may add before the near one must give way."""


class Decision(StrEnum):
    """What may be said of a value, or of a whole swatch or lot."""

    CONFORMS = "conforms"
    DOES_NOT_CONFORM = "does not conform"
    UNDECIDED = "undecided"


@dataclass(frozen=True, slots=True)
class Limits:
    """A tolerance: the lowest and the highest value that conform; None where there is no limit."""

    lower: float | None
    upper: float | None

    def __post_init__(self) -> None:
        if self.lower is None and self.upper is None:
            raise ValueError("limits need a lower or an upper value")
        if self.lower is not None and self.upper is not None and not self.lower < self.upper:
            raise ValueError(f"lower must be below upper, got {self.lower} and {self.upper}")

    @property
    def width(self) -> float:
        """Distance between the limits; infinite where one is missing."""
        return math.inf if self.lower is None or self.upper is None else self.upper - self.lower

    def shrunk(self, guard: float) -> Limits | None:
        """Draw both limits in by the guard band; None when nothing is left between them."""
        lower = None if self.lower is None else self.lower + guard
        upper = None if self.upper is None else self.upper - guard
        if lower is not None and upper is not None and lower >= upper:
            return None
        return Limits(lower, upper)


def guard_band(
    u: float, *, risk: float | None = None, freedom: float = math.inf, width: float = math.inf
) -> float:
    """How far from a limit a value must lie before anything is said.

    Parameters
    ----------
    u : float
        Standard uncertainty of the value that is judged.
    risk : float, optional
        The largest probability that a stated decision is wrong; None takes U = 2 u.
    freedom : float
        Effective degrees of freedom of u: Student's t then takes the place of the normal factor,
        so that a mean of few places is not trusted like a mean of many.
    width : float
        Distance between the limits, same unit as u. With a stated risk, limits that lie close
        together share it: beyond both must not be likelier than the risk (JCGM 106 8.3.3).

    Returns
    -------
    float
        The guard band, same unit as u.

    Raises
    ------
    ValueError
        When u is negative, the risk is not between 0 and 0.5, or freedom is not positive.

    Examples
    --------
    >>> guard_band(0.1)
    0.2
    >>> round(guard_band(0.1, risk=0.05), 4)
    0.1645
    >>> round(guard_band(0.1, freedom=4), 4)
    0.2869
    """
    if not u >= 0:
        raise ValueError(f"u must not be negative, got {u}")
    if not freedom > 0:
        raise ValueError(f"freedom must be positive, got {freedom}")
    if risk is None:
        return u * (COVERAGE if math.isinf(freedom) else _quantile(DEFAULT_RISK, freedom))
    if not 0 < risk < 0.5:
        raise ValueError(f"risk must lie between 0 and 0.5, got {risk}")
    if u == 0 or math.isinf(width):
        return u * _quantile(risk, freedom)
    return u * _shared_quantile(risk, freedom, width / u)


def decide(value: float, limits: Limits, guard: float) -> Decision:
    """Decide by guarded acceptance and guarded rejection.

    Examples
    --------
    >>> limits = Limits(9.8, 10.2)
    >>> [decide(value, limits, 0.1).value for value in (10.0, 10.15, 10.4)]
    ['conforms', 'undecided', 'does not conform']
    """
    below = limits.lower is not None and value < limits.lower - guard
    above = limits.upper is not None and value > limits.upper + guard
    if below or above:
        return Decision.DOES_NOT_CONFORM
    inside = limits.shrunk(guard)
    if inside is None:
        return Decision.UNDECIDED
    low_enough = inside.upper is None or value <= inside.upper
    high_enough = inside.lower is None or value >= inside.lower
    return Decision.CONFORMS if low_enough and high_enough else Decision.UNDECIDED


def probability_inside(value: float, u: float, limits: Limits, freedom: float = math.inf) -> float:
    """Probability that the true value conforms, given what was measured (JCGM 106 7.2–7.5).

    Examples
    --------
    >>> round(probability_inside(9.9, 0.1, Limits(9.8, None)), 4)
    0.8413
    """
    if u == 0:
        return float(decide(value, limits, 0.0) is Decision.CONFORMS)
    below = 0.0 if limits.lower is None else _below((limits.lower - value) / u, freedom)
    above = 0.0 if limits.upper is None else _below((value - limits.upper) / u, freedom)
    return 1.0 - below - above


def overall(decisions: tuple[Decision, ...]) -> Decision:
    """Decide for the whole: one that fails decides, else one that is open leaves it open.

    Of no decisions at all, the whole is undecided.
    """
    if Decision.DOES_NOT_CONFORM in decisions:
        return Decision.DOES_NOT_CONFORM
    if not decisions or Decision.UNDECIDED in decisions:
        return Decision.UNDECIDED
    return Decision.CONFORMS


def _below(score: float, freedom: float) -> float:
    """Lower tail of Student's t, or of the normal distribution where freedom is infinite."""
    if math.isinf(freedom):
        return NormalDist().cdf(score)
    # here, and not above: a third of a second to load, and only lots have few places
    from scipy.special import stdtr

    return float(stdtr(freedom, score))


def _quantile(risk: float, freedom: float) -> float:
    if math.isinf(freedom):
        return NormalDist().inv_cdf(1.0 - risk)
    from scipy.special import stdtrit

    return -float(stdtrit(freedom, risk))


def _shared_quantile(risk: float, freedom: float, width: float) -> float:
    """Smallest factor at which both tails of limits `width` apart stay within the risk.

    At the middle both tails are equal, so no factor below the two-sided one can do where the
    limits are so close that even the middle is too risky.
    """
    low, high = _quantile(risk, freedom), _quantile(risk / 2.0, freedom)
    if width <= 2.0 * high:
        return high
    if _below(low - width, freedom) < NEGLIGIBLE * risk:
        return low
    for _ in range(45):
        # halving 45 times leaves nothing of the bracket that a double could show
        middle = 0.5 * (low + high)
        if _below(-middle, freedom) + _below(middle - width, freedom) > risk:
            low = middle
        else:
            high = middle
    return high


__all__ = [
    "COVERAGE",
    "DEFAULT_RISK",
    "Decision",
    "Limits",
    "decide",
    "guard_band",
    "overall",
    "probability_inside",
]
