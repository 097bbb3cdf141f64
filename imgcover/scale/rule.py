"""Is there a rule in the picture, and how many pixels make its millimetre?

The search goes from coarse to fine copies of the picture: spots of parallel lines (`rule_seeds`)
are followed along their row (`rule_band`), the pattern of long and short lines tells rule from
cloth and millimetre from inch (`rule_hierarchy`, `rule_proof`), and every line is placed on the
finest copy (`rule_fit`). Where that finds none, it is done again with the cloth pressed down
(`rule_quiet`). Nothing is known about the cloth, and nothing of it is used.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.rule_area import rule_corners
from imgcover.scale.rule_band import follow_row
from imgcover.scale.rule_class import RuleClass, rule_u
from imgcover.scale.rule_digits import numbered_otherwise
from imgcover.scale.rule_fit import fit_row
from imgcover.scale.rule_hierarchy import Graduation, bend_of
from imgcover.scale.rule_levels import Level, Pictured, levels_of
from imgcover.scale.rule_lines import Row, goes_on, measure_lines
from imgcover.scale.rule_proof import BEYOND_CHANCE, Proof, evidence, prove
from imgcover.scale.rule_quiet import quieten
from imgcover.scale.rule_recurrence import UNMISTAKABLE
from imgcover.scale.rule_seeds import Seed, even_out, find_seeds
from imgcover.scale.rule_view import View, view_of

MOST_SEEDS = 24
"""Spots followed on each level: on drawn pictures a rule's row is among the first eight."""
LARGEST_SCATTER = 0.06
"""Pitches: lines that stray more from equal distances belong to a bent tape or to no rule."""
LARGEST_CHANGE = 0.08
"""Relative change of scale over the frame up to which a tilt is corrected; beyond, refused. Up to
here the correction was seen right to a hundredth of the change (tests/scale/sweep_rule.py)."""
HALF_WIDTH_MM = 8.0
"""Of a tape, whose middle keeps its length when it is bent in its plane and whose edge does not."""
LARGEST_U = 0.002
"""Relative standard uncertainty of fit and tilt beyond which a reading is not given: with more, not
the rule (0.3 % over 100 mm in class II) but the picture would decide."""

Unit = Literal["auto", "mm", "inch"]


@dataclass(frozen=True, slots=True, eq=False)
class RuleReading:
    """One graduated edge, read.

    Parameters
    ----------
    px_per_mm : Measured
        Along the rule, at the picture's middle; u holds fit, tilt and the rule's class.
    angle : float
        Direction of the rule in the picture, rad.
    graduations : tuple of Graduation
        What its lines can be; one when the unit is proven.
    u_fit, u_class : float
        Relative standard uncertainties of the fitted lines and of the rule itself.
    lines, dropped : int
        Graduations fitted, and strays left out.
    length_mm : float
        From the first to the last.
    tilt : float
        Relative change of scale over the frame that was corrected.
    corners : ndarray, shape (4, 2)
        The rule's body in picture pixels, x and y; it may reach outside the frame.
    view : View
        How its pitch goes on over the picture, `factor` picture pixels to one of the view's.
    """

    px_per_mm: Measured
    angle: float
    graduations: tuple[Graduation, ...]
    u_fit: float
    u_class: float
    lines: int
    dropped: int
    length_mm: float
    tilt: float
    corners: NDArray[np.float64]
    view: View
    factor: int

    def at(self, place: NDArray[np.float64]) -> RuleReading:
        """Return the scale at another place of the picture, x and y in its pixels."""
        pitch, u_fit = self.view.pitch_at((place - (self.factor - 1) / 2) / self.factor)
        value = pitch * self.factor / self.graduations[0].step_mm
        u = value * math.hypot(u_fit, self.u_class)
        return replace(self, px_per_mm=Measured(value, u, "px/mm"), u_fit=u_fit)

    def read_as(self, graduation: Graduation) -> RuleReading:
        """Return the same lines read as another graduation."""
        factor = self.graduations[0].step_mm / graduation.step_mm
        return replace(
            self,
            px_per_mm=self.px_per_mm.times(factor, "px/mm"),
            graduations=(graduation,),
            length_mm=self.length_mm / factor,
        )


@dataclass(frozen=True, slots=True, eq=False)
class RuleSearch:
    """What was found: readings that hold, the areas that are no cloth, and what was noticed."""

    readings: tuple[RuleReading, ...]
    areas: tuple[NDArray[np.float64], ...]
    findings: tuple[Finding, ...]


