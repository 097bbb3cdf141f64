"""What can this device tell about this article, and what does it take to prove it?"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import UTC, datetime

from imgcover.asking import certificate
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import predict
from imgcover.errors import OptionError
from imgcover.plan.proof import BETWEEN_PLACES, MOST_SPENT, Proof, Room, proof, room_of
from imgcover.plan.sight import FLATBED_DETAIL_MM, Resolution, Sight, resolution_for, sight
from imgcover.plan.trial import FieldError, Told, Trial, try_out
from imgcover.quantity import Measured
from imgcover.request import read_options
from imgcover.scale.certificate_use import scale_from_certificate
from imgcover.scale.pitch import INCH_MM, parse_pitch, scale_from
from imgcover.scale.scale import Scale
from imgcover.verdict.aims import aims
from imgcover.verdict.decision import guard_band
from imgcover.verdict.line import Aim, Basis, Quantity


@dataclass(frozen=True, slots=True)
class SystemPlan:
    """What is planned for ends or picks.

    Parameters
    ----------
    per_mm : float
        As declared.
    sight : Sight
    told : Told or None
        As read of drawn pictures; None where the threads are too fine for one to be drawn.
    room : Room or None
        Relative; None without a tolerance.
    proof : Proof or None
        None where they could not be counted.
    """

    per_mm: float
    sight: Sight
    told: Told | None
    room: Room | None
    proof: Proof | None


@dataclass(frozen=True, slots=True)
class CoverPlan:
    """What is planned for the cover; fractions.

    Parameters
    ----------
    told : Told or None
        As read of drawn pictures.
    expected : Measured
        What the declared construction leads to.
    basis : Basis or None
        What it would be held against; None where there is nothing.
    room : Room or None
        None without a tolerance.
    u : float or None
        Of the reading and what it is held against together.
    guard : float or None
        The guard band of that.
    """

    told: Told | None
    expected: Measured
    basis: Basis | None
    room: Room | None
    u: float | None
    guard: float | None

    @property
    def possible(self) -> bool | None:
        """Whether any cloth could be proved to conform; None where nothing is judged."""
        if self.room is None or self.guard is None:
            return None
        return self.guard < self.room.nearest

    @property
    def ample(self) -> bool | None:
        """Whether the guard band leaves half of the tolerance; None where nothing is judged."""
        if self.room is None or self.guard is None:
            return None
        return self.guard <= MOST_SPENT * self.room.nearest


@dataclass(frozen=True, slots=True)
class Plan:
    """What a device can tell about an article.

    Parameters
    ----------
    declaration : Declaration
    scale : Scale
        That pictures of the device will have.
    detail_mm : float
        Smallest detail that the device shows.
    resolution : Resolution
        What the threads need.
    ends, picks : SystemPlan
    cover : CoverPlan
    pictures : int
        How many were drawn and read.
    between : float
        Relative standard deviation between places that was assumed.
    """

    declaration: Declaration
    scale: Scale
    detail_mm: float
    resolution: Resolution
    ends: SystemPlan
    picks: SystemPlan
    cover: CoverPlan
    pictures: int
    between: float

    @property
    def places(self) -> int | None:
        """Places of a lot that both systems ask for; None where no number will do."""
        asked = [each.proof.places for each in (self.ends, self.picks) if each.proof is not None]
        known = [each for each in asked if each is not None]
        return max(known) if len(known) == len(asked) == 2 else None


def plan(
    declaration: Declaration,
    scale: Scale,
    *,
    detail_mm: float = FLATBED_DETAIL_MM,
    between: float = BETWEEN_PLACES,
    risk: float | None = None,
) -> Plan:
    """Plan how an article is to be measured.

    Parameters
    ----------
    declaration : Declaration
    scale : Scale
        Of the pictures to come (`scale_for`).
    detail_mm : float
        Smallest detail that the device shows.
    between : float
        Relative standard deviation of a density between places of a lot.
    risk : float or None
        Largest probability of a wrong decision; None takes the guard band U = 2 u.
    """
    setts = [declaration.warp.threads.per_mm, declaration.weft.threads.per_mm]
    # the swatch may lie either way round: the coarser axis must do for both systems
    px_per_mm = min(scale.x.value, scale.y.value)
    seen = [sight(each, px_per_mm, detail_mm=detail_mm) for each in setts]
    # threads too fine to be counted fold over in a drawing as they do in a scan
    trial = None
    if all(each.counted for each in seen):
        trial = try_out(declaration, px_per_mm, detail_mm=detail_mm)
    aimed = aims(declaration, predict(declaration))
    scale_u = max(each.u / each.value for each in (scale.x, scale.y))
    systems = []
    for quantity, per_mm, each in zip((Quantity.ENDS, Quantity.PICKS), setts, seen, strict=True):
        aim = aimed[quantity]
        room = room_of(aim.limits, aim.value.value, relative=True)
        told, error = _of_trial(trial, quantity)
        proved = None
        if error is not None and told is not None and told.right:
            proved = proof(
                per_mm, error=error, scale_u=scale_u, room=room, between=between, risk=risk
            )
        systems.append(SystemPlan(per_mm, each, told, room, proved))
    return Plan(
        declaration,
        scale,
        detail_mm,
        resolution_for(max(setts), detail_mm=detail_mm),
        systems[0],
        systems[1],
        _cover_plan(declaration, trial, aimed.get(Quantity.COVER), risk),
        0 if trial is None else trial.pictures,
        between,
    )


def scale_for(
    declaration: Declaration, words: Mapping[str, str], *, detail_mm: float = FLATBED_DETAIL_MM
) -> Scale:
    """Find the scale that pictures of a device will have.

    Parameters
    ----------
    declaration : Declaration
        Where nothing is said of the device, its threads choose the resolution.
    words : mapping of str to str
        The options device, pitch, pitch-y and pitch-u, as `imgcover.request.read_options` takes
        them. A pitch beside a device is the resolution at which it will be used.
    detail_mm : float
        As in `plan`.

    Raises
    ------
    OptionError, ScaleError, CertificateError
        When an option says something impossible, or no flatbed shows threads so fine.
    """
    options = read_options(words)
    held = certificate(options.device)
    if held is not None:
        dpi = held.resolution_dpi
        if options.pitch is not None:
            x, y = options.pitch, options.pitch_y or options.pitch
            dpi = (x.px_per_mm * INCH_MM, y.px_per_mm * INCH_MM)
        return scale_from_certificate(held, dpi=dpi, swapped=False, on=datetime.now(UTC).date())
    if options.pitch is not None:
        return scale_from(options.pitch, options.pitch_y, pitch_u=options.pitch_u)
    finest = max(declaration.warp.threads.per_mm, declaration.weft.threads.per_mm)
    usual = resolution_for(finest, detail_mm=detail_mm).usual
    if usual is None:
        raise OptionError(
            "--pitch",
            f"no flatbed shows {10 * finest:.4g} threads a centimetre",
            "name the pitch of a finer device, such as --pitch 5um with --detail 8um",
        )
    return scale_from(parse_pitch(f"{usual}dpi"))


def _of_trial(trial: Trial | None, quantity: Quantity) -> tuple[Told | None, FieldError | None]:
    if trial is None:
        return None, None
    if quantity is Quantity.ENDS:
        return trial.ends, trial.ends_error
    return trial.picks, trial.picks_error


def _cover_plan(
    declaration: Declaration, trial: Trial | None, aim: Aim | None, risk: float | None
) -> CoverPlan:
    told = None if trial is None else trial.cover
    expected = predict(declaration).cover
    room = None if aim is None else room_of(aim.limits, aim.value.value, relative=False)
    u = guard = None
    if told is not None and told.right and told.u is not None:
        u = math.hypot(told.u, 0.0 if aim is None else aim.value.u)
        guard = guard_band(u, risk=risk, width=math.inf if room is None else room.width)
    return CoverPlan(told, expected, None if aim is None else aim.basis, room, u, guard)


__all__ = ["CoverPlan", "Plan", "SystemPlan", "plan", "scale_for"]
