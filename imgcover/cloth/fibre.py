"""How dense are fibres, and how closely does each way of spinning pack them?

References
----------
Fibre densities at 65 % r.h.: Morton & Hearle, Physical Properties of Textile Fibres, table 5.1;
flax from another handbook, where 1.50 to 1.54 is met. Packing of yarns is scattered over the
literature; the values here are the middle of the ranges commonly given, and their u says so.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches

from imgcover.cloth.constant import Constant
from imgcover.cloth.stated import NUMBER, StatementError, as_text

DENSITY = {
    "cotton": 1.52,
    "viscose": 1.49,
    "acetate": 1.32,
    "wool": 1.31,
    "silk": 1.34,
    "nylon": 1.14,
    "polyester": 1.39,
    "acrylic": 1.19,
    "polypropylene": 0.91,
    "polyethylene": 0.95,
    "p-aramid": 1.44,
    "m-aramid": 1.39,
    "glass": 2.5,
    "flax": 1.53,
}
"""g/cm³ at 65 % relative humidity."""
OTHER_NAMES = {"linen": "flax", "rayon": "viscose", "polyamide": "nylon", "pes": "polyester"}
DENSITY_SPREAD = 0.01
"""Relative u: handbooks differ by about one percent on one fibre."""

PACKING = {
    "ring": (0.55, 0.65),
    "compact": (0.60, 0.65),
    "rotor": (0.50, 0.55),
    "worsted": (0.55, 0.60),
    "woollen": (0.40, 0.50),
    "filament": (0.65, 0.80),
    "textured": (0.30, 0.50),
    "monofilament": (1.0, 1.0),
}
"""Fibre volume in yarn volume by way of spinning: the range commonly given, from memory."""
PACKING_U = 0.05
"""One standard uncertainty of a packing: it moves a diameter by four percent."""


@dataclass(frozen=True, slots=True)
class Fibre:
    """A fibre or a blend.

    Parameters
    ----------
    shares : tuple of (str, float)
        Each fibre's name and its share of the mass; shares add up to 1.
    """

    shares: tuple[tuple[str, float], ...]

    @property
    def name(self) -> str:
        """The fibre's name, or the blend's."""
        if len(self.shares) == 1:
            return self.shares[0][0]
        return ", ".join(f"{name} {100 * share:g} %" for name, share in self.shares)

    @property
    def density(self) -> Constant:
        """Density in g/cm³; of a blend, total mass over total volume."""
        value = 1 / sum(share / DENSITY[name] for name, share in self.shares)
        return Constant(
            f"fibre density of {self.name}",
            value,
            DENSITY_SPREAD * value,
            "Morton & Hearle, table 5.1, 65 % r.h." if self.name != "flax" else "handbook",
        )


def read_fibre(value: object) -> Fibre:
    """Read a fibre, or a blend such as "polyester 65 %, cotton 35 %".

    Raises
    ------
    StatementError
        When a fibre is not known or the shares of a blend do not add up to 100 %.

    Examples
    --------
    >>> read_fibre("65 % polyester 35 % cotton").name
    'polyester 65 %, cotton 35 %'
    """
    text = as_text(value, "cotton").lower()
    name_first = re.findall(rf"([a-z][a-z-]*)\s*({NUMBER})\s*%", text)
    share_first = [(name, n) for n, name in re.findall(rf"({NUMBER})\s*%\s*([a-z][a-z-]*)", text)]
    if not re.search(r"\d", text):
        return Fibre(((_known(text), 1.0),))
    parts = share_first if re.match(NUMBER, text) else name_first
    left = re.sub(rf"[a-z][a-z-]*|{NUMBER}|%|,|/|\+|\s", "", text)
    if not parts or left or text.count("%") != len(parts):
        raise StatementError(
            f'expected a fibre or a blend, got "{text}"', 'write "polyester 65 %, cotton 35 %"'
        )
    shares = tuple((_known(name), float(number) / 100) for name, number in parts)
    if abs(sum(share for _, share in shares) - 1) > 1e-9 or min(s for _, s in shares) <= 0:
        raise StatementError(
            f'expected shares that add up to 100 %, got "{text}"', "correct the shares"
        )
    return Fibre(shares)


def read_spinning(value: object) -> str:
    """Read how the yarn was made: it decides how closely fibres are packed."""
    text = as_text(value, "ring").lower()
    if text not in PACKING:
        raise StatementError(
            f'unknown way of spinning "{text}"', _nearest(text, PACKING) or _all(PACKING)
        )
    return text


def packing_of(spinning: str) -> Constant:
    """The packing of yarns spun that way, with the spread of what is published."""
    low, high = PACKING[spinning]
    u = 0.0 if low == high else max(PACKING_U, (high - low) / 12**0.5)
    return Constant(f"packing of {spinning} yarn", (low + high) / 2, u, "range of the literature")


def _known(name: str) -> str:
    known = OTHER_NAMES.get(name, name)
    if known not in DENSITY:
        raise StatementError(
            f'unknown fibre "{name}"',
            (_nearest(name, {**DENSITY, **OTHER_NAMES}) or _all(DENSITY))
            + '; for another fibre give yarn_density = "0.9 g/cm3"',
        )
    return known


def _nearest(name: str, known: Iterable[str]) -> str | None:
    close = get_close_matches(name, list(known), n=2, cutoff=0.6)
    return f"nearest: {', '.join(close)}" if close else None


def _all(known: Iterable[str]) -> str:
    return "known: " + ", ".join(known)


__all__ = ["DENSITY", "PACKING", "PACKING_U", "Fibre", "packing_of", "read_fibre", "read_spinning"]