def find_rules(
    picture: Pictured, *, unit: Unit = "auto", rule_class: RuleClass = RuleClass.II
) -> RuleSearch:
    """Find the rules in a picture.

    Parameters
    ----------
    picture : Pictured
        A picture, or whatever gives block means of its linear light.
    unit : {"auto", "mm", "inch"}
        Which graduations to believe; with "auto" the pattern of the lines must tell.
    rule_class : RuleClass
        Sets how far the rule itself may be wrong.

    Returns
    -------
    RuleSearch
        `readings` is empty where no rule was found or its unit stayed open; the finding
        (`no-rule-found`, `rule-unit-open`, `rule-refused`) says which.
    """
    levels = levels_of(picture)
    found_rows: list[tuple[RuleReading, Proof]] = []
    refused: list[str] = []
    doubted = False
    fitted_on = levels[0]
    for quiet, level in ((quiet, level) for quiet in (False, True) for level in reversed(levels)):
        if quiet and doubted:
            break
        for row, proof in _rows_on(level, unit, quiet=quiet):
            if not proof.graduations:
                # what the picture as it is disproves must not be proven in one made for searching
                doubted = True
                continue
            if quiet and fitted_on is levels[0]:
                fitted_on = Level(levels[0].factor, quieten(levels[0].tone))
            reading = _read(picture, fitted_on, level, row, proof, rule_class)
            if isinstance(reading, str):
                refused.append(reading)
            else:
                found_rows.append((reading, proof))
        if any(proof.proven for _, proof in found_rows):
            break
    return _agree([reading for reading, _ in found_rows], refused)


def _rows_on(level: Level, unit: Unit, *, quiet: bool) -> list[tuple[Row, Proof]]:
    """Follow and judge the seeds of one level; of rows that overlap keep a proven one.

    With `quiet` the rows are looked for with the cloth pressed down.
    """
    tone = quieten(level.tone) if quiet else level.tone
    kept: list[tuple[Row, Proof]] = []
    for seed in find_seeds(even_out(tone * tone), most=MOST_SEEDS):
        if any(proof.proven and _inside(row, seed) for row, proof in kept):
            continue
        covers = any(proof.graduations and _inside(row, seed) for row, proof in kept)
        for row in follow_row(tone, seed):
            proof = prove(row, unit)
            if quiet and proof is not None and not _beyond_doubt(proof, row):
                # pressing down touches the ends of lines, and with them half or twice the period
                row, proof = _as_it_is(level, row, unit)
            if proof is None:
                continue
            if proof.graduations and (goes_on(tone, row) or _other_period(level.tone, row, proof)):
                proof = Proof((), proof.pattern)
            if proof.proven:
                # half-millimetre lines hide the foot of the millimetres that a seed beyond found
                kept = [each for each in kept if each[1].proven or not _inside(each[0], seed)]
            if proof.proven or not covers:
                kept.append((row, proof))
            if proof.graduations:
                break
    return kept


def _other_period(tone: NDArray[np.float32], row: Row, proof: Proof) -> bool:
    """Whether digits tell that a period which could be doubled is."""
    return proof.pattern.steps not in UNMISTAKABLE and numbered_otherwise(tone, row, proof.pattern)


def _beyond_doubt(proof: Proof, row: Row) -> bool:
    """Whether pressing the cloth down can have made or hidden nothing that the proof rests on.

    What is pressed down is pressed alike all along the row. Lines of one length stay so; and where
    a period were lost, its longest lines would be half pressed away, which is no sharp end.
    """
    return proof.pattern.steps in UNMISTAKABLE or (
        proof.proven and evidence(proof.pattern, row) >= BEYOND_CHANCE
    )


def _as_it_is(level: Level, row: Row, unit: Unit) -> tuple[Row, Proof | None]:
    """Measure and judge a row's lines anew in the picture as it is."""
    zone = (0.0, row.zone)
    again = measure_lines(level.tone, row.frame, row.numbers, row.positions, row.light, zone=zone)
    return (row, None) if again is None else (again, prove(again, unit))


def _inside(row: Row, seed: Seed) -> bool:
    """Whether a seed lies on the lines of a row that is already read."""
    offset = np.array([seed.x - row.frame.x, seed.y - row.frame.y])
    axes = np.array(
        [
            [math.cos(row.frame.along), math.cos(row.frame.upright)],
            [math.sin(row.frame.along), math.sin(row.frame.upright)],
        ]
    )
    s, t = np.linalg.solve(axes, offset)
    tall = float(np.quantile(row.reach, 0.95))
    beyond = 4 * row.pitch
    return bool(
        -beyond < t < tall + beyond and row.positions[0] - beyond < s < row.positions[-1] + beyond
    )


