"""Loops closed: the back half's demand scaled until the healthy lead bottoms at the height asked.

The scale does nothing before the top, so each try is flown from there on. Compiled; a batch equals its
single loops to the last bit.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numba import njit, prange

from render.errors import FlightError
from render.flight import records as r
from render.flight.passes import fly_lead
from render.flight.plan import DT_S, Plan
from render.flight.records import A_LIMIT, A_STEP, NA, NY, Array, D
from render.flight.script import M_INSIDE, M_SCRIPT_END_S, M_TOP_S, NM
from scenes.model import Loop

FOOT_M = 0.3048
CLOSE_TOL_M = 0.02
SCALE_LOW, SCALE_HIGH, SCALES = 0.25, 3.0, 9
TRIES = 25
# What the search leaves behind, one row a loop.
C_SCALE, C_MISSED, C_LOW, C_HIGH, C_LIMIT, C_TOPPED, C_FOUND = range(7)


@njit(cache=True)
def bottom_of(y: Array, a: Array, mem: Array, loop: int, dt_s: float) -> tuple[float, float]:
    """Lowest height after the top in the closing loop and the step after it, m, and the limits met on the way.

    By a parabola through three instants; NaN if there is none. Nothing after the script's end counts.
    """
    top = round(mem[M_TOP_S] / dt_s) + 1
    end = mem[M_SCRIPT_END_S]
    until = min(round(end / dt_s) + 1, y.shape[0]) if end >= 0.0 else y.shape[0]
    last, count = -1, 0
    for i in range(top, until):
        if a[i, A_STEP] <= loop + 1:
            last = i
            count += 1
    if count < 3:
        return np.nan, 0.0
    low = top
    for i in range(top, last + 1):
        if y[i, D] > y[low, D]:
            low = i
    limit = 0.0
    for i in range(top, low + 1):
        limit = max(limit, a[i, A_LIMIT])
    bottom = -y[low, D]
    if top < low < last:
        left, right = -y[low - 1, D], -y[low + 1, D]
        bend = left - 2.0 * bottom + right
        if bend > 0.0:
            bottom -= (right - left) ** 2 / (8.0 * bend)
    return bottom, limit


@njit(cache=True)
def _try(
    scale: float, begin: int, y0: Array, mem0: Array, af: Any, case: Any, script: Array, knots: Array, coeffs: Array,
    below: Array, grid: Array, dt_s: float, y: Array, a: Array, loop: int,
) -> tuple[float, float]:
    """Fly from the top on with a scale; the bottom and the limits met."""
    case[0].loop_scale = scale
    mem = mem0.copy()
    mem[M_INSIDE] = 1.0
    fly_lead(y0, af, case[0], script, knots, coeffs, below, grid, dt_s, y, a, mem, begin, -1, 0)
    return bottom_of(y, a, mem, loop, dt_s)


@njit(cache=True)
def close_one(
    y0: Array, memory: Array, af: Any, case: Any, script: Array, knots: Array, coeffs: Array, want_m: float, loop: int,
    steps: int, dt_s: float, out: Array,
) -> None:
    """Search the scale of one loop: grid of scales outward from the middle, then Illinois false position.

    case (1,): changed; loop: step of the script that closes; out (7,): the scale, by how much the bottom misses,
    the lowest and highest miss seen, limits met, whether the top came, whether a bracket was found.
    """
    # a ground far below, so that a loop that would hit has a bottom too
    below, grid = np.full((1, 1), -20_000.0), np.array([0.0, 0.0, 1.0])
    y, a, kept = np.empty((steps + 1, NY)), np.empty((steps + 1, NA)), np.empty((steps + 1, NM))
    mem = memory.copy()
    case[0].fault_kind = 0.0
    case[0].loop_scale = 1.0
    _, flown = fly_lead(y0, af, case[0], script, knots, coeffs, below, grid, dt_s, y, a, mem, 0, -1, 0, kept)
    out[C_SCALE], out[C_MISSED], out[C_LOW], out[C_HIGH] = 1.0, np.nan, np.inf, -np.inf
    out[C_LIMIT], out[C_FOUND] = 0.0, 0.0
    out[C_TOPPED] = 1.0 if mem[M_TOP_S] >= 0.0 else 0.0
    if out[C_TOPPED] < 0.5:
        return
    begin = min(max(int(mem[M_TOP_S] / dt_s), 0), flown)
    y_top, mem_top = y[begin].copy(), kept[begin].copy()
    scales = SCALE_LOW * (SCALE_HIGH / SCALE_LOW) ** (np.arange(SCALES) / (SCALES - 1.0))
    missed = np.full(SCALES, np.inf)  # infinite: not flown yet
    lo, hi = -1, -1
    # from the middle to where the miss changes sign; if that fails all of them, upward
    for sweep in range(2):
        j = SCALES // 2 if sweep == 0 else 0
        up = True
        lo, hi = -1, -1
        while 0 <= j < SCALES:
            if np.isinf(missed[j]):
                b, limit = _try(scales[j], begin, y_top, mem_top, af, case, script, knots, coeffs, below, grid, dt_s,
                                y, a, loop)
                missed[j] = b - want_m
                if not np.isnan(b):
                    out[C_LIMIT] = max(out[C_LIMIT], limit)
                    out[C_LOW], out[C_HIGH] = min(out[C_LOW], missed[j]), max(out[C_HIGH], missed[j])
            if np.isnan(missed[j]):
                if sweep == 0:
                    break
            elif missed[j] < 0.0:
                lo = j
            elif lo >= 0 or sweep == 0:
                hi = j
            if lo >= 0 and hi >= 0:
                break
            if sweep == 0:
                up = lo >= 0
            j += 1 if up else -1
        if lo >= 0 and hi >= 0:
            break
    if lo < 0 or hi < 0:
        return
    out[C_FOUND] = 1.0
    s_lo, f_lo, s_hi, f_hi = scales[lo], missed[lo], scales[hi], missed[hi]
    out[C_SCALE], out[C_MISSED] = s_lo, f_lo
    side = 0
    for _ in range(TRIES):
        mid = (s_lo * f_hi - s_hi * f_lo) / (f_hi - f_lo)
        b, _ = _try(mid, begin, y_top, mem_top, af, case, script, knots, coeffs, below, grid, dt_s, y, a, loop)
        f = b - want_m
        if abs(f) < abs(out[C_MISSED]):
            out[C_SCALE], out[C_MISSED] = mid, f
        if abs(out[C_MISSED]) < CLOSE_TOL_M:
            break
        if f < 0.0:
            if side == 1:
                f_hi *= 0.5
            s_lo, f_lo, side = mid, f, 1
        else:
            if side == -1:
                f_lo *= 0.5
            s_hi, f_hi, side = mid, f, -1


@njit(cache=True, parallel=True)
def close_many(
    y0: Array, memory: Array, af: Any, case: Any, script: Array, knots: Array, coeffs: Array, want_m: Array,
    loop: Array, steps: int, dt_s: float, out: Array,
) -> None:
    """``close_one`` of a batch; case (B, 1), out (B, 7)."""
    for b in prange(y0.shape[0]):
        close_one(y0[b], memory[b], af[b], case[b], script[b], knots[b], coeffs[b], want_m[b], int(loop[b]), steps,
                  dt_s, out[b])


def close_each(plans: Sequence[Plan], longest_s: float) -> tuple[Array, list[str | None]]:
    """Scale of each plan's back-half demand, (B,), and for each plan why it can't be closed, None if it can.

    Plans of one shape. 1 where nothing is to be closed.
    """
    scale = np.ones(len(plans))
    why: list[str | None] = [None] * len(plans)
    closing = [(i, *_closes(p)) for i, p in enumerate(plans)]
    todo = [(i, loop, want) for i, loop, want in closing if loop >= 0]
    if not todo:
        return scale, why
    work = [plans[i] for i, _, _ in todo]
    want = np.array([w for _, _, w in todo])
    out = np.empty((len(todo), 7))
    close_many(
        np.stack([p.entry[0] for p in work]), np.stack([p.memory for p in work]),
        np.concatenate([p.af[:1] for p in work]), np.concatenate([p.case for p in work]).reshape(-1, 1),
        np.stack([p.script for p in work]), np.stack([p.knots for p in work]), np.stack([p.coeffs for p in work]),
        want, np.array([float(loop) for _, loop, _ in todo]), round(longest_s / DT_S), DT_S, out,
    )
    for (i, _, w), row in zip(todo, out, strict=True):
        scale[i] = row[C_SCALE]
        name = plans[i].scene.name
        if row[C_FOUND] < 0.5:
            why[i] = _cannot_close(name, w, row)
        elif not abs(row[C_MISSED]) <= FOOT_M:
            why[i] = (f"the loop of '{name}' does not close within 1 ft of {w / FOOT_M:.0f} ft: the nearest bottom "
                      f"found is {(w + row[C_MISSED]) / FOOT_M:.1f} ft")
    return scale, why


def close_loops(plans: Sequence[Plan], longest_s: float) -> Array:
    """Scale of each plan's back-half demand so that its healthy loop bottoms at the height asked, (B,).

    1 where nothing is to be closed. Raises FlightError with what is reachable and what limits it.
    """
    scale, why = close_each(plans, longest_s)
    for reason in why:
        if reason is not None:
            raise FlightError(reason)
    return scale


def _closes(plan: Plan) -> tuple[int, float]:
    """The step of the script that closes, and at which height, m; -1 if none does."""
    for i, step in enumerate(plan.scene.script):
        if isinstance(step, Loop) and step.close_at_m is not None:
            return i, step.close_at_m
    return -1, np.nan


def _cannot_close(name: str, want_m: float, row: Array) -> str:
    if row[C_TOPPED] < 0.5:
        return (f"the loop of '{name}' never reaches its top: the aircraft runs out of speed on the way up; "
                "enter faster, pull earlier, or use more power")
    what = {r.LIMIT_BUFFET: "the wing's buffet limit", r.LIMIT_N_MAX: "the airframe's load factor limit"}.get(
        int(row[C_LIMIT]), "the demand's shape (scaled from 0.25 to 3)")
    low_ft, high_ft = (want_m + row[C_LOW]) / FOOT_M, (want_m + row[C_HIGH]) / FOOT_M
    return (f"the loop of '{name}' can't close at {want_m / FOOT_M:.0f} ft: with the back half scaled, bottoms from "
            f"{low_ft:.0f} ft to {high_ft:.0f} ft are reachable; limited by {what}")
