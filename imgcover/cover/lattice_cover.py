"""Cover of a cloth whose threads are known: every opening fitted, two witnesses of the area."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from imgcover.cover.before import FINEST
from imgcover.cover.bound import most_open
from imgcover.cover.cells import Cells, cells_of
from imgcover.cover.fitting import Fit, Fitted, light_terms
from imgcover.cover.fold import mean_cell
from imgcover.cover.places import Places
from imgcover.cover.pores import describe_pores
from imgcover.cover.reading import CoverReading, Lattice, Pitch
from imgcover.cover.shown import shown
from imgcover.cover.surface import Surface
from imgcover.cover.systems import each_system
from imgcover.cover.windows import Window, cell_sides, whole_periods
from imgcover.cover.witnesses import between_windows, edge_bias, open_share, weighted
from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured

EXPLAINED = 0.955
"""Share of a patch's variance that light through openings explains: 0.99 on most drawn backlit
cloth, 0.96 where translucent yarns show their twist, at most 0.946 on cloth in reflected light."""
FLOOR = 0.0015
"""What drawn cloths of known cover are off by where nothing else speaks (sweep_cover.py)."""
BLURRED = 0.003
"""Cover of pores without clear edges is uncertain by this over the square of how many blurs fit
into a pore (sweep_cover.py): 0.1 points for one and a half, 0.5 for three quarters."""
PIXEL_BLUR = 0.29
"""Standard deviation of a pixel's own aperture: 1 / √12 px."""
FEWEST_BLURS = 1.5
"""Pores smaller than so many blurs can leave a fit astray on any backlit cloth."""
LEAST_SURE = 0.0075
"""A cover less sure than this is refused: threads and pores so small leave the section of the yarns
to be guessed, and with it where they end."""
MOST_MISFIT, MOST_FUZZ, RESOLVED = 0.003, 0.0105, 6.0
"""Misfit common to all pores, a share of the light, is refused beyond the first; beyond the second
where more blurs than the third fit into a pore: fuzz on well resolved yarns shows up to 0.0100, and
the cover was still within 0.5 points; the others show 0.0016 and with many hairs 0.0032 (seed 61803
of sweep_cover.py), sharpened ones to 0.007 with the cover off by 3 points."""
SMOTHERED = 2.5
"""Where pores are resolved by less than `RESOLVED` blurs, blur hides most of what does not fit, and
the misfit counts so many times."""
HAIRY_PX = 0.32
"""Hairs along the rims of small threads are taken for yarn: cover is uncertain by the square of it
over the pixels a thread (seed 61803: 1.7 and 1.3 points too much at 5.9 and 5.4 px, u 0.7)."""
MOST_APART = 0.004
"""Misfit that one part of the field has and another has not, a share of the light: even cloth shows
up to 0.002, a field with a third out of focus by 1.2 px 0.0085, and cover was 3 points off."""
PARTS_A_SIDE, FEWEST_IN_PART = 3, 9
"""Parts of the field each way that misfit is looked at in, and pores that tell it."""
MOST_BIAS = 0.25
"""Where blur makes the half-level edge miss more of the open area, the edge is no witness."""
APART = 0.015
"""Witnesses further apart than this disagree: five times what they differ by on drawn cloth."""
GUESSED, MOST_GUESSED = 0.2, 0.05
"""Light above what the file can hold is guessed from the edges: cover is uncertain by the first of
that share of all light, and refused beyond the second (pictures exposed 1.2 times too long)."""
ODD = 0.005
"""Misfit common to all pores, a share of the light, from which the picture is not as it should be:
sharpened pictures and fields blurred in part show 0.004 to 0.02, others at most 0.002."""
NEARLY_SHUT = 0.97
"""From this cover on a bound on the open area is given too."""
WIRE, ANY_SECTION = 0.014, 3.0
"""Threads more even than the first are wires or tapes and no yarn (drawn wires show up to 0.012,
drawn yarns 0.017 and more): they may be flat, three times as far from the section expected as
yarns are, and what the picture cannot tell of it counts so many times more."""
LOSSY_U, LOSSY_POWER, LOSSY_FINEST = 0.0006, 1.5, 0.004
"""Cover from a file stored with losses is uncertain by the first times this power of its step in
grey levels (0.2 points at JPEG quality 90, 0.5 at 85, 0.9 and refused at 75), and its profiles are
true to the last, a share of the light (cloths of 6 to 22 px of the sweep's seed 61803, as JPEG)."""
WINDOWS_FIRST = 6
"""Windows in which light, blur and yarns are first looked for: the light has six coefficients."""
BLANK_U = 0.003
"""Relative standard uncertainty of a blank exposure: lamps drift between two pictures."""


