"""Escapes: one, and the better of two.

Compiled with numba like the passes: a batch equals its single escapes to the last bit.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numba import njit, prange

from render.flight.kinematics import air_of, derivative_in, ground_height, load_factor_of, path_axes, path_x
from render.flight.records import (
    NDEM,
    NY,
    Q0,
    Q3,
    YES,
    Array,
    D,
    E,
    N,
    V,
)
from render.flight.station import escape_commands

ESCAPE_DT_S = 0.02
LONGEST_S = 25.0


@njit(cache=True)
def fly_escape(
    y0: Array, af: Any, case: Any, esc: Any, away: float, throttle: float, fault_on: bool, stab_at_fault: float,
    heights: Array, grid: Array, dt_s: float, steps: int, path: Array, beat_m: float = -1e9,
) -> tuple[float, float]:
    """Fly one escape; returns its lowest height above the ground, m, and when, s from the decision.

    It goes on through the ground, so that the clearance of an escape that fails is a negative number.
    path (P, 4): north, east, down, load factor of the first P steps (P may be 0). beat_m: flown no further
    once it is not above this; what is returned then is at or below it, and not the lowest.
    """
    y = y0.copy()
    n0, _, _, _ = load_factor_of(y, af, case)
    y[NDEM] = n0
    k = np.zeros((5, NY))
    lowest, when = 1e9, 0.0
    for i in range(steps + 1):
        t = i * dt_s
        agl = -y[D] - ground_height(heights, grid, y[N], y[E])
        if i < path.shape[0]:
            path[i, 0], path[i, 1], path[i, 2] = y[N], y[E], y[D]
            path[i, 3], _, _, _ = load_factor_of(y, af, case)
        if agl < lowest:
            lowest, when = agl, t
            if lowest <= beat_m:
                break
        _, _, az = path_x(y)
        # over hills the lowest point may come after the path is level: fly on until it climbs steeper
        # than the ground can (30 deg)
        if t > esc.delay_s + 0.5 and az <= (-0.05 if heights.size == 1 else -0.5) and agl > lowest + 30.0:
            break
        if not math.isfinite(y[V]) or y[V] < 5.0 or y[V] > 600.0:
            break
        for s in range(4):
            c = 0.0 if s == 0 else (1.0 if s == 3 else 0.5)
            for m in range(NY):
                k[4, m] = y[m] + c * dt_s * k[max(s - 1, 0), m] if s > 0 else y[m]
            _, _, rho, sound = air_of(k[4], case)
            n, onset, roll, thr, _ = escape_commands(t + c * dt_s, k[4], y0, n0, throttle, away, af, rho, esc)
            derivative_in(
                k[4], af, case, rho, sound, n, onset, roll, thr, fault_on, stab_at_fault, YES, 0.0, k[s]
            )
        for m in range(NY):
            y[m] += dt_s / 6.0 * (k[0, m] + 2.0 * k[1, m] + 2.0 * k[2, m] + k[3, m])
        scale = 1.0 / math.sqrt(y[Q0] ** 2 + y[Q0 + 1] ** 2 + y[Q0 + 2] ** 2 + y[Q3] ** 2)
        for m in range(Q0, Q3 + 1):
            y[m] *= scale
    return lowest, when


@njit(cache=True, parallel=True)
def fly_escapes(
    y0: Array, af: Any, case: Any, esc: Any, away: Array, throttle: Array, fault_on: Array, stab_at_fault: Array,
    heights: Array, grid: Array, dt_s: float, steps: int, row: Array, lowest_m: Array, when_s: Array,
) -> None:
    """A batch of escapes; row (B,): which airframe, case and escape record each uses."""
    for b in prange(y0.shape[0]):
        r = int(row[b])
        nothing = np.empty((0, 4))
        lowest_m[b], when_s[b] = fly_escape(
            y0[b], af[r], case[r], esc[r], away[b], throttle[b], fault_on[b] > 0.5, stab_at_fault[b], heights, grid,
            dt_s, steps, nothing, -1e9
        )


@njit(cache=True)
def better_escape(
    y0: Array, af: Any, case: Any, esc: Any, away: float, throttle: float, fault_on: bool, stab_at_fault: float,
    heights: Array, grid: Array, beat_m: float = -1e9, enough_m: float = 1e9,
) -> float:
    """Lowest height above the ground, m, of the better of two escapes: esc (2,), pulling as he is and rolling first.

    At or below ``beat_m`` it is not exact, and from ``enough_m`` on it is that of one of them, the better may be
    higher. The one more likely to be better is flown first, and the other only as long as it may still be.
    """
    steps = round(LONGEST_S / ESCAPE_DT_S)
    nothing = np.empty((0, 4))
    cz = path_axes(y0)[8]
    first = 0 if cz > 0.0 else 1
    one, _ = fly_escape(y0, af, case, esc[first], away, throttle, fault_on, stab_at_fault, heights, grid, ESCAPE_DT_S,
                        steps, nothing, beat_m)
    if one >= enough_m:
        return one
    other, _ = fly_escape(y0, af, case, esc[1 - first], away, throttle, fault_on, stab_at_fault, heights, grid,
                          ESCAPE_DT_S, steps, nothing, max(one, beat_m))
    return max(one, other)


@njit(cache=True, parallel=True)
def better_escapes(
    y0: Array, af: Any, case: Any, esc: Any, away: Array, throttle: Array, fault_on: Array, stab_at_fault: Array,
    heights: Array, grid: Array, row: Array, lowest_m: Array,
) -> None:
    """A batch of better escapes; row (B,): which airframe, case and pair of escape records (R, 2) each uses."""
    for b in prange(y0.shape[0]):
        r = int(row[b])
        lowest_m[b] = better_escape(
            y0[b], af[r], case[r], esc[r], away[b], throttle[b], fault_on[b] > 0.5, stab_at_fault[b], heights, grid,
            -1e9, 1e9
        )
