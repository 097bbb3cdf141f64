"""Sheets for the tests of this room, written from a few figures."""

from __future__ import annotations

from imgcover.cloth.declaration import Declaration, read_declaration


def sheet(
    ends: str,
    picks: str,
    warp: str,
    weft: str,
    *,
    weave: str = "plain",
    of_warp: str = "",
    of_weft: str = "",
    of_article: str = "",
    rest: str = "",
    code: str = "ORLA-3",
) -> Declaration:
    """Write and read a declaration."""
    text = f"""
[article]
code = "{code}"
weave = "{weave}"
{of_article}
[warp]
threads = "{ends}"
count = "{warp}"
{of_warp}
[weft]
threads = "{picks}"
count = "{weft}"
{of_weft}
{rest}
"""
    return read_declaration(text.encode(), name="orla.toml")
