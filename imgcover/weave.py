"""Weave names and their matrices: which thread lies on top where an end crosses a pick."""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

LONGEST_REPEAT = 64
"""Threads in a repeat; no loom with shafts goes further, and a longer one is a slip of the pen."""

WRITTEN = (
    "plain",
    "2/1 twill",
    "1/2 twill",
    "3/1 twill",
    "1/3 twill",
    "2/2 twill",
    "3/3 twill",
    "5-end satin",
    "5-end sateen",
    "8-end satin",
    "8-end sateen",
    "2/2 herringbone",
    "2/2 hopsack",
    "2/2 warp rib",
    "2/2 weft rib",
)
"""How the usual weaves are written; other floats and repeats follow the same patterns."""


@dataclass(frozen=True, slots=True, eq=False)
class Weave:
    """One repeat of a weave.

    Parameters
    ----------
    name : str
        The weave as `weave` writes it.
    matrix : ndarray, shape (picks, ends), bool
        True where the end lies over the pick, seen from the face; row 0 is the uppermost pick of
        the shown picture, column 0 its leftmost end.
    """

    name: str
    matrix: NDArray[np.bool_]

    @property
    def ends_repeat(self) -> int:
        """Ends in one repeat."""
        return int(self.matrix.shape[1])

    @property
    def picks_repeat(self) -> int:
        """Picks in one repeat."""
        return int(self.matrix.shape[0])

    @property
    def intersections(self) -> tuple[float, float]:
        """Changes of side in one repeat: (of a pick, met by its ends; of an end, by its picks).

        The first belongs with `ends_repeat` in a sett rule for the ends, the second with
        `picks_repeat` in one for the picks. They are means, since in some weaves not every
        thread interlaces alike.

        Examples
        --------
        >>> weave("2/2 twill").intersections
        (2.0, 2.0)
        """
        across = self.matrix != np.roll(self.matrix, 1, axis=1)
        down = self.matrix != np.roll(self.matrix, 1, axis=0)
        return float(across.sum(axis=1).mean()), float(down.sum(axis=0).mean())

    @property
    def warp_on_top(self) -> float:
        """Share of the crossings at which the end lies on top, 0…1."""
        return float(self.matrix.mean())


def weave(name: str) -> Weave:
    """Give the weave of that name.

    Parameters
    ----------
    name : str
        "plain"; "a/b twill" with " s" behind it for a twill that rises to the left; "n-end satin"
        (warp on top) or "n-end sateen" (weft on top); "a/a herringbone", "a/a hopsack",
        "a/a warp rib" (a picks in a shed), "a/a weft rib" (a ends weaving as one).

    Raises
    ------
    ValueError
        When no weave is written so; the message names the nearest that are.

    Examples
    --------
    >>> weave("2/1 twill").matrix.astype(int).tolist()
    [[1, 1, 0], [1, 0, 1], [0, 1, 1]]
    """
    asked = " ".join(name.lower().replace("_", " ").split())
    for pattern, draft in DRAFTS:
        fits = pattern.fullmatch(asked)
        if fits:
            matrix = draft(fits)
            if matrix is not None and max(matrix.shape) <= LONGEST_REPEAT:
                matrix.setflags(write=False)
                return Weave(asked, matrix)
    near = difflib.get_close_matches(asked, WRITTEN, n=3, cutoff=0.4) or list(WRITTEN)
    raise ValueError(f"no weave is written {name!r}; the nearest are {', '.join(near)}")


def _plain(_: re.Match[str]) -> NDArray[np.bool_]:
    """Draft every end over one pick and under the next."""
    return np.array([[True, False], [False, True]])


def _twill(fits: re.Match[str]) -> NDArray[np.bool_] | None:
    """Draft ends over `up` picks and under `down`, each one pick higher than its left neighbour."""
    up, down = int(fits["up"]), int(fits["down"])
    if up < 1 or down < 1 or up + down < 3:
        return None
    pick, end = _grid(up + down, up + down)
    slope = -end if fits["hand"] == " s" else end
    return np.asarray((pick + slope) % (up + down) < up)


def _satin(fits: re.Match[str]) -> NDArray[np.bool_] | None:
    """Draft single bindings spread by a step that shares no factor with the repeat."""
    ends = int(fits["ends"])
    steps = [step for step in range(2, ends - 1) if math.gcd(step, ends) == 1]
    if not steps:
        return None
    step = min(steps, key=lambda each: abs(each - ends * 0.38))
    # 0.38 of the repeat keeps neighbouring bindings furthest apart: step 2 of 5, 3 of 8
    pick, end = _grid(ends, ends)
    bound = (pick * step) % ends == end
    return np.asarray(bound if fits["face"] == "sateen" else ~bound)


def _herringbone(fits: re.Match[str]) -> NDArray[np.bool_] | None:
    """Draft a balanced twill that turns back, with the break of one clean cut."""
    up, down = int(fits["up"]), int(fits["down"])
    if up != down or up < 2:
        return None
    pick, end = _grid(up + down, 2 * (up + down))
    turned = end >= up + down
    return np.where(turned, (pick + up - 1 - end) % (2 * up) < up, (pick + end) % (2 * up) < up)


def _hopsack(fits: re.Match[str]) -> NDArray[np.bool_] | None:
    """Draft plain weave with both threads doubled, or more."""
    return _grouped(fits, picks=True, ends=True)


def _warp_rib(fits: re.Match[str]) -> NDArray[np.bool_] | None:
    """Draft plain weave with several picks in a shed."""
    return _grouped(fits, picks=True, ends=False)


def _weft_rib(fits: re.Match[str]) -> NDArray[np.bool_] | None:
    """Draft plain weave with several ends weaving as one."""
    return _grouped(fits, picks=False, ends=True)


def _grouped(fits: re.Match[str], *, picks: bool, ends: bool) -> NDArray[np.bool_] | None:
    """Draft plain weave whose threads are grouped `up` and `down` together."""
    up, down = int(fits["up"]), int(fits["down"])
    if up < 1 or down < 1 or up + down < 3:
        return None
    grouped = np.arange(up + down) < up
    single = np.array([True, False])
    by_pick = grouped if picks else single
    by_end = grouped if ends else single
    return np.equal.outer(by_pick, by_end)


def _grid(picks: int, ends: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Number the picks down and the ends across."""
    return np.arange(picks)[:, None], np.arange(ends)[None, :]


Draft = Callable[[re.Match[str]], NDArray[np.bool_] | None]
FLOATS = r"(?P<up>\d{1,2})/(?P<down>\d{1,2}) "
DRAFTS: tuple[tuple[re.Pattern[str], Draft], ...] = (
    (re.compile(r"plain|tabby|1/1 plain"), _plain),
    (re.compile(FLOATS + r"twill(?P<hand>| s| z)"), _twill),
    (re.compile(r"(?P<ends>\d{1,2})[- ]end (?P<face>satin|sateen)"), _satin),
    (re.compile(FLOATS + r"herringbone"), _herringbone),
    (re.compile(FLOATS + r"hopsack"), _hopsack),
    (re.compile(FLOATS + r"warp rib"), _warp_rib),
    (re.compile(FLOATS + r"weft rib"), _weft_rib),
)

__all__ = ["WRITTEN", "Weave", "weave"]
