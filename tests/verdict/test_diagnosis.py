"""What a diagnosis says of particular deliveries.

Truth is theory: every cloth is built from the declared one by arithmetic, without noise.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from verdict_sheets import sheet

from imgcover.cloth.construction import construction_of
from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import predict
from imgcover.quantity import Measured
from imgcover.verdict.cause import Cause
from imgcover.verdict.departure import SEEN, Departure, expected
from imgcover.verdict.diagnosis import diagnose
from imgcover.verdict.evidence import evidence_of
from imgcover.verdict.observed import Observed
from imgcover.verdict.other_cloth import causes_in_cloth
from imgcover.verdict.sheet import sheet_of
from imgcover.verdict.slips import slips
from imgcover.verdict.verdict import Suspect
from imgcover.verdict.weighing import NOTHING_FITS

DECLARED = sheet('[tolerance]\nends = "2 %"\npicks = "2 %"')


def seen_of(
    declaration: Declaration,
    *,
    ends: float = 1.0,
    picks: float = 1.0,
    warp_width: float = 1.0,
    weft_width: float = 1.0,
    mass: float = 1.0,
    parts: str = "all",
) -> Observed:
    """The declared cloth with its figures multiplied; `parts` names what was looked at."""
    prediction = predict(declaration)
    warp = prediction.warp.value * warp_width
    weft = prediction.weft.value * weft_width
    whole = Observed(
        ends=Measured(declaration.warp.threads.per_cm * ends, 0.06, "1/cm"),
        picks=Measured(declaration.weft.threads.per_cm * picks, 0.05, "1/cm"),
        warp_cover=Measured(warp, 0.01, "1"),
        weft_cover=Measured(weft, 0.01, "1"),
        cover=Measured(1 - (1 - warp) * (1 - weft), 0.005, "1"),
        gsm=Measured(prediction.mass.value * mass, 0.5, "g/m2"),
        conditioned=True,
    )
    if parts == "all":
        return whole
    absent = {"setts": ("warp_cover", "weft_cover", "cover", "gsm"), "no mass": ("gsm",)}[parts]
    return replace(whole, **dict.fromkeys(absent))


def diagnosed(observed: Observed, declaration: Declaration = DECLARED) -> tuple[Suspect, ...]:
    return diagnose(sheet_of(declaration), evidence_of(observed))


def test_the_declared_cloth_is_accused_of_nothing() -> None:
    assert diagnosed(seen_of(DECLARED)) == ()
    assert diagnosed(Observed()) == ()


def test_a_sett_anywhere_in_its_tolerance_is_accused_of_nothing() -> None:
    for ends in (0.98, 1.02):
        assert diagnosed(seen_of(DECLARED, ends=ends, parts="setts")) == ()


def test_the_numbers_for_and_against_are_named() -> None:
    """Picks 10 % short: the weft covers less and the cloth weighs less, and both are said."""
    short = seen_of(DECLARED, picks=0.9, weft_width=0.9, mass=0.954)
    best = diagnosed(short)[0]
    assert best.cause == "picks short"
    assert any("picks 22.500 a cm" in each and "25.000" in each for each in best.speaks_for)
    assert any("% fewer picks than declared" in each for each in best.speaks_for)
    assert best.speaks_against == ()
    assert "glass" in best.settle


def test_a_mass_tells_flatter_from_coarser() -> None:
    wider = {"warp_width": 1.25, "weft_width": 1.25}
    flat = diagnosed(seen_of(DECLARED, **wider))
    coarse = diagnosed(seen_of(DECLARED, **wider, mass=1.25**2))
    assert flat[0].cause == "yarn flattened in finishing"
    assert flat[0].tied_with == ()
    assert coarse[0].cause == "warp and weft yarns coarser than declared"


def test_without_a_mass_flatter_and_coarser_are_a_tie() -> None:
    flat = diagnosed(seen_of(DECLARED, warp_width=1.25, weft_width=1.25, parts="no mass"))
    together = {flat[0].cause, *flat[0].tied_with}
    assert {"yarn flattened in finishing", "warp and weft yarns coarser than declared"} <= together


def test_from_the_setts_alone_equal_shrinkage_and_a_wrong_scale_are_a_tie() -> None:
    grey = sheet(
        '[tolerance]\nends = "2 %"\npicks = "2 %"',
        instead=('state = "finished"', 'state = "grey"'),
    )
    both = diagnosed(seen_of(grey, ends=1.05, picks=1.05, parts="setts"), grey)
    together = {both[0].cause, *both[0].tied_with}
    assert "both densities off by one factor (scale)" in together
    assert "grey declared, finished delivered: shrinkage both ways" in together


def test_cover_tells_a_misread_count_from_a_denser_cloth() -> None:
    misread = diagnosed(seen_of(DECLARED, picks=2.0))
    denser = diagnosed(seen_of(DECLARED, picks=2.0, weft_width=2.0, mass=1.454))
    assert misread[0].cause == "threads in pairs: picks"
    assert denser[0].cause == "picks inserted together declared as one"


def test_a_repeat_of_another_weave_accuses_the_weave() -> None:
    twill = replace(seen_of(DECLARED), repeat=(3, 3))
    best = diagnosed(twill)[0]
    assert best.cause == "wrong weave"
    assert any("3 × 3" in each and "2 × 2" in each for each in best.speaks_for)


@pytest.mark.parametrize("repeat", [(1, 1), (2, 1), (2, 2), (12, 2)])
def test_a_part_or_a_multiple_of_the_repeat_accuses_nothing(repeat: tuple[int, int]) -> None:
    """A backlit plain cloth may show no repeat at all, and stripes show a longer one."""
    assert diagnosed(replace(seen_of(DECLARED), repeat=repeat)) == ()


def test_a_forked_reading_accuses_pairs_and_names_both_readings() -> None:
    forked = replace(seen_of(DECLARED), ends=None, ends_forks=(30.0, 15.0))
    best = diagnosed(forked)[0]
    assert best.cause == "threads in pairs: ends"
    assert "the ends could be read as 30 or 15 a cm" in best.speaks_for


def test_two_things_wrong_at_once_fit_nothing() -> None:
    """Ends a fifth short while picks are an eighth over: no one cause does that."""
    both = seen_of(DECLARED, ends=0.8, picks=1.12, warp_width=0.8, weft_width=1.12, mass=0.95)
    best = diagnosed(both)[0]
    assert best.cause == NOTHING_FITS
    assert best.tied_with == ()
    assert "dissected" in best.settle


def test_an_approved_swatch_takes_the_models_place() -> None:
    """Cloth flattened beyond the model conforms to a swatch that was as flat."""
    seen = seen_of(DECLARED, warp_width=1.2, weft_width=1.2, parts="no mass")
    assert seen.cover is not None
    assert diagnosed(seen) != ()
    approved = sheet(
        '[tolerance]\nends = "2 %"\npicks = "2 %"',
        f'[reference]\noptical_cover = "{seen.cover.value:.4f} u 0.005"',
    )
    assert diagnosed(seen, approved) == ()
    finer = replace(seen, cover=Measured(seen.cover.value - 0.08, 0.005, "1"))
    accused = diagnosed(replace(finer, warp_cover=None, weft_cover=None), approved)
    assert any("the approved swatch" in each for each in accused[0].speaks_for)


def test_wording_indicates_and_names_checks() -> None:
    """No cause claims more than it may: none says proved, and each can be settled."""
    listed: list[Cause] = [*causes_in_cloth(sheet_of(DECLARED)), *slips(sheet_of(DECLARED))]
    for cause in listed:
        assert cause.settle
        assert not {"prove", "fraud", "certain"} & set(f"{cause.name} {cause.takes}".split())
        assert np.sum(cause.weights) == pytest.approx(1.0)
        assert 0 < cause.prior <= 1
    assert len({cause.name for cause in listed}) == len(listed)


@pytest.mark.parametrize(
    "departure",
    [
        Departure(),
        Departure(ends=np.array([0.9]), warp_tex=np.array([1.3])),
        Departure(picks=np.array([1.1]), width=np.array([1.2]), weft_length=np.array([1.05])),
        Departure(turned=np.ones(1)),
    ],
)
def test_the_closed_form_is_the_cloth_rooms_prediction(departure: Departure) -> None:
    """Truth is a referee: the prediction of imgcover.cloth for a construction changed likewise."""
    means, _ = expected(sheet_of(DECLARED), departure)
    cloth = construction_of(DECLARED)

    def at(values: np.ndarray) -> float:
        return float(values[0])

    warp, weft = (
        replace(
            threads,
            sett=replace(threads.sett, per_mm=threads.sett.per_mm * density),
            count=replace(threads.count, tex=threads.count.tex * tex),
            crimp=replace(threads.crimp, value=(1 + threads.crimp.value) * length - 1),
        )
        for threads, density, tex, length in (
            (cloth.warp, at(departure.ends), at(departure.warp_tex), at(departure.warp_length)),
            (cloth.weft, at(departure.picks), at(departure.weft_tex), at(departure.weft_length)),
        )
    )
    changed = replace(cloth, warp=warp, weft=weft)
    k1, k2 = (t.fraction({}) * at(departure.width) for t in (warp, weft))
    seen = [warp.sett.per_cm, weft.sett.per_cm, k1, k2, 1 - (1 - k1) * (1 - k2), changed.mass({})]
    if departure.turned[0]:
        seen = [seen[1], seen[0], seen[3], seen[2], *seen[4:]]
    assert dict(zip(SEEN, means[0], strict=True)) == pytest.approx(
        dict(zip(SEEN, seen, strict=True))
    )
