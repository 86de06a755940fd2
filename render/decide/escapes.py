"""Last pulls of many flights at once: the last instant from which an escape still clears the floor."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from render.decide.seats import states_at
from render.flight import records as r
from render.flight.escapes import better_escapes
from render.flight.plan import DT_S, Plan, escape_pair
from render.frames import Array
from render.margin.escape import away_of

FIRST_PARTS, NEXT_PARTS, ROUNDS = 6, 4, 3


def lowest_of_escapes(
    plans: Sequence[Plan], k: int, y: Array, a: Array, steps: Array, heights: Array, grid: Array, *,
    delay_s: float | None = None,
) -> Array:
    """Lowest height above the ground, m, of the better escape of aircraft k begun at each fractional step, (B, M).

    y (B, T, NY), a (B, T, NA) of that aircraft; steps (B, M). NaN where a step is NaN.
    """
    b, m = steps.shape
    todo = np.isfinite(steps)
    states, throttles = states_at(y, a, np.where(todo, steps, 0.0))
    row = np.repeat(np.arange(b), m).reshape(b, m)[todo].astype(float)
    n = row.size
    best = np.empty(n)
    esc = np.concatenate([escape_pair(p.scene.break_out, delay_s=delay_s) for p in plans])
    away = np.array([away_of(p, k) for p in plans])[row.astype(int)]
    better_escapes(states[todo], np.concatenate([p.af[k : k + 1] for p in plans]),
                   np.concatenate([p.case for p in plans]), esc, away, throttles[todo], np.zeros(n), np.zeros(n),
                   heights, grid, row, best)
    out = np.full((b, m), np.nan)
    out[todo] = best
    return out


def last_pulls(
    plans: Sequence[Plan], k: int, y: Array, a: Array, fault_step: Array, end_step: NDArray[np.int64], floor_m: float,
    heights: Array, grid: Array,
) -> tuple[Array, Array]:
    """Last pull against a floor, s from the start of each flight, (B,), and the lowest own height after the fault, m.

    fault_step (B,) fractional; end_step (B,): the last step that is real (contact, or the end of the time axis).
    Infinity: it never runs out. 0: no escape clears from the start on. An aircraft that stays above the floor as
    it is has not run out; otherwise the last pull is looked for from its lowest point backward, where the
    clearance passes zero for the last time (``margin.escape`` looks everywhere, and finds the same).
    """
    b = len(plans)
    last, low = np.full(b, np.inf), np.full(b, np.inf)
    bottom = np.zeros(b)
    for i in range(b):
        first = int(np.ceil(fault_step[i]))
        agl = a[i, first : end_step[i] + 1, r.A_AGL]
        if agl.size:
            low[i] = max(float(np.min(agl)), 0.0)
            bottom[i] = first + int(np.argmin(agl))
    todo = np.flatnonzero(low < floor_m)
    if todo.size == 0:
        return last, low
    some = [plans[int(i)] for i in todo]
    ys, as_ = y[todo], a[todo]

    def clearance(steps: Array) -> Array:
        return lowest_of_escapes(some, k, ys, as_, steps, heights, grid) - floor_m

    part = np.linspace(0.0, 1.0, FIRST_PARTS + 1)
    start, stop = fault_step[todo], bottom[todo]
    begin = clearance(start[:, None])[:, 0]
    # gone before the fault: look from the start of the flight to it
    gone = begin < 0.0
    start, stop = np.where(gone, 0.0, start), np.where(gone, start, stop)
    steps = start[:, None] + (stop - start)[:, None] * part
    left, right, c_left, c_right = _bracket(steps, clearance(steps))
    for _ in range(ROUNDS - 1):
        steps = left[:, None] + (right - left)[:, None] * np.linspace(0.0, 1.0, NEXT_PARTS + 1)
        inner = clearance(steps[:, 1:-1])
        left, right, c_left, c_right = _bracket(steps, np.column_stack([c_left, inner, c_right]))
    known = (c_left >= 0.0) & (c_right < 0.0)
    exact = left + (right - left) * c_left / np.where(known, c_left - c_right, 1.0)
    # never cleared: from the start on; cleared to the end of what is known: at least until then
    last[todo] = DT_S * np.where(known, exact, np.where(c_left < 0.0, 0.0, right))
    return last, low


def _bracket(steps: Array, c: Array) -> tuple[Array, Array, Array, Array]:
    """The last pair of neighbours between which c (B, M) falls below zero; the first or last pair if none."""
    down = (c[:, :-1] >= 0.0) & (c[:, 1:] < 0.0)
    m = down.shape[1]
    last = m - 1 - np.argmax(down[:, ::-1], axis=1)
    last = np.where(np.any(down, axis=1), last, np.where(c[:, 0] < 0.0, 0, m - 1))
    row = np.arange(len(c))
    return steps[row, last], steps[row, last + 1], c[row, last], c[row, last + 1]
