"""The cues, in the words a pilot uses: faulted flight against healthy twin at the same time, from the same eye.

Pure functions over arrays (..., T); a leading axis of thousands of flights works like none. Each cue gives a
difference (ln ratio or plain difference), how far off the gaze it stands and, for flow, how much slow motion
widens the threshold. Noise and detection are elsewhere.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from render.frames import Array
from render.sight import geometry as geo
from render.sight.canal import canal_filter
from render.sight.observers import CLOSING_LIMIT_S, FELT_DELAY_S, HELD_M, VISION_DELAY_S, VISUAL

UNITS = {
    "tilt": "rad", "turning": "rad/s", "flow": "ln ratio", "closing": "ln ratio", "growth": "ln ratio",
    "load": "ln ratio", "felt rate": "rad/s", "lead": "rad", "gauge": "readings", "call": "heard",
    "stick force": "ratio",
}  # fmt: skip

# Ground has detail at all scales; fields, woods and roads of this size are the coarsest that tell (guess).
TEXTURE_M = 60.0
# Image speed below which the threshold rises: 5 deg/s at the fovea, 30 deg/s at 40 deg (1.10, published).
FLOW_BEST_FOVEA_RADPS = float(np.radians(5.0))
FLOW_BEST_SLOPE = 25.0 / 40.0
FLOW_WIDENING_EXPONENT = 0.5  # how fast it rises below: guess
# A twentieth of the lead's size (his range) weighs as much as one degree of his place (guess).
LEAD_RANGE_WEIGHT = float(np.radians(1.0)) / 0.05
# What a pilot can read off the instruments in a loop: 50 ft, 5 kt, 0.2 g (guess).
READING_HEIGHT_M, READING_SPEED_MPS, READING_LOAD = 15.24, 2.572, 0.2
FORCE_FLOOR_N = 20.0  # the ratio of small forces means nothing to the hand (guess)


@dataclass(frozen=True, slots=True, eq=False)
class Seat:
    """What one pilot's flight gives: arrays (..., T) with vectors last."""

    pos_e_m: Array
    vel_e_mps: Array
    quat_eb: Array
    rate_b_radps: Array
    load_factor: Array
    cas_mps: Array
    height_m: Array
    eye_forward_m: float
    eye_up_m: float
    lead_eye_e_m: Array | None  # the lead's eye; None for the lead himself


@dataclass(frozen=True, slots=True, eq=False)
class View:
    """The picture at one pilot's eye, arrays (..., T); P patches of ground."""

    axes: Array  # (..., T, 3, 3) rows of the eye frame
    turning_c_radps: Array  # (..., T, 3)
    flow_radps: Array  # (..., T, P)
    range_m: Array  # (..., T, P)
    eccentricity_rad: Array  # (..., T, P) of the patches
    seen: geo.Mask  # (..., T, P) in the field, and texture fine enough there survives
    time_to_ground_s: Array
    horizon_eccentricity_rad: Array
    scene_eccentricity_rad: Array
    velocity_eccentricity_rad: Array  # angle from the gaze to where he is going (0.14)
    lead_dir_b: Array | None  # (..., T, 3)
    lead_range_m: Array | None
    lead_eccentricity_rad: Array | None


@dataclass(frozen=True, slots=True, eq=False)
class Cue:
    """One cue of one pilot: difference (..., T), eccentricity (None if not seen), widening of the threshold.

    ``there``: where the cue can be had at all (ground in view, eyes outside, less than 10 s to the ground).
    """

    difference: Array
    eccentricity_rad: Array | None = None
    widening: Array | float = 1.0
    there: geo.Mask | bool = True
    scatter: Array | float = 0.0  # technique at the time, where more than its row


def view(seat: Seat, height_at: geo.HeightAt, display_line_rad: float | Array, look_at: str) -> View:
    """The picture at the eye. look_at: ``lead`` or ``ahead``. Shapes (..., T)."""
    eye = geo.eye_position(seat.pos_e_m, seat.quat_eb, seat.eye_forward_m, seat.eye_up_m)
    los = geo.line_of_sight(eye, seat.quat_eb, seat.lead_eye_e_m if look_at == "lead" else None)
    axes = geo.eye_axes(los, seat.quat_eb)
    height = geo.height_over_ground_m(eye, height_at)
    vec = geo.ground_patches(eye, height, height_at, display_line_rad)
    distance = geo.length(vec)
    vec_c = np.matmul(vec, np.swapaxes(axes, -1, -2))
    off = np.arccos(np.clip(vec_c[..., 2] / distance, -1.0, 1.0))
    seen = geo.in_field(vec_c) & (TEXTURE_M / distance >= 2.0 * geo.mar_rad(off))
    to_lead = None if seat.lead_eye_e_m is None else seat.lead_eye_e_m - eye
    return View(
        axes,
        geo.turning_c_radps(seat.rate_b_radps, seat.quat_eb, axes),
        geo.translation_flow_radps(vec, seat.vel_e_mps),
        distance,
        off,
        seen,
        geo.time_to_ground_s(height, seat.vel_e_mps[..., 2]),
        geo.horizon_eccentricity_rad(los),
        geo.scene_eccentricity_rad(los),
        geo.angle_between(los, seat.vel_e_mps),
        None if to_lead is None else geo.unit(geo.direction_b(to_lead, seat.quat_eb)),
        None if to_lead is None else geo.length(to_lead),
        None if to_lead is None else geo.angle_between(los, to_lead),
    )


