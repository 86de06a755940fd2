"""The passes over time: the lead by his script, a wing pilot on his slot.

One flight is one call of a scalar kernel; a batch is the same kernel in a parallel loop, so
that a batch equals its single flights to the last bit. Steps of classical Runge-Kutta, 4th order,
with the pilots' demands worked out at every stage.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numba import njit, prange

from render.flight.air import G0_MPS2, HEIGHT_MAX_M, HEIGHT_MIN_M, cas_from_tas
from render.flight.controls import stick_force
from render.flight.kinematics import (
    air_of,
    derivative,
    ground_height,
    load_factor_of,
    path_x,
    renormalise,
)
from render.flight.records import (
    A_AGL,
    A_CAS,
    A_LIMIT,
    A_LOOP,
    A_N,
    A_NCMD,
    A_PUSH,
    A_ROLL_CMD,
    A_STEP,
    A_STICK_FORCE,
    A_THROTTLE,
    A_THRUST,
    AT_AFTER_TOP,
    AT_HEIGHT,
    AT_LOOP_ANGLE,
    AT_TIME,
    CONTACT,
    ENGINE,
    LOOP,
    NO,
    NOT_FINITE,
    NY,
    OK,
    OUT_OF_AIR,
    ROLL,
    ROLL_STEP,
    STAB,
    STICK,
    TOO_FAST,
    TOO_HIGH_MACH,
    YES,
    Array,
    D,
    E,
    N,
    V,
)
from render.flight.script import (
    M_FAULT_ON,
    M_FAULT_S,
    M_INSIDE,
    M_LOOP,
    M_LOOPS,
    M_ROLLED,
    M_SCRIPT_END_S,
    M_STAB,
    M_STEP,
    M_TOP_S,
    S_KIND,
    begin_step,
    lead_commands,
    loop_angle,
    step_done,
)
from render.flight.station import learn_trim, wing_commands

NOTHING = np.empty((0, 0))


@njit(cache=True)
def _put(into: Array, values: Array) -> None:
    """Copy a row; numba would compile the words of an error about shapes for ``into[:] = values``, for seconds."""
    for m in range(values.shape[0]):
        into[m] = values[m]


@njit(cache=True)
def _note(
    y: Array, a: Array, dy: Array, af: Any, case: Any, n_cmd: float, roll_cmd: float, throttle: float, limit: int,
    heights: Array, grid: Array,
) -> int:
    """Write what the step shows beside the state; returns why the flight must stop, if it must."""
    _, pressure, _, sound = air_of(y, case)
    n_now, _, _, thrust = load_factor_of(y, af, case)
    a[A_N] = n_now
    a[A_STICK_FORCE] = stick_force(af, y[STICK], n_now)
    a[A_THRUST] = thrust
    a[A_THROTTLE] = throttle
    a[A_CAS] = cas_from_tas(y[V], pressure, sound)
    a[A_AGL] = -y[D] - ground_height(heights, grid, y[N], y[E])
    a[A_NCMD] = n_cmd
    a[A_ROLL_CMD] = roll_cmd
    a[A_LIMIT] = limit
    _, _, az = path_x(y)
    a[A_PUSH] = dy[V] - G0_MPS2 * az  # specific force along the path: thrust less drag, m/s2
    if not math.isfinite(y[V]) or y[V] < 5.0:
        return NOT_FINITE
    if a[A_AGL] <= 0.0:
        return CONTACT
    if a[A_CAS] > af.speed_max_mps:
        return TOO_FAST
    if y[V] / sound > af.mach_max:
        return TOO_HIGH_MACH
    above_sea = case.field_elevation_m - y[D]
    if above_sea < HEIGHT_MIN_M or above_sea > HEIGHT_MAX_M:
        return OUT_OF_AIR
    return OK


@njit(cache=True)
def _fault_reached(t: float, y: Array, case: Any, mem: Array, angle: float) -> float:
    """How far past the fault's point the lead is, >= 0 once it is reached (same unit as the point)."""
    kind = int(case.fault_at)
    if kind == AT_TIME:
        return t - case.fault_value
    if kind == AT_LOOP_ANGLE:
        return angle - case.fault_value if mem[M_LOOPS] == 1.0 else -1.0
    if kind == AT_AFTER_TOP:
        return t - mem[M_TOP_S] - case.fault_value if mem[M_TOP_S] >= 0.0 else -1.0
    if kind == AT_HEIGHT:
        height = -y[D]
        _, _, az = path_x(y)
        if case.fault_down > 0.5:
            return case.fault_value - height if az > 0.0 else -1.0
        return height - case.fault_value if az < 0.0 else -1.0
    return -1.0