@dataclass(frozen=True, slots=True)
class _Witnessed:
    """Cover by both witnesses; `threshold` is None where the edge is none.

    `blurs` says how many standard deviations of the blur fit into a pore's smaller side.
    """

    threshold: float | None
    two_level: float
    blurs: float
    u_fit: float
    u_windows: float
    u_hairs: float
    misfit: float
    apart: float
    u_guessed: float
    u_lossy: float

    @property
    def cover(self) -> float:
        """Mean of the witnesses there are."""
        return self.two_level if self.threshold is None else (self.threshold + self.two_level) / 2

    @property
    def u(self) -> float:
        """One standard uncertainty."""
        return math.hypot(self._u_read, self.u_misfit)

    @property
    def sure(self) -> bool:
        """Whether this is sure enough to be told."""
        most = MOST_MISFIT if self.blurs < RESOLVED else MOST_FUZZ
        return self._u_read <= LEAST_SURE and self.misfit <= most and self.even

    @property
    def u_misfit(self) -> float:
        """Of what one blur and one kind of yarn do not explain."""
        return self.misfit * (SMOTHERED if self.blurs < RESOLVED else 1.0)

    @property
    def even(self) -> bool:
        """Whether one blur and one light explain every part of the field alike."""
        return self.apart <= MOST_APART

    @property
    def _u_read(self) -> float:
        """Of what was read: the fit's, the field's, and the witnesses' difference."""
        apart = self.cover - self.two_level
        if self.threshold is None:
            apart = BLURRED / self.blurs**2
        known = (self.u_fit, self.u_windows, self.u_hairs, self.u_guessed, self.u_lossy)
        return math.hypot(*known, apart, FLOOR)


