"""Plans flown together: leads, then wings, in the compiled passes; loops closed by their back half."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from render.errors import FlightError
from render.flight import passes
from render.flight import records as r
from render.flight import script as s
from render.flight.plan import DT_S, Plan
from render.frames import Array
from scenes.model import Loop

FOOT_M = 0.3048
CLOSE_TOL_M = 0.02
SCALE_LOW, SCALE_HIGH = 0.25, 3.0


@dataclass(frozen=True, slots=True, eq=False)
class Raw:
    """What the passes wrote; B flights, T instants, K aircraft."""

    y: Array  # (B, T, K, NY)
    a: Array  # (B, T, K, NA)
    mem: Array  # (B, NM) the lead's memory at the end
    status: Array  # (B, K, 2) why and at which step each one stopped


def fly_lead_batch(plans: Sequence[Plan], scale: Array, steps: int, heights: Array, grid: Array, *,
                   healthy: bool) -> tuple[Array, Array, Array, Array]:
    """Fly the leads of plans of one shape; returns y (B,T,NY), a (B,T,NA), mem (B,NM), status (B,2)."""
    b = len(plans)
    case = np.concatenate([p.case for p in plans])
    case["loop_scale"] = scale
    if healthy:
        case["fault_kind"] = 0.0
    af = np.concatenate([p.af[:1] for p in plans])
    y0 = np.stack([p.entry[0] for p in plans])
    script = np.stack([p.script for p in plans])
    knots = np.stack([p.knots for p in plans])
    coeffs = np.stack([p.coeffs for p in plans])
    out_y = np.empty((b, steps + 1, r.NY))
    out_a = np.empty((b, steps + 1, r.NA))
    mem = np.stack([p.memory for p in plans])
    status = np.zeros((b, 2))
    passes.fly_leads(y0, af, case, script, knots, coeffs, heights, grid, DT_S, out_y, out_a, mem, status)
    return out_y, out_a, mem, status


def fly_batch(plans: Sequence[Plan], scale: Array, steps: int, heights: Array, grid: Array, *, healthy: bool) -> Raw:
    """Fly leads and wings of plans of one shape (same number of steps, loops and slots)."""
    b, k = len(plans), len(plans[0].airframes)
    ly, la, mem, lstat = fly_lead_batch(plans, scale, steps, heights, grid, healthy=healthy)
    y = np.empty((b, steps + 1, k, r.NY))
    a = np.empty((b, steps + 1, k, r.NA))
    status = np.empty((b, k, 2))
    y[:, :, 0], a[:, :, 0], status[:, 0] = ly, la, lstat
    if k > 1:
        w = k - 1
        case = np.repeat(np.concatenate([p.case for p in plans]), w)
        af = np.concatenate([p.af[1:] for p in plans])
        y0 = np.concatenate([p.entry[1:] for p in plans])
        slots = np.concatenate([p.slots for p in plans])
        wy = np.empty((b * w, steps + 1, r.NY))
        wa = np.empty((b * w, steps + 1, r.NA))
        wstat = np.zeros((b * w, 2))
        lead_of = np.repeat(np.arange(b), w).astype(float)
        passes.fly_wings(y0, af, case, slots, ly, la, lead_of, heights, grid, DT_S, lstat[:, 1].copy(), wy, wa, wstat)
        y[:, :, 1:] = wy.reshape(b, w, steps + 1, r.NY).transpose(0, 2, 1, 3)
        a[:, :, 1:] = wa.reshape(b, w, steps + 1, r.NA).transpose(0, 2, 1, 3)
        status[:, 1:] = wstat.reshape(b, w, 2)
    return Raw(y, a, mem, status)


def _bottoms(plans: Sequence[Plan], scale: Array, steps: int) -> tuple[Array, Array, Array]:
    """Lowest height of the healthy lead after the top of his closing loop, (B,); limits met; if the top came.

    Flown over a ground far below, so that a loop that would hit has a bottom too.
    """
    below = np.full((1, 1), -20_000.0)
    y, a, mem, _ = fly_lead_batch(plans, scale, steps, below, np.array([0.0, 0.0, 1.0]), healthy=True)
    bottom = np.full(len(plans), np.nan)
    limit = np.zeros(len(plans))
    topped = np.asarray(mem[:, s.M_TOP_S] >= 0.0)
    for b, plan in enumerate(plans):
        if not topped[b]:
            continue
        loop = next(i for i, st in enumerate(plan.scene.script) if isinstance(st, Loop) and st.close_at_m is not None)
        i0 = round(mem[b, s.M_TOP_S] / DT_S) + 1
        # the bottom belongs to the loop and the step after it, not to a dive later, nor to what follows the script
        end_s = mem[b, s.M_SCRIPT_END_S]
        until = round(end_s / DT_S) + 1 if end_s >= 0.0 else y.shape[1]
        inside = np.flatnonzero(a[b, i0:until, r.A_STEP] <= loop + 1)
        if inside.size < 3:
            continue
        h = -y[b, i0 : i0 + inside[-1] + 1, r.D]
        i = int(np.argmin(h))
        limit[b] = np.max(a[b, i0 : i0 + i + 1, r.A_LIMIT], initial=0.0)
        if 0 < i < len(h) - 1:
            left, mid, right = h[i - 1], h[i], h[i + 1]
            bend = left - 2.0 * mid + right
            bottom[b] = mid - (right - left) ** 2 / (8.0 * bend) if bend > 0.0 else mid
        else:
            bottom[b] = h[i]
    return bottom, limit, topped.astype(float)


def close_loops(plans: Sequence[Plan], longest_s: float) -> Array:
    """Scale of each plan's back-half demand so that its healthy loop bottoms at the height asked, (B,).

    1 where nothing is to be closed. Raises FlightError with what is reachable and what limits it.
    Method: a coarse grid of scales, then Illinois false position, all plans at once.
    """
    goal = np.array([_close_height(p) for p in plans])
    scale = np.ones(len(plans))
    todo = np.flatnonzero(np.isfinite(goal))
    if todo.size == 0:
        return scale
    work = [plans[int(i)] for i in todo]
    want = goal[todo]
    steps = round(longest_s / DT_S)
    grid = np.geomspace(SCALE_LOW, SCALE_HIGH, 9)
    lo, hi = np.full(todo.size, np.nan), np.full(todo.size, np.nan)
    f_lo, f_hi = np.full(todo.size, np.nan), np.full(todo.size, np.nan)
    low_seen, high_seen = np.full(todo.size, np.inf), np.full(todo.size, -np.inf)
    limits = np.zeros(todo.size)
    topped = np.zeros(todo.size)
    for g in grid:
        f, limit, top = _bottoms(work, np.full(todo.size, g), steps)
        f = np.where(np.isfinite(f), f - want, np.nan)
        topped = np.maximum(topped, top)
        limits = np.where(np.isfinite(f), np.maximum(limits, limit), limits)
        low_seen, high_seen = np.fmin(low_seen, f), np.fmax(high_seen, f)
        lower = (f < 0.0) & ~np.isfinite(hi)
        lo, f_lo = np.where(lower, g, lo), np.where(lower, f, f_lo)
        upper = (f >= 0.0) & np.isfinite(lo) & ~np.isfinite(hi)
        hi, f_hi = np.where(upper, g, hi), np.where(upper, f, f_hi)
        if np.all(np.isfinite(hi)):
            break
    for i in np.flatnonzero(~np.isfinite(hi)):
        raise FlightError(_cannot_close(work[i], want[i], low_seen[i], high_seen[i], int(limits[i]), bool(topped[i])))
    side = np.zeros(todo.size)
    best, f_best = lo.copy(), f_lo.copy()
    for _ in range(25):
        mid = (lo * f_hi - hi * f_lo) / (f_hi - f_lo)
        f, _, _ = _bottoms(work, mid, steps)
        f = f - want
        better = np.abs(f) < np.abs(f_best)
        best, f_best = np.where(better, mid, best), np.where(better, f, f_best)
        if np.all(np.abs(f_best) < CLOSE_TOL_M):
            break
        low = f < 0.0
        f_hi = np.where(low & (side == 1), 0.5 * f_hi, f_hi)
        f_lo = np.where(~low & (side == -1), 0.5 * f_lo, f_lo)
        side = np.where(low, 1.0, -1.0)
        lo, f_lo = np.where(low, mid, lo), np.where(low, f, f_lo)
        hi, f_hi = np.where(low, hi, mid), np.where(low, f_hi, f)
    worst = int(np.argmax(np.abs(f_best)))
    if abs(f_best[worst]) > FOOT_M:
        raise FlightError(
            f"the loop of '{work[worst].scene.name}' does not close within 1 ft of {want[worst] / FOOT_M:.0f} ft: "
            f"the nearest bottom found is {(want[worst] + f_best[worst]) / FOOT_M:.1f} ft"
        )
    scale[todo] = best
    return scale


def _close_height(plan: Plan) -> float:
    heights = [st.close_at_m for st in plan.scene.script if isinstance(st, Loop) and st.close_at_m is not None]
    return heights[0] if heights else np.nan


def _cannot_close(plan: Plan, want_m: float, low_m: float, high_m: float, limit: int, topped: bool) -> str:
    name = plan.scene.name
    if not topped:
        return (f"the loop of '{name}' never reaches its top: the aircraft runs out of speed on the way up; "
                "enter faster, pull earlier, or use more power")
    what = {r.LIMIT_BUFFET: "the wing's buffet limit", r.LIMIT_N_MAX: "the airframe's load factor limit"}.get(
        limit, "the demand's shape (scaled from 0.25 to 3)")
    low_ft, high_ft = (want_m + low_m) / FOOT_M, (want_m + high_m) / FOOT_M
    return (f"the loop of '{name}' can't close at {want_m / FOOT_M:.0f} ft: with the back half scaled, bottoms from "
            f"{low_ft:.0f} ft to {high_ft:.0f} ft are reachable; limited by {what}")
