"""Text from outside made plain: nothing in a file name may steer a terminal or a spreadsheet."""

from __future__ import annotations

import unicodedata

STEERING = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})
"""Unicode categories that steer or hide: controls (escape sequences begin with one), formats (they
turn text round), lone surrogates, unassigned, and line and paragraph separators."""
FORMULA = ("=", "+", "-", "@", "\t", "\r", "\n", "＝", "＋", "－", "＠")
"""First characters that spreadsheets read as a formula, the full-width forms included."""


def plain(text: str) -> str:
    r"""Show steering characters as escapes instead of sending them on.

    Examples
    --------
    >>> plain("swatch\x1b[2J.png")
    'swatch\\x1b[2J.png'
    """
    if text.isascii() and text.isprintable():
        return text
    return "".join(
        each.encode("unicode_escape").decode() if _steers(each) else each for each in text
    )


def cell(text: str) -> str:
    """Make text a spreadsheet cell that is never computed.

    Examples
    --------
    >>> cell("=HYPERLINK(1)")
    "'=HYPERLINK(1)"
    """
    shown = plain(text)
    return f"'{shown}" if text.lstrip(" ").startswith(FORMULA) else shown


def columns(text: str) -> int:
    """How many terminal columns a text takes: wide letters take two, marks none."""
    return sum(0 if unicodedata.combining(each) else 2 if _wide(each) else 1 for each in text)


def shortened(text: str, width: int) -> str:
    """Cut the middle out of a plain text that takes more than `width` columns.

    Examples
    --------
    >>> shortened("goods-in-2031-harrow-07.png", 16)
    'goods-i…w-07.png'
    """
    if columns(text) <= width:
        return text
    head, tail = "", ""
    while columns(head) + columns(text[len(head)]) <= (width - 1) // 2:
        head += text[len(head)]
    while columns(tail) + columns(text[-len(tail) - 1]) + columns(head) + 1 <= width:
        tail = text[-len(tail) - 1 :]
    return f"{head}…{tail}"


def _steers(character: str) -> bool:
    return unicodedata.category(character) in STEERING


def _wide(character: str) -> bool:
    return unicodedata.east_asian_width(character) in ("W", "F")


__all__ = ["cell", "columns", "plain", "shortened"]
