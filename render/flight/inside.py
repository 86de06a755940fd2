"""Flights that begin inside a script: at an angle of the loop, with the speed and height wanted there.

A gate is a state: path angle, speed and height decide what comes after it. The state is taken from a flown
pass; where speed differs, angle of attack, nose rate, surface and stick go with it as they do in steady flight.
"""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from render.errors import FlightError
from render.flight import records as r
from render.flight import script as s
from render.flight.air import G0_MPS2, air_at, tas_from_cas
from render.flight.airframe import alpha_for_lift, stab_for_steady, thrust_full
from render.flight.batch import Raw, fly_batch
from render.flight.plan import DT_S, Plan
from render.frames import Array
from scenes.model import Level, Loop

FAR_BELOW = np.full((1, 1), -20_000.0)  # a ground that no pass meets
FAR_GRID = np.array([0.0, 0.0, 1.0])
FAR_BELOW.setflags(write=False)  # as ``ground_arrays`` has it


@dataclass(frozen=True, slots=True, eq=False)
class Crossing:
    """Where a flown pass went through an angle of its loop; K aircraft."""

    angle_rad: float
    time_s: float
    y: Array  # (K, NY)
    a: Array  # (K, NA)
    step: int  # of the script
    cas_mps: float  # of the lead
    height_m: float  # of the lead, above the field


def fly_far(plans: Sequence[Plan], scale: Array, seconds: float) -> Raw:
    """Fly plans of one shape without their fault, over a ground far below."""
    return fly_batch(plans, scale, round(seconds / DT_S), FAR_BELOW, FAR_GRID, healthy=True)


def loop_step(plan: Plan) -> int:
    """Index of the script's first loop. Raises FlightError if there is none."""
    for i, step in enumerate(plan.scene.script):
        if isinstance(step, Loop):
            return i
    raise FlightError(f"'{plan.scene.name}' has no loop in its script, and this needs one")


def crossing(plan: Plan, raw: Raw, b: int, angle_rad: float) -> Crossing:
    """The state in which flight ``b`` first passes an angle of its first loop, linear between steps.

    Raises FlightError if it never does.
    """
    step = loop_step(plan)
    loop, at = raw.a[b, :, 0, r.A_LOOP], raw.a[b, :, 0, r.A_STEP]
    over = np.flatnonzero((loop[:-1] < angle_rad) & (loop[1:] >= angle_rad) & (at[:-1] == step))
    if over.size == 0:
        raise FlightError(f"the loop of '{plan.scene.name}' never comes to {math.degrees(angle_rad):.0f} deg of its "
                          "turn: the aircraft runs out of speed before")
    i = int(over[0])
    part = (angle_rad - loop[i]) / (loop[i + 1] - loop[i])
    y = raw.y[b, i] + part * (raw.y[b, i + 1] - raw.y[b, i])
    a = raw.a[b, i] + part * (raw.a[b, i + 1] - raw.a[b, i])
    y[:, r.Q0 : r.Q3 + 1] /= np.linalg.norm(y[:, r.Q0 : r.Q3 + 1], axis=-1, keepdims=True)
    return Crossing(angle_rad, (i + part) * DT_S, y, a, step, float(a[0, r.A_CAS]), float(-y[0, r.D]))


def begin_at(plan: Plan, gate: Crossing, cas_mps: float | None = None, height_m: float | None = None) -> Plan:
    """The plan begun where a pass went through an angle, at another calibrated speed and height if given.

    Height in m above the field, of the lead; the wings keep their places about him. Time begins there.
    """
    case = plan.case[0]
    height = gate.height_m if height_m is None else height_m
    cas = gate.cas_mps if cas_mps is None else cas_mps
    _, pressure, _, sound = air_at(case["field_elevation_m"] + height, case["temp_offset_k"])
    y = gate.y.copy()
    faster_mps = tas_from_cas(cas, pressure, sound) - y[0, r.V]
    for k in range(len(y)):
        load = float(gate.a[k, r.A_N])
        before = steady_angles(plan.af[k], case, y[k], load)
        y[k, r.D] -= height - gate.height_m
        y[k, r.V] += faster_mps
        after = steady_angles(plan.af[k], case, y[k], load)
        y[k, [r.ALPHA, r.PITCH, r.STAB, r.STICK]] += np.array(after) - np.array(before)
    memory = np.zeros(s.NM)
    first = plan.scene.script[0]
    heading = first.heading_rad if isinstance(first, Level) and first.heading_rad is not None else 0.0
    memory[s.M_INSIDE], memory[s.M_STEP], memory[s.M_LOOPS] = 1.0, gate.step, 1.0
    memory[s.M_LOOP], memory[s.M_HEIGHT], memory[s.M_CAS] = gate.angle_rad, height, cas
    memory[s.M_HEAD_N], memory[s.M_HEAD_E] = math.cos(heading), math.sin(heading)
    memory[s.M_THROTTLE] = gate.a[0, r.A_THROTTLE]
    memory[s.M_FAULT_S], memory[s.M_SCRIPT_END_S] = -1.0, -1.0
    memory[s.M_TOP_S] = 0.0 if gate.angle_rad >= math.pi - 1e-9 else -1.0
    return dataclasses.replace(plan, entry=y, memory=memory)


def steady_angles(af: Any, case: Any, y: Array, load: float) -> tuple[float, float, float, float]:
    """Angle of attack, path rate, surface and stick at a load factor in steady flight in this state."""
    _, _, rho, sound = air_at(case["field_elevation_m"] - y[r.D], case["temp_offset_k"])
    if case["density_held_kgm3"] > 0.0:
        rho = case["density_held_kgm3"]
    speed = y[r.V]
    qs = 0.5 * rho * speed**2 * af["wing_area_m2"]
    thrust = 0.0 if af["thrust_equals_drag"] > 0.5 else thrust_full(af, rho, sound, speed) * y[r.ENGINE]
    alpha = 0.0
    for _ in range(30):
        alpha = alpha_for_lift(af, (load * af["mass_kg"] * G0_MPS2 - thrust * math.sin(alpha)) / qs)
    w, a, b, c = y[r.Q0 : r.Q3 + 1]
    across = G0_MPS2 * (w * w - a * a - b * b + c * c)  # gravity along the path's z
    pitch = (load * G0_MPS2 - across) / speed
    stab = stab_for_steady(af, alpha, pitch, speed)
    return alpha, pitch, stab, (af["stab_trim_rad"] - stab) / (af["stab_trim_rad"] - af["stab_min_rad"])


def frozen_at(plan: Plan, angle_rad: float) -> Plan:
    """The plan with a surface that freezes at an angle of the loop (whatever its scene says)."""
    case = plan.case.copy()
    case["fault_kind"], case["fault_at"] = r.FAULT_CODES["freeze"], r.AT_LOOP_ANGLE
    case["fault_value"] = angle_rad
    return dataclasses.replace(plan, case=case)


def demanding(plan: Plan, load_factor: float) -> Plan:
    """The plan with one load factor demanded through the whole of its first loop, to level flight again."""
    loop = loop_step(plan)
    script, coeffs = plan.script.copy(), plan.coeffs.copy()
    script[loop, s.S_ANGLE] = 2.0 * np.pi
    coeffs[int(script[loop, s.S_SCHEDULE])] = np.array([0.0, 0.0, 0.0, load_factor])
    return dataclasses.replace(plan, script=script, coeffs=coeffs)