def by_openings(
    windows: list[Window],
    places: Places,
    lattice: Lattice,
    pitch: Pitch | None,
    *,
    size: tuple[int, int],
    light_known: bool,
    loss_step: float,
) -> CoverReading:
    """Measure the cover with the openings of the thread lattice.

    Parameters
    ----------
    windows : list of Window
    places : Places
        Pores to fit, from parts of the windows.
    lattice : Lattice
    pitch : Pitch or None
    size : tuple of int
        Rows and columns of the picture.
    light_known : bool
        Whether light is given as a share of a blank exposure.
    loss_step : float
        Grey levels to which a file stored with losses was rounded; 0 for none.
    """
    rows, columns = size

    def fit(some: Places) -> Fit:
        return Fit(
            some,
            lattice,
            rows=rows,
            columns=columns,
            known_light_u=BLANK_U if light_known else None,
            finest=LOSSY_FINEST if loss_step else FINEST,
        )

    # Light, blur and yarns are all but told by a few of the windows.
    fitted = fit(places).solve(fit(places.thinned(WINDOWS_FIRST)).begin())
    surface = Surface(rows, columns, tuple(float(c) for c in fitted.optics.light))
    bare = np.exp(light_terms(places.row, places.column, rows, columns) @ fitted.optics.light)
    cells = cells_of(places, fitted)
    middle = (1 + cells.yarn_level) / 2
    shares = [
        (window.light - np.float32(fitted.optics.glare)) / surface.over(window)
        for window in windows
    ]
    maps = [open_share(share, middle) for share in shares]
    weights = [whole_periods(window.inside, lattice) for window in windows]
    source = "blank" if light_known else "open pores"
    u_light = math.sqrt(max(0.0, float(fitted.covariance[0, 0])))
    reading = shown(windows, shares, maps, surface, source=source, u_light=u_light)
    blurs = _blurs(cells, fitted)
    guessed = _guessed(places, fitted, bare)
    refused = _refusal(places, fitted, blurs, guessed)
    if refused is not None:
        small = refused.flag is Flag.COVER_NOT_RESOLVED
        bound = most_open(windows, light_known=light_known) if small else None
        return replace(reading, upper_bound_open=bound, findings=(refused,))
    bias = edge_bias(places, fitted, bare, middle)
    edge = 1 - weighted(maps, weights) / (1 + bias) if abs(bias) < MOST_BIAS else None
    misfit, apart = _misfits(places, fitted, bare)
    witnessed = _Witnessed(
        threshold=edge,
        two_level=(1 - weighted(shares, weights)) / (1 - cells.yarn_level),
        blurs=blurs,
        u_fit=fitted.u_open_share(lattice) * (ANY_SECTION if cells.unevenness < WIRE else 1),
        u_windows=between_windows(shares, weights) / (1 - cells.yarn_level),
        u_hairs=(HAIRY_PX / min(cell_sides(lattice))) ** 2,
        misfit=misfit,
        apart=apart,
        u_guessed=GUESSED * guessed,
        u_lossy=LOSSY_U * loss_step**LOSSY_POWER,
    )
    if not witnessed.sure:
        return _not_resolved(reading, windows, witnessed, light_known)
    reading = replace(
        reading,
        yarn_transmittance=Measured(cells.yarn_level, _u_yarn(fitted), "1"),
        pores=describe_pores(cells, lattice, pitch),
        open_level=1.0,
        yarn_level=cells.yarn_level,
        threshold_level=middle,
        blur_px=fitted.optics.blur_px,
        mean_cell=mean_cell(places, fitted, bare, lattice),
    )
    return _answered(reading, witnessed, cells, lattice, len(windows))


def _answered(
    reading: CoverReading, witnessed: _Witnessed, cells: Cells, lattice: Lattice, windows: int
) -> CoverReading:
    """Put the figures into the reading, and say what is to be said of them."""
    cover, u = witnessed.cover, witnessed.u
    warp, weft = each_system(cells, lattice, cover=cover, u=u)
    findings: list[Finding] = []
    if witnessed.threshold is not None and abs(witnessed.threshold - witnessed.two_level) > APART:
        findings.append(found(Flag.COVER_WITNESSES_DISAGREE))
    if max(witnessed.u_misfit, witnessed.u_guessed) > ODD:
        findings.append(found(Flag.COVER_PICTURE_ODD))
    if witnessed.u_lossy > 0:
        findings.append(found(Flag.COVER_FROM_LOSSY))
    if windows > 1:
        findings.append(found(Flag.COVER_FROM_WINDOWS))
    bound = None
    if cover > NEARLY_SHUT:
        bound = Measured(1 - cover, u, "1")
        findings.append(found(Flag.NEARLY_SHUT))
    edge = witnessed.threshold
    return replace(
        reading,
        optical=Measured(cover, u, "1"),
        threshold=None if edge is None else Measured(edge, u, "1"),
        two_level=Measured(witnessed.two_level, u, "1"),
        upper_bound_open=bound,
        warp=warp,
        weft=weft,
        findings=tuple(findings),
    )


