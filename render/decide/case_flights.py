"""The flights of many cases: healthy twins closed and flown once each, faulted flights begun from them.

What one scene's ``fly_scene`` does, for many: the same kernels, the same rules for where a flight ends, the same
complaints, kept beside the case instead of raised.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from render.errors import FlightError
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import Kept, Raw, fly_batch, fly_faulted, fly_kept
from render.flight.closing import close_each
from render.flight.fly import AFTER_SCRIPT_S, contact_time, departed_end, faulted_end, find_events, healthy_end
from render.flight.plan import DT_S, Memo, Plan, compile_scene
from render.frames import Array
from scenes.airframe import Airframe
from scenes.model import Scene

AFTER = round(AFTER_SCRIPT_S / DT_S)
ROOM = round(1.0 / DT_S) + 2  # steps after contact that a flight is shown for
TWINS = 48
GATES = ("entry", "vertical_up", "top", "vertical_down", "bottom")

Errors = dict[int, str]
"""Case to why it can't be flown."""


@dataclass(frozen=True, slots=True, eq=False)
class Flown:
    """Cases flown together, all of one shape; B cases, K aircraft, T steps. Rows of ``case`` in the caller's table."""

    case: NDArray[np.int64]  # (B,)
    plans: tuple[Plan, ...]  # (B,)
    twins: Kept  # W of them
    twin_of: NDArray[np.int64]  # (B,)
    twin_contact_s: Array  # (W, K)
    y: Array  # (K, B, T, NY)
    a: Array  # (K, B, T, NA)
    last: NDArray[np.int64]  # (B,) last step that counts
    fault_s: Array  # (B,) NaN without
    contact_s: Array  # (B, K)
    scale: Array  # (B,) of the flown script
    gate_end: NDArray[np.int64]  # (B,) last step that counts of the pass without fault


def compile_cases(
    scenes: Sequence[Scene], airframe_of: Callable[[str], Airframe], errors: Errors
) -> list[tuple[int, Plan, Plan | None]]:
    """Cases with their plans, and the plan as briefed where the script is another; those that compile."""
    memo: Memo = {}
    known: dict[str, Airframe] = {}
    out: list[tuple[int, Plan, Plan | None]] = []
    for i, scene in enumerate(scenes):
        names = [scene.airframe] + [slot.airframe or scene.airframe for slot in scene.formation]
        for name in names:
            if name not in known:
                known[name] = airframe_of(name)
        frames = tuple(known[name] for name in names)
        try:
            plan = compile_scene(scene, frames, memo)
            briefed = None
            if scene.briefed is not None:
                briefed = compile_scene(replace(scene, script=scene.briefed, briefed=None), frames, memo)
        except FlightError as exc:
            errors[i] = str(exc)
            continue
        out.append((i, plan, briefed))
    return out


def shape_key(plan: Plan, briefed: Plan | None) -> Hashable:
    """Plans with the same key can be flown in one call."""
    twin = plan if briefed is None else briefed
    return (plan.script.shape, plan.knots.shape, twin.script.shape, twin.knots.shape, plan.airframes, briefed is None,
            plan.longest_s, twin.longest_s)


def twin_key(plan: Plan) -> Hashable:
    """Plans with the same key have the same healthy flight."""
    scene = plan.scene
    return scene.day, scene.script, scene.formation


def one(raw: Raw, b: int) -> Raw:
    """One flight of a batch, as a batch of one."""
    return Raw(raw.y[b : b + 1], raw.a[b : b + 1], raw.mem[b : b + 1], raw.status[b : b + 1])


def contacts(raw: Raw, b: int, last: int) -> list[float]:
    """When each aircraft of a flight met the ground, s; NaN: not up to step ``last``."""
    found = []
    for k in range(raw.status.shape[1]):
        met = raw.status[b, k, 0] == r.CONTACT and raw.status[b, k, 1] <= last
        found.append(contact_time(raw.a[b, :, k, r.A_AGL], int(raw.status[b, k, 1])) if met else np.nan)
    return found


