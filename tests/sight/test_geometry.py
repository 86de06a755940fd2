"""Section 0 of NOTICING.md: closed forms of the picture at the eye."""

from __future__ import annotations

import numpy as np
import pytest

from render.frames import Array, quat_from_euler, quat_rotate
from render.sight import geometry as geo
from render.sight.notice import seat
from tests.sight.toy import G, flat, planar

ANGLES = np.radians([-80.0, -35.0, -5.0, 0.0, 20.0, 75.0])


def ahead(speed_mps: float, sink_mps: float) -> Array:
    return np.array([np.sqrt(speed_mps**2 - sink_mps**2), 0.0, sink_mps])


def test_pitch_rate_of_the_toy_is_0_1() -> None:
    # 0.1, and its example: n 4 -> 3.2 at 130 m/s is "about 4 deg/s less" (3.46 by the formula itself).
    a, b = planar(lambda s: 4.0, end_s=0.1), planar(lambda s: 3.2, end_s=0.1)
    assert a.rate_b_radps[0, 0, 1] == pytest.approx(G * 4.0 / 130.0, rel=1e-9)
    less = np.degrees(a.rate_b_radps[0, 0, 1] - b.rate_b_radps[0, 0, 1])
    assert less == pytest.approx(np.degrees(G * 0.8 / 130.0), rel=1e-9)


def test_height_lost_of_the_toy_is_0_2() -> None:
    # 0.2: dh = V^2/g ln[(n - cos g0)/(n - 1)], constant speed and load factor; V 130, vertical, n 4: 495.8 m.
    f = planar(lambda s: 4.0, end_s=9.0)
    lost = f.height_m[0, 0] - f.height_m[:, 0].min()
    assert lost == pytest.approx(130.0**2 / G * np.log(4.0 / 3.0), rel=1e-4)


def test_time_to_ground() -> None:
    # 0.6: h/s; no sink, no end.
    assert geo.time_to_ground_s(np.array([300.0]), np.array([60.0]))[0] == pytest.approx(5.0)
    assert np.isinf(geo.time_to_ground_s(np.array([300.0]), np.array([-1.0]))[0])


@pytest.mark.parametrize("depression_deg", [10.0, 45.0, 70.0])
def test_abeam_point_forward_and_sinking(depression_deg: float) -> None:
    # 0.7, 0.8: image speed abeam = (V/h) sin(delta). 0.9: d(delta)/dt = -(s/h) sin cos.
    h, delta = 240.0, np.radians(depression_deg)
    point = np.array([[0.0, h / np.tan(delta), h]])
    level = geo.translation_flow_radps(point, np.array([130.0, 0.0, 0.0]))
    assert level[0] == pytest.approx(130.0 / h * np.sin(delta), rel=1e-12)
    drift = geo.elevation_drift_radps(point, np.array([130.0, 0.0, 40.0]))
    assert drift[0] == pytest.approx(-40.0 / h * np.sin(delta) * np.cos(delta), rel=1e-12)


def test_elevation_drift_against_differences() -> None:
    # Same thing another way: depression of a fixed point, by central differences along the path.
    point, vel, dt = np.array([300.0, 120.0, 200.0]), np.array([90.0, -20.0, 50.0]), 1e-4

    def depression(s: float) -> float:
        p = point - vel * s
        return float(np.arctan2(p[2], np.hypot(p[0], p[1])))

    expected = (depression(dt) - depression(-dt)) / (2 * dt)
    assert geo.elevation_drift_radps(point[None], vel)[0] == pytest.approx(expected, rel=1e-7)


def test_largest_elevation_drift_is_s_over_2h_at_45_deg() -> None:
    # 0.9, its note.
    h, delta = 100.0, np.radians(np.arange(5.0, 86.0, 1.0))
    points = np.stack([np.zeros_like(delta), h / np.tan(delta), np.full_like(delta, h)], axis=-1)
    drift = np.abs(geo.elevation_drift_radps(points, np.array([100.0, 0.0, 30.0])))
    assert np.degrees(delta[np.argmax(drift)]) == pytest.approx(45.0)
    assert drift.max() == pytest.approx(30.0 / 200.0)


