"""One thing that may be wrong: its effect, its usual sizes, and the check that would settle it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from imgcover.verdict.departure import Departure, Floats

NODES = 51
"""Sizes tried of one deviation: steps below one percent, as a sett varies by that much anyway."""


@dataclass(frozen=True, slots=True, eq=False)
class Cause:
    """One thing that may be wrong.

    Parameters
    ----------
    name : str
    prior : float
        How common it is beside the other causes, before anything is seen; 1 for the commonest.
    departure : Departure
        Its effect, at every size tried.
    sizes, weights : ndarray, shape (nodes,), float64
        The sizes, and how likely each is; weights add up to 1.
    settle : str
        The check that would settle it.
    takes : str
        What it would take, with room for the size in percent; empty where it has no size.
    sett : str
        The sett ("ends", "picks") whose deviation is its size; empty for none.
    forks : str
        The set of threads ("ends", "picks") whose forked reading speaks for it; empty for none.
    other_weave : bool
        Whether it lets another weave repeat be seen than the declared one.
    """

    name: str
    prior: float
    departure: Departure
    sizes: Floats
    weights: Floats
    settle: str
    takes: str = ""
    sett: str = ""
    forks: str = ""
    other_weave: bool = False


def sized(
    name: str,
    departure: Callable[[Floats], Departure],
    *,
    prior: float,
    between: tuple[float, float],
    usual: float,
    takes: str,
    settle: str,
    sett: str = "",
) -> Cause:
    """Make a cause of one size.

    Parameters
    ----------
    departure : callable
        The effect for an array of sizes.
    between : tuple of float
        Smallest and largest size.
    usual : float
        Small sizes are likelier than large ones: the mean of an exponential law from the smallest.
    """
    sizes = np.linspace(*between, NODES)
    weights = np.exp(-(sizes - sizes[0]) / usual)
    weights = weights / weights.sum()
    return Cause(name, prior, departure(sizes), sizes, weights, settle, takes, sett)


def fixed(
    name: str,
    departure: Departure,
    *,
    prior: float,
    settle: str,
    shares: Sequence[float] = (1.0,),
    forks: str = "",
) -> Cause:
    """Make a cause whose size is one of a few known numbers, with how often each is met."""
    weights = np.array(shares)
    return Cause(name, prior, departure, np.zeros(len(weights)), weights, settle, forks=forks)


__all__ = ["NODES", "Cause", "fixed", "sized"]