def fly_cases(
    cases: Sequence[tuple[int, Plan, Plan | None]], heights: Array, grid: Array, errors: Errors
) -> Flown | None:
    """Fly cases of one shape; those that can't be flown go to ``errors``. None if none is left."""
    departs = cases[0][2] is not None
    seen: dict[Hashable, int] = {}
    twin_plans: list[Plan] = []
    of: list[int] = []
    for _, plan, briefed in cases:
        source = plan if briefed is None else briefed
        key = twin_key(source)
        if key not in seen:
            seen[key] = len(twin_plans)
            twin_plans.append(source)
        of.append(seen[key])
    longest_s = max(max(p.longest_s for p in twin_plans), max(p.longest_s for _, p, _ in cases))
    steps = round((longest_s + AFTER_SCRIPT_S) / DT_S)
    scale, why = close_each(twin_plans, twin_plans[0].longest_s)
    # a flight that is not the briefed one may run on long after the briefed one has ended
    twins = fly_kept(twin_plans, scale, steps, heights, grid, tail=-1 if departs else AFTER + ROOM, keep=not departs)
    ends, cuts, contact = np.zeros(len(twin_plans)), np.zeros(len(twin_plans), dtype=np.int64), []
    for w, plan in enumerate(twin_plans):
        if why[w] is None and not departs:
            try:
                ends[w], cuts[w] = healthy_end(plan, one(twins.raw, w))
            except FlightError as exc:
                why[w] = str(exc)
        # contact within what any of its faulted flights shows
        contact.append(contacts(twins.raw, w, steps))
    good = []
    for j, (i, _, _) in enumerate(cases):
        reason = why[of[j]]
        if reason is None:
            good.append(j)
        else:
            errors[i] = reason
    if not good:
        return None
    twin = _Twins(twins, ends, cuts, np.array(contact))
    kept = [cases[j] for j in good]
    rows = np.array([of[j] for j in good])
    return _departed(kept, rows, twin, heights, grid, errors) if departs else _faulted(
        kept, rows, twin, heights, grid, errors)


@dataclass(frozen=True, slots=True, eq=False)
class _Twins:
    kept: Kept
    end_s: Array
    cut: NDArray[np.int64]
    contact_s: Array


def _faulted(
    cases: Sequence[tuple[int, Plan, Plan | None]], of: NDArray[np.int64], twin: _Twins, heights: Array, grid: Array,
    errors: Errors,
) -> Flown | None:
    """Flights with a fault begun from their twins; a case without one is its twin."""
    plans = [plan for _, plan, _ in cases]
    end_step = np.round(twin.end_s / DT_S).astype(np.int64)
    steps = min(int(end_step[of].max()) + AFTER + ROOM, twin.kept.raw.y.shape[1] - 1)
    raw, begin = fly_faulted(plans, twin.kept, of, end_step[of], steps, heights, grid)
    last = np.zeros(len(cases), dtype=np.int64)
    fault_s, contact = np.full(len(cases), np.nan), np.full((len(cases), raw.status.shape[1]), np.nan)
    whole = twin.kept.raw
    good = []
    for b, (i, plan, _) in enumerate(cases):
        w = int(of[b])
        if plan.scene.fault is None:
            last[b], contact[b] = twin.cut[w], contacts(whole, w, int(twin.cut[w]))
            raw.y[b, : last[b] + 1], raw.a[b, : last[b] + 1] = whole.y[w, : last[b] + 1], whole.a[w, : last[b] + 1]
            good.append(b)
            continue
        try:
            mine = one(raw, b)
            if begin[b] < 0:
                mine.mem[0, s.M_FAULT_S] = -1.0
            last[b] = faulted_end(plan, one(whole, w), mine, float(twin.end_s[w]), int(twin.cut[w]))
        except FlightError as exc:
            errors[i] = str(exc)
            continue
        fault_s[b], contact[b] = raw.mem[b, s.M_FAULT_S], contacts(raw, b, int(last[b]))
        good.append(b)
    return _flown(cases, of, twin, raw, last, fault_s, contact, twin.kept.scale[of], good, twin.cut[of])


