"""The last instant of a flight from which an escape still clears, found without flying an escape from all of them.

``find_margin`` flies one from every tenth of a second and shows the whole curve; thousands of cases need only
where it passes zero for the last time. Both take the same instants, the same escapes and the same straight line
between them.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numba import njit, prange
from numpy.typing import NDArray

from render.flight.escapes import better_escape
from render.flight.plan import DT_S, Plan, escape_pair
from render.flight.records import A_N, A_THROTTLE, INTEG, NDEM, NO, NY, Q0, Q3, WORK_D, WORK_T, Array
from render.margin.escape import EVERY_S, away_of

STAGE = 8  # instants stepped over at first
DEEP_M = -150.0  # an escape that far under the ground has failed, however far it goes on
# What waiting can add to a clearance, at most: it grows as the flight climbs, 0.7 of its speed in the shipped
# scenes. So an instant with a large one needs no look at those shortly before it.
RISE_MPS = 300.0
HIGH_M = 15.0  # an escape that clears by so much clears; the other of the two needs no look
NOWHERE: Any = np.int64(-1)  # no hint; a bare -1 is a type of its own to numba, see ``records.NO``
DIP_M = 10.0  # a lowest clearance that close to zero is looked at instant by instant


@njit(cache=True)
def state_at(y: Array, a: Array, step: float, last: int, out: Array) -> float:
    """The state at a fractional step of a flight, (NY,), as ``states.state_rows`` has it; returns the throttle."""
    i = min(max(int(step + 1e-9), 0), last - 1)
    part = step - i
    for m in range(NY):
        out[m] = y[i, m] + part * (y[i + 1, m] - y[i, m])
    scale = 1.0 / math.sqrt(out[Q0] ** 2 + out[Q0 + 1] ** 2 + out[Q0 + 2] ** 2 + out[Q3] ** 2)
    for m in range(Q0, Q3 + 1):
        out[m] *= scale
    out[NDEM] = a[i, A_N] + part * (a[i + 1, A_N] - a[i, A_N])
    # his integral part and the work sums begin at zero
    out[INTEG], out[WORK_T], out[WORK_D] = 0.0, 0.0, 0.0
    throttle: float = a[i, A_THROTTLE] + part * (a[i + 1, A_THROTTLE] - a[i, A_THROTTLE])
    return throttle


@njit(cache=True)
def _clearance(
    j: int, low: Array, beat_m: float, enough_m: float, stop_s: float, last: int, y: Array, a: Array, af: Any,
    case: Any, esc: Any, away: float, heights: Array, grid: Array, dt_s: float,
) -> float:
    """Lowest height of the escape begun at instant j, m; looked up if it has been flown (NaN: it has not)."""
    if math.isnan(low[j]):
        at_s = stop_s if j == low.shape[0] - 1 else j * EVERY_S
        state = np.empty(NY)
        throttle = state_at(y, a, at_s / dt_s, last, state)
        low[j] = better_escape(state, af, case, esc, away, throttle, NO, 0.0, heights, grid, beat_m,
                               enough_m)
    return low[j]


@njit(cache=True)
def last_pull(
    level_m: float, enough_m: float, hint: int, contact: bool, low: Array, stop_s: float, last: int, y: Array,
    a: Array, af: Any, case: Any, esc: Any, away: float, heights: Array, grid: Array, dt_s: float,
) -> tuple[float, int]:
    """When the clearance above ``level_m`` is there for the last time, s, and the instant before it.

    NaN, -1: it does not run out. 0, 0: it is never there. low (M + 1,): what has been flown, filled in;
    hint: an instant it may lie after, -1 for none, trusted only where the flight ends in contact.
    Searched from the end back in stages, then within one; a lowest clearance near zero is looked at closely, and
    what a large clearance rules out is stepped over.
    """
    rest = (stop_s, last, y, a, af, case, esc, away, heights, grid, dt_s)
    end = low.shape[0] - 1
    lo, hi = -1, -1
    f_hi = _clearance(end, low, DEEP_M, enough_m, *rest) - level_m
    if contact and 0 <= hint < end and f_hi < 0.0:
        f = _clearance(hint, low, DEEP_M, enough_m, *rest) - level_m
        g = _clearance(hint + 1, low, DEEP_M, enough_m, *rest) - level_m
        if f >= 0.0 and g < 0.0:
            lo, hi = hint, hint + 1
    if lo < 0:
        at, later, f_later = end, -1, 0.0
        j = ((end - 1) // STAGE) * STAGE
        while True:
            f = _clearance(j, low, DEEP_M, enough_m, *rest) - level_m
            if f >= 0.0 and f_hi < 0.0:
                lo, hi = j, at
                break
            if f >= 0.0 and f_hi >= 0.0 and later >= 0 and f_hi <= f and f_hi <= f_later:
                # a lowest value between two stages: how far a parabola may still go down there
                if f_hi < 0.125 * (f + f_later - 2.0 * f_hi) + DIP_M:
                    best, f_best, step = at, f_hi, STAGE // 2
                    while step > 0 and f_best >= 0.0:
                        here = best
                        for m in (here - step, here + step):
                            if j < m < later:
                                g = _clearance(m, low, DEEP_M, enough_m, *rest) - level_m
                                if g < f_best:
                                    best, f_best = m, g
                        step //= 2
                    if f_best < 0.0:
                        lo, hi = j, best
                        break
            if j == 0:
                return (np.nan, -1) if f >= 0.0 else (0.0, 0)
            later, f_later = at, f_hi
            at, f_hi = j, f
            j = max(j - STAGE * max(int(f / (RISE_MPS * STAGE * EVERY_S)), 1), 0)
    while hi - lo > 1:
        c_lo, c_hi = low[lo] - level_m, low[hi] - level_m
        m = (lo + hi) // 2
        if low[hi] > DEEP_M:
            m = min(max(lo + round((hi - lo) * c_lo / (c_lo - c_hi)), lo + 1), hi - 1)
        f = _clearance(m, low, DEEP_M, enough_m, *rest) - level_m
        if f >= 0.0:
            lo = m
        else:
            hi = m
    if low[lo] >= enough_m:
        low[lo] = np.nan
        _clearance(lo, low, -1e9, 1e9, *rest)
    if low[hi] <= DEEP_M:
        low[hi] = np.nan
        _clearance(hi, low, -1e9, 1e9, *rest)
    c_lo, c_hi = low[lo] - level_m, low[hi] - level_m
    t_hi = stop_s if hi == end else hi * EVERY_S
    return lo * EVERY_S + (t_hi - lo * EVERY_S) * c_lo / (c_lo - c_hi), lo


@njit(cache=True, parallel=True)
def _last_pulls(
    y: Array, a: Array, last: Array, stop_s: Array, contact: Array, af: Any, case: Any, esc: Any, away: Array,
    floor_m: Array, known: Array, known_of: Array, until: Array, heights: Array, grid: Array, dt_s: float,
    floor_s: Array, ground_s: Array,
) -> None:
    """Last pulls of wings, y (S, B, T, NY), a (S, B, T, NA), last, stop_s, contact, af, away (S, B), the rest (B,).

    known (W, S, J): clearances of other flights at the stages, known_of (B,): whose they are, -1 nobody's, which
    are those of this flight too up to step ``until`` (B,).
    """
    for i in prange(y.shape[1]):
        # neighbours cost much the same: dealt out in turn to the cores
        half = (y.shape[1] + 1) // 2
        b = 2 * i if i < half else 2 * (i - half) + 1
        hint_floor, hint_ground, enough_m = NOWHERE, NOWHERE, floor_m[b] + HIGH_M
        w = int(known_of[b])
        for k in range(y.shape[0]):
            # as many tenths as there are before the end, and the end itself
            low = np.full(math.ceil(stop_s[k, b] / EVERY_S) + 1, np.nan)
            if w >= 0:
                for j in range(known.shape[2]):
                    if j * STAGE < low.shape[0] - 1 and j * STAGE * EVERY_S / dt_s + 1.0 < until[b]:
                        low[j * STAGE] = known[w, k, j]
            met = contact[k, b] > 0.5
            floor_s[b, k], hint_floor = last_pull(
                floor_m[b], enough_m, hint_floor, met, low, stop_s[k, b], int(last[k, b]), y[k, b], a[k, b], af[k, b],
                case[b], esc[b], away[k, b], heights, grid, dt_s
            )
            ground_s[b, k], hint_ground = last_pull(
                0.0, enough_m, hint_ground, met, low, stop_s[k, b], int(last[k, b]), y[k, b], a[k, b], af[k, b],
                case[b], esc[b], away[k, b], heights, grid, dt_s
            )


@njit(cache=True, parallel=True)
def _stages(
    y: Array, a: Array, last: Array, af: Any, case: Any, esc: Any, away: Array, enough_m: float, heights: Array,
    grid: Array, dt_s: float, low: Array,
) -> None:
    """Clearances at the stages of flights: y (S, W, T, NY), a, last (W,), low (W, S, J) filled in."""
    for i in prange(low.shape[0] * low.shape[1] * low.shape[2]):
        w, k, j = i // (low.shape[1] * low.shape[2]), i // low.shape[2] % low.shape[1], i % low.shape[2]
        state = np.empty(NY)
        step = j * STAGE * EVERY_S / dt_s
        low[w, k, j] = np.nan
        if step + 1.0 < last[w]:
            throttle = state_at(y[k, w], a[k, w], step, int(last[w]), state)
            low[w, k, j] = better_escape(state, af[k, w], case[w], esc[w], away[k, w], throttle, NO, 0.0, heights,
                                         grid, DEEP_M, enough_m)


@dataclass(frozen=True, slots=True, eq=False)
class Stages:
    """Clearances of the wings of W flights at the stages of the search: what flights that begin like them share."""

    low_m: Array  # (W, S, J)


def stages(plans: Sequence[Plan], y: Array, a: Array, last: NDArray[np.int64], heights: Array, grid: Array) -> Stages:
    """Clearances at the stages; y (S, W, T, NY), a (S, W, T, NA) of the wings, last (W,)."""
    low = np.empty((len(plans), len(y), math.ceil(int(last.max()) * DT_S / (STAGE * EVERY_S))))
    enough_m = max(p.scene.floor_m for p in plans) + HIGH_M
    _stages(y, a, last.astype(float), *_records(plans, None), enough_m, heights, grid, DT_S, low)
    return Stages(low)


def _records(plans: Sequence[Plan], delay_s: float | None) -> tuple[Any, Any, Any, Array]:
    """Airframes of the wings (S, B), cases (B,), escape pairs (B, 2) and which way is away (S, B)."""
    wings = range(1, len(plans[0].airframes))
    return (
        np.stack([p.af[1:] for p in plans], axis=1), np.concatenate([p.case for p in plans]),
        np.concatenate([escape_pair(p.scene.break_out, delay_s=delay_s) for p in plans]),
        np.array([[away_of(p, k) for p in plans] for k in wings]),
    )


def last_pulls(
    plans: Sequence[Plan], y: Array, a: Array, last: NDArray[np.int64], contact_s: Array, heights: Array, grid: Array,
    shared: Stages | None = None, shared_of: NDArray[np.int64] | None = None, until: NDArray[np.int64] | None = None,
) -> tuple[Array, Array]:
    """Last pulls of all wings of many flights against floor and ground, s, both (B, S).

    y (S, B, T, NY), a (S, B, T, NA) of the wings; last (B,): the last step of each flight that counts; contact_s
    (B, S): NaN without. NaN: it does not run out. 0: it is never there. shared, shared_of (B,), until (B,): each
    flight is the same as that one of the shared ones (-1: none) up to that step, with the same break-out.
    """
    wings, b = y.shape[:2]
    floor_s, ground_s = np.empty((b, wings)), np.empty((b, wings))
    if wings == 0:
        return floor_s, ground_s
    contact = np.ascontiguousarray(contact_s.T)  # as for one flight: compiled but once
    stop_s = np.where(np.isnan(contact), last * DT_S, contact)
    known = np.empty((0, wings, 0)) if shared is None else shared.low_m
    of = np.full(b, -1.0) if shared_of is None else shared_of.astype(float)
    same = np.zeros(b) if until is None else until.astype(float)
    _last_pulls(
        y, a, np.broadcast_to(last, (wings, b)).astype(float, order="C"), stop_s, np.isfinite(contact).astype(float),
        *_records(plans, None), np.array([p.scene.floor_m for p in plans]), known, of, same, heights, grid, DT_S,
        floor_s, ground_s,
    )
    return floor_s, ground_s


@njit(cache=True, parallel=True)
def _clearances(
    y: Array, a: Array, last: Array, at_s: Array, af: Any, case: Any, esc: Any, away: Array, heights: Array,
    grid: Array, dt_s: float, low_m: Array,
) -> None:
    """Lowest heights of escapes begun at at_s (B, S, O), NaN where that is NaN; the rest as ``_last_pulls``."""
    for b in prange(y.shape[1]):
        state = np.empty(NY)
        for k in range(y.shape[0]):
            for o in range(at_s.shape[2]):
                low_m[b, k, o] = np.nan
                if not math.isnan(at_s[b, k, o]):
                    throttle = state_at(y[k, b], a[k, b], at_s[b, k, o] / dt_s, int(last[b]), state)
                    low_m[b, k, o] = better_escape(state, af[k, b], case[b], esc[b], away[k, b], throttle, NO, 0.0,
                                                   heights, grid, -1e9, 1e9)


def clearances(
    plans: Sequence[Plan], y: Array, a: Array, last: NDArray[np.int64], at_s: Array, heights: Array, grid: Array
) -> Array:
    """Lowest height above the ground of the break-outs begun at at_s (B, S, O) without further delay, m.

    NaN where at_s is; the other shapes as in ``last_pulls``.
    """
    low_m = np.full(at_s.shape, np.nan)
    if y.shape[0] == 0:
        return low_m
    _clearances(y, a, last.astype(float), at_s, *_records(plans, 0.0), heights, grid, DT_S, low_m)
    return low_m
