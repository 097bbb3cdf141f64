"""Draws lots from the families of cloth and picture that are met in real life."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from imgcover.loom.cases import Case, Light, Reach, ordinary
from imgcover.loom.cloth import Fault
from imgcover.loom.noise import Rng
from imgcover.tone import SRGB


def random_case(rng: Rng, *, family: str = "ordinary", reach: Reach | None = None) -> Case:
    """Draw one case of a family.

    Raises
    ------
    ValueError
        When no family is called so.
    """
    if family not in FAMILIES:
        raise ValueError(f"family must be one of {', '.join(FAMILIES)}, got {family!r}")
    return FAMILIES[family](rng, ordinary(rng, family=family, reach=reach))


def _in_light(case: Case, light: Light) -> Case:
    """See the case in that light."""
    return replace(case, camera=replace(case.camera, light=light))


def _as_is(_: Rng, case: Case) -> Case:
    return case


def _reed(rng: Rng, case: Case) -> Case:
    """Two, three or four ends a dent, the dents apart."""
    size = int(rng.integers(2, 5))
    gap = float(rng.uniform(0.15, 0.6))
    return replace(case, cloth=replace(case.cloth, weave="plain", reed=size, reed_gap=gap))


def _two_colour(rng: Rng, case: Case) -> Case:
    """Dark ends under light picks, or the other way: the dots stand in quincunx."""
    dark, light = float(rng.uniform(0.08, 0.3)), float(rng.uniform(0.55, 0.85))
    if rng.random() < 0.5:
        dark, light = light, dark
    cloth = replace(
        case.cloth,
        weave="plain",
        end_lightness=(dark,),
        pick_lightness=(light,),
        end_diameter_mm=float(rng.uniform(0.8, 1.05)) / case.cloth.ends_per_mm,
        pick_diameter_mm=float(rng.uniform(0.8, 1.05)) / case.cloth.picks_per_mm,
    )
    return _in_light(replace(case, cloth=cloth), "reflected")


def _paired(rng: Rng, case: Case) -> Case:
    """Open canvas whose ends and picks lie in pairs."""
    gap = float(rng.uniform(0.2, 0.7))
    cloth = replace(
        case.cloth,
        weave="plain",
        reed=2,
        reed_gap=gap,
        paired_picks=2,
        pair_gap=float(rng.uniform(0.2, 0.7)),
        end_diameter_mm=float(rng.uniform(0.35, 0.65)) / case.cloth.ends_per_mm,
        pick_diameter_mm=float(rng.uniform(0.35, 0.65)) / case.cloth.picks_per_mm,
    )
    return replace(case, cloth=cloth)


def _woven(*names: str) -> Callable[[Rng, Case], Case]:
    """Take one of these weaves."""

    def family(rng: Rng, case: Case) -> Case:
        return replace(case, cloth=replace(case.cloth, weave=str(rng.choice(names))))

    return family


def _denim(rng: Rng, case: Case) -> Case:
    """Warp-faced twill, dark warp, light weft, warp closed: little but the diagonal shows."""
    cloth = replace(
        case.cloth,
        weave=str(rng.choice(["3/1 twill", "2/1 twill", "3/1 twill s"])),
        end_lightness=(float(rng.uniform(0.06, 0.2)),),
        pick_lightness=(float(rng.uniform(0.5, 0.8)),),
        picks_per_mm=case.cloth.ends_per_mm * float(rng.uniform(0.6, 0.8)),
        end_diameter_mm=float(rng.uniform(0.95, 1.15)) / case.cloth.ends_per_mm,
        float_cv=float(rng.uniform(0.1, 0.35)),
    )
    width = float(rng.uniform(0.8, 1.0)) / cloth.picks_per_mm
    return _in_light(replace(case, cloth=replace(cloth, pick_diameter_mm=width)), "reflected")


def _stripes(rng: Rng, case: Case) -> Case:
    """Coloured ends, many threads wide."""
    cloth = replace(case.cloth, end_lightness=_bands(rng))
    return _in_light(replace(case, cloth=cloth), "reflected")


def _checks(rng: Rng, case: Case) -> Case:
    """Coloured ends and picks, many threads wide."""
    cloth = replace(case.cloth, end_lightness=_bands(rng), pick_lightness=_bands(rng))
    return _in_light(replace(case, cloth=cloth), "reflected")


def _bands(rng: Rng) -> tuple[float, ...]:
    """Warp two or three colours, five to twelve threads of each."""
    shades: tuple[float, ...] = ()
    for shade in rng.permutation([0.15, 0.4, 0.75])[: int(rng.integers(2, 4))]:
        shades += (float(shade),) * int(rng.integers(5, 13))
    return shades


def _with_fault(*kinds: str) -> Callable[[Rng, Case], Case]:
    """Put one fault of these kinds somewhere in the middle half."""

    def family(rng: Rng, case: Case) -> Case:
        kind = str(rng.choice(kinds))
        scale = case.width / case.camera.px_per_mm
        size = {"slub": 0.3, "stain": 0.14, "crease": 0.03}.get(kind, 0.4) * scale
        strength = float(rng.uniform(1.6, 2.6) if kind == "slub" else rng.uniform(0.3, 0.7))
        x, y = (float(each) for each in rng.uniform(0.25, 0.75, 2))
        fault = Fault(kind, x, y, size * float(rng.uniform(0.7, 1.3)), strength)  # type: ignore[arg-type]
        return replace(case, cloth=replace(case.cloth, faults=(fault,)))

    return family


def _blurred_third(rng: Rng, case: Case) -> Case:
    """The swatch does not lie flat: its left third is out of focus."""
    blur = float(rng.uniform(0.3, 0.8)) * case.camera.px_per_mm / case.cloth.ends_per_mm
    return replace(case, camera=replace(case.camera, blurred_third=blur))


def _shadow(rng: Rng, case: Case) -> Case:
    """Something stands in the light of the right third."""
    return replace(case, camera=replace(case.camera, shadowed_third=float(rng.uniform(0.4, 0.8))))


def _bare(sides: int) -> Callable[[Rng, Case], Case]:
    """Show bare bed or light table on so many sides of the swatch."""

    def family(rng: Rng, case: Case) -> Case:
        margin = [0.0, 0.0, 0.0, 0.0]
        for side in rng.permutation(4)[:sides]:
            margin[side] = float(rng.uniform(0.1, 0.22))
        left, above, right, below = margin
        camera = replace(case.camera, margin=(left, above, right, below))
        grown = 1 / (1 - max(left + right, above + below))
        return replace(
            case, camera=camera, width=round(case.width * grown), height=round(case.height * grown)
        )

    return family


def _selvedge(rng: Rng, case: Case) -> Case:
    """The selvedge lies in the frame, bare bed or light beyond it."""
    width_mm = case.width / case.camera.px_per_mm
    camera = replace(case.camera, margin=(float(rng.uniform(0.05, 0.12)), 0.0, 0.0, 0.0))
    band = float(rng.uniform(0.08, 0.16)) * width_mm
    cloth = replace(
        case.cloth,
        selvedge_mm=band,
        weave="plain",
        end_diameter_mm=min(case.cloth.end_diameter_mm, 0.6 / case.cloth.ends_per_mm),
    )
    return replace(case, camera=camera, cloth=cloth, width=round(case.width * 1.25))


def _rotated(rng: Rng, case: Case) -> Case:
    """The swatch lies as it fell, but for the five degrees about 45 where warp is undecided."""
    turn = float(rng.uniform(-40, 40)) + (90.0 if rng.random() < 0.3 else 0.0)
    return replace(case, camera=replace(case.camera, rotation_deg=turn))


def _skewed(rng: Rng, case: Case) -> Case:
    """Picks up to 8 degrees off the right angle."""
    skew = float(rng.uniform(3, 8)) * float(rng.choice([-1, 1]))
    return replace(case, camera=replace(case.camera, skew_deg=skew))


def _bowed(rng: Rng, case: Case) -> Case:
    """Picks that sag by up to 3 % of the frame."""
    bow = float(rng.uniform(0.008, 0.03)) * float(rng.choice([-1, 1]))
    return replace(case, camera=replace(case.camera, bow=bow))


def _sharpened(rng: Rng, case: Case) -> Case:
    """A telephone's idea of a sharp picture."""
    return replace(case, camera=replace(case.camera, sharpening=float(rng.uniform(0.8, 2.0))))


