"""Loops closed: the back half's demand scaled until the healthy lead bottoms at the height asked.

The scale does nothing before the top, so each try is flown from there on; many loops try side by side.
"""

from __future__ import annotations

from collections.abc import Generator, Sequence

import numpy as np

from render.errors import FlightError
from render.flight import passes
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import fly_lead_kept
from render.flight.plan import DT_S, Plan
from render.frames import Array
from scenes.model import Loop

FOOT_M = 0.3048
CLOSE_TOL_M = 0.02
SCALES = np.geomspace(0.25, 3.0, 9)
TRIES = 25
CHUNK = 64  # loops closed side by side, about 1.5 MB each
# a ground far below, so that a loop that would hit has a bottom too
BELOW, BELOW_GRID = np.full((1, 1), -20_000.0), np.array([0.0, 0.0, 1.0])
BELOW.setflags(write=False)  # as ``ground_arrays`` has it

Try = tuple[float, int]  # the bottom, m (NaN: none), and the limits met on the way
Found = tuple[float, str | None]  # the scale, or why there is none
Search = Generator[float, Try, Found]


def _search(name: str, want_m: float) -> Search:
    """Yields scales to try, is sent their bottoms: a grid outward from its middle, then Illinois false position."""
    missed: dict[int, float] = {}
    limits = 0

    def miss(j: int) -> Generator[float, Try, float]:
        nonlocal limits
        if j not in missed:
            bottom, limit = yield float(SCALES[j])
            missed[j] = bottom - want_m
            if np.isfinite(bottom):
                limits = max(limits, limit)
        return missed[j]

    lo = hi = -1
    j = len(SCALES) // 2
    f = yield from miss(j)
    step = 1 if f < 0.0 else -1
    while 0 <= j < len(SCALES) and not (lo >= 0 and hi >= 0):
        f = yield from miss(j)
        if not np.isfinite(f):
            break
        lo, hi = (j, hi) if f < 0.0 else (lo, j)
        j += step
    if lo < 0 or hi < 0:
        # not one clean change of sign from the middle: all of them, upward
        lo = hi = -1
        for j in range(len(SCALES)):
            f = yield from miss(j)
            if f < 0.0:
                lo = j
            elif f >= 0.0 and lo >= 0:
                hi = j
                break
    if lo < 0 or hi < 0:
        return 1.0, _cannot_close(name, want_m, missed, limits)
    s_lo, f_lo, s_hi, f_hi = SCALES[lo], missed[lo], SCALES[hi], missed[hi]
    best, f_best, side = s_lo, f_lo, 0
    for _ in range(TRIES):
        mid = (s_lo * f_hi - s_hi * f_lo) / (f_hi - f_lo)
        bottom, _ = yield float(mid)
        f = bottom - want_m
        if abs(f) < abs(f_best):
            best, f_best = mid, f
        if abs(f_best) < CLOSE_TOL_M:
            break
        if f < 0.0:
            f_hi = 0.5 * f_hi if side == 1 else f_hi
            s_lo, f_lo, side = mid, f, 1
        else:
            f_lo = 0.5 * f_lo if side == -1 else f_lo
            s_hi, f_hi, side = mid, f, -1
    if abs(f_best) > FOOT_M:
        return 1.0, (f"the loop of '{name}' does not close within 1 ft of {want_m / FOOT_M:.0f} ft: the nearest bottom "
                     f"found is {(want_m + f_best) / FOOT_M:.1f} ft")
    return float(best), None


def _bottom(y: Array, a: Array, mem: Array, loop: int) -> Try:
    """Lowest height after the top in the closing loop and the step after it, by a parabola; limits met before it.

    It belongs to the loop and the step after it, not to a dive later, nor to what follows the script.
    """
    top, end_s = round(mem[s.M_TOP_S] / DT_S) + 1, mem[s.M_SCRIPT_END_S]
    until = round(end_s / DT_S) + 1 if end_s >= 0.0 else len(y)
    inside = np.flatnonzero(a[top:until, r.A_STEP] <= loop + 1)
    if inside.size < 3:
        return np.nan, 0
    height = -y[top : top + inside[-1] + 1, r.D]
    i = int(np.argmin(height))
    limit = int(np.max(a[top : top + i + 1, r.A_LIMIT], initial=0.0))
    bottom = float(height[i])
    if 0 < i < len(height) - 1:
        left, right = height[i - 1], height[i + 1]
        bend = left - 2.0 * bottom + right
        bottom -= float((right - left) ** 2 / (8.0 * bend)) if bend > 0.0 else 0.0
    return bottom, limit


