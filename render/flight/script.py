"""What the lead wants: the script's steps as demands of load factor, roll rate and throttle."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numba import njit

from render.flight.air import G0_MPS2, cas_from_tas
from render.flight.airframe import drag_coefficient, lift_coefficient, thrust_full
from render.flight.kinematics import air_of, limit_demand, path_axes, path_x
from render.flight.records import (
    ALPHA,
    CLIMB,
    DIVE,
    LEVEL,
    LOOP,
    POWER_FULL,
    POWER_HELD,
    POWER_IDLE,
    PULL_OUT,
    ROLL_STEP,
    Array,
    D,
    V,
)

# What the lead remembers between steps of the script (one row a flight).
(M_STEP, M_START_S, M_HEIGHT, M_CAS, M_HEAD_N, M_HEAD_E, M_LOOP, M_ROLLED, M_THROTTLE, M_FAULT_ON, M_FAULT_S,
 M_STAB, M_TOP_S, M_LAST_HEIGHT, M_LOOPS, M_SCRIPT_END_S, M_INSIDE) = range(17)
NM = 17

# Columns of the script table.
(S_KIND, S_CAS, S_HEIGHT, S_FOR, S_POWER, S_PART, S_ANGLE, S_RATE, S_LOAD, S_SCHEDULE) = range(10)
NS = 10

GAIN_PATH = 2.0  # 1/s, flight path angle held by the lead
GAIN_HEIGHT = 0.25  # 1/s, sink asked per metre of height missed
GAIN_ROLL = 2.5  # 1/s
LEVEL_N_MIN, LEVEL_N_MAX = 0.6, 3.0  # what a lead asks of his formation in level flight (common practice, no source)
SPEED_FLOOR = 1.2  # times the stall speed: where a lead gives up his climb (common practice, no source)
NOSE_DOWN_RAD = 1.2  # for each stall speed he is slower than that
GAIN_SPEED = 0.6  # 1/s, acceleration asked per m/s of speed missed


@njit(cache=True)
def loop_angle(y: Array, mem: Array) -> float:
    """Angle of the path in the vertical plane of the entry heading, rad, unwrapped near the last one known."""
    ax, ay, az = path_x(y)
    along = ax * mem[M_HEAD_N] + ay * mem[M_HEAD_E]
    angle = math.atan2(-az, along)
    turns = round((mem[M_LOOP] - angle) / (2.0 * math.pi))
    return angle + 2.0 * math.pi * turns


@njit(cache=True)
def scheduled(angle_rad: float, knots: Array, coeffs: Array, scale: float) -> float:
    """Load factor demanded at a loop angle: a monotone cubic through the knots, the back half scaled.

    coeffs (M - 1, 4), highest power first. The scale comes in smoothly over 20 deg from the top on.
    """
    m = knots.shape[0]
    a = min(max(angle_rad, knots[0]), knots[m - 1])
    k = min(max(np.searchsorted(knots, a, side="right") - 1, 0), m - 2)
    x = a - knots[k]
    n = ((coeffs[k, 0] * x + coeffs[k, 1]) * x + coeffs[k, 2]) * x + coeffs[k, 3]
    u = min(max((angle_rad - math.pi) / 0.349066, 0.0), 1.0)
    return n * (1.0 + (scale - 1.0) * u * u * (3.0 - 2.0 * u))


@njit(cache=True)
def throttle_for_speed(y: Array, af: Any, case: Any, accel_mps2: float) -> float:
    """Throttle that gives an acceleration along the path, 0..1."""
    _, _, rho, sound = air_of(y, case)
    speed = y[V]
    cl = lift_coefficient(af, y[ALPHA])
    drag = 0.5 * rho * speed * speed * af.wing_area_m2 * drag_coefficient(af, cl, y[ALPHA])
    _, _, az = path_x(y)
    needed = (af.mass_kg * (accel_mps2 - G0_MPS2 * az) + drag) / max(math.cos(y[ALPHA]), 0.5)
    part = needed / thrust_full(af, rho, sound, speed)
    return min(max((part - af.thrust_idle) / (1.0 - af.thrust_idle), 0.0), 1.0)


@njit(cache=True)
def roll_to_side(y: Array, side_n: float, side_e: float) -> float:
    """Roll rate that brings the right wing to a horizontal direction of earth, rad/s."""
    _, _, _, bx, by, _, cx, cy, _ = path_axes(y)
    return GAIN_ROLL * math.atan2(side_n * cx + side_e * cy, side_n * bx + side_e * by)


@njit(cache=True)
def path_demand(y: Array, af: Any, case: Any, gamma_asked: float) -> float:
    """Load factor that turns the flight path toward an angle; below SPEED_FLOOR stall speeds he lowers the nose."""
    _, _, az, _, _, _, _, _, cz = path_axes(y)
    gamma = -math.asin(min(max(az, -1.0), 1.0))
    _, _, rho, _ = air_of(y, case)
    stall = math.sqrt(2.0 * af.mass_kg * G0_MPS2 / (rho * af.wing_area_m2 * af.cl_max))
    slow = max(SPEED_FLOOR - y[V] / stall, 0.0)
    gamma_asked = max(gamma_asked - NOSE_DOWN_RAD * slow, min(gamma_asked, -0.35))
    return cz + GAIN_PATH * (gamma_asked - gamma) * y[V] / G0_MPS2


@njit(cache=True)
def lead_commands(
    t: float, y: Array, af: Any, case: Any, mem: Array, script: Array, knots: Array, coeffs: Array
) -> tuple[float, float, float, float, int]:
    """What the lead asks for: load factor, onset limit (g/s), roll rate, throttle, what limits him.

    script (S, NS); knots (L, M), coeffs (L, M - 1, 4): the loops' schedules.
    """
    row = script[int(mem[M_STEP])]
    kind = int(row[S_KIND])
    height = -y[D]
    roll = roll_to_side(y, -mem[M_HEAD_E], mem[M_HEAD_N])
    n = 1.0
    if kind == LEVEL:
        sink = min(max(GAIN_HEIGHT * (mem[M_HEIGHT] - height), -15.0), 15.0)
        n = path_demand(y, af, case, math.asin(min(max(sink / y[V], -0.5), 0.5)))
        n = min(max(n, LEVEL_N_MIN), LEVEL_N_MAX)
    elif kind == LOOP:
        k = int(row[S_SCHEDULE])
        n = scheduled(loop_angle(y, mem), knots[k], coeffs[k], case.loop_scale)
    elif kind == ROLL_STEP:
        n = row[S_LOAD]
        roll = row[S_RATE] if row[S_ANGLE] > 0.0 else -row[S_RATE]
    elif kind == CLIMB:
        n = min(max(path_demand(y, af, case, row[S_ANGLE]), 0.2), row[S_LOAD])
    elif kind == DIVE:
        n = max(min(path_demand(y, af, case, -row[S_ANGLE]), 2.0), row[S_LOAD])
    elif kind == PULL_OUT:
        n = row[S_LOAD]
    n, limit = limit_demand(y, af, case, n, af.cl_buffet + 0.6 * (af.cl_max - af.cl_buffet))
    power = int(row[S_POWER])
    throttle = row[S_PART]
    if power == POWER_FULL:
        throttle = 1.0
    elif power == POWER_IDLE:
        throttle = 0.0
    elif power == POWER_HELD:
        if kind == LEVEL:
            _, pressure, _, sound = air_of(y, case)
            missed = mem[M_CAS] - cas_from_tas(y[V], pressure, sound)
            throttle = throttle_for_speed(y, af, case, GAIN_SPEED * missed)
        else:
            throttle = mem[M_THROTTLE]
    return n, case.onset_gps, roll, throttle, limit


@njit(cache=True)
def begin_step(t: float, y: Array, case: Any, mem: Array, script: Array, throttle: float) -> None:
    """Remember what the step that begins needs: its start, height, speed, heading, throttle."""
    row = script[int(mem[M_STEP])]
    ax, ay, _ = path_x(y)
    flat = math.hypot(ax, ay)
    if flat > 0.05:
        mem[M_HEAD_N], mem[M_HEAD_E] = ax / flat, ay / flat
    mem[M_START_S] = t
    mem[M_HEIGHT] = row[S_HEIGHT] if row[S_HEIGHT] > -1e8 else -y[D]
    _, pressure, _, sound = air_of(y, case)
    mem[M_CAS] = row[S_CAS] if row[S_CAS] > 0.0 else cas_from_tas(y[V], pressure, sound)
    mem[M_LOOP] = 0.0
    mem[M_ROLLED] = 0.0
    mem[M_THROTTLE] = throttle


@njit(cache=True)
def step_done(t: float, y: Array, mem: Array, script: Array) -> bool:
    """Whether the script step the lead is in has ended."""
    row = script[int(mem[M_STEP])]
    kind = int(row[S_KIND])
    _, _, az = path_x(y)
    if kind == LOOP:
        # the unloading at the end of the table is part of the loop, what is left of its angle is not
        return mem[M_LOOP] >= row[S_ANGLE]
    if kind == ROLL_STEP:
        return abs(mem[M_ROLLED]) >= abs(row[S_ANGLE]) - 1e-6
    if kind == PULL_OUT:
        return az <= 0.0
    return t - mem[M_START_S] >= row[S_FOR] - 1e-9