@njit(cache=True)
def fault_step(case: Any, y: Array, kept: Array, last: int, script: Array, dt_s: float) -> int:
    """The step of a flight without fault, y (T, NY), kept (T, NM), after which a case's fault comes on; -1: never.

    last: the last step that was flown.
    """
    for i in range(last):
        mem, t = kept[i], i * dt_s
        angle = loop_angle(y[i + 1], mem) if int(script[int(mem[M_STEP]), S_KIND]) == LOOP else mem[M_LOOP]
        if _fault_reached(t + dt_s, y[i + 1], case, mem, angle) >= 0.0:
            return i
    return -1


@njit(cache=True)
def _lead_step(
    t: float, dt_s: float, y: Array, af: Any, case: Any, mem: Array, script: Array, knots: Array, coeffs: Array,
    k: Array, known: bool,
) -> Array:
    """One Runge-Kutta step of the lead; k (5, NY) is scratch, k[0] the rate at the start, there already if known."""
    on = mem[M_FAULT_ON] > 0.5
    stab = mem[M_STAB]
    if not known:
        n, onset, roll, throttle, _ = lead_commands(t, y, af, case, mem, script, knots, coeffs)
        derivative(y, af, case, n, onset, roll, throttle, on, stab, YES, 0.0, k[0])
    for s in range(1, 4):
        h = dt_s if s == 3 else 0.5 * dt_s
        for m in range(NY):
            k[4, m] = y[m] + h * k[s - 1, m]
        n, onset, roll, throttle, _ = lead_commands(t + h, k[4], af, case, mem, script, knots, coeffs)
        derivative(k[4], af, case, n, onset, roll, throttle, on, stab, YES, 0.0, k[s])
    new = np.empty(NY)
    for m in range(NY):
        new[m] = y[m] + dt_s / 6.0 * (k[0, m] + 2.0 * k[1, m] + 2.0 * k[2, m] + k[3, m])
    renormalise(new)
    return new


