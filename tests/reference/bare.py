"""Our flight code reduced to what the exact solutions assume: thrust = drag, air of one density, no limits.

Nothing of the motion is written here: every rate comes from ``render.flight.kinematics.derivative``.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from render.flight import records as r
from render.flight.airframe import alpha_for_lift
from render.flight.kinematics import derivative
from render.frames import Array, quat_from_euler
from tests.flight.made import invented_jet

G = 9.80665
RHO = 1.225


def bare_airframe(*, thrust_equals_drag: bool = True, **changes: Any) -> Any:
    """Kernel record of the invented trainer of the reference cases; lift is a straight line without an end.

    m 5300 kg, S 16 m2, c 2.35 m, Iy 38 000 kg m2, CD .022 + .14 CL2, CL 4.0 alpha, Cm -.45/-9/-1.3.
    """
    figures: dict[str, Any] = dict(
        cl_buffet=1e3, cl_max=1e3, cl_min=-1e3, cd_induced=0.14, cm_zero=0.0, n_max=99.0, n_min=-99.0,
        thrust_static_n=23e3, thrust_mach_1=0.0, thrust_mach_2=0.0, speed_max_mps=999.0, mach_max=9.0,
    )
    figures.update(changes)
    return r.airframe_record(invented_jet(**figures), 0.0, thrust_equals_drag=thrust_equals_drag)[0]


def bare_case(*, density_kgm3: float = RHO) -> Any:
    """Case record without a fault; density_kgm3: held everywhere, negative for the standard atmosphere."""
    case = np.zeros(1, r.CASE_DT)
    case["loop_scale"] = 1.0
    case["onset_gps"] = 1e3
    case["density_held_kgm3"] = density_kgm3
    return case[0]


def state(speed_mps: float, gamma_rad: float, height_m: float, *, bank_rad: float = 0.0, alpha_rad: float = 0.0,
          pitch_radps: float = 0.0) -> Array:
    """State (NY,) heading north at full power."""
    y = np.zeros(r.NY)
    y[r.D], y[r.V], y[r.ALPHA], y[r.PITCH], y[r.ENGINE] = -height_m, speed_mps, alpha_rad, pitch_radps, 1.0
    y[r.Q0 : r.Q3 + 1] = quat_from_euler(0.0, gamma_rad, bank_rad)
    return y


def alpha_of(af: Any, speed_mps: float, n: float, density_kgm3: float = RHO) -> float:
    """Angle of attack of a load factor without thrust in it, rad."""
    qs = 0.5 * density_kgm3 * speed_mps**2 * af["wing_area_m2"]
    return float(alpha_for_lift(af, n * af["mass_kg"] * G / qs))


def path_direction(y: Array) -> Array:
    """Unit vectors (..., 3) north, east, down of the airspeed, from the state's quaternion."""
    w, a, b, c = np.moveaxis(y[..., r.Q0 : r.Q3 + 1], -1, 0)
    return np.stack([w * w + a * a - b * b - c * c, 2 * (a * b + w * c), 2 * (a * c - w * b)], axis=-1)


def path_angle(y: Array) -> Array:
    """Path angle (...,) in the vertical north plane, rad, unwrapped through the vertical and the top."""
    x = path_direction(y)
    return np.asarray(np.unwrap(np.arctan2(-x[..., 2], x[..., 0])))


def fly_load_factor(y0: Array, af: Any, case: Any, load_factor: float, end_s: float, *, steps: int,
                    hold_speed: bool = False) -> Array:
    """Fly our derivative with a load factor that is exactly constant: (steps + 1, NY).

    The angle of attack is set at every stage to the one of the load factor, so that only the equations of
    the path are at work: no surface, no pilot. hold_speed: the speed does not change either (case E2).
    """
    h = end_s / steps
    out = np.empty((steps + 1, r.NY))
    out[0] = y0

    def rate(y: Array) -> Array:
        z, dy = y.copy(), np.empty(r.NY)
        z[r.ALPHA] = alpha_of(af, z[r.V], load_factor)
        derivative(z, af, case, 1.0, 1.0, 0.0, 1.0, False, 0.0, False, 0.0, dy)
        for i in (r.ALPHA, r.PITCH, r.ROLL, r.ENGINE):
            dy[i] = 0.0
        if hold_speed:
            dy[r.V] = 0.0
        return dy

    for i in range(steps):
        out[i + 1] = _runge_kutta(rate, out[i], h)
    return out


def _runge_kutta(rate: Callable[[Array], Array], y: Array, h: float) -> Array:
    k1 = rate(y)
    k2 = rate(y + 0.5 * h * k1)
    k3 = rate(y + 0.5 * h * k2)
    k4 = rate(y + h * k3)
    return y + h / 6.0 * (k1 + 2.0 * k2 + 2.0 * k3 + k4)


def at_angle(time_s: Array, y: Array, gamma_rad: float) -> tuple[float, Array]:
    """Time and state (NY,) where the path angle first passes a value, linear between fine steps."""
    gamma = path_angle(y)
    i = int(np.flatnonzero((gamma[:-1] - gamma_rad) * (gamma[1:] - gamma_rad) <= 0.0)[0])
    part = (gamma_rad - gamma[i]) / (gamma[i + 1] - gamma[i])
    return float(time_s[i] + part * (time_s[i + 1] - time_s[i])), y[i] + part * (y[i + 1] - y[i])


