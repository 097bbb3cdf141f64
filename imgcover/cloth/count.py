"""How fine is a yarn: reading a count in any of the trade's systems, and saying it back.

References
----------
ISO 1139, the tex notation of single and folded yarns.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace

from imgcover.cloth.count_system import CountSystem
from imgcover.cloth.stated import NUMBER, StatementError, as_text

MOST_PLIES_WRITTEN = 12
"""In `a/b` the number up to this is the plies: twelve-fold is the stoutest yarn so written."""
FINEST_TEX = 0.1
COARSEST_TEX = 20_000.0
"""From a single microfilament to a rope: beyond, the number and its unit do not belong together."""

_BY_SPELLING = {spelling: system for system in CountSystem for spelling in system.spellings}
KNOWN_UNITS = "; ".join(f"{system.label} ({', '.join(system.spellings)})" for system in CountSystem)
_UNIT = "|".join(re.escape(each) for each in sorted(_BY_SPELLING, key=len, reverse=True))
_SIMPLE = re.compile(
    rf"(?P<r>r\s*(?=\d))?(?:(?P<before>{_UNIT})\s*)?"
    rf"(?P<a>{NUMBER})s?(?:\s*/\s*(?P<b>{NUMBER})s?)?"
    rf"(?:\s*(?P<after>{_UNIT})(?![a-z]))?"
    rf"(?:\s*/\s*(?P<slash>{NUMBER}))?(?:\s*f\s*(?P<f>{NUMBER}))?(?:\s*x\s*(?P<x>{NUMBER}))?",
    re.IGNORECASE,
)
_FILAMENT_SYSTEMS = (CountSystem.DTEX, CountSystem.DEN)
_SLASH_SYSTEMS = (
    CountSystem.NE,
    CountSystem.NM,
    CountSystem.WORSTED,
    CountSystem.LEA,
    CountSystem.RUN,
)


@dataclass(frozen=True, slots=True)
class Count:
    """A yarn's count as read.

    Parameters
    ----------
    system : CountSystem
        The system it was written in.
    tex : float
        Of the whole yarn, folded as declared: the resultant.
    singles_tex : tuple of float
        Each single's tex; one entry where all are alike.
    plies : int
        How many singles are folded together; 1 for a single.
    filaments : int or None
        In one single, where written; never counted as threads.
    text : str
        What was declared.
    """

    system: CountSystem
    tex: float
    singles_tex: tuple[float, ...]
    plies: int
    filaments: int | None
    text: str

    @property
    def ne(self) -> float:
        """The resultant in English cotton count."""
        return CountSystem.NE.from_tex(self.tex)

    def in_all_systems(self) -> dict[str, float]:
        """The resultant in every system, by the system's name."""
        return {system.label: system.from_tex(self.tex) for system in CountSystem}

    @property
    def said(self) -> str:
        """How it was read, in words."""
        show = self.system.show
        single = " + ".join(show(self.system.from_tex(tex)) for tex in self.singles_tex)
        if self.filaments is not None:
            single += f" of {self.filaments} filament{'s' if self.filaments != 1 else ''}"
        resultant = show(self.system.from_tex(self.tex))
        other = CountSystem.NE.show(self.ne) if self.system is CountSystem.TEX else self._tex_said
        if self.plies == 1:
            return f"read as single {single} = {other}"
        folded = single if len(self.singles_tex) > 1 else f"{self.plies} × {single}"
        return f"read as {folded}, resultant {resultant} = {other}"

    def times(self, factor: float) -> Count:
        """The same yarn made coarser by a factor: a hypothesis, no longer the declared one."""
        singles = tuple(tex * factor for tex in self.singles_tex)
        text = f"{self.text} × {factor:.4g}"
        return replace(self, tex=self.tex * factor, singles_tex=singles, text=text)

    @property
    def _tex_said(self) -> str:
        return f"{self.tex:.3g} tex" if self.tex < 1000 else f"{self.tex:.0f} tex"

    def folded(self, plies: int) -> Count:
        """Fold a count that was written as a single number.

        Raises
        ------
        StatementError
            When the count's own text already says another number of plies.
        """
        if self.plies not in (1, plies) or len(self.singles_tex) > 1:
            raise StatementError(
                f'"{self.text}" says {self.plies} plies, but plies = {plies}',
                "leave one of the two out, or make them agree",
            )
        if self.plies == plies:
            return self
        if self._is_resultant:
            return replace(self, plies=plies, singles_tex=(self.tex / plies,))
        return replace(self, plies=plies, tex=self.tex * plies)

    @property
    def _is_resultant(self) -> bool:
        return self.system is CountSystem.SPUN_SILK or self.text[:1].lower() == "r"


def read_count(value: object) -> Count:
    """Read a count.

    Parameters
    ----------
    value : object
        Text such as "32 Ne", "2/40 Ne", "60/2 Nm", "30 tex x 2", "R 60 tex/2",
        "167 dtex f 48 x 2", "60/2 spun silk", "8 lb/spyndle", "40 Ne + 20 Ne".

    Raises
    ------
    StatementError
        When the unit is missing or unknown, or the text can be read in two ways.

    Examples
    --------
    >>> read_count("2/40 Ne").said
    'read as 2 × 40s, resultant 20s = 29.5 tex'
    >>> read_count("167 dtex f 48 x 2").said
    'read as 2 × 167 dtex of 48 filaments, resultant 334 dtex = 33.4 tex'
    """
    text = as_text(value, "32 Ne")
    parts = [part.strip() for part in re.split(r"(?<=\D)\+(?=\D|\d)|(?<=\d)\s+\+\s*(?=\d)", text)]
    counts = [_read_simple(part) for part in parts]
    if len(counts) == 1:
        return counts[0]
    if any(count.plies != 1 or count.filaments is not None for count in counts):
        raise StatementError(
            f'expected singles on both sides of +, got "{text}"', 'write "40 Ne + 20 Ne"'
        )
    tex = sum(count.tex for count in counts)
    singles = tuple(count.tex for count in counts)
    return Count(counts[0].system, tex, singles, len(counts), None, text)


