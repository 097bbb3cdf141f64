"""How is a figure written down: "6 %", "118 g/m2", "0.812 u 0.004"?

One grammar for every figure of a declaration: a number, its unit, and optionally `u` and one
standard uncertainty in the same unit. A unit that is missing or unknown is refused, never guessed.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal

NUMBER = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)"
"""No exponents: nobody writes a sett as 6.8e1, and a stray e should not pass for one."""
LEAST_VALUE_OVER_U = 3.0
"""Below three u a positive figure is not told from zero."""

LONGEST_FIGURE = 100
"""Characters: a blend of five fibres fits; what is longer is not a figure."""


class StatementError(ValueError):
    """A figure whose text cannot be read in exactly one way.

    Parameters
    ----------
    fault : str
        What was expected and what came; it never repeats control characters.
    remedy : str
        The next thing to try.
    """

    def __init__(self, fault: str, remedy: str) -> None:
        super().__init__(f"{fault}. {remedy}")
        self.fault = fault
        self.remedy = remedy


@dataclass(frozen=True, slots=True)
class Stated:
    """A figure as declared, in the inside unit.

    Parameters
    ----------
    value : float
        The figure.
    u : float or None
        Its standard uncertainty where one was written.
    last_digit : float
        The worth of the last digit written: "6 %" is stated to 0.01, "6.0 %" to 0.001.
    text : str
        What was written.
    """

    value: float
    u: float | None
    last_digit: float
    text: str

    @property
    def u_of_writing(self) -> float:
        """The written u, else that of a figure rounded to its last digit (rectangular)."""
        return self.u if self.u is not None else self.last_digit / 12**0.5


def tidy(text: str) -> str:
    """Bring the signs people type for one thing to one spelling, and spaces to one."""
    for typed, meant in (("−", "-"), ("–", "-"), ("×", "x"), ("²", "2"), ("³", "3")):
        text = text.replace(typed, meant)
    return " ".join(text.split())


def as_text(value: object, example: str) -> str:
    """Take a TOML value as text, or say what was expected instead.

    Raises
    ------
    StatementError
        When it is not text, is too long, has control characters or a decimal comma.
    """
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise StatementError(
            f'expected text such as "{example}", got {_kind(value)}', f'write "{example}"'
        )
    if isinstance(value, int | float):
        raise StatementError(
            f'the unit is missing: expected text such as "{example}", got the bare number {value}',
            "write the number with its unit, in quotes",
        )
    text = tidy(value)
    if not text.isprintable() or len(text) > LONGEST_FIGURE:
        raise StatementError(f'expected a short text such as "{example}"', f'write "{example}"')
    if re.search(r"\d,\d", text):
        raise StatementError(
            f'expected a decimal point, got "{text}" with a comma', f'write it as in "{example}"'
        )
    return text


def read_figure(value: object, *, units: Mapping[str, float], example: str) -> Stated:
    """Read one figure.

    Parameters
    ----------
    value : object
        What the file holds: text, or `{value = …, u = …}` with a text or, for pure numbers, a
        number in `value`.
    units : mapping of str to float
        Each spelling allowed and what one of it is worth in the inside unit; the empty spelling
        is a pure number, which may then also be a TOML number.
    example : str
        A valid spelling, for the remedy.

    Raises
    ------
    StatementError
        When it cannot be read in exactly one way.

    Examples
    --------
    >>> read_figure("6 %", units={"%": 0.01}, example="6 %").value
    0.06
    >>> read_figure("0.812 u 0.004", units={"": 1.0}, example="0.812 u 0.004").u
    0.004
    """
    if isinstance(value, dict):
        return _read_table(value, units=units, example=example)
    if "" in units and isinstance(value, int | float) and not isinstance(value, bool):
        value = f"{Decimal(str(value)):f}"  # never with an exponent, as in 1e-06
    text = as_text(value, example)
    main_text, *u_texts = re.split(r"\s+u\s+", text, maxsplit=1)
    main = _read_number(main_text, units=units, example=example)
    if not u_texts:
        return main
    bare = re.fullmatch(NUMBER, u_texts[0])
    u_text = f"{u_texts[0]} {_unit_of(main_text)}".strip() if bare else u_texts[0]
    return _with_u(main, _read_number(u_text, units=units, example=example).value, text, example)


def without_u(stated: Stated) -> Stated:
    """Refuse a u where the declared figure itself is the aim: it is not a measurement.

    Raises
    ------
    StatementError
        When a u was written.
    """
    if stated.u is not None:
        raise StatementError(
            f'expected the declared figure alone, got "{stated.text}"',
            "how far it may stray is written in [tolerance]",
        )
    return stated


def surely_positive(stated: Stated) -> Stated:
    """Refuse a u so large that the figure could be zero: nothing can be predicted from it.

    Raises
    ------
    StatementError
        When u passes a third of the figure.
    """
    if stated.u is not None and stated.u > stated.value / LEAST_VALUE_OVER_U:
        raise StatementError(
            f'expected a u of at most a third of the figure, got "{stated.text}"', "check u"
        )
    return stated


def _with_u(main: Stated, u: float, text: str, example: str) -> Stated:
    if u < 0:
        raise StatementError(
            f'expected an uncertainty of zero or more, got "{text}"', f'write it as in "{example}"'
        )
    return Stated(main.value, u, main.last_digit, text)


def _read_table(table: dict[object, object], *, units: Mapping[str, float], example: str) -> Stated:
    if set(table) != {"value", "u"}:
        keys = ", ".join(sorted(str(key) for key in table))
        raise StatementError(
            f"expected a table of value and u, got the keys {keys or 'none'}",
            "write { value = 0.812, u = 0.004 }, or one text",
        )
    main = read_figure(table["value"], units=units, example=example)
    u = read_figure(table["u"], units=units, example=example)
    return _with_u(main, u.value, f"{main.text} u {u.text}", example)


def _unit_of(text: str) -> str:
    return re.sub(rf"^{NUMBER}\s*", "", text)


def _read_number(text: str, *, units: Mapping[str, float], example: str) -> Stated:
    found = re.fullmatch(rf"({NUMBER})\s*(.*)", text)
    if found is None:
        raise StatementError(f'expected a figure such as "{example}", got "{text}"', "correct it")
    number, unit = found[1], found[2].strip()
    worth = units.get(_spelling(unit))
    if worth is None:
        allowed = ", ".join(f'"{name}"' for name in units if name) or "none (a pure number)"
        fault = f'the unit is missing in "{text}"' if not unit else f'unknown unit "{unit}"'
        raise StatementError(
            f'{fault}: expected a figure such as "{example}"', f"units known here: {allowed}"
        )
    decimals = len(number.partition(".")[2])
    return Stated(float(number) * worth, None, 10.0**-decimals * worth, text)


def _spelling(unit: str) -> str:
    spelled = unit.lower().replace("per ", "/").replace(" ", "")
    return spelled.replace("inch", "in")


def _kind(value: object) -> str:
    names = {bool: "true or false", list: "a list", dict: "a table"}
    return names.get(type(value), f"a {type(value).__name__}")


__all__ = [
    "NUMBER",
    "Stated",
    "StatementError",
    "as_text",
    "read_figure",
    "surely_positive",
    "tidy",
    "without_u",
]
