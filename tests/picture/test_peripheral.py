"""What the peripheral view leaves of gratings: against the published acuity line, in real frames' pixels."""

from __future__ import annotations

import numpy as np
import pytest

from render.frames import quat_rotate
from render.picture.camera import Camera, quat_from_axes
from render.picture.panini import Panini
from render.picture.peripheral import Peripheral, patch_px

SIZE = (640, 360)
LEVEL = quat_from_axes(np.array([[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [1.0, 0.0, 0.0]]))


def grating(period_px: float) -> np.ndarray:
    """Upright bars, grey 128 +- 100."""
    wave = 128.0 + 100.0 * np.sin(2.0 * np.pi * (np.arange(SIZE[0]) + 0.5) / period_px)
    return np.repeat(np.tile(np.round(wave).astype(np.uint8)[None, :, None], (SIZE[1], 1, 1)), 3, axis=2)


def left_of(period_px: float, patch: float) -> float:
    """Part of a grating's contrast that is left by patches of one width."""
    frame = Peripheral(SIZE).blur(grating(period_px), np.full((SIZE[1], SIZE[0]), patch, np.float32))
    row = frame[180, 100:540, 1].astype(float)
    return float(row.max() - row.min()) / 200.0


@pytest.mark.parametrize("patch", [3.0, 6.0, 13.0, 24.0])
def test_bars_of_one_mar_are_all_but_gone_and_of_five_stay(patch: float) -> None:
    # MAR is the width of the finest bars that are just resolved at full contrast; what is finer must not be seen
    assert left_of(2.0 * patch, patch) == pytest.approx(1 / 3, abs=0.05)
    assert patch < 6.0 or left_of(1.2 * patch, patch) < 0.15  # finer ones than 4 px are cut by the pixels themselves
    assert left_of(4.0 * patch, patch) == pytest.approx(2 / 3, abs=0.05)
    assert left_of(10.0 * patch, patch) > 0.9


def test_below_a_pixel_nothing_changes() -> None:
    frame = grating(5.0)
    assert np.array_equal(Peripheral(SIZE).blur(frame, np.full((SIZE[1], SIZE[0]), 0.9, np.float32)), frame)


def test_patches_follow_the_acuity_line() -> None:
    camera = Camera(np.zeros(3), LEVEL, np.radians(75.0), *SIZE)
    patch = patch_px(camera, np.array([1.0, 0.0, 0.0]))
    # at the gaze 1 arcmin, here a tenth of a pixel: sharp
    assert patch[180, 320] < 0.3
    # 30 deg off: (1 + 1.5 x 30) arcmin; a pixel there covers cos^1.5 less angle across and along together
    x = int(320 + camera.focal_px * np.tan(np.radians(30.0)))
    expected = np.radians(46.0 / 60.0) * camera.focal_px / np.cos(np.radians(30.0)) ** 1.5
    assert patch[180, x] == pytest.approx(expected, rel=0.02)


def test_patches_of_a_wide_picture_are_those_of_its_own_directions() -> None:
    wide = Panini(np.radians(120.0), SIZE)
    camera = Camera(np.zeros(3), LEVEL, np.radians(120.0), *SIZE)
    phi = np.radians(50.0)
    ray = quat_rotate(LEVEL, np.array([np.sin(phi), 0.0, np.cos(phi)]))
    x, y = wide.project(camera, ray).astype(int)
    patch = patch_px(camera, np.array([1.0, 0.0, 0.0]), wide)
    stretch = 2.0 / (1.0 + np.cos(phi))  # pixels a radian against the middle: S across and S along at d = 1
    assert patch[y, x] == pytest.approx(np.radians(76.0 / 60.0) * wide.focal_px * stretch, rel=0.02)
