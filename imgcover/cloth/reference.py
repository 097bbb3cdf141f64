"""How is an approved swatch written down, so that later deliveries are held against it?"""

from __future__ import annotations

import json

from imgcover.quantity import Measured

LEAST_U = 1e-6
"""What six decimals can hold; a reference without u would be refused when read."""


def reference_table(
    *,
    optical_cover: Measured | None,
    warp_cover: Measured | None,
    weft_cover: Measured | None,
    source: str,
) -> str:
    """Write the `[reference]` table of a declaration.

    Parameters
    ----------
    optical_cover, warp_cover, weft_cover : Measured or None
        Fractions as measured on the approved swatch; None is left out.
    source : str
        Which picture or record they come from, in one line.

    Raises
    ------
    ValueError
        When there is no cover at all: a swatch without one approves nothing.

    Examples
    --------
    >>> print(reference_table(optical_cover=Measured(0.8123, 0.0041, "1"), warp_cover=None,
    ...                       weft_cover=None, source="swatch 7"))
    [reference]
    optical_cover = "0.812300 u 0.004100"
    source = "swatch 7"
    <BLANKLINE>
    """
    covers = {
        "optical_cover": optical_cover,
        "warp_cover": warp_cover,
        "weft_cover": weft_cover,
    }
    if not any(covers.values()):
        raise ValueError("expected at least one cover, got none")
    lines = [
        f'{key} = "{cover.value:.6f} u {max(cover.u, LEAST_U):.6f}"'
        for key, cover in covers.items()
        if cover is not None
    ]
    return "\n".join(
        ["[reference]", *lines, f"source = {json.dumps(source, ensure_ascii=False)}", ""]
    )


__all__ = ["reference_table"]
