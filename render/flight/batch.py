"""Plans flown together: leads, then wings, in the compiled passes; from the start or from what a twin kept."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.flight import passes
from render.flight import records as r
from render.flight import script as s
from render.flight.plan import DT_S, Plan
from render.frames import Array

LEARNT = 6  # what a wing pilot remembers: trim and the last miss


@dataclass(frozen=True, slots=True, eq=False)
class Raw:
    """What the passes wrote; B flights, T instants, K aircraft."""

    y: Array  # (B, T, K, NY)
    a: Array  # (B, T, K, NA)
    mem: Array  # (B, NM) the lead's memory at the end
    status: Array  # (B, K, 2) why and at which step each one stopped


@dataclass(frozen=True, slots=True, eq=False)
class Kept:
    """Flights without fault, with what was remembered at each step: others begin from them."""

    plans: tuple[Plan, ...]  # (B,)
    scale: Array  # (B,)
    raw: Raw
    lead: Array  # (B, T, NM) the lead's memory
    learnt: Array  # (S * B, T, 6) the wings', the first slot's of all flights first


def _leads(plans: Sequence[Plan], scale: Array, healthy: bool) -> tuple[Array, NDArray[np.void]]:
    """Entry states (B, NY) and cases (B,) of the leads."""
    case = np.concatenate([p.case for p in plans])
    case["loop_scale"] = scale
    if healthy:
        case["fault_kind"] = 0.0
    return np.stack([p.entry[0] for p in plans]), case


def fly_lead_batch(plans: Sequence[Plan], scale: Array, steps: int, heights: Array, grid: Array, *,
                   healthy: bool) -> tuple[Array, Array, Array, Array]:
    """Fly the leads of plans of one shape; returns y (B,T,NY), a (B,T,NA), mem (B,NM), status (B,2)."""
    y, a, mem, status, _ = _fly_leads(plans, scale, steps, heights, grid, healthy, -1, 1, False)
    return y[0], a[0], mem, status[0]


def fly_lead_kept(plans: Sequence[Plan], scale: Array, steps: int, heights: Array,
                  grid: Array) -> tuple[Array, Array, Array, Array]:
    """Leads without fault to the end of their scripts: y, a, mem, and their memory at each step (B, T, NM)."""
    y, a, mem, _, kept = _fly_leads(plans, scale, steps, heights, grid, True, 0, 1, True)
    return y[0], a[0], mem, kept


def _fly_leads(
    plans: Sequence[Plan], scale: Array, steps: int, heights: Array, grid: Array, healthy: bool, tail: int,
    aircraft: int, keep: bool,
) -> tuple[Array, Array, Array, Array, Array]:
    """Leads flown into the first row of arrays (aircraft, B, T, …) that have room for the wings."""
    b = len(plans)
    y0, case = _leads(plans, scale, healthy)
    y, a = np.empty((aircraft, b, steps + 1, r.NY)), np.empty((aircraft, b, steps + 1, r.NA))
    mem, status = np.stack([p.memory for p in plans]), np.zeros((aircraft, b, 2))
    kept = np.empty((b, steps + 1, s.NM) if keep else (b, 0, 0))
    passes.fly_leads(
        y0, np.concatenate([p.af[:1] for p in plans]), case, np.stack([p.script for p in plans]),
        np.stack([p.knots for p in plans]), np.stack([p.coeffs for p in plans]), np.arange(float(b)), heights, grid,
        DT_S, np.zeros(b), np.full(b, -1.0), tail, y[0], a[0], mem, status[0], kept,
    )
    return y, a, mem, status, kept


def _fly_wings(
    plans: Sequence[Plan], case: NDArray[np.void], y0: Array, of: NDArray[np.int64], begin: Array, learnt: Array,
    y: Array, a: Array, status: Array, heights: Array, grid: Array, keep: bool,
) -> Array:
    """Wings flown behind the leads in y[0], a[0], into the other rows; returns what they learnt.

    case (B,); y0 (K, B, NY) where each begins; of (B,): the plan whose airframes and slots each flight has.
    """
    aircraft, b = y.shape[:2]
    wings, n = aircraft - 1, len(plans)
    kept = np.empty((wings * b, y.shape[2], LEARNT) if keep else (wings * b, 0, 0))
    if wings == 0:
        return kept
    row = (np.arange(wings)[:, None] * n + of).reshape(-1)
    flat = status[1:].reshape(wings * b, 2)
    passes.fly_wings(
        y0[1:].reshape(wings * b, r.NY), np.concatenate([p.af[k : k + 1] for k in range(1, aircraft) for p in plans]),
        case, np.stack([p.slots[k] for k in range(wings) for p in plans]), y[0], a[0],
        np.tile(np.arange(float(b)), wings), heights, grid, DT_S, status[0, :, 1].copy(), begin, learnt,
        row.astype(float), y[1:].reshape(wings * b, *y.shape[2:]), a[1:].reshape(wings * b, *a.shape[2:]), flat, kept,
    )
    return kept


def fly_batch(plans: Sequence[Plan], scale: Array, steps: int, heights: Array, grid: Array, *, healthy: bool,
              tail: int = -1) -> Raw:
    """Fly leads and wings of plans of one shape (same number of steps, loops and slots).

    tail: no further than that many steps after each script's end, the last state held from there.
    """
    return fly_kept(plans, scale, steps, heights, grid, healthy=healthy, tail=tail, keep=False).raw


def fly_kept(plans: Sequence[Plan], scale: Array, steps: int, heights: Array, grid: Array, *, healthy: bool = True,
             tail: int = -1, keep: bool = True) -> Kept:
    """``fly_batch``, with what lead and wings remember at each step."""
    b, k = len(plans), len(plans[0].airframes)
    y, a, mem, status, lead = _fly_leads(plans, scale, steps, heights, grid, healthy, tail, k, keep)
    _, case = _leads(plans, scale, healthy)
    y0 = np.stack([p.entry for p in plans], axis=1)
    unlearnt = np.empty(((k - 1) * b, 0, 0))
    learnt = _fly_wings(plans, case, y0, np.arange(b), np.zeros(b), unlearnt, y, a, status, heights, grid, keep)
    return Kept(tuple(plans), scale, _raw(y, a, mem, status), lead, learnt)


def _raw(y: Array, a: Array, mem: Array, status: Array) -> Raw:
    return Raw(y.transpose(1, 2, 0, 3), a.transpose(1, 2, 0, 3), mem, status.transpose(1, 0, 2))


def fly_faulted(
    plans: Sequence[Plan], twins: Kept, twin_of: NDArray[np.int64], end_step: NDArray[np.int64], steps: int,
    heights: Array, grid: Array,
) -> tuple[Raw, NDArray[np.int64]]:
    """Fly plans from the instants their faults come on; until then each is its twin, to the last bit.

    twin_of (B,): the row of the twins each belongs to, whose script, entry and scale it has; end_step (B,): it is
    flown on until the path is level after that step. Returns the flights and (B,) the step each fault comes on
    after, -1 where its point is never reached (such a row is void).
    """
    b, k = len(plans), len(plans[0].airframes)
    _, case = _leads(plans, twins.scale[twin_of], False)
    of = twins.plans
    script = np.stack([p.script for p in of])
    twin_y, twin_a = twins.raw.y.transpose(2, 0, 1, 3), twins.raw.a.transpose(2, 0, 1, 3)
    row, begin = twin_of.astype(float), np.empty(b)
    passes.fault_steps(case, twin_y[0], twins.lead, twins.raw.status[:, 0, 1].copy(), script, row, DT_S, begin)
    begin[begin >= steps] = -1.0
    y, a = np.empty((k, b, steps + 1, r.NY)), np.empty((k, b, steps + 1, r.NA))
    mem, status = np.zeros((b, s.NM)), np.zeros((k, b, 2))
    y0 = np.zeros((k, b, r.NY))
    for i, w in enumerate(twin_of):
        at = int(begin[i])
        if at < 0:
            continue
        y[:, i, :at], a[:, i, :at] = twin_y[:, w, :at], twin_a[:, w, :at]
        y0[:, i], mem[i] = twin_y[:, w, at], twins.lead[w, at]
        mem[i, s.M_INSIDE] = 1.0
    passes.fly_leads(
        y0[0], np.concatenate([p.af[:1] for p in of]), case, script, np.stack([p.knots for p in of]),
        np.stack([p.coeffs for p in of]), row, heights, grid, DT_S, begin, end_step.astype(float), -1, y[0], a[0], mem,
        status[0], np.empty((b, 0, 0)),
    )
    _fly_wings(of, case, y0, twin_of, begin, twins.learnt, y, a, status, heights, grid, False)
    return _raw(y, a, mem, status), begin.astype(np.int64)
