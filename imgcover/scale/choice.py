"""Of the ways to find the scale that are at hand, which counts, and do the others agree?"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.metadata import metadata_fault, scale_from_metadata
from imgcover.scale.pitch import INCH_MM
from imgcover.scale.scale import ComparedScale, Scale, ScaleSource

PRECEDENCE = tuple(ScaleSource)
"""What was measured beats what was stated; what was stated beats what a file claims."""


@dataclass(frozen=True, slots=True)
class ScaleChoice:
    """The scale that counts, or None, and what was noticed on the way.

    Parameters
    ----------
    scale : Scale or None
        With the other ways in `compared`; None when there is none.
    findings : tuple of Finding
        Those of every way at hand, and those of comparing them.
    """

    scale: Scale | None
    findings: tuple[Finding, ...]


def choose_scale(
    candidates: Iterable[Scale | None] = (),
    *,
    dpi: tuple[float, float] | None = None,
    use_metadata: bool = False,
    nominal: bool = False,
) -> ScaleChoice:
    """Choose the scale by precedence: certificate, rule, sheet, stated pitch, metadata.

    Parameters
    ----------
    candidates : iterable of Scale or None
        Scales by certificate, rule, sheet and stated pitch, in any order; None is passed over.
    dpi : (float, float) or None
        What the file claims, along the shown axes (`Picture.dpi`).
    use_metadata : bool
        Whether the user lets that claim stand as a scale (`--metadata`).
    nominal : bool
        Whether the pitch was stated in dots an inch, which is a device's setting.

    Returns
    -------
    ScaleChoice
        Two given ways that disagree by more than twice their uncertainty leave
        `scales-disagree`, and the decision undecided. A claim of the file that nobody asked for
        is only held against the scale used: it can warn, not undecide. But where the scale used is
        itself no more than a device's setting, told from memory, the file's claim is as good.
    """
    given = sorted(
        (each for each in candidates if each is not None),
        key=lambda each: PRECEDENCE.index(ScaleSource(each.source)),
    )
    claimed = scale_from_metadata(dpi)
    if claimed is not None and use_metadata:
        given.append(claimed)
    if not given:
        return ScaleChoice(None, (_no_scale(dpi, use_metadata=use_metadata),))
    used, others = given[0], given[1:]
    findings = [finding for each in given for finding in each.findings]
    findings += [_disagreement(used, each) for each in others if not used.agrees_with(each)]
    if claimed is not None and not use_metadata:
        others.append(claimed)
        if nominal and used.source == ScaleSource.STATED and not used.agrees_with(claimed):
            findings.append(_other_setting(used, claimed))
        else:
            findings += _held_against(used, claimed)
    if used.source == ScaleSource.METADATA:
        findings.append(found(Flag.SCALE_FROM_METADATA))
    if use_metadata and claimed is None:
        findings.append(_not_trusted(dpi))
    compared = tuple(
        ComparedScale(each.source, each.x, each.y, used.agrees_with(each)) for each in others
    )
    return ScaleChoice(replace(used, compared=compared, findings=tuple(findings)), tuple(findings))


def _disagreement(used: Scale, other: Scale) -> Finding:
    message = (
        f"the {used.source} says {_told(used)} and the {other.source} says {_told(other)}: "
        "more than twice their uncertainty apart"
    )
    return found(Flag.SCALES_DISAGREE, message)


def _other_setting(used: Scale, claimed: Scale) -> Finding:
    stated, written = (f"{_dpi(each.x)} × {_dpi(each.y)} dpi" for each in (used, claimed))
    message = f"the stated pitch is {stated}, but the file says it was taken at {written}"
    return found(
        Flag.SCALES_DISAGREE,
        message,
        "find out which is wrong; a pitch that was measured is stated in px/mm or um",
    )


def _dpi(pitch: Measured) -> str:
    return f"{pitch.value * INCH_MM:.4g}"


def _held_against(used: Scale, claimed: Scale) -> list[Finding]:
    """Compare a claim that nobody asked for; it is worth a word only when it differs."""
    if used.agrees_with(claimed):
        return []
    message = f"the file claims {_told(claimed)}, the {used.source} used says {_told(used)}"
    return [found(Flag.METADATA_DISAGREES, message)]


def _told(scale: Scale) -> str:
    return f"{scale.x.value:.5g} × {scale.y.value:.5g} px/mm"


def _no_scale(dpi: tuple[float, float] | None, *, use_metadata: bool) -> Finding:
    told = Flag.NO_SCALE.message
    if dpi is not None and (fault := metadata_fault(dpi)):
        told += f"; the file claims {fault}"
    elif dpi is not None:
        told += f"; the file claims {dpi[0]:.5g} × {dpi[1]:.5g} dpi, which was not asked for"
    elif use_metadata:
        told += "; the file claims no resolution"
    return found(Flag.NO_SCALE, told)


def _not_trusted(dpi: tuple[float, float] | None) -> Finding:
    told = "the file claims no resolution"
    if dpi is not None:
        told = f"the file claims {metadata_fault(dpi)}: it was not used"
    return found(Flag.METADATA_NOT_TRUSTED, told)


__all__ = ["ScaleChoice", "choose_scale"]