def _read(
    picture: Pictured,
    finest: Level,
    level: Level,
    row: Row,
    proof: Proof,
    rule_class: RuleClass,
) -> RuleReading | str:
    """Place a row's lines on the finest level; return the reading, or why it is refused."""
    fitted = fit_row(finest.tone, row, level.factor / finest.factor)
    if fitted is None:
        return "its lines do not stand at equal distances"
    comb, graduation = fitted.comb, proof.graduations[0]
    if comb.scatter > LARGEST_SCATTER * comb.pitch:
        return "its lines stray from equal distances: it is bent, or not flat on the cloth"
    bend = bend_of(row, proof.pattern).finer(level.factor / finest.factor)
    half_width = HALF_WIDTH_MM * comb.pitch / graduation.step_mm
    view = view_of(fitted, finest.tone.shape, bend=bend, half_width=half_width)
    if view.change > LARGEST_CHANGE:
        return "it lies too much aslant to the camera"
    middle = np.array([picture.columns - 1, picture.rows - 1]) / 2
    pitch, u_relative = view.pitch_at(finest.from_picture(middle))
    if u_relative > LARGEST_U:
        return "its lines leave the scale too uncertain: they are few, or lie aslant to the camera"
    px_per_mm = pitch * finest.factor / graduation.step_mm
    numbers = fitted.numbers[comb.kept]
    length = float(numbers[-1] - numbers[0]) * graduation.step_mm
    u_class = rule_u(length, rule_class)
    ends = comb.position(numbers[[0, -1]])
    corners = rule_corners(
        finest.tone,
        fitted.frame,
        px_per_mm=px_per_mm / finest.factor,
        first=float(ends[0]),
        last=float(ends[1]),
        longest_mm=proof.pattern.lengths[-1] * graduation.step_mm,
    )
    return RuleReading(
        px_per_mm=Measured(px_per_mm, px_per_mm * math.hypot(u_relative, u_class), "px/mm"),
        angle=fitted.frame.along,
        graduations=proof.graduations,
        u_fit=u_relative,
        u_class=u_class,
        lines=int(comb.kept.sum()),
        dropped=len(row.numbers) - int(comb.kept.sum()),
        length_mm=length,
        tilt=view.change,
        corners=finest.to_picture(corners),
        view=view,
        factor=finest.factor,
    )


def _agree(readings: list[RuleReading], refused: list[str]) -> RuleSearch:
    """Hold all rows against each other; one that is open may be closed by another."""
    areas = tuple(each.corners for each in readings)
    proven = [each for each in readings if len(each.graduations) == 1]
    open_ones = [each for each in readings if len(each.graduations) > 1]
    if not readings:
        if refused:
            return RuleSearch(
                (), (), (found(Flag.RULE_REFUSED, f"a rule shows, but {refused[0]}"),)
            )
        return RuleSearch((), (), (found(Flag.NO_RULE_FOUND),))
    if not proven:
        proven = in_common(open_ones)
    if not proven:
        return _open(open_ones, areas)
    for each in open_ones:
        proven += [
            read
            for read in (each.read_as(graduation) for graduation in each.graduations)
            if _near(read, proven[0])
        ]
    if not all(_near(each, proven[0]) for each in proven):
        named = " and ".join(_said(each) for each in proven)
        message = f"rules in the picture contradict each other: {named}"
        return RuleSearch((), areas, (found(Flag.RULE_REFUSED, message),))
    proven.sort(key=lambda each: each.px_per_mm.u / each.px_per_mm.value)
    return RuleSearch(tuple(proven), areas, ())


def in_common(readings: list[RuleReading]) -> list[RuleReading]:
    """Return how open rows read when only one scale of the picture fits them all, or nothing.

    Of millimetres beside tenths of an inch each can be the other, but both together only once.
    """
    first, *others = readings
    fitting = []
    for graduation in first.graduations:
        read = first.read_as(graduation)
        beside = [
            [each.read_as(other) for other in each.graduations if _near(each.read_as(other), read)]
            for each in others
        ]
        if others and all(beside):
            fitting.append([read, *(each[0] for each in beside)])
    return fitting[0] if len(fitting) == 1 else []


def _open(readings: list[RuleReading], areas: tuple[NDArray[np.float64], ...]) -> RuleSearch:
    named = " or ".join(_said(readings[0].read_as(each)) for each in readings[0].graduations)
    message = f"the rule's unit is not certain from its lines: {named}"
    return RuleSearch((), areas, (found(Flag.RULE_UNIT_OPEN, message),))


def _near(one: RuleReading, other: RuleReading) -> bool:
    """Whether two readings can be of one picture: scanners' axes differ by up to one per cent."""
    apart = abs(math.sin(one.angle - other.angle))
    ratio = one.px_per_mm.value / other.px_per_mm.value
    return abs(ratio - 1) < 0.01 + 2 * math.hypot(one.u_fit, other.u_fit) + 0.02 * apart


def _said(reading: RuleReading) -> str:
    value = reading.px_per_mm.value
    return f"{reading.graduations[0]} lines at {value:.4g} px/mm"


__all__ = ["RuleReading", "RuleSearch", "Unit", "find_rules", "in_common"]
