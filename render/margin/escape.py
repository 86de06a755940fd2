"""What is left before the ground: an escape flown from every instant, and the last one that clears.

Two escapes are flown from each instant, pulling as he is and rolling the lift toward the sky first;
the better one counts. A faulted lead escapes with what control he has left.
"""

from __future__ import annotations

import numpy as np

from render.flight.escapes import ESCAPE_DT_S, LONGEST_S, better_escapes
from render.flight.plan import Plan, escape_pair
from render.flight.states import state_rows
from render.frames import Array
from render.types import Flight, Margin

__all__ = ["ESCAPE_DT_S", "EVERY_S", "LONGEST_S", "escape_heights", "find_margin", "seconds_left"]

EVERY_S = 0.1  # instants of a flight an escape is begun from


def escape_heights(
    plan: Plan, flight: Flight, k: int, times_s: Array, heights: Array, grid: Array, *, delay_s: float | None = None
) -> Array:
    """Lowest height above the ground, m, of the better escape begun at each time, (n,), for aircraft k.

    Negative where no escape clears the ground. delay_s: wait before it acts, the scene's by default.
    """
    y = state_rows(flight, k, times_s)
    n = len(times_s)
    away = away_of(plan, k)
    throttle = np.interp(times_s, flight.time_s, flight.throttle[:, k])
    on = np.zeros(n)
    stab = np.zeros(n)
    if k == 0 and flight.fault_s is not None:
        on = (times_s >= flight.fault_s).astype(float)
        stab[:] = np.interp(flight.fault_s, flight.time_s, flight.stabilator_rad[:, 0])
    best = np.empty(n)
    pair = escape_pair(plan.scene.break_out, delay_s=delay_s)
    better_escapes(y, plan.af[k : k + 1], plan.case, pair, np.full(n, away), throttle, on, stab, heights, grid,
                   np.zeros(n), best)
    return best


def away_of(plan: Plan, k: int) -> float:
    """+1 if the formation is on his left, -1 if on his right, 0 for the lead and those behind him."""
    if k == 0:
        return 0.0
    right = plan.slots[k - 1, 1]
    return float(np.sign(right)) if abs(right) > 1.0 else 0.0


def seconds_left(time_s: Array, clearance_m: Array) -> tuple[Array, float | None]:
    """Seconds until the clearance is gone, (T,), and the last instant it is there, s.

    NaN and None where it never runs out; negative after it is gone. A clearance that comes back
    counts again. Linear between instants.
    """
    left = np.full(len(time_s), np.nan)
    ok = np.isfinite(clearance_m)
    if not np.any(ok):
        return left, None
    t, c = time_s[ok], clearance_m[ok]
    down = np.flatnonzero((c[:-1] >= 0.0) & (c[1:] < 0.0))
    if down.size == 0 and c[0] >= 0.0:
        return left, None
    ends = t[down] + (t[down + 1] - t[down]) * c[down] / (c[down] - c[down + 1])
    here = np.full(len(t), np.nan)
    for i in range(len(t)):
        if c[i] >= 0.0:
            coming = ends[ends >= t[i]]
            here[i] = coming[0] - t[i] if coming.size else np.nan
        else:
            gone = ends[ends <= t[i]]
            here[i] = gone[-1] - t[i] if gone.size else t[0] - t[i]
    left[ok] = here
    return left, float(ends[-1]) if ends.size else float(t[0])


def find_margin(plan: Plan, flight: Flight, heights: Array, grid: Array) -> Margin:
    """Margins of every aircraft of a flight, against the scene's floor and against the ground."""
    time_s, count = flight.time_s, len(flight.names)
    floor = plan.scene.floor_m
    shape = (len(time_s), count)
    ground_m, floor_left, ground_left = np.full(shape, np.nan), np.full(shape, np.nan), np.full(shape, np.nan)
    last_floor: list[float | None] = []
    last_ground: list[float | None] = []
    for k in range(count):
        end = flight.contact_s[k]
        stop = time_s[-1] if end is None else end
        coarse = np.append(np.arange(0.0, stop, EVERY_S), stop)
        low = escape_heights(plan, flight, k, coarse, heights, grid)
        inside = time_s <= stop
        ground_m[inside, k] = np.interp(time_s[inside], coarse, low)
        ground_left[:, k], _ = seconds_left(time_s, ground_m[:, k])
        floor_left[:, k], _ = seconds_left(time_s, ground_m[:, k] - floor)
        # from the instants flown, as ``last_pull`` finds it without flying all of them
        last_floor.append(seconds_left(coarse, low - floor)[1])
        last_ground.append(seconds_left(coarse, low)[1])
    fault = plan.scene.fault
    # a frozen or trailing surface does not answer the stick at all
    dead = flight.fault_s is not None and fault is not None and (
        fault.kind in ("freeze", "trail") or (fault.kind == "authority" and fault.fraction == 0.0))
    return Margin(
        time_s=time_s.copy(), clearance_floor_m=ground_m - floor, clearance_ground_m=ground_m,
        seconds_floor_s=floor_left, seconds_ground_s=ground_left, last_pull_floor_s=tuple(last_floor),
        last_pull_ground_s=tuple(last_ground), no_pull_left=(dead, *(False for _ in range(count - 1))),
    )