def close_each(plans: Sequence[Plan], longest_s: float) -> tuple[Array, list[str | None]]:
    """Scale of each plan's back-half demand, (B,), and for each plan why it can't be closed, None if it can.

    Plans of one shape. 1 where nothing is to be closed.
    """
    scale = np.ones(len(plans))
    why: list[str | None] = [None] * len(plans)
    todo = [i for i, plan in enumerate(plans) if _closes(plan) is not None]
    for at in range(0, len(todo), CHUNK):
        rows = todo[at : at + CHUNK]
        for i, (found, reason) in zip(rows, _close([plans[i] for i in rows], longest_s), strict=True):
            scale[i], why[i] = found, reason
    return scale, why


def _close(plans: Sequence[Plan], longest_s: float) -> list[Found]:
    """Searches of some loops in step, each try flown for all of them that still search."""
    y, a, mem, kept = fly_lead_kept(plans, np.ones(len(plans)), round(longest_s / DT_S), BELOW, BELOW_GRID)
    found: list[Found] = [(1.0, None)] * len(plans)
    open_: dict[int, tuple[Search, float]] = {}
    loops = [_closes(plan) or (0, 0.0) for plan in plans]
    y0, mem0 = np.zeros((len(plans), r.NY)), np.zeros((len(plans), s.NM))
    begin = np.zeros(len(plans))
    for i, plan in enumerate(plans):
        if mem[i, s.M_TOP_S] < 0.0:
            found[i] = 1.0, _no_top(plan.scene.name)
            continue
        begin[i] = int(mem[i, s.M_TOP_S] / DT_S)
        y0[i], mem0[i] = y[i, int(begin[i])], kept[i, int(begin[i])]
        search = _search(plan.scene.name, loops[i][1])
        open_[i] = search, next(search)
    af = np.concatenate([p.af[:1] for p in plans])
    script, knots, coeffs = (np.stack([getattr(p, n) for p in plans]) for n in ("script", "knots", "coeffs"))
    mem0[:, s.M_INSIDE] = 1.0
    while open_:
        rows = np.array(list(open_))
        n = rows.size
        case = np.concatenate([plans[i].case for i in rows])
        case["fault_kind"], case["loop_scale"] = 0.0, [scale for _, scale in open_.values()]
        memory = mem0[rows]
        passes.fly_leads(y0[rows], af, case, script, knots, coeffs, rows.astype(float), BELOW, BELOW_GRID, DT_S,
                         begin[rows], np.full(n, -1.0), 0, y[:n], a[:n], memory, np.zeros((n, 2)), np.empty((n, 0, 0)))
        for j, i in enumerate(rows):
            search, _ = open_[int(i)]
            try:
                open_[int(i)] = search, search.send(_bottom(y[j], a[j], memory[j], loops[i][0]))
            except StopIteration as done:
                found[i] = done.value
                del open_[int(i)]
    return found


def close_loops(plans: Sequence[Plan], longest_s: float) -> Array:
    """Scale of each plan's back-half demand so that its healthy loop bottoms at the height asked, (B,).

    1 where nothing is to be closed. Raises FlightError with what is reachable and what limits it.
    """
    scale, why = close_each(plans, longest_s)
    for reason in why:
        if reason is not None:
            raise FlightError(reason)
    return scale


def _closes(plan: Plan) -> tuple[int, float] | None:
    """The step of the script that closes, and at which height, m."""
    for i, step in enumerate(plan.scene.script):
        if isinstance(step, Loop) and step.close_at_m is not None:
            return i, step.close_at_m
    return None


def _no_top(name: str) -> str:
    return (f"the loop of '{name}' never reaches its top: the aircraft runs out of speed on the way up; "
            "enter faster, pull earlier, or use more power")


def _cannot_close(name: str, want_m: float, missed: dict[int, float], limits: int) -> str:
    what = {r.LIMIT_BUFFET: "the wing's buffet limit", r.LIMIT_N_MAX: "the airframe's load factor limit"}.get(
        limits, "the demand's shape (scaled from 0.25 to 3)")
    known = [m for m in missed.values() if np.isfinite(m)] or [np.nan]
    low_ft, high_ft = (want_m + min(known)) / FOOT_M, (want_m + max(known)) / FOOT_M
    return (f"the loop of '{name}' can't close at {want_m / FOOT_M:.0f} ft: with the back half scaled, bottoms from "
            f"{low_ft:.0f} ft to {high_ft:.0f} ft are reachable; limited by {what}")
