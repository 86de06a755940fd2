"""The equations of motion of one aircraft and the fixed-step integrator, as scalar kernels.

Zero-sideslip flight in three dimensions over a flat earth with constant gravity. Air-path axes
``w``: x along the airspeed, z in the plane of symmetry, down. With L, D, T and alpha:
  V'   = (T cos a - D)/m + g_wx          q_w = (L + T sin a - m g_wz)/(m V)
  r_w  = g_wy/V                           a'  = q - q_w
  q'   = qbar S c Cm / Iy                 p'  = (p_asked - p)/tau_roll
Source: Etkin & Reid, Dynamics of Flight, ch. 4 (wind-axes form); checked against JSBSim in the tests.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numba import njit

from render.flight.air import G0_MPS2, air_at
from render.flight.airframe import (
    alpha_for_lift,
    drag_coefficient,
    lift_coefficient,
    pitching_moment,
    stab_for_steady,
    thrust_full,
)
from render.flight.controls import engine_target, surface_rate
from render.flight.records import (
    ALPHA,
    ENGINE,
    INTEG,
    LIMIT_BUFFET,
    LIMIT_N_MAX,
    LIMIT_NONE,
    NDEM,
    NO,
    NY,
    PITCH,
    Q0,
    Q1,
    Q2,
    Q3,
    ROLL,
    STAB,
    STICK,
    WORK_D,
    WORK_T,
    Array,
    D,
    E,
    N,
    V,
)

# The pilot's hand on the stick: a lag, a proportional and an integral part on the missed load
# factor. Engineering guesses inside the published crossover range (McRuer & Krendel 1974, AGARD-AG-188).
HAND_LAG_S = 0.12
DEMAND_LAG_S = 0.10
GAIN_P = 0.15
GAIN_I = 0.70  # 1/s
EXPECTED_LAG_S = 0.22  # in a steady change of demand he does not hold on against the lag he knows
GAIN_LEAD = 1.35  # he leads a change by this over the short-period frequency
GAIN_DAMP = 1.3  # and damps the nose by this times it, up to
DAMP_MAX_PS = 3.2


@njit(cache=True)
def path_axes(y: Array) -> tuple[float, float, float, float, float, float, float, float, float]:
    """The air-path axes x, y, z in earth axes, nine numbers, from the state's quaternion."""
    w, a, b, c = y[Q0], y[Q1], y[Q2], y[Q3]
    return (
        w * w + a * a - b * b - c * c, 2.0 * (a * b + w * c), 2.0 * (a * c - w * b),
        2.0 * (a * b - w * c), w * w - a * a + b * b - c * c, 2.0 * (b * c + w * a),
        2.0 * (a * c + w * b), 2.0 * (b * c - w * a), w * w - a * a - b * b + c * c,
    )


@njit(cache=True)
def path_x(y: Array) -> tuple[float, float, float]:
    """The direction of the airspeed in earth axes."""
    w, a, b, c = y[Q0], y[Q1], y[Q2], y[Q3]
    return w * w + a * a - b * b - c * c, 2.0 * (a * b + w * c), 2.0 * (a * c - w * b)


@njit(cache=True)
def air_of(y: Array, case: Any) -> tuple[float, float, float, float]:
    """Temperature, pressure, density, speed of sound where the aircraft is."""
    t, p, rho, a = air_at(case.field_elevation_m - y[D], case.temp_offset_k)
    if case.density_held_kgm3 > 0.0:
        rho = case.density_held_kgm3
    return t, p, rho, a


@njit(cache=True)
def load_factor_of(y: Array, af: Any, case: Any) -> tuple[float, float, float, float]:
    """Load factor along the lift axis, lift N, drag N, thrust N."""
    _, _, rho, sound = air_of(y, case)
    return load_factor_in(y, af, rho, sound)


@njit(cache=True)
def load_factor_in(y: Array, af: Any, rho: float, sound: float) -> tuple[float, float, float, float]:
    """``load_factor_of`` in air that is at hand: density kg/m3, speed of sound m/s (the powers in it cost most)."""
    speed = y[V]
    qs = 0.5 * rho * speed * speed * af.wing_area_m2
    cl = lift_coefficient(af, y[ALPHA])
    lift = qs * cl
    drag = qs * drag_coefficient(af, cl, y[ALPHA])
    thrust = thrust_full(af, rho, sound, speed) * y[ENGINE]
    if af.thrust_equals_drag > 0.5:
        # the exact solutions have thrust along the path, equal to drag
        return lift / (af.mass_kg * G0_MPS2), lift, drag, drag
    return (lift + thrust * math.sin(y[ALPHA])) / (af.mass_kg * G0_MPS2), lift, drag, thrust


@njit(cache=True)
def limit_demand(y: Array, af: Any, case: Any, n: float, cl_top: float) -> tuple[float, int]:
    """The load factor a pilot can ask for: within the structure's limit and short of a lift coefficient."""
    _, _, rho, _ = air_of(y, case)
    return limit_demand_in(y, af, rho, n, cl_top)