def _departed(
    cases: Sequence[tuple[int, Plan, Plan | None]], of: NDArray[np.int64], twin: _Twins, heights: Array, grid: Array,
    errors: Errors,
) -> Flown | None:
    """Scripts that are not the briefed one: the twin flies as briefed, the fault is where the two part."""
    plans = [plan for _, plan, _ in cases]
    scale, why = close_each(plans, plans[0].longest_s)
    steps = twin.kept.raw.y.shape[1] - 1
    raw = fly_batch(plans, scale, steps, heights, grid, healthy=True, tail=AFTER + ROOM)
    last = np.zeros(len(cases), dtype=np.int64)
    fault_s, contact = np.full(len(cases), np.nan), np.full((len(cases), raw.status.shape[1]), np.nan)
    good = []
    for b, (i, plan, briefed) in enumerate(cases):
        reason = why[b]
        if reason is None:
            try:
                assert briefed is not None
                last[b], fault_s[b] = departed_end(briefed, plan, one(twin.kept.raw, int(of[b])), one(raw, b))
            except FlightError as exc:
                reason = str(exc)
        if reason is not None:
            errors[i] = reason
            continue
        contact[b] = contacts(raw, b, int(last[b]))
        good.append(b)
    return _flown(cases, of, twin, raw, last, fault_s, contact, scale, good, last)


def _flown(
    cases: Sequence[tuple[int, Plan, Plan | None]], of: NDArray[np.int64], twin: _Twins, raw: Raw,
    last: NDArray[np.int64], fault_s: Array, contact: Array, scale: Array, good: list[int], gate_end: NDArray[np.int64],
) -> Flown | None:
    if not good:
        return None
    y, a = raw.y.transpose(2, 0, 1, 3), raw.a.transpose(2, 0, 1, 3)
    if len(good) < len(cases):
        y, a = np.ascontiguousarray(y[:, good]), np.ascontiguousarray(a[:, good])
    return Flown(
        np.array([cases[b][0] for b in good]), tuple(cases[b][1] for b in good), twin.kept, of[good],
        twin.contact_s, y, a, last[good], fault_s[good], contact[good], scale[good], gate_end[good],
    )


def blocks(
    group: Sequence[tuple[int, Plan, Plan | None]], twins: int = TWINS
) -> list[list[tuple[int, Plan, Plan | None]]]:
    """A group cut so that no part has more than so many different twins, each about 5 MB, kept in order."""
    parts: list[list[tuple[int, Plan, Plan | None]]] = [[]]
    seen: set[Hashable] = set()
    for case in group:
        key = twin_key(case[1] if case[2] is None else case[2])
        if key not in seen and len(seen) == twins:
            parts.append([])
            seen = set()
        seen.add(key)
        parts[-1].append(case)
    return parts


def gate_points(y: Array, a: Array, last: int, script_end_s: float) -> Array:
    """Time s, height above ground m, calibrated speed m/s and load factor of the lead at his gates, (5, 4).

    y (T, NY), a (T, NA) of him; NaN at a gate he does not pass up to step ``last``.
    """
    end = last + 1
    time_s: Array = np.arange(end, dtype=np.float64) * DT_S
    events = find_events(time_s, a[:end, r.A_LOOP], -y[:end, r.D], a[:end, r.A_STEP], script_end_s)
    points = np.full((len(GATES), 4), np.nan)
    for j, gate in enumerate(GATES):
        if gate in events:
            at_s = events[gate]
            points[j] = [at_s, *(np.interp(at_s, time_s, a[:end, c]) for c in (r.A_AGL, r.A_CAS, r.A_N))]
    return points
