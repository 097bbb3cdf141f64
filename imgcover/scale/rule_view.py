"""How does a row's pitch go on over the rest of the picture, seen straight or aslant?

A plane seen aslant shows line k of a row at k = s / (pitch · (1 + along · s + across · t)), s along
the row and t up its lines from where they were placed. The comb gives `along`, the lines' foot
against their tip `across`; a scanner has neither, a camera both.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from imgcover.scale.rule_fit import FittedRow
from imgcover.scale.rule_frame import Frame
from imgcover.scale.rule_hierarchy import Bend

USUAL_LEAN = 0.02
"""Standard deviation of the tilt of a camera held level, in each direction, over the longer side
of the picture: a degree and a half behind a lens as long as the picture is wide."""
ACROSS_ONLY = 0.1
"""Share of cameras that lean across the row alone: of these the row's length says nothing."""
STRAIGHTER = 9.0
"""By how much the squared misfit of a bent row must exceed a straight one's: three of their u."""
U_BENT = 0.005
"""Of the change over the frame: what a rule that is not quite flat, or a lens that bends, adds."""


@dataclass(frozen=True, slots=True)
class View:
    """A row's pitch over the picture, in pixels of the level on which it was fitted.

    Parameters
    ----------
    frame : Frame
    s, t : float
        Where along the frame, and how far up the lines, the pitch was found.
    pitch, u_pitch : float
    along, across : float
        Relative change of the view's depth for one pixel; both 0 where the picture was more
        likely taken straight.
    u_along, u_across : float
    extent : float
        The picture's diagonal, pixels.
    """

    frame: Frame
    s: float
    t: float
    pitch: float
    u_pitch: float
    along: float
    across: float
    u_along: float
    u_across: float
    extent: float

    @property
    def change(self) -> float:
        """Relative change of the scale over the frame."""
        return math.hypot(2 * self.along, self.across) * self.extent

    def pitch_at(self, place: NDArray[np.float64]) -> tuple[float, float]:
        """Return the pitch at a place of the level, x and y, and its relative u.

        At right angles to the lines: where the frame cuts their feet off, the row seems to run
        aslant.
        """
        frame = self.frame
        x, y = place - np.array([frame.x, frame.y])
        s = x * math.cos(frame.along) + y * math.sin(frame.along) - self.s
        t = x * math.cos(frame.upright) + y * math.sin(frame.upright) - self.t
        depth = 1 + self.along * s + self.across * t
        square = abs(math.sin(frame.upright - frame.along))
        pitch = self.pitch * depth**2 / (1 + self.across * t) * square
        relative = math.sqrt(
            (self.u_pitch / self.pitch) ** 2
            + (2 * self.u_along * s) ** 2
            + (self.u_across * t) ** 2
            + (U_BENT * self.change) ** 2
        )
        return pitch, relative


def view_of(fitted: FittedRow, size: tuple[int, int], *, bend: Bend, half_width: float) -> View:
    """Judge from a row whether the picture was taken aslant, and how much.

    Parameters
    ----------
    fitted : FittedRow
    size : (int, int)
        Rows and columns of the level.
    bend : Bend
        Of the row's ends, in pixels of the level (`rule_hierarchy.bend_of`).
    half_width : float
        How far from the lines, in pixels, a bent rule may have kept its length.

    Returns
    -------
    View

    Notes
    -----
    Held against each other are a scanner, which has no tilt, and a camera, whose tilt is normal
    about none with `USUAL_LEAN`, as likely beforehand. Where the scanner stays the likelier, the
    tilt that the camera would have had is left to the uncertainty, by the camera's share. A row
    that does not tell foot from tip (infinite u) leaves the usual tilt. On a row bent in its plane
    the pitch grows from foot to tip by just its curvature, as it does under a tilt; a tilt leaves
    the row straight. Where the ends do not say that it is straight, what foot and tip differ by is
    left to the uncertainty: nothing tells how it goes on beside the row, nor where across a bent
    rule the graduations kept their distance.
    """
    comb = fitted.comb
    usual = USUAL_LEAN / max(size)
    terms = (
        (-comb.tilt / comb.pitch, comb.u_tilt / comb.pitch),
        (fitted.across, min(fitted.u_across, 1e3 * usual)),
    )
    odds, leans = [], []
    for value, u in terms:
        total = usual**2 + u**2
        exponent = (value**2 / u**2 - value**2 / total) / 2
        odds.append(u / math.sqrt(total) * math.exp(min(exponent, 300.0)))
        leans.append((value * usual**2 / total, usual * u / math.sqrt(total)))
    camera = max(odds[0], ACROSS_ONLY) * odds[1]
    share = camera / (1 + camera)
    if share > 0.5:
        (along, u_along), (across, u_across) = leans
    else:
        along = across = 0.0
        u_along, u_across = (math.sqrt(share) * math.hypot(*each) for each in leans)
    u_pitch = comb.u_pitch
    curved = abs(bend.value) if bend.plain else 0.0
    if share > 0.5 and not _straight(bend, *terms[1]):
        curved = max(curved, abs(fitted.across))
    if curved:
        u_across = math.hypot(u_across, fitted.across, curved)
        across = 0.0
        u_pitch = math.hypot(u_pitch, comb.pitch * curved * half_width)
    return View(
        fitted.frame,
        comb.origin,
        fitted.height,
        comb.pitch,
        u_pitch,
        along,
        across,
        u_along,
        u_across,
        math.hypot(*size),
    )


def _straight(bend: Bend, across: float, u_across: float) -> bool:
    """Whether the ends of a row whose foot and tip differ speak for straight against bent."""
    straight = (bend.value / bend.u) ** 2
    bent = (bend.value - across) ** 2 / (bend.u**2 + u_across**2)
    return straight + STRAIGHTER < bent


__all__ = ["View", "view_of"]
