"""What may stand in each single field of a declaration, and within which bounds?"""

from __future__ import annotations

from imgcover.cloth.stated import Stated, StatementError, read_figure, surely_positive, without_u
from imgcover.cloth.tolerance import MASS_UNITS
from imgcover.quantity import Measured
from imgcover.weave import weave

MOST_CRIMP = 0.5
"""Past this is a crepe or a stretch yarn, for which straight-thread mass means nothing."""
MOST_SIZE = 0.4
MOST_PLIES = 24
LIGHTEST, HEAVIEST = 5.0, 3000.0
"""g/m2: from a silk gauze to a belting duck."""
LONGEST_TEXT = 200


def read_text(value: object) -> str:
    """Read a line of plain text: no control characters, which could steer a terminal."""
    if not isinstance(value, str):
        raise StatementError(f"expected text, got {value!r:.40}", "write it in quotes")
    if not value.isprintable() or len(value) > LONGEST_TEXT:
        raise StatementError(
            f"expected one line of at most {LONGEST_TEXT} characters, none of them a control",
            "correct it",
        )
    return value


def read_code(value: object) -> str:
    """Read an article's code: a line of text that is not empty."""
    text = read_text(value).strip()
    if not text:
        raise StatementError("expected an article code, got nothing", 'write code = "A-100"')
    return text


def read_weave(value: object) -> str:
    """Read a weave's name, known to `imgcover.weave`."""
    text = read_text(value).strip()
    try:
        return weave(text).name
    except ValueError as error:
        raise StatementError(f'unknown weave "{text}"', str(error)) from None


def read_plies(value: object) -> int:
    """Read a number of plies."""
    if isinstance(value, bool) or not isinstance(value, int) or not 1 <= value <= MOST_PLIES:
        raise StatementError(
            f"expected a whole number of plies from 1 to {MOST_PLIES}, got {value!r:.40}",
            "write plies = 2",
        )
    return value


def _bounded(stated: Stated, low: float, high: float, expected: str) -> Stated:
    if not low <= stated.value <= high:
        raise StatementError(f'expected {expected}, got "{stated.text}"', "check the number")
    return stated


def read_crimp(value: object) -> Stated:
    """Read a crimp as a fraction."""
    stated = read_figure(value, units={"%": 0.01}, example="6 %")
    return _bounded(stated, 0.0, MOST_CRIMP, "a crimp from 0 to 50 %")


def read_size(value: object) -> Stated:
    """Read the size on the warp as a share of the yarn's mass."""
    stated = read_figure(value, units={"%": 0.01}, example="8 %")
    return _bounded(stated, 0.0, MOST_SIZE, "size from 0 to 40 %")


def read_finish_change(value: object) -> Stated:
    """Read what finishing adds to or takes from the mass, as a share."""
    stated = read_figure(value, units={"%": 0.01}, example="-4 %")
    return _bounded(stated, -0.5, 2.0, "a change from -50 to +200 %")


def read_packing(value: object) -> Stated:
    """Read a packing: fibre volume in yarn volume."""
    stated = read_figure(value, units={"": 1.0}, example="0.60 u 0.05")
    return surely_positive(_bounded(stated, 0.1, 1.0, "a packing from 0.1 to 1"))


def read_yarn_density(value: object) -> Stated:
    """Read a yarn's own density, air included, in g/cm³."""
    units = {"g/cm3": 1.0, "kg/m3": 0.001}
    stated = read_figure(value, units=units, example="0.91 g/cm3")
    expected = "a yarn density from 0.05 to 8 g/cm3"
    return surely_positive(_bounded(stated, 0.05, 8.0, expected))


def read_cover(value: object) -> float:
    """Read a covered fraction."""
    stated = without_u(read_figure(value, units={"": 1.0, "%": 0.01}, example="0.84"))
    return _bounded(stated, 0.0, 1.0, "a covered fraction from 0 to 1").value


def read_mass(value: object) -> float:
    """Read a mass in g/m2."""
    stated = without_u(read_figure(value, units=MASS_UNITS, example="118 g/m2"))
    return _bounded(stated, LIGHTEST, HEAVIEST, "a mass from 5 to 3000 g/m2").value


def read_reference(value: object) -> Measured:
    """Read a cover measured on the approved swatch, with its u."""
    stated = read_figure(value, units={"": 1.0, "%": 0.01}, example="0.812 u 0.004")
    _bounded(stated, 0.0, 1.0, "a covered fraction from 0 to 1")
    if stated.u is None or stated.u <= 0:
        raise StatementError(
            f'expected a cover with its standard uncertainty, got "{stated.text}"',
            'write "0.812 u 0.004"',
        )
    return Measured(stated.value, stated.u, "1")


__all__ = [
    "read_code",
    "read_cover",
    "read_crimp",
    "read_finish_change",
    "read_mass",
    "read_packing",
    "read_plies",
    "read_reference",
    "read_size",
    "read_text",
    "read_weave",
    "read_yarn_density",
]
