"""Two readings of one set, and a declared weave that may decide as it helps a person."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

import numpy as np

from imgcover.threads.profile import Multiple
from imgcover.weave import Weave


def settled(
    multiple: Multiple, weave: Weave | None, name: Literal["ends", "picks"]
) -> Multiple | None:
    """Break a tie by the declared weave.

    Parameters
    ----------
    multiple : Multiple
        With a rival.
    weave : Weave or None
        As declared.
    name : {"ends", "picks"}
        Which set was read.

    Returns
    -------
    Multiple or None
        Without a rival; None where the weave says nothing of it.

    Notes
    -----
    Where neighbours weave alike (hopsack, rib) they lie together, and the finer of two readings
    counts them singly. In any other weave neighbours differ, so a ridge is a thread and the
    coarser reading holds. What decides is not in the picture: the count must carry
    `rests-on-declared-weave`.
    """
    if weave is None or multiple.rival is None:
        return None
    threads = weave.matrix.T if name == "ends" else weave.matrix
    alike = bool((threads == np.roll(threads, 1, axis=0)).all(axis=1).any())
    low, high = sorted((multiple.factor, multiple.rival))
    return replace(multiple, factor=high if alike else low, rival=None)


__all__ = ["settled"]