def _misfits(places: Places, fitted: Fitted, bare: NDArray[np.float64]) -> tuple[float, float]:
    """What pores are misfitted by alike, beyond what noise leaves, as a share of the light.

    A sharpened picture cannot be explained by one blur: the cover was found to be off by about
    the first. In a field blurred in part the parts are misfitted each in its own way: the second.
    """
    off = (places.patch - fitted.light) * places.sound / bare[:, None, None]
    part = np.zeros(len(off), np.int64)
    for place in (places.row, places.column):
        limits = np.quantile(place, np.arange(1, PARTS_A_SIDE) / PARTS_A_SIDE)
        part = part * PARTS_A_SIDE + np.searchsorted(limits, place)
    counts = np.bincount(part)
    told = np.flatnonzero(counts >= FEWEST_IN_PART)
    squares = [_alike(off[part == each]) for each in told]
    everywhere = _alike(off)
    by_part = float(np.average(squares, weights=counts[told])) if len(told) else everywhere
    return math.sqrt(max(0.0, everywhere)), math.sqrt(max(0.0, by_part - max(0.0, everywhere)))


def _alike(off: NDArray[np.float64]) -> float:
    """Mean square of what the patches have in common, less what noise leaves of it."""
    noise = float(np.mean(off**2, dtype=np.float64)) / len(off)
    return float(np.mean(off.mean(axis=0, dtype=np.float64) ** 2)) - noise


def _guessed(places: Places, fitted: Fitted, bare: NDArray[np.float64]) -> float:
    """Light that the fit expects above what the file could hold, as a share of all light."""
    above = np.maximum(fitted.light - places.patch, 0) * places.clipped / bare[:, None, None]
    return float(np.mean(above, dtype=np.float64))


def _blurs(cells: Cells, fitted: Fitted) -> float:
    smaller = min(float(np.median(cells.open_width)), float(np.median(cells.open_height)))
    return max(smaller, 0.1) / math.hypot(fitted.optics.blur_px, PIXEL_BLUR)


def _refusal(places: Places, fitted: Fitted, blurs: float, guessed: float) -> Finding | None:
    """Say why the fit cannot be a backlit cloth, where it cannot."""
    spread = float(np.median(places.patch.var(axis=(1, 2))))
    explained = 1 - float(np.median(fitted.misfit**2)) / max(spread, 1e-12)
    if explained < EXPLAINED:
        small = blurs < FEWEST_BLURS
        return found(Flag.COVER_NOT_RESOLVED if small else Flag.COVER_NOT_BACKLIT)
    if guessed > MOST_GUESSED:
        return found(Flag.COVER_CLIPPED)
    return None


def _not_resolved(
    reading: CoverReading, windows: list[Window], witnessed: _Witnessed, light_known: bool
) -> CoverReading:
    """Refuse the cover, and bound the open area."""
    bound = most_open(windows, light_known=light_known)
    worst = max(witnessed.u_misfit, witnessed.u_guessed)
    if worst > witnessed.u / 2 or not witnessed.even:
        clipped = witnessed.even and worst == witnessed.u_guessed
        why = Flag.COVER_CLIPPED if clipped else Flag.COVER_UNEVEN
        return replace(reading, upper_bound_open=bound, findings=(found(why),))
    lossy = witnessed.u_lossy > LEAST_SURE / 2
    cause = "it was stored with losses" if lossy else "the pores are too small for this picture"
    message = (
        f"optical cover was not measured: {cause}, its uncertainty would be "
        f"{100 * witnessed.u:.1f} points; at most {100 * bound.value:.0f} % of the field is open"
    )
    return replace(
        reading, upper_bound_open=bound, findings=(found(Flag.COVER_NOT_RESOLVED, message),)
    )


def _u_yarn(fitted: Fitted) -> float:
    """Standard uncertainty of the yarn's level: glare looks like light through the yarn."""
    bare = math.exp(float(fitted.optics.light[0]))
    u_glare = math.sqrt(max(0.0, float(fitted.covariance[-1, -1])))
    return math.hypot(u_glare / bare, FLOOR)


__all__ = ["by_openings"]
