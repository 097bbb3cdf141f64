"""What scale does the file claim of itself, and can the claim be one?"""

from __future__ import annotations

import math

from imgcover.picture.exif import is_default_dpi
from imgcover.quantity import Measured
from imgcover.scale.pitch import HIGHEST, INCH_MM, LOWEST, STATED_DPI_U
from imgcover.scale.scale import Scale, ScaleSource


def scale_from_metadata(dpi: tuple[float, float] | None) -> Scale | None:
    """Make a scale of the resolution that a file claims.

    Parameters
    ----------
    dpi : (float, float) or None
        Along the shown x and y, as `Picture.dpi` holds it: already turned with the picture.

    Returns
    -------
    Scale or None
        None without a claim, and for a claim that is a program's default (72, 96) or absurd.

    Notes
    -----
    The claim is a device's nominal figure, so it carries the 0.5 % of a stated dpi, each axis
    for itself. Files that round it (whole pixels a metre or a centimetre) err by at most 0.2 %.
    """
    if dpi is None or metadata_fault(dpi):
        return None
    x, y = (axis / INCH_MM for axis in dpi)
    return Scale(
        x=Measured(x, x * STATED_DPI_U, "px/mm"),
        y=Measured(y, y * STATED_DPI_U, "px/mm"),
        ratio_u=math.sqrt(2) * STATED_DPI_U,
        source=ScaleSource.METADATA,
    )


def metadata_fault(dpi: tuple[float, float]) -> str:
    """Say why a claimed resolution is never used; empty when it might be.

    Examples
    --------
    >>> metadata_fault((72.0, 72.0))
    '72 × 72 dpi, which is what programs write when they know nothing'
    >>> metadata_fault((600.0, 600.0))
    ''
    """
    told = f"{dpi[0]:.5g} × {dpi[1]:.5g} dpi"
    if is_default_dpi(dpi):
        return f"{told}, which is what programs write when they know nothing"
    if not all(LOWEST <= axis / INCH_MM <= HIGHEST for axis in dpi):
        return f"{told}, which no picture of cloth has"
    return ""


__all__ = ["metadata_fault", "scale_from_metadata"]
