"""From what the rooms measured to what a verdict weighs: values with u, and what weakens them."""

from __future__ import annotations

from collections.abc import Iterable

from imgcover.cover.reading import CoverReading
from imgcover.findings import Finding
from imgcover.quantity import Measured
from imgcover.scale.scale import Scale
from imgcover.threads.density import Density
from imgcover.threads.reading import ThreadReading, ThreadSet
from imgcover.verdict.observed import Observed, Spread


def observe(
    *,
    threads: ThreadReading | None,
    density: Density | None,
    scale: Scale | None,
    cover: CoverReading | None,
    gsm: Measured | None,
    conditioned: bool,
    findings: Iterable[Finding],
    place: str,
) -> Observed:
    """Draw together what was seen of one picture.

    Parameters
    ----------
    threads, density, scale, cover
        The rooms' answers; None where a room had none.
    gsm : Measured or None
        Mass from the balance, g/m2.
    conditioned : bool
        Whether it was weighed conditioned.
    findings : iterable of Finding
        Everything noticed on the way.
    place : str
        Which place of the lot; empty where not said.
    """
    ends, picks = (None, None) if threads is None else (threads.ends, threads.picks)
    return Observed(
        ends=None if density is None else density.ends,
        picks=None if density is None else density.picks,
        cover=None if cover is None else cover.optical,
        warp_cover=None if cover is None else cover.warp,
        weft_cover=None if cover is None else cover.weft,
        gsm=gsm,
        conditioned=conditioned,
        ends_spread=_spread(ends),
        picks_spread=_spread(picks),
        scale_u=_scale_u(scale),
        ends_length_mm=None if density is None else density.length_ends_mm,
        picks_length_mm=None if density is None else density.length_picks_mm,
        repeat=None if threads is None else threads.repeat,
        ends_forks=() if density is None else density.ends_forks,
        picks_forks=() if density is None else density.picks_forks,
        flags=frozenset(each.flag for each in findings),
        place=place,
    )


def _spread(threads: ThreadSet | None) -> Spread:
    return Spread() if threads is None else Spread(threads.local_scatter, threads.parts)


def _scale_u(scale: Scale | None) -> float:
    """The larger relative u of both axes: what all pictures of one scale have in common."""
    return 0.0 if scale is None else max(each.u / each.value for each in (scale.x, scale.y))


__all__ = ["observe"]