@njit(cache=True)
def limit_demand_in(y: Array, af: Any, rho: float, n: float, cl_top: float) -> tuple[float, int]:
    """``limit_demand`` in air of a density that is at hand, kg/m3."""
    per_cl = 0.5 * rho * y[V] * y[V] * af.wing_area_m2 / (af.mass_kg * G0_MPS2)
    limit = LIMIT_NONE
    if n > af.n_max:
        n, limit = af.n_max, LIMIT_N_MAX
    if n < af.n_min:
        n, limit = af.n_min, LIMIT_N_MAX
    if n > per_cl * cl_top:
        n, limit = per_cl * cl_top, LIMIT_BUFFET
    if n < per_cl * af.cl_min * 0.95:
        n, limit = per_cl * af.cl_min * 0.95, LIMIT_BUFFET
    return n, limit


@njit(cache=True)
def stick_wanted(
    y: Array, af: Any, rho: float, n_now: float, n_rate: float, thrust: float, g_z: float
) -> tuple[float, float]:
    """Stick the pilot's hand goes to for his demand, and the rate of his integral part.

    What the aircraft needs in steady flight (he knows it), and what he adds for the load factor he misses.
    """
    speed = y[V]
    weight = af.mass_kg * G0_MPS2
    qs = 0.5 * rho * speed * speed * af.wing_area_m2
    n = y[NDEM]
    lift_per_g = weight / (qs + thrust / af.lift_slope)
    alpha = alpha_for_lift(af, n * lift_per_g)
    pitch = (n * G0_MPS2 - g_z) / speed
    stab = stab_for_steady(af, alpha, pitch, speed)
    # surface per g at this speed: the pilot's sense of how much stick a missed g takes
    per_g = stab_for_steady(af, lift_per_g / af.lift_slope, G0_MPS2 / speed, speed) + af.cm_zero / af.cm_delta
    missed = n - n_now
    qsc = qs * af.chord_m / af.inertia_pitch_kgm2
    short_period = math.sqrt(max(-qsc * af.cm_alpha, 0.25))
    lead = min(GAIN_LEAD / short_period, 0.8) * n_rate
    damping = min(GAIN_DAMP * short_period, DAMP_MAX_PS) / max(-qsc * af.cm_delta, 1.0)
    asked = stab + (GAIN_P * missed + lead + y[INTEG]) * per_g + damping * (y[PITCH] - pitch)
    stick = (af.stab_trim_rad - asked) / (af.stab_trim_rad - af.stab_min_rad)
    forward = (af.stab_trim_rad - af.stab_max_rad) / (af.stab_trim_rad - af.stab_min_rad)
    rate = GAIN_I * (missed - EXPECTED_LAG_S * n_rate)
    if stick > 1.0:
        stick = 1.0
        rate = min(rate, 0.0)
    elif stick < max(forward, -1.0):
        stick = max(forward, -1.0)
        rate = max(rate, 0.0)
    return stick, rate


@njit(cache=True)
def derivative(
    y: Array, af: Any, case: Any, n_cmd: float, onset_gps: float, roll_cmd: float, throttle: float,
    fault_on: bool, stab_at_fault: float, hand: bool, stab_rate: float, dy: Array,
) -> None:
    """Rate of change of the state into ``dy``.

    hand: the pilot flies (demand -> stick -> surface). Otherwise the surface is prescribed and moves
    at ``stab_rate`` (checks and replays). Angles rad, rates rad/s, load factor n, SI.
    """
    _, _, rho, sound = air_of(y, case)
    derivative_in(
        y, af, case, rho, sound, n_cmd, onset_gps, roll_cmd, throttle, fault_on, stab_at_fault, hand, stab_rate, dy
    )


