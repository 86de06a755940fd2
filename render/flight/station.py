"""What a wing pilot asks for: to hold his slot on the lead, and the escape when he breaks out."""

from __future__ import annotations

import math
from typing import Any

from numba import njit

from render.flight.air import G0_MPS2
from render.flight.kinematics import limit_demand, limit_demand_in, path_axes, path_x
from render.flight.records import (
    A_N,
    A_PUSH,
    ENGINE,
    INTEG,
    NDEM,
    POWER_FULL,
    POWER_IDLE,
    POWER_PART,
    ROLL,
    Array,
    D,
    E,
    N,
    V,
)
from render.flight.script import throttle_for_speed

# Station keeping. Engineering guesses, chosen so that a practised wing pilot holds his slot in the
# healthy loop to a metre or two (common practice, no source): pursuit of position and closing rate,
# a slow trim of what stays, an anticipation of the load factor he knows from the lead's nose, a delay.
DELAY_S = 0.16  # inside the published 0.1-0.2 s of pure delay (McRuer and Krendel 1974)
ANTICIPATE_S = 0.34
ANTICIPATE_MAX_G = 0.9
GAIN_POS = 0.60  # 1/s2
GAIN_VEL = 1.30  # 1/s
GAIN_ACC = 0.30  # his own load factor, felt, against the lead's, seen
GAIN_TRIM = 0.08  # 1/s3
TRIM_MAX_MPS2 = 8.0
BANK_MAX_RAD = 0.30
THROTTLE_LEAD = 2.5
CORRECTION_MAX_MPS2 = 12.0
# Beyond this from his slot a wing pilot no longer chases it (he has overrun the lead, or lost him): straight on.
GIVES_UP_M, GAVE_UP_M = 30.0, 60.0
ONSET_WING_GPS = 6.0


@njit(cache=True)
def _between(a: Array, i: int, f: float, k: int) -> float:
    return a[i, k] * (1.0 - f) + a[i + 1, k] * f


@njit(cache=True)
def slot_place(lead_y: Array, case: Any, row: float, dt_s: float, slot: Array) -> tuple[float, float, float]:
    """Where the slot is at a (fractional) step of the lead's history, earth axes, m.

    slot: aft, right, down, m. The aft distance is measured back along the path the lead has flown through
    the air, right and down across it: a wing pilot astern follows the lead through the same air, he is not
    bolted to his tail (common practice, no source). Before the history begins the lead flew straight on.
    """
    at = min(max(row, 0.0), lead_y.shape[0] - 1.0)
    j = min(int(at), lead_y.shape[0] - 2)
    f = at - j
    lag_s = max(slot[0], 0.0) / (lead_y[j, V] * (1.0 - f) + lead_y[j + 1, V] * f)
    back = row - lag_s / dt_s
    at = min(max(back, 0.0), lead_y.shape[0] - 1.0)
    j = min(int(at), lead_y.shape[0] - 2)
    f = at - j
    beyond_s = (back - at) * dt_s  # negative: before the history begins
    out_n, out_e, out_d = 0.0, 0.0, 0.0
    for i in range(2):
        part = f if i == 1 else 1.0 - f
        lead = lead_y[j + i]
        ax, ay, az, bx, by, bz, cx, cy, cz = path_axes(lead)
        ahead = lead[V] * beyond_s - min(slot[0], 0.0)
        out_n += part * (lead[N] + ahead * ax + slot[1] * bx + slot[2] * cx)
        out_e += part * (lead[E] + ahead * ay + slot[1] * by + slot[2] * cy)
        out_d += part * (lead[D] + ahead * az + slot[1] * bz + slot[2] * cz)
    drift_s = lag_s + beyond_s
    return out_n + drift_s * case.wind_n_mps, out_e + drift_s * case.wind_e_mps, out_d


