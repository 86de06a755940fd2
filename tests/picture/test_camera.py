"""The camera, the looks and the wide projection in closed form: nothing is drawn here."""

from __future__ import annotations

import numpy as np
import pytest

from render.frames import quat_from_euler, quat_rotate, quat_to_matrix
from render.picture import views
from render.picture.camera import Camera, quat_from_axes
from render.picture.instant import Instant, instant_at, slerp
from render.picture.panini import Panini
from render.sight.geometry import eye_axes, eye_position, line_of_sight
from render.sight.looks import eyes_inside
from scenes.model import Watch
from tests.flight.made import invented_jet
from tests.output.made_up import made_up_flight

SIZE = (1280, 720)
LEVEL = quat_from_axes(np.array([[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [1.0, 0.0, 0.0]]))  # looks north, upright


def camera(field_deg: float = 75.0, quat: np.ndarray = LEVEL) -> Camera:
    return Camera(np.array([100.0, -50.0, -300.0]), quat, np.radians(field_deg), *SIZE)


def abreast(heading_rad: float, pitch_rad: float, bank_rad: float) -> Instant:
    """Lead and a wing 14 m on his right."""
    quat = quat_from_euler(heading_rad, pitch_rad, bank_rad)
    lead = np.array([400.0, 900.0, -800.0])
    pos = np.stack([lead, lead + quat_rotate(quat, np.array([0.0, 14.0, 0.0]))])
    zero = np.zeros(2)
    return Instant(0.0, pos, np.stack([quat, quat]), zero, zero, (True, True))


def test_a_point_right_of_and_below_the_axis_stands_right_and_below() -> None:
    # by hand: 100 m ahead, 20 m right, 10 m down; focal length 640/tan(37.5 deg)
    focal = 640.0 / np.tan(np.radians(37.5))
    px = camera().project(np.array([200.0, -30.0, -290.0]))
    assert px == pytest.approx([640.0 + 0.2 * focal, 360.0 + 0.1 * focal])
    assert np.all(np.isnan(camera().project(np.array([0.0, -50.0, -300.0]))))


def test_the_field_reaches_from_side_to_side() -> None:
    for deg in (30.0, 75.0, 110.0):
        half = np.radians(deg / 2)
        edge = camera(deg).pos_e_m + 50.0 * np.array([np.cos(half), np.sin(half), 0.0])
        assert camera(deg).project(edge) == pytest.approx([1280.0, 360.0])


def test_directions_undo_the_projection() -> None:
    quat = quat_from_euler(1.1, -0.4, 2.0)
    px = np.array([[3.0, 5.0], [640.0, 360.0], [1200.0, 700.0]])
    one = camera(quat=quat)
    assert one.project(one.pos_e_m + 37.0 * one.directions_e(px)) == pytest.approx(px)


def test_quaternions_of_axes_turn_back_into_the_axes() -> None:
    rng = np.random.default_rng(4)
    for quat in [*rng.normal(size=(200, 4)), *np.eye(4), np.array([0.0, 1.0, 1.0, 0.0])]:
        matrix = quat_to_matrix(quat / np.linalg.norm(quat))
        assert quat_to_matrix(quat_from_axes(matrix.T)) == pytest.approx(matrix, abs=1e-12)


@pytest.mark.parametrize("attitude", [(0.0, 0.0, 0.0), (1.4, 0.9, 0.3), (1.4, -1.5, 0.0), (0.2, 0.1, 3.1)])
def test_the_camera_sits_at_the_noticing_eye_with_its_head_upright(attitude: tuple[float, float, float]) -> None:
    frames = (invented_jet(), invented_jet())
    instant = abreast(*attitude)
    seen = views.sightline(instant, frames, 1, "lead")
    cam = views.seat_camera(instant, frames, 1, seen.axis_b, np.radians(75.0), SIZE)
    eyes = [eye_position(instant.pos_e_m[k], instant.quat_eb[k], 2.6, 0.9) for k in (0, 1)]
    assert cam.pos_e_m == pytest.approx(eyes[1])
    # his eyes are on the lead's eye, along the study's own line of sight
    los = line_of_sight(eyes[1], instant.quat_eb[1], eyes[0])
    assert quat_rotate(instant.quat_eb[1], seen.eyes_b) == pytest.approx(los)
    # the study's eye frame, turned to the picture's axis, is the camera's
    axis_e = quat_rotate(instant.quat_eb[1], seen.axis_b)
    assert quat_to_matrix(cam.quat_ec).T == pytest.approx(eye_axes(axis_e, instant.quat_eb[1]), abs=1e-9)


def test_the_lead_abreast_is_framed_aft_of_the_middle_and_above_it() -> None:
    frames = (invented_jet(), invented_jet())
    instant = abreast(1.4, -0.7, 0.0)
    seen = views.sightline(instant, frames, 1, "lead")
    assert np.degrees(views.angles(seen.axis_b)) == pytest.approx([-89.5, -5.0])
    cam = views.seat_camera(instant, frames, 1, seen.axis_b, np.radians(75.0), SIZE)
    head = cam.project(views.eye_of(instant, frames, 0))
    # closed form for a direction at azimuth -90, elevation 0 from an axis at -89.5, -5 with the head upright
    turn, up = np.radians(-0.5), np.radians(5.0)
    ray = np.array([np.sin(turn), -np.sin(up) * np.cos(turn), np.cos(up) * np.cos(turn)])
    assert head == pytest.approx([640.0 + cam.focal_px * ray[0] / ray[2], 360.0 + cam.focal_px * ray[1] / ray[2]])
    # the whole lead is in the picture, 6 m ahead of his centre to 6 m behind it: his stabilator too
    ends = cam.project(instant.pos_e_m[0] + quat_rotate(instant.quat_eb[0], np.array([[6.0, 0, 0], [-6.0, 0, 0]])))
    assert 0.0 < ends[1, 0] < ends[0, 0] < 1280.0


def test_the_ground_look_follows_down_and_never_jumps() -> None:
    turns = np.radians(np.arange(0.0, 720.0, 1.0))
    looks, eyes = [], []
    for turn in turns:
        instant = abreast(1.4, 0.0, 0.0)
        quat = np.stack([quat_from_euler(1.4, float(turn), 0.0)] * 2)
        one = Instant(0.0, instant.pos_e_m, quat, np.zeros(2), np.zeros(2), (True, True))
        seen = views.sightline(one, (invented_jet(),) * 2, 1, "ground")
        looks.append(seen.axis_b)
        eyes.append(seen.eyes_b)
    steps = np.arccos(np.clip(np.sum(np.array(looks)[1:] * np.array(looks)[:-1], axis=1), -1.0, 1.0))
    assert np.degrees(steps.max()) < 9.0
    assert np.degrees(views.angles(eyes[270])) == pytest.approx([0.0, 0.0], abs=1e-6)  # straight down: ahead
    assert np.degrees(views.angles(eyes[200]))[1] == pytest.approx(70.0)  # on the back: up through the canopy


def test_the_head_is_inside_just_when_the_study_says_so() -> None:
    watch = Watch(gauges_every_s=8.0)
    times = np.arange(0.0, 40.0, 0.01)
    part = np.array([views.part_inside(float(t), watch) for t in times])
    assert np.array_equal(part > 0.0, eyes_inside(times, watch) & (part > 0.0))
    assert np.mean(part[eyes_inside(times, watch)] > 0.0) > 0.95
    assert part.max() == 1.0 and np.abs(np.diff(part)).max() < 0.04  # smooth: no more than 0.04 in 10 ms
    assert views.part_inside(12.0, Watch()) == 0.0


def test_a_gauge_look_turns_the_head_from_the_lead_to_the_panel_and_back() -> None:
    frames = (invented_jet(), invented_jet())
    watch = Watch(gauges_every_s=8.0)
    base = abreast(1.4, 0.0, 0.0)

    def at(time_s: float) -> np.ndarray:
        one = Instant(time_s, base.pos_e_m, base.quat_eb, np.zeros(2), np.zeros(2), (True, True))
        return views.gazing(one, frames, 1, watch).axis_b

    lead = views.sightline(base, frames, 1, "lead").axis_b
    assert at(7.9) == pytest.approx(lead) and at(10.51) == pytest.approx(lead)
    assert np.degrees(views.angles(at(9.2))) == pytest.approx([0.0, -24.0])


def test_slerp_goes_evenly_the_short_way() -> None:
    one, two = quat_from_euler(0.3, 0.0, 0.0), -quat_from_euler(0.9, 0.0, 0.0)
    assert np.abs(slerp(one, two, 0.25) @ quat_from_euler(0.45, 0.0, 0.0)) == pytest.approx(1.0)
    assert slerp(one, one, 0.5) == pytest.approx(one)


def test_an_instant_lies_between_its_samples_and_holds_after_contact() -> None:
    flight = made_up_flight(20.0)
    a, b = flight.pos_e_m[100], flight.pos_e_m[101]
    between = instant_at(flight, float(flight.time_s[100] + 0.02))
    assert between.pos_e_m == pytest.approx(a + 0.4 * (b - a))
    met = flight.contact_s[0]
    assert met is not None
    assert instant_at(flight, met - 0.01).alive == (True,) * 3
    after = instant_at(flight, met + 1.0)
    assert after.alive == (False,) * 3
    assert after.pos_e_m == pytest.approx(flight.pos_e_m[-1])


@pytest.mark.parametrize("field_deg", [90.0, 125.0, 150.0])
def test_panini_fills_its_field_and_keeps_the_scale_of_the_middle(field_deg: float) -> None:
    wide = Panini(np.radians(field_deg), SIZE)
    half = np.radians(field_deg / 2)
    assert wide.project_c(np.array([np.sin(half), 0.0, np.cos(half)])) == pytest.approx([1280.0, 360.0])
    small = 1e-4
    at = wide.project_c(np.array([[small, 0.0, 1.0], [0.0, small, 1.0]]))
    assert (at - np.array([640.0, 360.0])) / small == pytest.approx(wide.focal_px * np.eye(2), rel=1e-6)


def test_panini_keeps_upright_and_radial_lines_straight() -> None:
    wide = Panini(np.radians(125.0), SIZE)
    height = np.linspace(-2.0, 2.0, 9)
    upright = wide.project_c(np.stack([np.full(9, 3.0), height, np.full(9, 2.0)], axis=-1))
    assert np.ptp(upright[:, 0]) < 1e-9
    along = np.linspace(0.1, 5.0, 9)
    radial = wide.project_c(np.stack([along, 0.4 * along, np.ones(9)], axis=-1)) - np.array([640.0, 360.0])
    assert radial[:, 1] / radial[:, 0] == pytest.approx(np.full(9, 0.4))


def test_panini_squeezes_the_edge_that_a_plane_stretches() -> None:
    # width of one degree at 60 deg off against the middle: 1/cos^2 = 4 on a plane, 2/(1 + cos) = 4/3 here
    wide = Panini(np.radians(150.0), SIZE)
    phi = np.radians([60.0, 60.001])
    px = wide.project_c(np.stack([np.sin(phi), np.zeros(2), np.cos(phi)], axis=-1))[:, 0]
    assert np.diff(px)[0] / np.radians(0.001) / wide.focal_px == pytest.approx(4.0 / 3.0, rel=1e-4)
