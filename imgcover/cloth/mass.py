"""What should a square metre weigh?"""

from __future__ import annotations


def mass_of(per_mm: float, tex: float, *, crimp: float, added: float = 0.0) -> float:
    """Mass of one set of threads, in g/m².

    Threads a metre × tex/1000 × (1 + crimp) × (1 + added).

    Parameters
    ----------
    per_mm : float
        Threads a millimetre.
    tex : float
        Of the whole yarn.
    crimp : float
        Straightened length over length in the cloth, less 1.
    added : float
        Size on the yarn as a share of its mass.

    Examples
    --------
    The worked problem of GATE Textile 2009, question 37: 198 g/m².

    >>> round(mass_of(4.0, 30.0, crimp=0.10) + mass_of(3.0, 20.0, crimp=0.10), 6)
    198.0
    """
    return per_mm * tex * (1 + crimp) * (1 + added)


__all__ = ["mass_of"]
