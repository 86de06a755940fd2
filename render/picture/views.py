"""Where the camera sits and which way it looks: a pilot's seat, a chase aircraft, a spectator on the ground.

From a seat the eye is the one that noticing works with (``sight.geometry``: same place, head upright in the
aircraft). Directions in the cockpit are azimuth (right positive) and elevation (up positive) in body axes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from render.frames import Array, quat_rotate
from render.picture.camera import Camera, quat_from_axes
from render.picture.instant import Instant, instant_at
from render.sight.geometry import direction_b, eye_axes, eye_position, unit
from render.types import Flight
from scenes.airframe import Airframe
from scenes.model import Watch

LOOKS = ("lead", "ahead", "ground", "gaze")
VIEWS = ("seat", "chase", "spectator")

# The lead is framed a little off the middle: low, so that the ground ahead of him and his horizon are in the picture,
# and so far aft that in line abreast at 75 deg his stabilator is too, by whose angle a frozen one can be told.
FRAME_NOSEWARD_RAD, FRAME_DOWN_RAD = np.radians([0.5, 5.0])
FRAME_LOWEST_RAD = float(np.radians(-10.0))
GAUGES_DOWN_RAD = float(np.radians(24.0))  # the panel below the coaming, as the cockpits are drawn
# A large turn of the gaze takes 0.5-0.9 s, latency included (NOTICING 1.38, Guitton & Volle 1987, as remembered).
TURN_S = 0.6
GROUND_LOW_RAD, GROUND_HIGH_RAD = np.radians([-4.0, 100.0])  # what the coaming and the head leave open
FRAME_UP_RAD = float(np.radians(5.0))  # looking ahead: less of the coaming in the picture


@dataclass(frozen=True, slots=True, eq=False)
class Sightline:
    """Which way a pilot looks, unit vectors in own body axes: the picture's axis, and where his eyes rest."""

    axis_b: Array  # (3,)
    eyes_b: Array  # (3,)


def eye_of(instant: Instant, airframes: Sequence[Airframe], k: int) -> Array:
    """The eye of pilot k, (3,) m in earth axes: the eye that noticing works with."""
    frame = airframes[k]
    return eye_position(instant.pos_e_m[k], instant.quat_eb[k], frame.eye_forward_m, frame.eye_up_m)


def seat_camera(
    instant: Instant, airframes: Sequence[Airframe], k: int, axis_b: Array, field_rad: float, size_px: tuple[int, int]
) -> Camera:
    """The camera at pilot k's eye along a direction in his body axes, head upright in the aircraft."""
    quat = instant.quat_eb[k]
    axes = eye_axes(quat_rotate(quat, axis_b), quat)
    return Camera(eye_of(instant, airframes, k), quat_from_axes(axes), field_rad, *size_px)


def sightline(instant: Instant, airframes: Sequence[Airframe], k: int, look: str) -> Sightline:
    """Which way pilot k looks: ``lead``, ``ahead`` or ``ground``. The lead himself looks ahead, not at the lead."""
    if look == "lead" and k != 0:
        to_lead = eye_of(instant, airframes, 0) - eye_of(instant, airframes, k)
        eyes = unit(direction_b(to_lead, instant.quat_eb[k]))
        return Sightline(_framed(eyes), eyes)
    if look == "ground":
        low = _toward_ground(instant.quat_eb[k])
        return Sightline(_lifted(low), low)
    if look not in ("ahead", "lead"):
        raise ValueError(f"look {look}: lead, ahead or ground")
    ahead = np.array([1.0, 0.0, 0.0])
    return Sightline(_lifted(ahead), ahead)


def gazing(instant: Instant, airframes: Sequence[Airframe], k: int, watch: Watch) -> Sightline:
    """The scene's own gaze: where the eyes rest, and the looks inside at the gauges, the head turned smoothly."""
    outside = sightline(instant, airframes, k, watch.look_at)
    part = part_inside(instant.time_s, watch)
    if part == 0.0:
        return outside
    gauges = direction(0.0, -GAUGES_DOWN_RAD)
    return Sightline(_turned(outside.axis_b, gauges, part), _turned(outside.eyes_b, gauges, part))


def part_inside(time_s: float, watch: Watch) -> float:
    """How far the head is turned to the gauges, 0 outside .. 1 inside; same times as ``sight.looks.eyes_inside``.

    In, read and back all lie within the look. The turn is a minimum-jerk one (Flash & Hogan 1985, for the arm;
    a plausible shape for a head).
    """
    every = watch.gauges_every_s
    if every is None or time_s < every - 1e-9:
        return 0.0
    since = (time_s + 1e-9) % every
    turn = min(TURN_S, watch.gauge_look_s / 3.0)
    s = float(np.clip(min(since, watch.gauge_look_s - since) / turn, 0.0, 1.0))
    return s**3 * (10.0 - 15.0 * s + 6.0 * s**2)


