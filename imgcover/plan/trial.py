"""What is read of this very cloth, drawn as the device would see it?

A figure from a table would hold for other cloths. So the declared cloth is drawn a few times at the
planned resolution and goes the whole road; how far what is read lies from what was drawn is known.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from imgcover.cloth.declaration import Declaration
from imgcover.findings import Severity
from imgcover.inspection import inspect
from imgcover.loom.article import article_cloth, draw_article
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.keeping import encode
from imgcover.request import Options, Request
from imgcover.scale.pitch import StatedPitch
from imgcover.threads.reading import ThreadSet

SEEDS = (1, 2)
"""Two pictures: a reading that fails by chance shows as a difference between them, and the answer
still comes while one waits."""
THREADS_DRAWN = 40
"""Of each system: what is read of a wider field follows from it."""
SMALLEST_SIDE, LARGEST_SIDE = 160, 1000
"""Pixels: below, no field of threads can be read; above, the drawing takes longer than the scan."""
MOST_PIXELS = 12.0
"""Pixels of the finest thread in the drawing: more show the same threads larger."""
BLUR_OF_DETAIL = 0.68
"""Standard deviation of the optics' blur in smallest details: lines and gaps one detail wide keep
a tenth of their contrast, exp(−2 π² 0.68² / 4) = 0.10, where the eye takes detail to end."""
LEAST_BLUR_PX = 0.6
"""A pixel of finite size and a lens that just serves it."""
FAR = 4.0
"""Standard uncertainties from the drawn truth that no handful of readings reaches by chance: such
a reading is wrong, however sure of itself."""


@dataclass(frozen=True, slots=True)
class FieldError:
    """How the relative u of a count falls with the number of threads counted.

    Parameters
    ----------
    edges : float
        What the first and the last thread leave, in threads: falls as 1/n.
    spacing : float
        What uneven spacing leaves, relative for one thread: falls as 1/√n.
    """

    edges: float
    spacing: float

    def u(self, threads: float) -> float:
        """Relative standard uncertainty of a count of so many threads.

        Examples
        --------
        >>> round(FieldError(0.03, 0.04).u(100), 6)
        0.004011
        """
        return math.hypot(self.edges / threads, self.spacing / math.sqrt(threads))


@dataclass(frozen=True, slots=True)
class Told:
    """How well a figure was read of the drawn pictures.

    Parameters
    ----------
    right : bool
        Read in every picture, and never farther from what was drawn than its u allows.
    u : float or None
        Standard uncertainty, relative for threads and a fraction for cover: what was stated or how
        far it was off, whichever is more. None where nothing was read.
    off : float or None
        Largest distance from what was drawn, same unit.
    reasons : tuple of str
        What the readings said against it.
    """

    right: bool
    u: float | None
    off: float | None
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Trial:
    """What was read of the drawn pictures.

    Parameters
    ----------
    pictures : int
    ends, picks, cover : Told
    ends_error, picks_error : FieldError or None
        None where they could not be counted.
    """

    pictures: int
    ends: Told
    picks: Told
    cover: Told
    ends_error: FieldError | None
    picks_error: FieldError | None


@dataclass(frozen=True, slots=True)
class _Reading:
    """A figure as read of one picture, with its u and the truth; None where it was refused."""

    value: float | None
    u: float
    truth: float
    said: tuple[str, ...]


def try_out(declaration: Declaration, px_per_mm: float, *, detail_mm: float) -> Trial:
    """Draw the declared cloth at a resolution, light behind it, and read it.

    Parameters
    ----------
    declaration : Declaration
    px_per_mm : float
        Pixels a millimetre of the device.
    detail_mm : float
        Smallest detail that its optics show.
    """
    cloth = article_cloth(declaration)
    finest = max(cloth.ends_per_mm, cloth.picks_per_mm)
    drawn_at = min(px_per_mm, MOST_PIXELS * finest)
    blur_px = max(LEAST_BLUR_PX, BLUR_OF_DETAIL * detail_mm * drawn_at)
    camera = CameraSpec(px_per_mm=drawn_at, blur_px=blur_px)
    looks = [_look(declaration, cloth, camera, seed) for seed in SEEDS]
    return Trial(
        len(looks),
        _told([ends for ends, *_ in looks], relative=True),
        _told([picks for _, picks, *_ in looks], relative=True),
        _told([cover for _, _, cover, *_ in looks], relative=False),
        _field_error([each for *_, each, _ in looks]),
        _field_error([each for *_, each in looks]),
    )


def _look(
    declaration: Declaration, cloth: ClothSpec, camera: CameraSpec, seed: int
) -> tuple[_Reading, _Reading, _Reading, ThreadSet | None, ThreadSet | None]:
    drawn = draw_article(
        declaration,
        camera,
        seed=seed,
        width=_side(cloth.ends_per_mm, camera),
        height=_side(cloth.picks_per_mm, camera),
    )
    # the drawing's own scale is exact: what the device's adds is reckoned with apart
    exact = StatedPitch(camera.px_per_mm, 0.0, f"{camera.px_per_mm:.6g}px/mm")
    name = "drawn.png"
    answers = inspect(
        Request(
            source=encode(drawn, camera, name),
            name=name,
            options=Options(light="backlit", pitch=exact),
            declaration=declaration,
        )
    ).answers
    said = tuple(f.message for f in answers.findings if f.severity is Severity.REFUSAL)
    density, cover, threads = answers.density, answers.cover, answers.threads
    ends = None if density is None or density.ends is None else density.ends.times(0.1, "1/mm")
    picks = None if density is None or density.picks is None else density.picks.times(0.1, "1/mm")
    optical = None if cover is None else cover.optical
    readings = [
        _Reading(
            None if value is None else value.value, 0.0 if value is None else value.u, truth, said
        )
        for value, truth in (
            (ends, drawn.truth.ends),
            (picks, drawn.truth.picks),
            (optical, drawn.truth.cover),
        )
    ]
    sets = (None, None) if threads is None else (threads.ends, threads.picks)
    return (readings[0], readings[1], readings[2], *sets)


def _side(per_mm: float, camera: CameraSpec) -> int:
    wanted = math.ceil(THREADS_DRAWN * camera.px_per_mm / per_mm)
    return min(max(wanted, SMALLEST_SIDE), LARGEST_SIDE)


def _told(readings: Sequence[_Reading], *, relative: bool) -> Told:
    read = [
        (each.value - each.truth, each.u, each.truth if relative else 1.0)
        for each in readings
        if each.value is not None
    ]
    if not read:
        refusals = tuple(dict.fromkeys(text for each in readings for text in each.said))
        return Told(False, None, None, refusals or ("nothing was read",))
    off = max(abs(error) / unit for error, _, unit in read)
    u = math.sqrt(math.fsum(max(abs(e), u) ** 2 / unit**2 for e, u, unit in read) / len(read))
    reasons: list[str] = []
    if len(read) < len(readings):
        reasons.append(f"it was read in {len(read)} of {len(readings)} drawn pictures only")
        reasons += [text for each in readings if each.value is None for text in each.said]
    if any(abs(error) > FAR * u_read for error, u_read, _ in read):
        reasons.append(
            f"it was read {100 * off:.2g} {'%' if relative else 'points'} off what was drawn, "
            "far beyond its u"
        )
    return Told(not reasons, u, off, tuple(dict.fromkeys(reasons)))


def _field_error(sets: Sequence[ThreadSet | None]) -> FieldError | None:
    counted = [each for each in sets if each is not None]
    if not counted:
        return None
    edges = math.fsum((each.u_relative * each.counted) ** 2 for each in counted)
    spacing = math.fsum(each.local_scatter**2 / each.parts * each.counted for each in counted)
    return FieldError(math.sqrt(edges / len(counted)), math.sqrt(spacing / len(counted)))


__all__ = ["FieldError", "Told", "Trial", "try_out"]
