"""What the pilots of many flights have at their eyes, straight from what the passes wrote."""

from __future__ import annotations

from render.flight import records as r
from render.flight.plan import Plan
from render.flight.states import body_motion
from render.frames import Array
from render.sight.cues import Seat
from render.sight.geometry import eye_position


def lead_eye(plan: Plan, y: Array, wind_e_mps: Array) -> Array:
    """Where the lead's pilot has his eyes, (..., 3), of his states y (..., NY); wind (3,) or (..., 1, 3)."""
    lead = plan.airframes[0]
    quat, _, _ = body_motion(y, wind_e_mps)
    return eye_position(y[..., r.N : r.D + 1], quat, lead.eye_forward_m, lead.eye_up_m)


def seat_of(plan: Plan, y: Array, a: Array, wind_e_mps: Array, lead_eye_e_m: Array | None, k: int) -> Seat:
    """The seat of aircraft k of a plan: y (..., NY), a (..., NA) of it; wind (3,) or (..., 1, 3)."""
    quat, rate, vel = body_motion(y, wind_e_mps)
    own = plan.airframes[k]
    return Seat(
        y[..., r.N : r.D + 1], vel, quat, rate, a[..., r.A_N], a[..., r.A_CAS], -y[..., r.D], own.eye_forward_m,
        own.eye_up_m, lead_eye_e_m,
    )


def seats(plan: Plan, y: Array, a: Array, k: int, winds: Array | None = None) -> Seat:
    """The seat of aircraft k in flights of one shape of plan: y (B, T, K, NY), a (B, T, K, NA).

    The plan gives the airframes of every flight, and its wind unless each has its own: winds (B, 3).
    """
    wind = plan.wind_e_mps if winds is None else winds[:, None, :]
    eye = None if k == 0 else lead_eye(plan, y[:, :, 0], wind)
    return seat_of(plan, y[:, :, k], a[:, :, k], wind, eye, k)