@njit(cache=True)
def fly_lead(
    y0: Array, af: Any, case: Any, script: Array, knots: Array, coeffs: Array, heights: Array, grid: Array,
    dt_s: float, out_y: Array, out_a: Array, mem: Array, begin: int = 0, end_step: int = -1, tail: int = -1,
    kept: Array = NOTHING,
) -> tuple[int, int]:
    """Fly the lead through his script: fills out_y (T, NY), out_a (T, NA) and mem (NM,).

    Returns why it stopped (OK: the time axis ended) and the last step flown. After a stop the rows
    hold the last state. The step in which the fault comes on is split at its point. A memory that says
    M_INSIDE begins inside the script, as it stands; any other is begun anew.
    begin: the step y0 and mem are of; the rows before it are left as they are. kept (T, NM) takes the memory
    at each step, to begin another flight from. Flown no further than the first step after ``end_step`` on
    which the path does not go down, or ``tail`` steps after the script's end (negative: to the end of the axis).
    """
    steps = out_y.shape[0] - 1
    k = np.zeros((5, NY))
    y = y0.copy()
    if mem[M_INSIDE] < 0.5:
        mem[:] = 0.0
        mem[M_FAULT_S], mem[M_TOP_S], mem[M_SCRIPT_END_S] = -1.0, -1.0, -1.0
        # the throttle the entry needs: the engine state says it
        first = (y[ENGINE] - af.thrust_idle) / (1.0 - af.thrust_idle)
        begin_step(0.0, y, case, mem, script, first)
        mem[M_LOOPS] = 1.0 if int(script[0, S_KIND]) == LOOP else 0.0
    status = OK
    for i in range(begin, steps + 1):
        t = i * dt_s
        if kept.shape[0] > i:
            _put(kept[i], mem)
        n, onset, roll, throttle, limit = lead_commands(t, y, af, case, mem, script, knots, coeffs)
        on = mem[M_FAULT_ON] > 0.5
        derivative(y, af, case, n, onset, roll, throttle, on, mem[M_STAB], YES, 0.0, k[0])
        _put(out_y[i], y)
        status = _note(y, out_a[i], k[0], af, case, n, roll, throttle, limit, heights, grid)
        out_a[i, A_STEP] = mem[M_STEP]
        out_a[i, A_LOOP] = mem[M_LOOP]
        done = end_step >= 0 and i > end_step and i > begin and out_y[i, D] <= out_y[i - 1, D]
        done = done or (tail >= 0 and mem[M_SCRIPT_END_S] >= 0.0 and t >= mem[M_SCRIPT_END_S] + tail * dt_s)
        if status != OK or i == steps or done:
            for j in range(i + 1, steps + 1):
                _put(out_y[j], y)
                _put(out_a[j], out_a[i])
            return status, i
        new = _lead_step(t, dt_s, y, af, case, mem, script, knots, coeffs, k, YES)
        in_loop = int(script[int(mem[M_STEP]), S_KIND]) == LOOP
        if mem[M_FAULT_ON] < 0.5 and case.fault_kind > 0.5:
            before = _fault_reached(t, y, case, mem, mem[M_LOOP])
            angle = loop_angle(new, mem) if in_loop else mem[M_LOOP]
            after = _fault_reached(t + dt_s, new, case, mem, angle)
            if after >= 0.0:
                part = min(max(-before / max(after - before, 1e-12), 0.0), 1.0) if before < 0.0 else 0.0
                mid = y
                if part > 1e-9:
                    mid = _lead_step(t, part * dt_s, y, af, case, mem, script, knots, coeffs, k, YES)
                mem[M_FAULT_ON], mem[M_FAULT_S], mem[M_STAB] = 1.0, t + part * dt_s, mid[STAB]
                new = _lead_step(
                    t + part * dt_s, (1.0 - part) * dt_s, mid, af, case, mem, script, knots, coeffs, k, NO
                )
        y = new
        t += dt_s
        if in_loop:
            last = mem[M_LOOP]
            mem[M_LOOP] = loop_angle(y, mem)
            if mem[M_TOP_S] < 0.0 and mem[M_LOOP] >= math.pi:
                mem[M_TOP_S] = t - dt_s * (mem[M_LOOP] - math.pi) / max(mem[M_LOOP] - last, 1e-12)
        elif int(script[int(mem[M_STEP]), S_KIND]) == ROLL_STEP:
            mem[M_ROLLED] += y[ROLL] * dt_s
        if step_done(t, y, mem, script):
            if int(mem[M_STEP]) + 1 < script.shape[0]:
                mem[M_STEP] += 1.0
                begin_step(t, y, case, mem, script, throttle)
                if int(script[int(mem[M_STEP]), S_KIND]) == LOOP:
                    mem[M_LOOPS] += 1.0
            elif mem[M_SCRIPT_END_S] < 0.0:
                mem[M_SCRIPT_END_S] = t
    return status, steps


