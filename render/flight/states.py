"""States for the kernels taken back out of a Flight, at any instant."""

from __future__ import annotations

import numpy as np

from render.flight import records as r
from render.frames import Array, quat_multiply
from render.types import Flight


def state_rows(flight: Flight, k: int, times_s: Array) -> Array:
    """States (n, NY) of aircraft k at times within the flight, linear between instants.

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
    quat_eb = at(flight.quat_eb)
    quat_eb = quat_eb / np.linalg.norm(quat_eb, axis=-1, keepdims=True)
    back = np.zeros_like(quat_eb)
    back[:, 0], back[:, 2] = np.cos(y[:, r.ALPHA] / 2.0), -np.sin(y[:, r.ALPHA] / 2.0)
    y[:, r.Q0 : r.Q3 + 1] = quat_multiply(quat_eb, back)
    rate_b = at(flight.rate_b_radps)
    y[:, r.PITCH] = rate_b[:, 1]
    y[:, r.ROLL] = rate_b[:, 0] * np.cos(y[:, r.ALPHA]) + rate_b[:, 2] * np.sin(y[:, r.ALPHA])
    y[:, r.STAB], y[:, r.STICK] = at(flight.stabilator_rad), at(flight.stick)
    y[:, r.ENGINE] = at(flight.engine)
    y[:, r.NDEM] = at(flight.load_factor)
    return y
