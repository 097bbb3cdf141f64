"""What scale does a certificate give a picture, and does the certificate still hold?"""

from __future__ import annotations

import math
from dataclasses import dataclass
from datetime import date
from enum import StrEnum

from imgcover.findings import Finding, Flag, found
from imgcover.quantity import Measured
from imgcover.scale.certificate import Certificate
from imgcover.scale.scale import Scale, ScaleSource
from imgcover.scale.sheet_device import DeviceReading

SAME_RESOLUTION = 0.01
"""Relative difference up to which two stated resolutions are one: files round them."""
U_OTHER_RESOLUTION = 0.01 / math.sqrt(3)
"""Relative standard uncertainty of a pitch carried over to another resolution of the device: a
carriage may step differently there, by as much as two axes differ."""
HOLDS_WITHIN, FAILS_BEYOND = 2.0, 3.0
"""Standard uncertainties of the difference between check and certificate."""
AXES = ("x", "y")
TOO_WEAK = 0.005
"""Relative standard uncertainty of that difference above which a check says nothing."""


def scale_from_certificate(
    certificate: Certificate,
    *,
    dpi: tuple[float, float] | None,
    swapped: bool | None,
    on: date,
) -> Scale:
    """Make a picture's scale of its device's certificate.

    Parameters
    ----------
    certificate : Certificate
    dpi : (float, float) or None
        What the file claims, along the shown axes (`Picture.dpi`).
    swapped : bool or None
        Whether stored columns became shown rows; None where that cannot be told, as of a picture
        that a program turned: then both axes get the mean, with half their difference in u.
    on : date
        The day for which the certificate must be valid.

    Returns
    -------
    Scale
        With findings where the certificate has expired or was made at another resolution: they
        leave every decision undecided.
    """
    findings = []
    x, y, ratio_u = certificate.x, certificate.y, certificate.ratio_u
    if swapped is None:
        x, y, ratio_u = _mean(x, y)
        findings.append(found(Flag.CERTIFICATE_AXES_UNKNOWN))
    elif swapped:
        x, y = y, x
    nominal = certificate.resolution_dpi[::-1] if swapped else certificate.resolution_dpi
    if not certificate.made <= on <= certificate.valid_until:
        findings.append(_expired(certificate))
    if dpi is None:
        findings.append(found(Flag.CERTIFICATE_RESOLUTION_UNCHECKED))
    else:
        ratios = [claimed / known for claimed, known in zip(dpi, nominal, strict=True)]
        if max(abs(each - 1) for each in ratios) > SAME_RESOLUTION:
            x, y = _carried(x, ratios[0]), _carried(y, ratios[1])
            ratio_u = math.hypot(ratio_u, U_OTHER_RESOLUTION)
            findings.append(_other_resolution(nominal, dpi))
    return Scale(x, y, ratio_u, ScaleSource.CERTIFICATE, findings=tuple(findings))


def _mean(x: Measured, y: Measured) -> tuple[Measured, Measured, float]:
    middle, half = (x.value + y.value) / 2, abs(x.value - y.value) / 2
    both = Measured(middle, math.hypot(max(x.u, y.u), half), "px/mm")
    return both, both, 2 * half / middle


def _carried(pitch: Measured, ratio: float) -> Measured:
    u = math.hypot(pitch.u / pitch.value, U_OTHER_RESOLUTION)
    return Measured(pitch.value * ratio, pitch.value * ratio * u, "px/mm")


def _expired(certificate: Certificate) -> Finding:
    # the day of measuring is left out: a record must not change from one day to the next
    message = (
        f"the certificate of {certificate.name} was used out of its time: it is valid from "
        f"{certificate.made} to {certificate.valid_until}"
    )
    return found(Flag.CERTIFICATE_EXPIRED, message)


def _other_resolution(nominal: tuple[float, ...], dpi: tuple[float, float]) -> Finding:
    message = (
        f"the certificate was made at {nominal[0]:g} × {nominal[1]:g} dpi, the file claims "
        f"{dpi[0]:g} × {dpi[1]:g}: its pitch was carried over"
    )
    return found(Flag.CERTIFICATE_OTHER_RESOLUTION, message)


class Holding(StrEnum):
    """Whether a certificate still holds."""

    HOLDS = "holds"
    FAILS = "no longer holds"
    OPEN = "undecided"


@dataclass(frozen=True, slots=True)
class CertificateCheck:
    """A check's decision, and one sentence for each axis."""

    decision: Holding
    reasons: tuple[str, ...]


def check_certificate(
    certificate: Certificate, reading: DeviceReading, *, same_sheet: bool, on: date
) -> CertificateCheck:
    """Hold a new reading of the sheet against a certificate.

    Parameters
    ----------
    certificate : Certificate
    reading : DeviceReading
        From new scans at the certificate's resolution.
    same_sheet : bool
        Whether it was read with the certificate's own sheet, its errors known from turned scans:
        what its bars leave uncertain is then common to both and does not count.
    on : date
        An expired certificate is undecided at best.

    Returns
    -------
    CertificateCheck
        Holds when both axes agree within twice the uncertainty of the difference, no longer
        holds when one is off by more than three times; between, and where the check is too weak
        to see half a per cent, undecided.
    """
    outcomes, reasons = [], []
    pairs = ((certificate.x, reading.x), (certificate.y, reading.y))
    for index, (old, new) in enumerate(pairs):
        difference = new.value / old.value - 1
        u = math.hypot(old.u / old.value, new.u / new.value)
        if same_sheet:
            u = math.hypot(certificate.u_own[index], reading.u_own[index])
        if u > TOO_WEAK:
            outcomes.append(Holding.OPEN)
        elif abs(difference) <= HOLDS_WITHIN * u:
            outcomes.append(Holding.HOLDS)
        else:
            far = abs(difference) > FAILS_BEYOND * u
            outcomes.append(Holding.FAILS if far else Holding.OPEN)
        reasons.append(
            f"{AXES[index]}: {new.value:.5g} px/mm against {old.value:.5g}, "
            f"{100 * difference:+.3f} % where {100 * HOLDS_WITHIN * u:.3f} % is uncertain: "
            f"{outcomes[-1]}"
        )
    if Holding.FAILS in outcomes:
        return CertificateCheck(Holding.FAILS, tuple(reasons))
    if not certificate.made <= on <= certificate.valid_until:
        outcomes.append(Holding.OPEN)
        reasons.append(f"valid from {certificate.made} to {certificate.valid_until}: not on {on}")
    decision = Holding.OPEN if Holding.OPEN in outcomes else Holding.HOLDS
    return CertificateCheck(decision, tuple(reasons))


__all__ = ["CertificateCheck", "Holding", "check_certificate", "scale_from_certificate"]
