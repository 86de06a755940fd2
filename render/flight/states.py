"""What a state of the kernels is in body and earth axes, and states taken back out of a Flight, at any instant."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from render.flight import records as r
from render.flight.air import G0_MPS2
from render.frames import Array, quat_multiply
from render.types import Flight


def body_motion(y: Array, wind_e_mps: Array) -> tuple[Array, Array, Array]:
    """Attitude earth <- body (..., 4), body rates (..., 3) and velocity over the ground (..., 3) of states (..., NY).

    wind_e_mps: (3,), or broadcast against (..., 3). The yaw rate is that of flight without sideslip.
    """
    alpha, speed, roll = y[..., r.ALPHA], y[..., r.V], y[..., r.ROLL]
    half = np.zeros((*alpha.shape, 4))
    half[..., 0], half[..., 2] = np.cos(alpha / 2.0), np.sin(alpha / 2.0)
    w, qa, qb, qc = np.moveaxis(y[..., r.Q0 : r.Q3 + 1], -1, 0)
    x_w = np.stack([w * w + qa * qa - qb * qb - qc * qc, 2 * (qa * qb + w * qc), 2 * (qa * qc - w * qb)], axis=-1)
    yaw = G0_MPS2 * 2.0 * (qb * qc + w * qa) / speed
    ca, sa = np.cos(alpha), np.sin(alpha)
    rate_b = np.stack([roll * ca - yaw * sa, y[..., r.PITCH], roll * sa + yaw * ca], axis=-1)
    return quat_multiply(y[..., r.Q0 : r.Q3 + 1], half), rate_b, x_w * speed[..., None] + wind_e_mps


def _path_quat(flight: Flight, k: int, rows: NDArray[np.int_]) -> Array:
    """Attitude of the air-path axes, (n, 4): the body's, turned back by the angle of attack."""
    half = flight.alpha_rad[rows, k] / 2.0
    back = np.zeros((len(rows), 4))
    back[:, 0], back[:, 2] = np.cos(half), -np.sin(half)
    return quat_multiply(flight.quat_eb[rows, k], back)


def state_rows(flight: Flight, k: int, times_s: Array) -> Array:
    """States (n, NY) of aircraft k at times within the flight, linear between instants as the passes keep them.

    The pilot's integral part and the work sums are not kept in a Flight and begin at zero.
    """
    t = np.clip(np.asarray(times_s, dtype=float), flight.time_s[0], flight.time_s[-1])
    i = np.clip(np.searchsorted(flight.time_s, t, side="right") - 1, 0, len(flight.time_s) - 2)
    part = (t - flight.time_s[i]) / (flight.time_s[i + 1] - flight.time_s[i])

    def at(values: Array) -> Array:
        a, b = values[i, k], values[i + 1, k]
        w = part.reshape(part.shape + (1,) * (a.ndim - 1))
        mixed: Array = a + w * (b - a)
        return mixed

    y = np.zeros((len(t), r.NY))
    y[:, r.N : r.D + 1] = at(flight.pos_e_m)
    y[:, r.V], y[:, r.ALPHA] = at(flight.speed_mps), at(flight.alpha_rad)
    quat_ew = _path_quat(flight, k, i)
    quat_ew = quat_ew + part[:, None] * (_path_quat(flight, k, i + 1) - quat_ew)
    y[:, r.Q0 : r.Q3 + 1] = quat_ew / np.linalg.norm(quat_ew, axis=-1, keepdims=True)
    rate_b = at(flight.rate_b_radps)
    y[:, r.PITCH] = rate_b[:, 1]
    y[:, r.ROLL] = rate_b[:, 0] * np.cos(y[:, r.ALPHA]) + rate_b[:, 2] * np.sin(y[:, r.ALPHA])
    y[:, r.STAB], y[:, r.STICK] = at(flight.stabilator_rad), at(flight.stick)
    y[:, r.ENGINE] = at(flight.engine)
    y[:, r.NDEM] = at(flight.load_factor)
    return y