@njit(cache=True)
def fly_wing(
    y0: Array, af: Any, case: Any, slot: Array, lead_y: Array, lead_a: Array, heights: Array, grid: Array, dt_s: float,
    last: int, out_y: Array, out_a: Array, begin: int = 0, learnt: Array = NOTHING, kept: Array = NOTHING,
) -> tuple[int, int]:
    """Fly a wing pilot on his slot behind a flown lead: fills out_y (T, NY), out_a (T, NA).

    last: the step the lead's history is real up to. Returns status and last step as ``fly_lead``.
    begin: the step y0 is of; the rows before it are there already. kept (T, 6) takes what he has learnt at
    each step, learnt (T, 6) is what another flight kept, to begin from.
    """
    steps = out_y.shape[0] - 1
    k = np.zeros((5, NY))
    trim, error, unused = np.zeros(3), np.zeros(3), np.zeros(3)
    y = y0.copy()
    status = OK
    if begin > 0 and learnt.shape[0] >= begin:
        _put(trim, learnt[begin - 1, :3])
        _put(error, learnt[begin - 1, 3:])
    for i in range(begin, steps + 1):
        _put(out_y[i], y)
        if i > 0:
            learn_trim(trim, error, lead_y[i], lead_y[i - 1], dt_s)
        n, onset, roll, throttle, limit = wing_commands(
            i, 0.0, y, af, case, slot, lead_y, lead_a, out_y, out_a, trim, error, dt_s
        )
        if kept.shape[0] > i:
            _put(kept[i, :3], trim)
            _put(kept[i, 3:], error)
        derivative(y, af, case, n, onset, roll, throttle, NO, 0.0, YES, 0.0, k[0])
        status = _note(y, out_a[i], k[0], af, case, n, roll, throttle, limit, heights, grid)
        out_a[i, A_STEP] = lead_a[i, A_STEP]
        out_a[i, A_LOOP] = lead_a[i, A_LOOP]
        if status != OK or i == steps or i >= last:
            for j in range(i + 1, steps + 1):
                _put(out_y[j], y)
                _put(out_a[j], out_a[i])
            return status, i
        for s in range(1, 4):
            c = 1.0 if s == 3 else 0.5
            for m in range(NY):
                k[4, m] = y[m] + c * dt_s * k[s - 1, m]
            n, onset, roll, throttle, _ = wing_commands(
                i, c, k[4], af, case, slot, lead_y, lead_a, out_y, out_a, trim, unused, dt_s
            )
            derivative(k[4], af, case, n, onset, roll, throttle, NO, 0.0, YES, 0.0, k[s])
        new = np.empty(NY)
        for m in range(NY):
            new[m] = y[m] + dt_s / 6.0 * (k[0, m] + 2.0 * k[1, m] + 2.0 * k[2, m] + k[3, m])
        renormalise(new)
        y = new
    return status, steps


@njit(cache=True, parallel=True)
def fly_leads(
    y0: Array, af: Any, case: Any, script: Array, knots: Array, coeffs: Array, row: Array, heights: Array, grid: Array,
    dt_s: float, begin: Array, end_step: Array, tail: int, out_y: Array, out_a: Array, mem: Array, status: Array,
    kept: Array,
) -> None:
    """A batch of leads: y0, case, begin, end_step and what is filled in have B in front, the rest row (B,) picks.

    status (B, 2): why and when each stopped; kept (B, T, NM), or (B, 0, 0) if nothing is to be kept. One that is
    to begin at a negative step is left as it is.
    """
    half = (y0.shape[0] + 1) // 2
    for i in prange(y0.shape[0]):
        # neighbours take much the same time: dealt out in turn to the cores
        b = 2 * i if i < half else 2 * (i - half) + 1
        at, r = int(begin[b]), int(row[b])
        if at >= 0:
            status[b, 0], status[b, 1] = fly_lead(
                y0[b], af[r], case[b], script[r], knots[r], coeffs[r], heights, grid, dt_s, out_y[b], out_a[b], mem[b],
                at, int(end_step[b]), tail, kept[b]
            )


@njit(cache=True, parallel=True)
def fly_wings(
    y0: Array, af: Any, case: Any, slot: Array, lead_y: Array, lead_a: Array, lead_of: Array, heights: Array,
    grid: Array, dt_s: float, last: Array, begin: Array, learnt: Array, row: Array, out_y: Array, out_a: Array,
    status: Array, kept: Array,
) -> None:
    """A batch of wing pilots; lead_of (W,): the row of the leads, cases, last and begin each one follows.

    row (W,): his own of airframes, slots and of what was learnt, (R, T, 6) or (R, 0, 0); kept as in ``fly_leads``.
    """
    half = (y0.shape[0] + 1) // 2
    for i in prange(y0.shape[0]):
        w = 2 * i if i < half else 2 * (i - half) + 1
        b, r = int(lead_of[w]), int(row[w])
        if begin[b] >= 0:
            status[w, 0], status[w, 1] = fly_wing(
                y0[w], af[r], case[b], slot[r], lead_y[b], lead_a[b], heights, grid, dt_s, int(last[b]),
                out_y[w], out_a[w], int(begin[b]), learnt[r], kept[w]
            )


@njit(cache=True, parallel=True)
def fault_steps(
    case: Any, twin_y: Array, kept: Array, last: Array, script: Array, row: Array, dt_s: float, step: Array
) -> None:
    """``fault_step`` of a batch of cases; row (B,): the twin of each, twin_y (W, T, NY), kept (W, T, NM), last (W,)."""
    for b in prange(step.shape[0]):
        w = int(row[b])
        step[b] = fault_step(case[b], twin_y[w], kept[w], int(last[w]), script[w], dt_s)
