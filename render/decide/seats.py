"""What the pilots of many flights have at their eyes, straight from what the passes wrote."""

from __future__ import annotations

import numpy as np

from render.flight import records as r
from render.flight.air import G0_MPS2
from render.flight.plan import Plan
from render.frames import Array, quat_multiply
from render.sight.cues import Seat
from render.sight.geometry import eye_position


def body_motion(y: Array, wind: Array) -> tuple[Array, Array, Array]:
    """Attitude earth <- body (..., 4), body rates (..., 3) and velocity over the ground (..., 3) of states (..., NY).

    wind: (..., 3), broadcast. As in ``flight.fly.to_flight``; the yaw rate is that of flight without sideslip.
    """
    alpha, speed, roll = y[..., r.ALPHA], y[..., r.V], y[..., r.ROLL]
    half = np.zeros((*alpha.shape, 4))
    half[..., 0], half[..., 2] = np.cos(alpha / 2.0), np.sin(alpha / 2.0)
    w, qa, qb, qc = np.moveaxis(y[..., r.Q0 : r.Q3 + 1], -1, 0)
    x_w = np.stack([w * w + qa * qa - qb * qb - qc * qc, 2 * (qa * qb + w * qc), 2 * (qa * qc - w * qb)], axis=-1)
    yaw = G0_MPS2 * 2.0 * (qb * qc + w * qa) / speed
    ca, sa = np.cos(alpha), np.sin(alpha)
    rate = np.stack([roll * ca - yaw * sa, y[..., r.PITCH], roll * sa + yaw * ca], axis=-1)
    return quat_multiply(y[..., r.Q0 : r.Q3 + 1], half), rate, x_w * speed[..., None] + wind


def seats(plan: Plan, y: Array, a: Array, k: int) -> Seat:
    """The seat of aircraft k in flights of one shape of plan: y (B, T, K, NY), a (B, T, K, NA).

    The plan gives wind and airframes; they are those of every flight given.
    """
    case = plan.case[0]
    wind = np.array([case["wind_n_mps"], case["wind_e_mps"], 0.0])
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