@njit(cache=True)
def wing_commands(
    i: int, c: float, y: Array, af: Any, case: Any, slot: Array, lead_y: Array, lead_a: Array, own_y: Array,
    own_a: Array, trim: Array, error_out: Array, dt_s: float,
) -> tuple[float, float, float, float, int]:
    """Load factor, onset, roll rate, throttle and limit that hold the slot.

    i, c: step and part of it; slot: aft, right, down, m; lead_y (T, NY), lead_a (T, NA): the lead's
    history; own_y (T, NY): this aircraft's own, filled up to i. What he sees is DELAY_S old. trim (3,):
    what he has learnt to hold against, m/s2; error_out (3,): the slot's place from his own, as seen, m.
    """
    now = i + c
    seen = max(now - DELAY_S / dt_s, 0.0)
    j = int(seen)
    f = seen - j
    own, own1 = own_y[j], own_y[min(j + 1, i)]
    s_n, s_e, s_d = slot_place(lead_y, case, seen, dt_s, slot)
    e_n = s_n - own[N] * (1.0 - f) - own1[N] * f
    e_e = s_e - own[E] * (1.0 - f) - own1[E] * f
    e_d = s_d - own[D] * (1.0 - f) - own1[D] * f
    # the slot's own motion, from what has been seen of it
    b_n, b_e, b_d = slot_place(lead_y, case, seen - 1.0, dt_s, slot)
    px, py, pz = path_x(own)
    v_n = (s_n - b_n) / dt_s - case.wind_n_mps - own[V] * px
    v_e = (s_e - b_e) / dt_s - case.wind_e_mps - own[V] * py
    v_d = (s_d - b_d) / dt_s - own[V] * pz
    # the place of the lead's path his slot is at; what the lead did there is known if it was seen since
    lag = max(slot[0], 0.0) / lead_y[j, V] / dt_s
    there = max(seen - lag, 0.0)
    jt = int(there)
    ft = there - jt
    lead = lead_y[jt]
    cx, cy, cz = path_axes(lead)[6:]
    # the load factor wanted a response time from now: as seen, or carried on at the rate it was changing
    wanted = now - lag + ANTICIPATE_S / dt_s
    at = min(max(wanted, 0.0), seen)
    ja = int(at)
    fa = at - ja
    h = max(int(0.2 / dt_s), 1)
    n_at = _between(lead_a, ja, fa, A_N)
    change = max(wanted - at, 0.0) / h * (n_at - _between(lead_a, max(ja - h, 0), fa, A_N))
    n_ahead = n_at + min(max(change, -ANTICIPATE_MAX_G), ANTICIPATE_MAX_G)
    n_there = _between(lead_a, jt, ft, A_N)
    n_felt = own_a[min(j, max(i - 1, 0)), A_N] if i > 0 else n_there
    pull = n_ahead + GAIN_ACC * (n_there - n_felt)
    push = _between(lead_a, jt, ft, A_PUSH)
    # what he corrects, earth axes
    missed = math.sqrt(e_n * e_n + e_e * e_e + e_d * e_d)
    keeps = min(max((GAVE_UP_M - missed) / (GAVE_UP_M - GIVES_UP_M), 0.0), 1.0)
    c_n = GAIN_VEL * v_n + GAIN_POS * e_n + trim[0]
    c_e = GAIN_VEL * v_e + GAIN_POS * e_e + trim[1]
    c_d = GAIN_VEL * v_d + GAIN_POS * e_d + trim[2]
    size = math.sqrt(c_n * c_n + c_e * c_e + c_d * c_d)
    part = keeps * min(1.0, CORRECTION_MAX_MPS2 / max(size, 1e-9))
    c_n, c_e, c_d = part * c_n, part * c_e, part * c_d
    error_out[0], error_out[1], error_out[2] = keeps * e_n, keeps * e_e, keeps * e_d
    mx, my, mz, nx, ny, nz, lx, ly, lz = path_axes(y)
    along = push + c_n * mx + c_e * my + c_d * mz
    # lift direction: the lead's, carried forward to now by his rate of turn, across the own path
    turn = -(cx * mx + cy * my + cz * mz)
    ux, uy, uz = -cx - turn * mx, -cy - turn * my, -cz - turn * mz
    length = math.sqrt(ux * ux + uy * uy + uz * uz)
    if length < 0.1:
        ux, uy, uz, length = -lx, -ly, -lz, 1.0
    ux, uy, uz = ux / length, uy / length, uz / length
    # right-hand side of that lift direction, seen along the own path
    rx, ry, rz = uz * my - uy * mz, ux * mz - uz * mx, uy * mx - ux * my
    up = pull + (c_n * ux + c_e * uy + c_d * uz) / G0_MPS2
    side = (c_n * rx + c_e * ry + c_d * rz) / G0_MPS2
    # with little lift to tilt, banking does nothing: a pilot waits
    lift = max(abs(up), 0.8)
    bank = min(max(math.atan2(side, lift), -BANK_MAX_RAD), BANK_MAX_RAD)
    if up < 0.0:
        bank = -bank
    cb, sb = math.cos(bank), math.sin(bank)
    wx, wy, wz = cb * ux + sb * rx, cb * uy + sb * ry, cb * uz + sb * rz
    error = math.atan2(wx * nx + wy * ny + wz * nz, -(wx * lx + wy * ly + wz * lz))
    roll = keeps * (lead[ROLL] + 3.0 * error)
    # straight on: the load factor of a straight path is gravity's part across it (a turn flown out stays flown)
    up = keeps * up / cb + (1.0 - keeps) * min(max(lz, 0.0), 1.0)
    n, limit = limit_demand(y, af, case, up, 0.97 * af.cl_max)
    wanted_throttle = throttle_for_speed(y, af, case, along + G0_MPS2 * mz)
    # he moves the lever further than he needs, since the engine lags
    engine = (y[ENGINE] - af.thrust_idle) / (1.0 - af.thrust_idle)
    throttle = min(max(engine + THROTTLE_LEAD * (wanted_throttle - engine), 0.0), 1.0)
    if (wanted_throttle >= 1.0 and along > 0.0) or (wanted_throttle <= 0.0 and along < 0.0):
        # at the stop of the lever there is nothing to learn along the path
        short = e_n * mx + e_e * my + e_d * mz
        error_out[0] -= short * mx
        error_out[1] -= short * my
        error_out[2] -= short * mz
    return n, ONSET_WING_GPS, roll, throttle, limit


