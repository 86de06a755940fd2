"""Our derivative linearised about a steady state by central differences: u, w, q, theta or alpha, q alone."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from scipy.optimize import fsolve

from render.flight import records as r
from render.flight.kinematics import derivative
from render.frames import Array, quat_conj, quat_from_euler, quat_multiply
from tests.reference.bare import G, state


def rates(y: Array, af: Any, case: Any) -> Array:
    """Our rate of change of a state, no pilot, surface and throttle as they are."""
    dy = np.empty(r.NY)
    derivative(y, af, case, 1.0, 1.0, 0.0, 1.0, False, 0.0, False, 0.0, dy)
    return dy


def steady_pull(af: Any, case: Any, speed_mps: float, n: float) -> tuple[float, float]:
    """Angle of attack and surface, rad, at the bottom of a steady pull-up to a load factor n, by our derivative.

    Steady: alpha' = 0 and q' = 0 with the pitch rate of the path, q = g (n - 1)/V.
    """
    q = G * (n - 1.0) / speed_mps

    def moving(x: Array) -> Array:
        y = state(speed_mps, 0.0, 0.0, alpha_rad=x[0], pitch_radps=q)
        y[r.STAB] = x[1]
        dy = rates(y, af, case)
        return np.array([dy[r.ALPHA], dy[r.PITCH]])

    alpha, stab = fsolve(moving, np.array([0.05, -0.02]), xtol=1e-11)
    return float(alpha), float(stab)


def short_period_block(af: Any, case: Any, speed_mps: float, n: float = 1.0) -> Array:
    """Jacobian (2, 2) of (alpha', q') by (alpha, q) at a speed that is held."""
    alpha, stab = steady_pull(af, case, speed_mps, n)
    q = G * (n - 1.0) / speed_mps
    y0 = state(speed_mps, 0.0, 0.0, alpha_rad=alpha, pitch_radps=q)
    y0[r.STAB] = stab
    block = np.empty((2, 2))
    for j, (i, h) in enumerate(((r.ALPHA, 1e-5), (r.PITCH, 1e-5))):
        up, down = y0.copy(), y0.copy()
        up[i] += h
        down[i] -= h
        change = (rates(up, af, case) - rates(down, af, case)) / (2.0 * h)
        block[:, j] = change[r.ALPHA], change[r.PITCH]
    return block


def longitudinal(af: Any, case: Any, speed_mps: float, alpha_rad: float, stab_rad: float, engine: float) -> Array:
    """Jacobian (4, 4) of (u', w', q', theta') by (u, w, q, theta) about level flight, stability axes.

    The body x axis of the books' stability axes lies along the airspeed of the steady state: with small
    changes V = V0 + u, alpha = alpha0 + w/V0 and the path angle is theta - w/V0.
    """

    def moving(x: Array) -> Array:
        u, w, q, theta = x
        speed = math.hypot(speed_mps + u, w)
        turn = math.atan2(w, speed_mps + u)  # of the airspeed below the steady x axis
        y = state(speed, 0.0, 0.0, alpha_rad=alpha_rad + turn, pitch_radps=q)
        y[r.Q0 : r.Q3 + 1] = quat_from_euler(0.0, theta - turn, 0.0)
        y[r.STAB], y[r.ENGINE] = stab_rad, engine
        dy = rates(y, af, case)
        # V' and alpha' turned back into u' and w'
        du = dy[r.V] * math.cos(turn) - speed * math.sin(turn) * dy[r.ALPHA]
        dw = dy[r.V] * math.sin(turn) + speed * math.cos(turn) * dy[r.ALPHA]
        return np.array([du, dw, dy[r.PITCH], q])

    matrix = np.empty((4, 4))
    for j, h in enumerate((1e-3, 1e-3, 1e-5, 1e-5)):
        step = np.zeros(4)
        step[j] = h
        matrix[:, j] = (moving(step) - moving(-step)) / (2.0 * h)
    return matrix


def path_rates(y: Array, af: Any, case: Any) -> Array:
    """Roll, pitch and yaw rate (3,) of the air-path axes, rad/s, out of our rate of the quaternion: 2 q* q'."""
    dy = rates(y, af, case)
    back = quat_conj(y[r.Q0 : r.Q3 + 1])
    return np.asarray(2.0 * quat_multiply(back, dy[r.Q0 : r.Q3 + 1])[1:])


def modes(matrix: Array) -> Array:
    """Eigenvalues with positive imaginary part, slowest first."""
    values = np.linalg.eigvals(matrix)
    values = values[values.imag > 1e-9]
    return np.asarray(values[np.argsort(np.abs(values))])