def test_splay_rate_against_differences() -> None:
    # 0.10 against central differences of atan(y/h).
    y, h, ydot, hdot, dt = 30.0, 80.0, 4.0, -25.0, 1e-4
    numeric = (np.arctan2(y + ydot * dt, h + hdot * dt) - np.arctan2(y - ydot * dt, h - hdot * dt)) / (2 * dt)
    given = geo.splay_rate_radps(np.array(y), np.array(h), np.array(ydot), np.array(hdot))
    assert float(given) == pytest.approx(numeric, rel=1e-7)


@pytest.mark.parametrize("side", [1.0, -1.0])
@pytest.mark.parametrize("pitch", ANGLES)
def test_along_the_wing_pitch_is_lean(side: float, pitch: float) -> None:
    # 0.11: looking along the wing, aircraft pitch rolls the scene about the line of sight.
    quat = quat_from_euler(1.1, pitch, 0.0)
    los = quat_rotate(quat, np.array([0.0, side, 0.0]))
    axes = geo.eye_axes(los, quat)
    assert geo.horizon_lean_rad(axes) == pytest.approx(side * pitch, abs=1e-12)
    assert geo.horizon_eccentricity_rad(los) == pytest.approx(0.0, abs=1e-12)
    turning = geo.turning_c_radps(np.array([0.0, 0.3, 0.0]), quat, axes)
    assert turning == pytest.approx(np.array([0.0, 0.0, side * 0.3]), abs=1e-12)
    slide = geo.turning_c_radps(np.array([0.3, 0.0, 0.0]), quat, axes)  # aircraft roll slides it
    assert slide[2] == pytest.approx(0.0, abs=1e-12)
    assert np.abs(slide).max() == pytest.approx(0.3)


def test_lean_sign_right_end_raised() -> None:
    # Nose up, looking along the right wing: the nose is on the left, so the horizon's left end sinks.
    quat = quat_from_euler(0.0, 0.2, 0.0)
    axes = geo.eye_axes(quat_rotate(quat, np.array([0.0, 1.0, 0.0])), quat)
    right_end = np.cross(np.array([0.0, 0.0, 1.0]), axes[2])  # horizontal, across the gaze
    right_end = right_end if right_end @ axes[0] > 0 else -right_end
    assert geo.horizon_lean_rad(axes) == pytest.approx(0.2)
    assert axes[1] @ right_end < 0.0  # above the middle of the picture (y is down)


def test_echelon_splits_pitch_into_roll_and_slide() -> None:
    # 0.11: with the true line of sight, not an assumed 90 deg; 45 deg forward gives cos 45 each.
    quat = quat_from_euler(0.0, 0.0, 0.0)
    axes = geo.eye_axes(geo.unit(np.array([1.0, 1.0, 0.0])), quat)
    turning = geo.turning_c_radps(np.array([0.0, 0.2, 0.0]), quat, axes)
    assert np.abs(turning) == pytest.approx(0.2 * np.array([np.sqrt(0.5), 0.0, np.sqrt(0.5)]), abs=1e-12)


def test_eye_frame_is_a_rotation_even_straight_up() -> None:
    quat = quat_from_euler(0.7, 0.4, -0.9)
    for b in ([0.0, 0.0, -1.0], [0.0, 0.0, 1.0], [0.3, -0.2, 0.9], [1.0, 0.0, 0.0]):
        axes = geo.eye_axes(quat_rotate(quat, geo.unit(np.array(b))), quat)
        assert axes @ axes.T == pytest.approx(np.eye(3), abs=1e-12)
        assert np.linalg.det(axes) == pytest.approx(1.0)
    up = geo.eye_axes(quat_rotate(quat, np.array([0.0, 0.0, -1.0])), quat)
    forward = quat_rotate(quat, np.array([1.0, 0.0, 0.0]))
    assert up[1] @ forward == pytest.approx(1.0)  # head thrown back: the nose is at the bottom of the picture