@njit(cache=True)
def learn_trim(trim: Array, error: Array, lead: Array, lead_before: Array, dt_s: float) -> None:
    """Carry the trim through one step: it turns with the lead's axes and grows with what stays missed."""
    ax, ay, az, bx, by, bz, cx, cy, cz = path_axes(lead_before)
    x = trim[0] * ax + trim[1] * ay + trim[2] * az
    y = trim[0] * bx + trim[1] * by + trim[2] * bz
    z = trim[0] * cx + trim[1] * cy + trim[2] * cz
    ax, ay, az, bx, by, bz, cx, cy, cz = path_axes(lead)
    trim[0] = x * ax + y * bx + z * cx + GAIN_TRIM * error[0] * dt_s
    trim[1] = x * ay + y * by + z * cy + GAIN_TRIM * error[1] * dt_s
    trim[2] = x * az + y * bz + z * cz + GAIN_TRIM * error[2] * dt_s
    size = math.sqrt(trim[0] ** 2 + trim[1] ** 2 + trim[2] ** 2)
    if size > TRIM_MAX_MPS2:
        for m in range(3):
            trim[m] *= TRIM_MAX_MPS2 / size


@njit(cache=True)
def escape_commands(
    t: float, y: Array, start: Array, n_start: float, throttle_start: float, away: float, af: Any, rho: float, esc: Any
) -> tuple[float, float, float, float, int]:
    """The escape: wait the delay, bring the lift toward the sky (or pull as he is), pull to the limit.

    t: time since the decision; start: the state then; away: +1 if the formation is on the left
    (bank to the right), -1 if on the right, 0 if neither; rho: density of the air there, kg/m3.
    """
    power = int(esc.power_kind)
    throttle = throttle_start
    if power == POWER_FULL:
        throttle = 1.0
    elif power == POWER_IDLE:
        throttle = 0.0
    elif power == POWER_PART:
        throttle = esc.power_part
    if t < esc.delay_s:
        return n_start, ONSET_WING_GPS, start[ROLL], throttle_start, 0
    ax, ay, az, bx, by, bz, cx, cy, cz = path_axes(y)
    n = esc.load_factor
    roll = 0.0
    if esc.roll_first > 0.5:
        # the sky, seen across the path: up less its part along the path (up = -z of earth)
        ux, uy, uz = az * ax, az * ay, -1.0 + az * az
        length = math.sqrt(ux * ux + uy * uy + uz * uz)
        if length > 0.15:
            side = (ux * bx + uy * by + uz * bz) / length
            up = -(ux * cx + uy * cy + uz * cz) / length
            error = math.atan2(side, up) + away * esc.bank_away_rad
            error = math.atan2(math.sin(error), math.cos(error))
            roll = 4.0 * error
            if abs(error) > 1.0:
                # he does not pull toward the ground: unload, roll, then pull
                n = min(n, max(0.5, n * math.cos(error)))
    n, limit = limit_demand_in(y, af, rho, n, 0.97 * af.cl_max)
    return n, esc.onset_gps, roll, throttle, limit


@njit(cache=True)
def take_over(y: Array, n_now: float) -> None:
    """Make a hand that was not flying by demand start from what the aircraft does now."""
    y[NDEM] = n_now
    y[INTEG] = 0.0
