"""Traces of having been stored with losses: found on whatever file, and nowhere else."""

from __future__ import annotations

from functools import cache
from typing import Any

import cv2
import numpy as np
import pytest
from numpy.typing import NDArray

from imgcover.loom.camera import CameraSpec
from imgcover.loom.cloth import ClothSpec
from imgcover.loom.drawing import draw
from imgcover.picture.losses import step_of_losses

Stored = NDArray[Any]


@cache
def drawn(light: str = "backlit", colour: bool = False) -> Stored:
    cloth = ClothSpec(1.8, 1.6, 0.3, 0.3)
    camera = CameraSpec(20.0, light=light, colour=colour, blur_px=0.8)
    return draw(cloth, camera, 300, 320, np.random.default_rng(8)).stored


def through_jpeg(stored: Stored, quality: int) -> Stored:
    packed = cv2.imencode(".jpg", stored, [cv2.IMWRITE_JPEG_QUALITY, quality])[1]
    return np.asarray(cv2.imdecode(packed, cv2.IMREAD_UNCHANGED))


@pytest.mark.parametrize("light, colour", [("backlit", False), ("reflected", True)])
def test_what_never_lost_shows_no_trace(light, colour):
    """Truth is drawn: loom, seed 8, grey and in colour."""
    assert step_of_losses(drawn(light, colour)) == 0


@pytest.mark.parametrize("quality, step", [(90, 2), (85, 4), (75, 6), (60, 9)])
def test_the_step_is_that_of_the_tables(quality, step):
    """Truth is published: ITU-T T.81, table K.1, scaled as usual; its low frequencies differ."""
    assert step_of_losses(through_jpeg(drawn(), quality)) == pytest.approx(step, abs=1)


def test_colour_cut_and_turned_pictures_keep_the_trace():
    """Truth is symmetry: the blocks only begin elsewhere."""
    red_first = drawn(colour=True)
    lossy = np.ascontiguousarray(through_jpeg(red_first[..., ::-1], 85)[..., ::-1])
    grey = through_jpeg(drawn(), 85)
    for picture in (lossy, lossy[3:, 5:], np.rot90(lossy), grey[:, ::-1], grey[6:-3, 1:]):
        assert step_of_losses(np.ascontiguousarray(picture)) == pytest.approx(4, abs=1)


def test_drawings_that_repeat_with_the_blocks_show_no_trace():
    """Truth is the contract: every block alike lies near some multiple of some step."""
    for pitch in (4, 8, 16, 12):
        wave = 110 + 90 * np.cos(2 * np.pi * np.arange(320) / pitch)
        grid = np.round((wave[:, None] + wave[None, :]) / 2).astype(np.uint8)
        assert step_of_losses(grid) == 0
        assert step_of_losses(np.where(grid > 110, 255, 0).astype(np.uint8)) == 0


def test_flat_small_and_deep_pictures_tell_nothing():
    """Truth is the contract: 0 where too little is seen."""
    assert step_of_losses(np.full((200, 200), 128, np.uint8)) == 0
    assert step_of_losses(drawn()[:12, :200]) == 0
    assert step_of_losses(drawn().astype(np.uint16) * 257) == 0
