"""Draws the cloth that a declaration describes, or one that departs from it."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np

from imgcover.cloth.declaration import Declaration
from imgcover.cloth.prediction import predict
from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import Drawn, draw

SIDE = 1200
"""Pixels of a picture's side where none is asked for: over sixty threads at 17 px a thread."""


@dataclass(frozen=True, slots=True)
class Departure:
    """How the cloth on the table differs from the cloth on the paper: factors, 1 where it agrees.

    Parameters
    ----------
    ends, picks : float
        Of the threads per length.
    warp_tex, weft_tex : float
        Of the yarn's mass per length; its diameter follows by the square root.
    """

    ends: float = 1.0
    picks: float = 1.0
    warp_tex: float = 1.0
    weft_tex: float = 1.0

    def __post_init__(self) -> None:
        for each in fields(self):
            if not 0.2 <= getattr(self, each.name) <= 5:
                raise ValueError(
                    f"{each.name} must lie between 0.2 and 5, got {getattr(self, each.name)}"
                )


def article_cloth(declaration: Declaration, departure: Departure | None = None) -> ClothSpec:
    """Turn a declaration into a cloth to draw: sett, predicted yarn width, and weave.

    Where no weave is declared the cloth is plain.
    """
    departs = departure or Departure()
    predicted = predict(declaration)
    return ClothSpec(
        ends_per_mm=declaration.warp.threads.per_mm * departs.ends,
        picks_per_mm=declaration.weft.threads.per_mm * departs.picks,
        end_diameter_mm=predicted.ends.width.value * departs.warp_tex**0.5,
        pick_diameter_mm=predicted.picks.width.value * departs.weft_tex**0.5,
        weave=declaration.article.weave or "plain",
    )


def draw_article(
    declaration: Declaration,
    camera: CameraSpec,
    *,
    seed: int,
    width: int = SIDE,
    height: int = SIDE,
    departure: Departure | None = None,
    look: dict[str, object] | None = None,
) -> Drawn:
    """Draw an article before a camera.

    Parameters
    ----------
    seed : int
        Same seed, same picture.
    width, height : int
        Pixels.
    departure : Departure or None
        How the cloth differs from its declaration.
    look : dict or None
        Other fields of `ClothSpec`, by name: colours, unevenness, faults.

    Raises
    ------
    ValueError
        When a field of `look` is impossible.
    """
    cloth = replace(article_cloth(declaration, departure), **(look or {}))  # type: ignore[arg-type]
    return draw(cloth, camera, width, height, np.random.default_rng(seed))


__all__ = ["SIDE", "Departure", "article_cloth", "draw_article"]
