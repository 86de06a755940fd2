"""From a frozen scene to the arrays the kernels take: trim at the entry, script table, fault, escape."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from scipy.interpolate import PchipInterpolator

from render.errors import FlightError
from render.flight import records as r
from render.flight import script as s
from render.flight.air import G0_MPS2, air_at, tas_from_cas, temp_offset
from render.flight.airframe import (
    alpha_for_lift,
    drag_coefficient,
    lift_coefficient,
    stab_for_steady,
    thrust_full,
)
from render.frames import Array, quat_from_euler
from scenes.airframe import Airframe
from scenes.model import BreakOut, Climb, Dive, Fault, Level, Loop, Power, PullOut, Roll, Scene

LOOP_LAST_RAD = np.radians(350.0)  # a table that ends beyond this ends the loop with its last knot
DT_S = 0.02
ONSET_LEAD_GPS = 4.0  # common practice, no source: a brisk but smooth hand
MAX_KNOTS = 32


@dataclass(frozen=True, slots=True, eq=False)
class Plan:
    """One scene compiled for the kernels; K aircraft, the lead first."""

    scene: Scene
    airframes: tuple[Airframe, ...]  # (K,)
    af: Any  # (K,) AIRFRAME_DT
    case: Any  # (1,) CASE_DT, with the fault
    entry: Array  # (K, NY) states at the start
    script: Array  # (S, NS)
    knots: Array  # (L, MAX_KNOTS)
    coeffs: Array  # (L, MAX_KNOTS - 1, 4)
    slots: Array  # (K - 1, 3) aft, right, down
    escape: Any  # (1,) ESCAPE_DT
    longest_s: float  # how long the script can take at most
    memory: Array = field(default_factory=lambda: np.zeros(s.NM))  # (NM,) of the lead, if the plan begins inside

    @property
    def wind_e_mps(self) -> Array:
        """Where the air goes, north east down, m/s, (3,)."""
        return np.array([self.case[0]["wind_n_mps"], self.case[0]["wind_e_mps"], 0.0])


def trim_level(airframe: Airframe, height_above_sea_m: float, temp_offset_k: float,
               speed_mps: float) -> tuple[float, float, float]:
    """Angle of attack rad, stabilator rad and thrust as a part of full for level flight at a true airspeed.

    Raises FlightError if the aircraft can't fly level at that speed.
    """
    af = r.airframe_record(airframe, 0.0)[0]
    _, _, rho, sound = air_at(height_above_sea_m, temp_offset_k)
    qs = 0.5 * rho * speed_mps**2 * airframe.wing_area_m2
    weight = airframe.mass_kg * G0_MPS2
    full = thrust_full(af, rho, sound, speed_mps)
    alpha, thrust = 0.05, 0.0
    for _ in range(60):
        cl = (weight - thrust * math.sin(alpha)) / qs
        if cl > airframe.cl_max:
            raise FlightError(
                f"{airframe.name} can't fly level at {speed_mps / (1852 / 3600):.0f} kt true airspeed: it needs a "
                f"lift coefficient of {cl:.2f}, the greatest is {airframe.cl_max:.2f}"
            )
        alpha = alpha_for_lift(af, cl)
        drag = qs * drag_coefficient(af, lift_coefficient(af, alpha), alpha)
        thrust = drag / math.cos(alpha)
    if thrust > full:
        raise FlightError(
            f"{airframe.name} can't hold level flight at {speed_mps / (1852 / 3600):.0f} kt true airspeed: it needs "
            f"{thrust / 1e3:.1f} kN of thrust and has {full / 1e3:.1f} kN at full power there"
        )
    stab = stab_for_steady(af, alpha, 0.0, speed_mps)
    return float(alpha), float(stab), float(thrust / full)


def entry_state(
    airframe: Airframe, level: Level, field_elevation_m: float, temp_offset_k: float
) -> tuple[Array, float]:
    """Trimmed state (NY,) at the start of the script, at the origin, and the trimmed stabilator angle."""
    assert level.speed_mps is not None and level.height_m is not None and level.heading_rad is not None
    above_sea = field_elevation_m + level.height_m
    _, pressure, _, sound = air_at(above_sea, temp_offset_k)
    speed = tas_from_cas(level.speed_mps, pressure, sound)
    alpha, stab, engine = trim_level(airframe, above_sea, temp_offset_k, speed)
    y = np.zeros(r.NY)
    y[r.D] = -level.height_m
    y[r.V] = speed
    y[r.Q0 : r.Q3 + 1] = quat_from_euler(level.heading_rad, 0.0, 0.0)
    y[r.ALPHA], y[r.STAB], y[r.ENGINE], y[r.NDEM] = alpha, stab, engine, 1.0
    return y, stab


def _power(row: Array, power: Power) -> None:
    row[s.S_POWER] = r.POWER_CODES[power.kind]
    row[s.S_PART] = power.part


def script_table(scene: Scene) -> tuple[Array, Array, Array, float]:
    """The script as (S, NS), its load factor schedules as monotone cubics, and how long it can take, s."""
    rows = np.zeros((len(scene.script), s.NS))
    knots: list[Array] = []
    coeffs: list[Array] = []
    longest = 0.0
    for row, step in zip(rows, scene.script, strict=True):
        _power(row, step.power)
        row[s.S_HEIGHT] = -1e9
        if isinstance(step, Level):
            row[s.S_KIND], row[s.S_FOR] = r.LEVEL, step.for_s
            row[s.S_CAS] = step.speed_mps or 0.0
            row[s.S_HEIGHT] = -1e9 if step.height_m is None else step.height_m
            longest += step.for_s
        elif isinstance(step, Loop):
            x = np.array(step.angle_rad)
            n = np.array(step.load_factor)
            # the demand holds its first and last value outside the knots
            straight = np.array([[0.0, 0.0, (n[1] - n[0]) / (x[1] - x[0]), n[0]]])
            pieces = PchipInterpolator(x, n).c.T if len(x) > 2 else straight
            k = np.full(MAX_KNOTS, x[-1])
            k[: len(x)] = x
            k[len(x) :] = x[-1] + np.arange(1, MAX_KNOTS - len(x) + 1)
            c = np.zeros((MAX_KNOTS - 1, 4))
            c[: len(x) - 1] = pieces
            c[len(x) - 1 :, 3] = n[-1]
            row[s.S_KIND], row[s.S_SCHEDULE] = r.LOOP, len(knots)
            row[s.S_ANGLE] = min(x[-1], 2.0 * np.pi) if x[-1] > LOOP_LAST_RAD else 2.0 * np.pi
            knots.append(k)
            coeffs.append(c)
            longest += 75.0
        elif isinstance(step, Roll):
            row[s.S_KIND], row[s.S_ANGLE], row[s.S_RATE] = r.ROLL_STEP, step.angle_rad, step.rate_radps
            row[s.S_LOAD] = step.load_factor
            longest += abs(step.angle_rad) / step.rate_radps + 3.0
        elif isinstance(step, Climb):
            row[s.S_KIND], row[s.S_ANGLE] = r.CLIMB, step.angle_rad
            row[s.S_LOAD], row[s.S_FOR] = step.load_factor, step.for_s
            longest += step.for_s
        elif isinstance(step, Dive):
            row[s.S_KIND], row[s.S_ANGLE] = r.DIVE, step.angle_rad
            row[s.S_LOAD], row[s.S_FOR] = step.load_factor, step.for_s
            longest += step.for_s
        elif isinstance(step, PullOut):
            row[s.S_KIND], row[s.S_LOAD] = r.PULL_OUT, step.load_factor
            longest += 30.0
    if not knots:
        knots, coeffs = [np.arange(MAX_KNOTS, dtype=float)], [np.zeros((MAX_KNOTS - 1, 4))]
    return rows, np.array(knots), np.array(coeffs), longest


def case_record(scene: Scene, airframe: Airframe) -> Any:
    """Day and fault as a kernel record, (1,) of CASE_DT."""
    case = np.zeros(1, r.CASE_DT)
    day = scene.day
    case["field_elevation_m"] = day.field_elevation_m
    case["temp_offset_k"] = temp_offset(day.field_elevation_m, day.temperature_k)
    if day.wind is not None:
        case["wind_n_mps"] = -day.wind.speed_mps * math.cos(day.wind.from_rad)
        case["wind_e_mps"] = -day.wind.speed_mps * math.sin(day.wind.from_rad)
    case["onset_gps"] = ONSET_LEAD_GPS
    case["loop_scale"] = 1.0
    case["density_held_kgm3"] = -1.0
    if scene.fault is not None:
        _fault(case, scene.fault, airframe)
    return case


def _fault(case: Any, fault: Fault, airframe: Airframe) -> None:
    case["fault_kind"] = r.FAULT_CODES[fault.kind]
    case["fault_at"] = r.AT_CODES[fault.at.kind]
    case["fault_value"] = fault.at.value
    case["fault_down"] = 0.0 if fault.at.going == "up" else 1.0
    case["fault_fraction"] = fault.fraction
    case["fault_rate_radps"] = fault.rate_radps
    case["fault_over_s"] = fault.over_s
    lost = fault.engines_lost or airframe.engines
    case["fault_lost"] = min(lost, airframe.engines) / airframe.engines


def escape_record(break_out: BreakOut, *, roll_first: bool, delay_s: float | None = None) -> Any:
    """A break-out as a kernel record, (1,) of ESCAPE_DT."""
    esc = np.zeros(1, r.ESCAPE_DT)
    esc["load_factor"] = break_out.load_factor
    esc["onset_gps"] = break_out.onset_gps
    esc["bank_away_rad"] = break_out.bank_away_rad
    esc["power_kind"] = r.POWER_CODES[break_out.power.kind]
    esc["power_part"] = break_out.power.part
    esc["delay_s"] = break_out.delay_s if delay_s is None else delay_s
    esc["roll_first"] = 1.0 if roll_first else 0.0
    return esc


def escape_pair(break_out: BreakOut, *, delay_s: float | None = None) -> Any:
    """The two escapes a break-out may be, (1, 2) of ESCAPE_DT: pulling as he is, and rolling first."""
    pair = [escape_record(break_out, roll_first=roll_first, delay_s=delay_s) for roll_first in (False, True)]
    return np.concatenate(pair).reshape(1, 2)


Memo = dict[tuple[Any, ...], Any]
"""What scenes that are variants of one share when compiled: trims, records, script tables."""


def compile_scene(scene: Scene, airframes: tuple[Airframe, ...], memo: Memo | None = None) -> Plan:
    """Compile a scene; airframes (K,): the lead's, then each slot's; memo: kept between variants of a scene.

    Raises FlightError if an aircraft can't fly the entry.
    """
    first = scene.script[0]
    if not isinstance(first, Level):
        raise FlightError("the script must begin with a level step that gives speed, height and heading")
    memo = {} if memo is None else memo
    case = case_record(scene, airframes[0])
    dt_k = float(case["temp_offset_k"][0])
    states, recs = [], []
    for airframe in airframes:
        key = (airframe, first, scene.day.field_elevation_m, dt_k)
        if key not in memo:
            y, stab = entry_state(airframe, first, scene.day.field_elevation_m, dt_k)
            memo[key] = y, r.airframe_record(airframe, stab)
        states.append(memo[key][0])
        recs.append(memo[key][1])
    entry = np.array(states)
    slots = np.array([[sl.aft_m, sl.right_m, sl.down_m] for sl in scene.formation]).reshape(-1, 3)
    heading = first.heading_rad or 0.0
    for k, (aft, right, down) in enumerate(slots, start=1):
        entry[k, r.N] = -aft * math.cos(heading) - right * math.sin(heading)
        entry[k, r.E] = -aft * math.sin(heading) + right * math.cos(heading)
        entry[k, r.D] += down
        entry[k, r.V] = entry[0, r.V]
    if scene.script not in memo:
        memo[scene.script] = script_table(scene)
    table, knots, coeffs, longest = memo[scene.script]
    return Plan(scene, airframes, np.concatenate(recs), case, entry, table, knots, coeffs, slots,
                escape_record(scene.break_out, roll_first=True), longest)
