"""What the pilots of many flights have at their eyes, straight from what the passes wrote."""

from __future__ import annotations

import numpy as np

from render.flight import records as r
from render.flight.plan import Plan
from render.flight.states import body_motion
from render.frames import Array
from render.sight.cues import Seat
from render.sight.geometry import eye_position


def wind_of(plan: Plan) -> Array:
    """The plan's wind, north east down, m/s, (3,)."""
    case = plan.case[0]
    return np.array([case["wind_n_mps"], case["wind_e_mps"], 0.0])


def seats(plan: Plan, y: Array, a: Array, k: int, winds: Array | None = None) -> Seat:
    """The seat of aircraft k in flights of one shape of plan: y (B, T, K, NY), a (B, T, K, NA).

    The plan gives the airframes of every flight, and its wind unless each has its own: winds (B, 3).
    """
    wind = wind_of(plan) if winds is None else winds[:, None, :]
    quat, rate, vel = body_motion(y[:, :, k], wind)
    lead_eye = None
    if k > 0:
        lead_quat, _, _ = body_motion(y[:, :, 0], wind)
        lead = plan.airframes[0]
        lead_eye = eye_position(y[:, :, 0, r.N : r.D + 1], lead_quat, lead.eye_forward_m, lead.eye_up_m)
    own = plan.airframes[k]
    return Seat(
        y[:, :, k, r.N : r.D + 1].copy(), vel, quat, rate, a[:, :, k, r.A_N].copy(), a[:, :, k, r.A_CAS].copy(),
        -y[:, :, k, r.D], own.eye_forward_m, own.eye_up_m, lead_eye,
    )
