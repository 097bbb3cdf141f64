"""How many places, and over what length, ISO 7211-2 asks threads to be counted.

References
----------
ISO 7211-2 (EN 1049-2), determination of the number of threads per unit length: the distances are
written down from memory of the standard.
"""

from __future__ import annotations

PLACES = 5
"""Places of a lot, apart from one another."""
SHORTEST_MM = ((10.0, 100.0), (25.0, 50.0), (40.0, 30.0))
"""Below so many threads a centimetre, at least so many millimetres."""
SHORTEST_OF_FINE_MM = 20.0
"""At more than 40 threads a centimetre."""


def shortest_length_mm(per_cm: float) -> float:
    """Shortest length to count threads over, in mm.

    Parameters
    ----------
    per_cm : float
        Threads a centimetre.

    Examples
    --------
    >>> [shortest_length_mm(n) for n in (8, 10, 26.8, 41)]
    [100.0, 50.0, 30.0, 20.0]
    """
    for below, length in SHORTEST_MM:
        if per_cm < below or (per_cm == below == 40.0):
            return length
    return SHORTEST_OF_FINE_MM


__all__ = ["PLACES", "shortest_length_mm"]
