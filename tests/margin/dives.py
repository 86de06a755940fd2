"""Straight dives as flights, made from closed forms: what the margin's escapes start from."""

from __future__ import annotations

import dataclasses
import math
from typing import Any

import numpy as np

from render.flight.airframe import alpha_for_lift, stab_for_steady
from render.flight.plan import Plan, compile_scene
from render.frames import Array, quat_from_euler
from render.types import Flight
from scenes.model import BreakOut
from tests.flight.made import invented_jet, loop_scene

G = 9.80665
RHO = 1.225
# An aircraft whose surface and nose follow at once: what the closed forms assume.
QUICK: dict[str, Any] = dict(
    cl_buffet=1e3, cl_max=1e3, cl_min=-1e3, cm_zero=0.0, n_max=99.0, n_min=-99.0, speed_max_mps=999.0, mach_max=9.0,
    inertia_pitch_kgm2=3800.0, stab_lag_s=0.01, stab_rate_radps=5.0,
)


def exact_plan(n: float, *, floor_m: float = 30.0, delay_s: float = 0.0) -> Plan:
    """A plan whose escape pulls n at once, thrust = drag, air of one density, no delay."""
    scene = dataclasses.replace(
        loop_scene(slots=()), floor_m=floor_m, break_out=BreakOut(n, 1e3, delay_s=delay_s)
    )
    plan = compile_scene(scene, (invented_jet(**QUICK),))
    plan.af["thrust_equals_drag"] = 1.0
    plan.case["density_held_kgm3"] = RHO
    return plan


def straight_dive(plan: Plan, *, speed_mps: float, dive_rad: float, height_m: float, end_s: float,
                  n: float | None = None) -> Flight:
    """A straight dive northward with thrust = drag: V' = g sin(dive).

    n: load factor the wing carries at every instant; None: that of the straight dive, cos(dive). With the
    pull-out's own n an escape begins with its load factor already there, as the closed form has it.
    """
    time_s: Array = np.arange(round(end_s / 0.02) + 1, dtype=np.float64) * 0.02
    speed = speed_mps + G * math.sin(dive_rad) * time_s
    along = speed_mps * time_s + 0.5 * G * math.sin(dive_rad) * time_s**2
    carried = math.cos(dive_rad) if n is None else n
    af = plan.af[0]
    qs = 0.5 * RHO * speed**2 * af["wing_area_m2"]
    alpha = np.array([alpha_for_lift(af, carried * af["mass_kg"] * G / x) for x in qs])
    alpha_rate = -2.0 * alpha * G * math.sin(dive_rad) / speed
    pitch = G * (carried - math.cos(dive_rad)) / speed + alpha_rate
    stab = np.array([stab_for_steady(af, a, q, v) for a, q, v in zip(alpha, pitch, speed, strict=True)])
    stick = (af["stab_trim_rad"] - stab) / (af["stab_trim_rad"] - af["stab_min_rad"])
    quat = np.array([quat_from_euler(0.0, a - dive_rad, 0.0) for a in alpha])
    zero = np.zeros_like(time_s)
    pos = np.stack([along * math.cos(dive_rad), zero, along * math.sin(dive_rad) - height_m], axis=-1)
    vel = speed[:, None] * np.array([math.cos(dive_rad), 0.0, math.sin(dive_rad)])

    def one(values: Array) -> Array:
        return values[:, None].copy()

    return Flight(
        time_s=time_s, pos_e_m=pos[:, None], vel_e_mps=vel[:, None], quat_eb=quat[:, None],
        rate_b_radps=np.stack([zero, pitch, zero], axis=-1)[:, None], speed_mps=one(speed), cas_mps=one(speed),
        alpha_rad=one(alpha), load_factor=one(zero + carried), load_factor_demand=one(zero + carried),
        stick=one(stick), stick_force_n=one(zero), stabilator_rad=one(stab), thrust_n=one(zero), throttle=one(zero),
        engine=one(zero + 1.0), gamma_rad=one(zero - dive_rad), loop_angle_rad=one(zero), height_m=one(-pos[:, 2]),
        height_agl_m=one(-pos[:, 2]), step=zero.copy(), airframes=plan.airframes, names=("lead",), fault_s=None,
        contact_s=(None,), events={}, loop_scale=1.0,
    )