def _jpeg(rng: Rng, case: Case) -> Case:
    """Stored as JPEG, hard enough to see the blocks."""
    camera = replace(case.camera, bits=8, jpeg=int(rng.integers(40, 90)))
    return replace(case, camera=replace(camera, tone=SRGB))


FAMILIES: dict[str, Callable[[Rng, Case], Case]] = {
    "ordinary": _as_is,
    "reed": _reed,
    "two-colour": _two_colour,
    "paired": _paired,
    "rib": _woven("2/2 warp rib", "2/2 weft rib", "3/3 warp rib"),
    "hopsack": _woven("2/2 hopsack", "3/3 hopsack"),
    "herringbone": _woven("2/2 herringbone"),
    "satin": _woven("5-end satin", "8-end satin", "5-end sateen"),
    "denim": _denim,
    "stripes": _stripes,
    "checks": _checks,
    "slub": _with_fault("slub"),
    "stain": _with_fault("stain"),
    "missing end": _with_fault("missing end", "broken end", "missing pick"),
    "crease": _with_fault("crease"),
    "blurred third": _blurred_third,
    "shadow": _shadow,
    "swatch edge": _bare(1),
    "selvedge": _selvedge,
    "bare bed": _bare(4),
    "rotated": _rotated,
    "skewed": _skewed,
    "bowed": _bowed,
    "sharpened": _sharpened,
    "jpeg": _jpeg,
}
"""What goods-in meets, each made from the ordinary case."""

__all__ = ["FAMILIES", "random_case"]
