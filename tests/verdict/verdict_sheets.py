"""Declarations for the tests of the verdict."""

from __future__ import annotations

from imgcover.cloth.declaration import Declaration, read_declaration

PLAIN = """
[article]
code = "V-100"
weave = "plain"
state = "finished"
[warp]
threads = "30 /cm"
count = "20 tex"
fibre = "cotton"
crimp = "6 %"
[weft]
threads = "25 /cm"
count = "20 tex"
fibre = "cotton"
crimp = "5 %"
[mass]
finish_change = "-4 %"
"""


def sheet(*more: str, instead: tuple[str, str] = ("", "")) -> Declaration:
    """Read the plain sheet with lines added, or with one text instead of another."""
    text = PLAIN.replace(*instead) if instead[0] else PLAIN
    return read_declaration("\n".join((text, *more)).encode(), name="article.toml")
