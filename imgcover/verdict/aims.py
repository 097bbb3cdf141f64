"""Which figures of a declaration are judged, against what, and within which limits."""

from __future__ import annotations

from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import Prediction
from imgcover.cloth.sett import Sett
from imgcover.cloth.tolerance import Tolerance
from imgcover.quantity import Measured
from imgcover.verdict.decision import Limits
from imgcover.verdict.line import UNIT, Aim, Basis, Quantity

PER_CM = 10.0
"""Setts are declared a millimetre inside and judged a centimetre."""


def aims(declaration: Declaration, prediction: Prediction) -> dict[Quantity, Aim]:
    """List what is to be judged, in the order of the verdict.

    Ends and picks always. Cover against the approved swatch, else against the declared cover,
    else against the model where a tolerance for it is written. Mass against the declared mass,
    else against the model where a tolerance for it is written.

    Parameters
    ----------
    declaration : Declaration
    prediction : Prediction
        What the declared construction leads to.

    Returns
    -------
    dict of Quantity to Aim
    """
    tolerance = declaration.tolerance
    listed = [
        _sett_aim(Quantity.ENDS, declaration.warp.threads, tolerance.ends),
        _sett_aim(Quantity.PICKS, declaration.weft.threads, tolerance.picks),
        _cover_aim(declaration, prediction),
        _mass_aim(declaration, prediction),
    ]
    return {aim.quantity: aim for aim in listed if aim is not None}


def _sett_aim(quantity: Quantity, sett: Sett, tolerance: Tolerance | None) -> Aim:
    limits = None if tolerance is None else _limits(tolerance, sett.per_mm, PER_CM)
    return Aim(quantity, Basis.DECLARED, Measured(sett.per_cm, 0.0, UNIT[quantity]), limits)


def _cover_aim(declaration: Declaration, prediction: Prediction) -> Aim | None:
    tolerance = declaration.tolerance.cover
    approved, declared = declaration.reference.optical_cover, declaration.cover.declared
    if approved is not None:
        return _aim(Quantity.COVER, Basis.REFERENCE, approved, tolerance)
    if declared is not None:
        return _aim(Quantity.COVER, Basis.DECLARED, Measured(declared, 0.0, "1"), tolerance)
    if tolerance is not None:
        return _aim(Quantity.COVER, Basis.MODEL, prediction.cover, tolerance)
    return None


def _mass_aim(declaration: Declaration, prediction: Prediction) -> Aim | None:
    tolerance, declared = declaration.tolerance.mass, declaration.mass.declared
    if declared is not None:
        return _aim(Quantity.MASS, Basis.DECLARED, Measured(declared, 0.0, "g/m2"), tolerance)
    if tolerance is not None:
        return _aim(Quantity.MASS, Basis.MODEL, prediction.mass, tolerance)
    return None


def _aim(quantity: Quantity, basis: Basis, value: Measured, tolerance: Tolerance | None) -> Aim:
    limits = None if tolerance is None else _limits(tolerance, value.value, 1.0)
    return Aim(quantity, basis, value, limits)


def _limits(tolerance: Tolerance, figure: float, factor: float) -> Limits:
    lower, upper = tolerance.limits(figure)
    return Limits(
        None if lower is None else lower * factor, None if upper is None else upper * factor
    )


__all__ = ["aims"]