def test_eccentricity_of_the_velocity_vector() -> None:
    # 0.12, 0.14: about 90 deg line abreast, 45-60 deg echelon.
    for aft, expected in ((0.0, 90.0), (14.0, 45.0)):
        f = planar(lambda s: 4.0, end_s=0.1, slots=((aft, 14.0, 0.0),))
        s = seat(f, 1)
        eye = geo.eye_position(s.pos_e_m, s.quat_eb, s.eye_forward_m, s.eye_up_m)
        los = geo.line_of_sight(eye, s.quat_eb, s.lead_eye_e_m)
        assert np.degrees(geo.angle_between(los, s.vel_e_mps)) == pytest.approx(expected, abs=1e-6)


def test_angle_between_small_and_flat_angles() -> None:
    for angle in (0.0, 1e-9, 0.5, 3.0, np.pi):
        b = np.array([np.cos(angle), np.sin(angle), 0.0])
        assert geo.angle_between(np.array([2.0, 0.0, 0.0]), b) == pytest.approx(angle, abs=1e-15, rel=1e-9)


def test_eye_offset_in_body_axes() -> None:
    # Vertical climb to the north: forward is up, up is south.
    quat = quat_from_euler(0.0, np.pi / 2, 0.0)
    assert geo.eye_position(np.zeros(3), quat, 2.0, 0.5) == pytest.approx(np.array([-0.5, 0.0, -2.0]), abs=1e-12)


def test_minimum_resolvable_angle() -> None:
    # 1.32 (Guenter et al 2012): 1 arcmin at the fovea, 1.32-1.65 arcmin more per degree.
    per_deg = (geo.mar_rad(np.radians(30.0)) - geo.mar_rad(np.array(0.0))) / 30.0
    assert np.degrees(geo.mar_rad(np.array(0.0))) * 60 == pytest.approx(1.0)
    assert 1.32 <= np.degrees(per_deg) * 60 <= 1.65


def test_field_of_the_two_eyes() -> None:
    # 1.36 (Ronne 1915, Traquair 1938): up 60, nasal 60, down 70-75, temporal 100-110 deg.
    def at(side_deg: float, down_deg: float) -> Array:
        a, d = np.radians([side_deg, down_deg])
        return np.array([np.sin(a) * np.cos(d), np.sin(d), np.cos(a) * np.cos(d)])

    assert all(geo.in_field(at(a, d)) for a, d in ((0, 0), (99, 0), (-99, 0), (0, 71), (0, -59), (50, 60)))
    assert not any(geo.in_field(at(a, d)) for a, d in ((101, 0), (-101, 0), (0, 73), (0, -61), (180, 0)))


def test_patches_lie_on_the_ground() -> None:
    def hill(north: Array, east: Array) -> Array:
        return 0.1 * north - 0.05 * east

    eye = np.array([[100.0, 50.0, -400.0], [0.0, 0.0, -120.0]])
    height = geo.height_over_ground_m(eye, hill)
    assert height == pytest.approx([400.0 - 7.5, 120.0])
    points = eye[:, None] + geo.ground_patches(eye, height, hill, 0.4)
    assert -points[..., 2] == pytest.approx(hill(points[..., 0], points[..., 1]))
    level = geo.ground_patches(eye, np.array([400.0, 120.0]), flat, 0.4)
    depression = np.arctan2(level[..., 2], np.hypot(level[..., 0], level[..., 1]))
    assert np.unique(depression.round(9)) == pytest.approx(np.sort(geo.PATCH_DEPRESSION_RAD))


def test_masked_median_against_numpy() -> None:
    rng = np.random.default_rng(3)
    values, mask = rng.normal(size=(50, 11)), rng.random((50, 11)) < 0.5
    expected = [np.median(v[m]) if m.any() else 0.0 for v, m in zip(values, mask, strict=True)]
    assert geo.masked_median(values, mask) == pytest.approx(expected)