def log_load(load_factor: Array) -> Array:
    """ln n above one g, n - 1 below: a ratio where g is felt as a ratio, smooth through the float at the top."""
    return np.where(load_factor >= 1.0, np.log(np.maximum(load_factor, 1.0)), load_factor - 1.0)


def visual_cues(healthy: View, faulted: View) -> dict[str, Cue]:
    """Tilt, turning, flow, closing, growth and lead of two views of one seat.

    Splay change and the drift of ground points in elevation aren't cues of their own: on level ground both
    carry s/h (0.9, 0.10), which is ``closing``, and would count it twice.
    """
    h, f = healthy, faulted
    down_h, down_f = geo.down_in_eye(h.axes), geo.down_in_eye(f.axes)
    lean = np.where(
        _wrap(geo.horizon_lean_rad(f.axes) - geo.horizon_lean_rad(h.axes)) < 0.0, -1.0, 1.0
    )  # only the sign; the amount is the whole angle, lean and rise of the ground's edge together
    turned = geo.length(f.turning_c_radps - h.turning_c_radps)
    slower = geo.length(f.turning_c_radps) < geo.length(h.turning_c_radps)

    both = f.seen & h.seen
    any_seen = np.any(both, axis=-1)
    flow = geo.masked_median(np.log(np.maximum(f.flow_radps, 1e-6) / np.maximum(h.flow_radps, 1e-6)), both)
    # Of the ground seen, the part nearest the gaze tells most: its eccentricity is the cue's.
    off = np.min(np.where(both, f.eccentricity_rad, np.pi), axis=-1)
    speed = geo.masked_median(f.flow_radps, both)
    best = FLOW_BEST_FOVEA_RADPS + FLOW_BEST_SLOPE * off
    widening = np.maximum(1.0, best / np.maximum(speed, 1e-3)) ** FLOW_WIDENING_EXPONENT
    growth = geo.masked_median(np.log(h.range_m / f.range_m), both)
    tau_f = np.clip(f.time_to_ground_s, 0.05, CLOSING_LIMIT_S)
    tau_h = np.clip(h.time_to_ground_s, 0.05, CLOSING_LIMIT_S)
    closing = np.where(any_seen, np.log(tau_h / tau_f), 0.0)  # positive: the ground comes sooner

    cues = {
        "tilt": Cue(lean * geo.angle_between(down_f, down_h), f.horizon_eccentricity_rad),
        "turning": Cue(np.where(slower, -turned, turned), f.scene_eccentricity_rad),
        "flow": Cue(flow, off, widening, any_seen),
        "closing": Cue(closing, off, 1.0, any_seen & (np.minimum(tau_f, tau_h) < CLOSING_LIMIT_S)),
        "growth": Cue(growth, off, 1.0, any_seen),
    }
    if f.lead_dir_b is not None and h.lead_dir_b is not None:
        assert f.lead_range_m is not None and h.lead_range_m is not None
        size = LEAD_RANGE_WEIGHT * np.abs(np.log(f.lead_range_m / h.lead_range_m))
        place = geo.angle_between(f.lead_dir_b, h.lead_dir_b)
        held = np.arctan2(HELD_M, h.lead_range_m)
        cues["lead"] = Cue(np.maximum(place, size), f.lead_eccentricity_rad, scatter=held)
    return cues


def felt_cues(healthy: Seat, faulted: Seat, step_s: float) -> dict[str, Cue]:
    """Load and felt rate. The canal filter is linear, so it is run on the difference."""
    pitch = canal_filter(faulted.rate_b_radps[..., 1] - healthy.rate_b_radps[..., 1], step_s)
    return {
        "load": Cue(log_load(faulted.load_factor) - log_load(healthy.load_factor)),
        "felt rate": Cue(pitch),
    }


def lead_cues(
    load_h: Array, load_f: Array, demand_h: Array, demand_f: Array, force_h_n: Array, force_f_n: Array
) -> dict[str, Cue]:
    """The lead's own: the g he gets against the g he asks for, compared with the twin, and the stick force.

    He pulls what he asks for; where the stick goes back without the g, both cues grow. All (..., T).
    """
    missing_f = log_load(load_f) - log_load(demand_f)
    missing_h = log_load(load_h) - log_load(demand_h)
    return {
        "load": Cue(missing_f - missing_h),
        "stick force": Cue((force_f_n - force_h_n) / np.maximum(np.abs(force_h_n), FORCE_FLOOR_N)),
    }


def gauge_reading(healthy: Seat, faulted: Seat) -> Array:
    """Largest of the differences in height, speed and load, in reading steps, (..., T)."""
    return np.maximum.reduce([
        np.abs(faulted.height_m - healthy.height_m) / READING_HEIGHT_M,
        np.abs(faulted.cas_mps - healthy.cas_mps) / READING_SPEED_MPS,
        np.abs(faulted.load_factor - healthy.load_factor) / READING_LOAD,
    ])


def delay_of(cue: str) -> float:
    """Delay from the eye or the body to a cue, s (6.1)."""
    return VISION_DELAY_S if cue in VISUAL else FELT_DELAY_S


def _wrap(angle_rad: Array) -> Array:
    return np.asarray((angle_rad + np.pi) % (2.0 * np.pi) - np.pi)