@njit(cache=True)
def derivative_in(
    y: Array, af: Any, case: Any, rho: float, sound: float, n_cmd: float, onset_gps: float, roll_cmd: float,
    throttle: float, fault_on: bool, stab_at_fault: float, hand: bool, stab_rate: float, dy: Array,
) -> None:
    """``derivative`` in air that is at hand: density kg/m3, speed of sound m/s."""
    ax, ay, az, _bx, _by, bz, _cx, _cy, cz = path_axes(y)
    speed, alpha = y[V], y[ALPHA]
    mass = af.mass_kg
    n_now, lift, drag, thrust = load_factor_in(y, af, rho, sound)
    g_x, g_y, g_z = G0_MPS2 * az, G0_MPS2 * bz, G0_MPS2 * cz
    ca, sa = math.cos(alpha), math.sin(alpha)
    if af.thrust_equals_drag > 0.5:
        ca, sa = 1.0, 0.0
    dy[N] = speed * ax + case.wind_n_mps
    dy[E] = speed * ay + case.wind_e_mps
    dy[D] = speed * az
    dy[V] = (thrust * ca - drag) / mass + g_x
    q_w = (lift + thrust * sa - mass * g_z) / (mass * speed)
    r_w = g_y / speed
    p_w = y[ROLL]
    w, a, b, c = y[Q0], y[Q1], y[Q2], y[Q3]
    dy[Q0] = 0.5 * (-a * p_w - b * q_w - c * r_w)
    dy[Q1] = 0.5 * (w * p_w + b * r_w - c * q_w)
    dy[Q2] = 0.5 * (w * q_w + c * p_w - a * r_w)
    dy[Q3] = 0.5 * (w * r_w + a * q_w - b * p_w)
    dy[ALPHA] = y[PITCH] - q_w
    qsc = 0.5 * rho * speed * speed * af.wing_area_m2 * af.chord_m
    dy[PITCH] = qsc * pitching_moment(af, alpha, y[PITCH], speed, y[STAB]) / af.inertia_pitch_kgm2
    roll = min(max(roll_cmd, -af.roll_rate_max_radps), af.roll_rate_max_radps)
    dy[ROLL] = (roll - p_w) / af.roll_s
    dy[ENGINE] = (engine_target(af, case, throttle, fault_on) - y[ENGINE]) / af.spool_s
    dy[WORK_T] = thrust * ca * speed
    dy[WORK_D] = drag * speed
    if not hand:
        dy[STAB] = stab_rate
        dy[STICK] = 0.0
        dy[INTEG] = 0.0
        dy[NDEM] = 0.0
        return
    rate = min(max((n_cmd - y[NDEM]) / DEMAND_LAG_S, -onset_gps), onset_gps)
    # in the exact cases the thrust lies along the path: none of it helps the lift
    helping = 0.0 if af.thrust_equals_drag > 0.5 else thrust
    wanted, integral_rate = stick_wanted(y, af, rho, n_now, rate, helping, g_z)
    dy[NDEM] = rate
    dy[STICK] = (wanted - y[STICK]) / HAND_LAG_S
    dy[INTEG] = integral_rate
    dy[STAB] = surface_rate(af, case, y[STICK], y[STAB], fault_on, stab_at_fault)


@njit(cache=True)
def renormalise(y: Array) -> None:
    """Bring the quaternion back to length one (its drift is of the integrator's order)."""
    s = 1.0 / math.sqrt(y[Q0] ** 2 + y[Q1] ** 2 + y[Q2] ** 2 + y[Q3] ** 2)
    y[Q0] *= s
    y[Q1] *= s
    y[Q2] *= s
    y[Q3] *= s


@njit(cache=True)
def ground_height(heights: Array, grid: Array, north_m: float, east_m: float) -> float:
    """Ground height, m: bilinear in a regular grid, its edge values beyond. grid: origin n, e, spacing."""
    ni, nj = heights.shape
    if ni == 1 and nj == 1:
        return heights[0, 0]
    x = min(max((north_m - grid[0]) / grid[2], 0.0), ni - 1.0)
    z = min(max((east_m - grid[1]) / grid[2], 0.0), nj - 1.0)
    i = min(int(x), ni - 2)
    j = min(int(z), nj - 2)
    fx, fz = x - i, z - j
    low = heights[i, j] * (1.0 - fz) + heights[i, j + 1] * fz
    high = heights[i + 1, j] * (1.0 - fz) + heights[i + 1, j + 1] * fz
    return low * (1.0 - fx) + high * fx


@njit(cache=True)
def fly_fixed(
    y0: Array, af: Any, case: Any, time_s: Array, stab_rad: Array, throttle: float, dt_s: float, steps: int
) -> Array:
    """Fly with a prescribed surface (linear between ``time_s``), throttle and no pilot.

    y0: (NY,) state; returns (steps + 1, NY). The surface at t = 0 replaces the state's. One classical
    Runge-Kutta step of 4th order per dt_s.
    """
    out = np.empty((steps + 1, NY))
    y = y0.copy()
    y[STAB] = np.interp(0.0, time_s, stab_rad)
    out[0] = y
    k1, k2, k3, k4 = np.empty(NY), np.empty(NY), np.empty(NY), np.empty(NY)
    for i in range(steps):
        t = i * dt_s
        s0 = np.interp(t, time_s, stab_rad)
        s1 = np.interp(t + dt_s, time_s, stab_rad)
        rate = (s1 - s0) / dt_s
        derivative(y, af, case, 0.0, 0.0, 0.0, throttle, NO, 0.0, NO, rate, k1)
        derivative(y + 0.5 * dt_s * k1, af, case, 0.0, 0.0, 0.0, throttle, NO, 0.0, NO, rate, k2)
        derivative(y + 0.5 * dt_s * k2, af, case, 0.0, 0.0, 0.0, throttle, NO, 0.0, NO, rate, k3)
        derivative(y + dt_s * k3, af, case, 0.0, 0.0, 0.0, throttle, NO, 0.0, NO, rate, k4)
        y = y + dt_s / 6.0 * (k1 + 2.0 * k2 + 2.0 * k3 + k4)
        y[STAB] = s1
        renormalise(y)
        out[i + 1] = y
    return out