def _read_simple(text: str) -> Count:
    found = _SIMPLE.fullmatch(text)
    unit = (found["before"] or found["after"]) if found else None
    if found is None or unit is None or (found["before"] and found["after"]):
        raise _unread(text)
    system = _BY_SPELLING[unit.lower()]
    written = {name: found[name] for name in ("a", "b", "slash", "f", "x")}
    number = _positive(written["a"], text)
    if system in _SLASH_SYSTEMS or system is CountSystem.SPUN_SILK:
        return _read_hanks(system, number, written, text, resultant=bool(found["r"]))
    if system is CountSystem.TEX or found["r"]:
        return _read_tex(system, number, written, text, resultant=bool(found["r"]))
    if written["b"] and written["slash"]:
        raise StatementError(
            f'"{text}" has two strokes', "write the filaments after f and the folding after x"
        )
    filaments = written["b"] or written["slash"]
    if filaments and (written["f"] or system not in _FILAMENT_SYSTEMS):
        raise StatementError(
            f'"{text}" cannot be read in one way only',
            f'write it as in "{number:g} {system.label} x 2"',
        )
    return _build(system, number, text, filaments=written["f"] or filaments, plies=written["x"])


def _read_hanks(
    system: CountSystem,
    number: float,
    written: dict[str, str | None],
    text: str,
    *,
    resultant: bool,
) -> Count:
    stroke = written["b"] or written["slash"]
    if resultant or written["f"] or (written["b"] and written["slash"]):
        raise StatementError(
            f'"{text}" mixes notations: R belongs to tex, f to filament yarns',
            f'write "2/40 {system.label}" where two 40s are folded',
        )
    if stroke is None:
        if written["x"] and system is CountSystem.SPUN_SILK:
            raise StatementError(
                f'"{text}" does not say whether the number is the resultant',
                'write "60/2 spun silk", where 60 is the resultant',
            )
        return _build(system, number, text, plies=written["x"])
    if written["x"]:
        raise StatementError(f'"{text}" folds twice', "write plies, the count being one single's")
    other = _positive(stroke, text)
    plies, count = min(number, other), max(number, other)
    if count <= MOST_PLIES_WRITTEN or plies > MOST_PLIES_WRITTEN or plies != int(plies):
        raise StatementError(
            f'in "{text}" it cannot be told which number is the plies: one must be a whole number '
            f"up to {MOST_PLIES_WRITTEN}, the other above it",
            f'write plies, and the count alone: count = "{count:g} {system.label}", '
            f"plies = {plies:.0f}",
        )
    single = count * plies if system is CountSystem.SPUN_SILK else count
    return _build(system, single, text, plies=f"{plies:.0f}")


def _read_tex(
    system: CountSystem,
    number: float,
    written: dict[str, str | None],
    text: str,
    *,
    resultant: bool,
) -> Count:
    wrong_system = system is not CountSystem.TEX and written["slash"]
    if written["b"] or wrong_system or (written["slash"] and not resultant):
        raise StatementError(
            f'"{text}" does not say whether {number:g} is one single or the resultant',
            f'write "{number:g} {system.label} x 2" for two singles, or "R {number:g} tex/2"',
        )
    if resultant and written["x"]:
        raise StatementError(
            f'"{text}" is a resultant and folded once more', f'write "R {number:g} tex/2"'
        )
    plies = written["slash"] or written["x"]
    single = number / _whole(plies, text) if resultant and plies else number
    return _build(system, single, text, filaments=written["f"], plies=plies)


def _build(
    system: CountSystem,
    single: float,
    text: str,
    *,
    filaments: str | None = None,
    plies: str | None = None,
) -> Count:
    single_tex = system.to_tex(single)
    fold = 1 if plies is None else _whole(plies, text)
    bundle = None if filaments is None else _whole(filaments, text)
    tex = single_tex * fold
    if not FINEST_TEX <= tex <= COARSEST_TEX:
        raise StatementError(
            f'"{text}" is {tex:.3g} tex, which no cloth is woven of', "check the number and unit"
        )
    return Count(system, tex, (single_tex,), fold, bundle, text)


def _positive(number: str, text: str) -> float:
    value = float(number)
    if value <= 0:
        raise StatementError(f'expected a count above zero, got "{text}"', "check the number")
    return value


def _whole(number: str, text: str) -> int:
    value = _positive(number, text)
    if value != int(value):
        raise StatementError(
            f'expected a whole number of plies or filaments, got "{text}"', "check the number"
        )
    return int(value)


def _unread(text: str) -> StatementError:
    bare = re.fullmatch(rf"(?:r\s+)?{NUMBER}s?(?:\s*/\s*{NUMBER}s?)?", text, re.IGNORECASE)
    fault = "no unit in" if bare else "no known count or unit in"
    return StatementError(f'{fault} "{text}"; none is guessed', f"units known: {KNOWN_UNITS}")


__all__ = [
    "KNOWN_UNITS",
    "MOST_PLIES_WRITTEN",
    "Count",
    "read_count",
]