def chase_camera(flight: Flight, time_s: float, field_rad: float, size_px: tuple[int, int]) -> Camera:
    """From astern of the lead, above and to his right, standing as he stood 0.5 s ago, so that a pull shows."""
    now, before = instant_at(flight, time_s), instant_at(flight, max(time_s - 0.5, float(flight.time_s[0])))
    span = max(float(np.ptp(now.pos_e_m @ _lateral(before))), flight.airframes[0].wing_span_m)
    back = 9.0 + 0.9 * span
    quat = before.quat_eb[0]
    pos = now.pos_e_m[0] + quat_rotate(quat, np.array([-back, 0.45 * back, -0.22 * back]))
    # never below the ground the formation is over
    ground_m = flight.height_m[:, 0] - flight.height_agl_m[:, 0]
    pos[2] = min(pos[2], -(float(np.interp(time_s, flight.time_s, ground_m)) + 2.0))
    middle = np.mean(now.pos_e_m, axis=0)
    return Camera(pos, quat_from_axes(eye_axes(unit(middle - pos), quat)), field_rad, *size_px)


def spectator_camera(
    flight: Flight, stand_e_m: Array, time_s: float, field_rad: float, size_px: tuple[int, int]
) -> Camera:
    """From the ground, upright, turned to the lead; the ground stays in the picture while he is low."""
    los = unit(instant_at(flight, time_s).pos_e_m[0] - stand_e_m)
    flat = float(np.hypot(los[0], los[1]))
    up = float(np.arctan2(-los[2], flat))
    room = 0.35 * field_rad * size_px[1] / size_px[0]
    aim = up - min(room, 0.5 * max(up, 0.0) + 0.1 * room)
    los = np.array([los[0] / flat * np.cos(aim), los[1] / flat * np.cos(aim), -np.sin(aim)])
    right = unit(np.cross(np.array([0.0, 0.0, 1.0]), los))
    return Camera(stand_e_m, quat_from_axes(np.stack([right, np.cross(los, right), los])), field_rad, *size_px)


def direction(azimuth_rad: float, elevation_rad: float) -> Array:
    """Unit vector in body axes of an azimuth (right positive) and an elevation (up positive), (3,)."""
    flat = np.cos(elevation_rad)
    return np.array([flat * np.cos(azimuth_rad), flat * np.sin(azimuth_rad), -np.sin(elevation_rad)])


def angles(vec_b: Array) -> tuple[float, float]:
    """Azimuth and elevation of a direction in body axes, rad."""
    x, y, z = (float(v) for v in vec_b)
    return float(np.arctan2(y, x)), float(np.arctan2(-z, np.hypot(x, y)))


def _framed(eyes_b: Array) -> Array:
    """The picture's axis for eyes on the lead: moved toward the nose and down; less where he is high or low."""
    azimuth, elevation = angles(eyes_b)
    shift = min(float(FRAME_NOSEWARD_RAD), abs(azimuth)) * np.cos(elevation)
    # Not down into the cockpit when he is low: then he stands below the middle instead, by 10 deg at most.
    down = min(max(elevation - float(FRAME_DOWN_RAD), FRAME_LOWEST_RAD), elevation + float(np.radians(10.0)))
    return direction(azimuth - np.sign(azimuth) * shift, down)


def _lifted(eyes_b: Array) -> Array:
    """The picture's axis for eyes ahead: lifted over the coaming, the less the higher the eyes are."""
    azimuth, elevation = angles(eyes_b)
    lift = FRAME_UP_RAD * min(max(1.0 - elevation / 0.5, 0.0), 1.0)
    return direction(azimuth, elevation + lift) if lift > 0.0 and eyes_b[0] > 0.0 else eyes_b


def _turned(from_b: Array, to_b: Array, part: float) -> Array:
    """A head part of the way between two directions, by azimuth and elevation, as a neck does it."""
    a0, e0 = angles(from_b)
    a1, e1 = angles(to_b)
    return direction(a0 + part * (a1 - a0), e0 + part * (e1 - e0))


def _toward_ground(quat_eb: Array) -> Array:
    """Toward straight down, as far as the nose and the head let: in the aircraft's plane of symmetry.

    Where down lies behind the seat (steep climbs) the look passes from over the nose to overhead within 30 deg.
    """
    down = direction_b(np.array([0.0, 0.0, 1.0]), quat_eb)
    seam = 0.5 * (GROUND_LOW_RAD + GROUND_HIGH_RAD) - np.pi
    lift = float((np.arctan2(-down[2], down[0]) - seam) % (2.0 * np.pi))  # 0 and 2 pi: right behind the seat
    held = float(np.clip(lift + seam, GROUND_LOW_RAD, GROUND_HIGH_RAD))
    near = float(np.clip(min(lift, 2.0 * np.pi - lift) / np.radians(15.0), 0.0, 1.0))
    part = near * near * (3.0 - 2.0 * near)
    middle = 0.5 * (GROUND_LOW_RAD + GROUND_HIGH_RAD)
    return direction(0.0, float(middle + part * (held - middle)))


def _lateral(instant: Instant) -> Array:
    return quat_rotate(instant.quat_eb[0], np.array([0.0, 1.0, 0.0]))
