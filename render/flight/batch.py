"""Plans flown together: leads, then wings, in the compiled passes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from render.flight import passes
from render.flight import records as r
from render.flight.plan import DT_S, Plan
from render.frames import Array


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
