"""The ground shadow against closed forms."""

from __future__ import annotations

import numpy as np
import pytest

from render.frames import quat_from_euler
from render.picture.shadow import SUN_RADIUS_RAD, Shadow, cast_samples
from render.picture.shapes import build_shape
from tests.picture.airframes_made import airframe

OVERHEAD = np.array([0.0, 0.0, -1.0])
LEVEL = quat_from_euler(0.0, 0.0, 0.0)


def sun_at(bearing_deg: float, elevation_deg: float) -> np.ndarray:
    a, e = np.radians([bearing_deg, elevation_deg])
    return np.array([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), -np.sin(e)])


@pytest.fixture(scope="module")
def samples() -> np.ndarray:
    return cast_samples(build_shape(airframe("jet")).parts)


def ball(radius_m: float, count: int = 6000) -> np.ndarray:
    """Points spread over a ball: its shadow's middle and outline are known exactly."""
    k = np.arange(count) + 0.5
    polar, turn = np.arccos(1 - 2 * k / count), np.pi * (1 + 5**0.5) * k
    return radius_m * np.stack([np.cos(turn) * np.sin(polar), np.sin(turn) * np.sin(polar), np.cos(polar)], -1)


def middle_and_alpha(shadow: Shadow) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    points = np.asarray(shadow.mesh.points, float)  # east, north, up
    alpha = shadow.mesh.point_data["colour"][:, 3].astype(float)
    return (points * alpha[:, None]).sum(axis=0) / alpha.sum(), points, alpha


@pytest.mark.parametrize("bearing_deg", [0.0, 70.0, 210.0])
@pytest.mark.parametrize("elevation_deg", [25.0, 45.0, 80.0])
def test_shadow_lies_where_the_sun_says(bearing_deg: float, elevation_deg: float) -> None:
    # Closed form: h / tan(elevation) away from the point below, on the side opposite to the sun.
    shadow, height, ground = Shadow(ball(3.0)), 60.0, 12.0
    assert shadow.update(np.array([100.0, -40.0, -height - ground]), LEVEL, sun_at(bearing_deg, elevation_deg), ground)
    away = height / np.tan(np.radians(elevation_deg))
    middle, _, _ = middle_and_alpha(shadow)
    north = 100.0 - away * np.cos(np.radians(bearing_deg))
    east = -40.0 - away * np.sin(np.radians(bearing_deg))
    assert middle == pytest.approx([east, north, ground + 0.05], abs=0.05)


def test_a_ball_throws_an_ellipse_longer_by_the_sine_of_the_elevation() -> None:
    # Closed form: a ball's shadow has half axes r and r / sin(elevation), so area pi r^2 / sin(elevation).
    shadow, elevation_deg = Shadow(ball(3.0), darkness=1.0), 30.0
    shadow.update(np.array([0.0, 0.0, -20.0]), LEVEL, sun_at(0.0, elevation_deg), 0.0)
    _, points, alpha = middle_and_alpha(shadow)
    core = points[alpha > 127]
    core = core - core.mean(axis=0)
    assert np.abs(core[:, 0]).max() == pytest.approx(3.0, abs=0.15)
    assert np.abs(core[:, 1]).max() == pytest.approx(3.0 / np.sin(np.radians(elevation_deg)), abs=0.3)


def test_size_is_kept_under_an_overhead_sun(samples: np.ndarray) -> None:
    frame = airframe("jet")
    shadow = Shadow(samples, darkness=1.0)
    shadow.update(np.array([0.0, 0.0, -30.0]), LEVEL, OVERHEAD, 0.0)
    _, points, alpha = middle_and_alpha(shadow)
    dark = points[alpha > 60]
    assert np.ptp(dark[:, 0]) == pytest.approx(frame.wing_span_m, abs=0.45)
    assert np.ptp(dark[:, 1]) == pytest.approx(frame.length_m, abs=0.45)
    # Heading north, the nose's end of the shadow is the northern one.
    assert dark[:, 1].max() == pytest.approx(frame.eye_forward_m + 3.75, abs=0.5)


def test_half_shadow_grows_with_height() -> None:
    # Closed form: the edge goes from dark to light over 2 h tan(sun's radius).
    for height in (100.0, 400.0):
        shadow = Shadow(ball(6.0, 60000), darkness=1.0, cells=161)
        shadow.update(np.array([0.0, 0.0, -height]), LEVEL, OVERHEAD, 0.0)
        grid = shadow.mesh.point_data["colour"][:, 3].astype(float).reshape(161, 161)[80]
        x = np.asarray(shadow.mesh.points, float).reshape(161, 161, 3)[80]
        along = np.hypot(x[:, 0], x[:, 1]) * np.sign(np.arange(161) - 80)
        half = slice(80, 161)
        # Spread of the edge: the standard deviation of its slope; a disc of radius r spreads by r / 2.
        slope = -np.diff(grid[half])
        at = (along[half][1:] + along[half][:-1]) / 2
        mean = (slope * at).sum() / slope.sum()
        spread = np.sqrt((slope * (at - mean) ** 2).sum() / slope.sum())
        assert mean == pytest.approx(6.0, abs=0.2)
        assert spread == pytest.approx(height * np.tan(SUN_RADIUS_RAD) / 2.0, rel=0.12)


def test_follows_a_slope() -> None:
    # A plane that rises 0.2 per metre to the north, sun from the south: the ray meets it where both lines cross.
    shadow, slope = Shadow(ball(2.0)), 0.2
    sun = sun_at(180.0, 40.0)
    shadow.update(np.array([0.0, 0.0, -50.0]), LEVEL, sun, lambda north, east: slope * north)
    run = 50.0 / (slope + np.tan(np.radians(40.0)))
    middle, _, _ = middle_and_alpha(shadow)
    assert middle == pytest.approx([0.0, run, slope * run + 0.05], abs=0.1)


def test_no_shadow_without_sun(samples: np.ndarray) -> None:
    assert not Shadow(samples).update(np.array([0.0, 0.0, -30.0]), LEVEL, np.array([1.0, 0.0, 0.02]), 0.0)


def test_bank_narrows_the_shadow(samples: np.ndarray) -> None:
    # Banked 60 deg under an overhead sun the span's shadow halves (the fin and dihedral add a little).
    shadow = Shadow(samples, darkness=1.0)
    shadow.update(np.array([0.0, 0.0, -30.0]), quat_from_euler(0.0, 0.0, np.radians(60.0)), OVERHEAD, 0.0)
    _, points, alpha = middle_and_alpha(shadow)
    dark = points[alpha > 60]
    assert np.ptp(dark[:, 0]) < 0.62 * airframe("jet").wing_span_m
