"""Many cases worked through together: variants of one scene in, one table of columns out.

A case goes through the same flight, margin and sight code as ``work_through``; a case that can't be flown
is a row with its error, not an exception.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from render.decide.case_flights import GATES, Errors, Flown, blocks, compile_cases, fly_cases, gate_points, shape_key
from render.decide.case_notices import SHARED, Sink, look
from render.errors import LatepullError
from render.flight import records as r
from render.flight import script as s
from render.flight.fly import ground_arrays
from render.flight.plan import DT_S, Plan
from render.frames import Array
from render.margin.last_pull import Stages, clearances, last_pulls, stages
from render.sight.observers import TABLE
from render.types import OBSERVERS, freeze_arrays
from scenes.airframe import Airframe
from scenes.model import Scene
from terrain.ground import Ground

GATE_COLUMNS = ("time_s", "height_m", "speed_mps", "load_factor")
# every cue there is; a cue of a case is an index into this, -1 for none
CUES = ("tilt", "turning", "flow", "closing", "growth", "lead", "load", "felt rate", "stick force", "gauge", "call")
CHUNK = 128

Progress = Callable[[int, int], None]


@dataclass(frozen=True, slots=True, eq=False)
class Cases:
    """Columns over B cases; S slots, K = S + 1 aircraft (the lead first), the three observers O early, likely, late.

    Times from the start of the script. NaN: it never runs out (last pull), is never noticed, never meets the
    ground, or the case could not be flown (then ``error`` says why).
    """

    names: tuple[str, ...]  # (S,) the slots
    error: tuple[str | None, ...]  # (B,)
    fault_s: Array  # (B,)
    contact_s: Array  # (B, K)
    lowest_m: Array  # (B, K) above the ground after the fault (after the top without one); 0 at contact
    loop_scale: Array  # (B,)
    gates: Array  # (B, 5, 4) of the lead without fault: GATES x GATE_COLUMNS, height above ground, calibrated speed
    load_factor_max: Array  # (B,) of the lead without fault, greatest
    speed_max_mps: Array  # (B,) of the lead without fault, calibrated
    last_pull_floor_s: Array  # (B, S)
    last_pull_ground_s: Array  # (B, S)
    lead_notice_s: Array  # (B, O)
    notice_s: Array  # (B, S, O)
    cue: NDArray[np.int64]  # (B, S, O) index into CUES, -1 none
    reaction_s: Array  # (O,)
    lateness_s: Array  # (B, S, O) against the floor; positive: too late
    clearance_floor_m: Array  # (B, S, O) lowest point above the floor if he breaks out when he has noticed
    clearance_ground_m: Array  # (B, S, O)

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def __len__(self) -> int:
        return len(self.error)

    @property
    def flown(self) -> NDArray[np.bool_]:
        """Which cases could be flown, (B,)."""
        return np.array([e is None for e in self.error], dtype=bool)


_PER_CASE = tuple(f.name for f in fields(Cases) if f.name not in ("names", "error", "reaction_s"))


def per_case() -> tuple[str, ...]:
    """Names of the columns with a row for each case."""
    return _PER_CASE


def work_cases(
    scenes: Sequence[Scene],
    airframe_of: Callable[[str], Airframe],
    ground: Ground,
    *,
    chunk: int = CHUNK,
    progress: Progress | None = None,
    threads: int = 2,
    sink: Sink | None = None,
) -> Cases:
    """Work through scenes with the same slots over one ground; in chunks of ``chunk`` cases.

    progress: called with cases done and all cases after each chunk. sink: called with each case's number, aircraft,
    times and evidence, from any thread (for another detector). A case equals ``work_through`` of its scene.
    Raises LatepullError if there is no scene or the slots differ.
    """
    if not scenes:
        raise LatepullError("no cases to work through")
    names = tuple(slot.name for slot in scenes[0].formation)
    for scene in scenes:
        if tuple(slot.name for slot in scene.formation) != names:
            raise LatepullError(f"cases of one table need the same slots: read {scene.name} with others than {names}")
    parts = []
    for at in range(0, len(scenes), chunk):
        parts.append(_chunk(scenes[at : at + chunk], names, airframe_of, ground, threads, sink, at))
        if progress is not None:
            progress(min(at + chunk, len(scenes)), len(scenes))
    return join(parts)


def join(parts: Sequence[Cases]) -> Cases:
    """Tables one after another; they need the same slots."""
    first = parts[0]
    columns: dict[str, Any] = {name: np.concatenate([getattr(p, name) for p in parts]) for name in _PER_CASE}
    return Cases(names=first.names, error=tuple(e for p in parts for e in p.error), reaction_s=first.reaction_s.copy(),
                 **columns)


def take(cases: Cases, rows: Sequence[int] | NDArray[np.int_]) -> Cases:
    """The table with some of its rows, in the order given."""
    index = np.asarray(rows, dtype=int)
    columns: dict[str, Any] = {name: getattr(cases, name)[index] for name in _PER_CASE}
    return Cases(names=cases.names, error=tuple(cases.error[int(i)] for i in index), reaction_s=cases.reaction_s.copy(),
                 **columns)


def _blank(b: int, s: int) -> dict[str, Any]:
    """Columns of cases that are not worked through yet: everything NaN, no cue."""
    o = len(OBSERVERS)
    shapes: dict[str, tuple[int, ...]] = {
        "fault_s": (b,), "contact_s": (b, s + 1), "lowest_m": (b, s + 1), "loop_scale": (b,),
        "gates": (b, len(GATES), len(GATE_COLUMNS)), "load_factor_max": (b,), "speed_max_mps": (b,),
        "last_pull_floor_s": (b, s), "last_pull_ground_s": (b, s), "lead_notice_s": (b, o), "notice_s": (b, s, o),
        "lateness_s": (b, s, o), "clearance_floor_m": (b, s, o), "clearance_ground_m": (b, s, o),
    }
    columns: dict[str, Any] = {name: np.full(shape, np.nan) for name, shape in shapes.items()}
    columns["cue"] = np.full((b, s, o), -1, dtype=np.int64)
    return columns


def _chunk(
    scenes: Sequence[Scene], names: tuple[str, ...], airframe_of: Callable[[str], Airframe], ground: Ground,
    threads: int, sink: Sink | None, first: int,
) -> Cases:
    columns = _blank(len(scenes), len(names))
    errors: Errors = {}
    heights, grid = ground_arrays(ground)
    groups: dict[Hashable, list[tuple[int, Plan, Plan | None]]] = {}
    for case in compile_cases(scenes, airframe_of, errors):
        groups.setdefault(shape_key(*case[1:]), []).append(case)
    for group in groups.values():
        for part in blocks(group):
            flown = fly_cases(part, heights, grid, errors)
            if flown is not None:
                _fill(columns, flown, ground, heights, grid, threads, sink, first)
    why = tuple(errors.get(i) for i in range(len(scenes)))
    return Cases(names=names, error=why, reaction_s=_reactions(), **columns)


def _reactions() -> Array:
    return np.array([TABLE[o].reaction.value for o in OBSERVERS])


def _shared(
    flown: Flown, heights: Array, grid: Array
) -> tuple[Stages | None, NDArray[np.int64] | None, NDArray[np.int64] | None]:
    """Clearances before the fault, from the twins that several cases with one break-out share; whose; up to when."""
    if np.all(np.isnan(flown.fault_s)) or flown.plans[0].scene.briefed is not None:
        return None, None, None
    twins, counts = np.unique(flown.twin_of, return_counts=True)
    first = {int(w): flown.plans[int(np.argmax(flown.twin_of == w))] for w in twins}
    use = [int(w) for w, n in zip(twins, counts, strict=True) if n >= SHARED]
    if not use:
        return None, None, None
    y, a = (raw.transpose(2, 0, 1, 3)[1:] for raw in (flown.twins.raw.y, flown.twins.raw.a))
    if len(use) < y.shape[1]:
        y, a = np.ascontiguousarray(y[:, use]), np.ascontiguousarray(a[:, use])
    until: NDArray[np.int64] = np.floor(np.nan_to_num(flown.fault_s, nan=-1.0) / DT_S).astype(np.int64)
    last = np.array([int(until[flown.twin_of == w].max()) for w in use])
    plans = [first[w] for w in use]
    of = np.array([
        use.index(int(w)) if int(w) in use and plan.scene.break_out == first[int(w)].scene.break_out else -1
        for w, plan in zip(flown.twin_of, flown.plans, strict=True)
    ])
    return stages(plans, y, a, last, heights, grid), of, until


def _fill(
    columns: dict[str, Any], flown: Flown, ground: Ground, heights: Array, grid: Array, threads: int,
    sink: Sink | None, first: int,
) -> None:
    """Write the rows of cases flown together: margins, notices and what a break-out buys."""
    rows = flown.case
    wing_y, wing_a, own = flown.y[1:], flown.a[1:], flown.contact_s[:, 1:]
    floor_s, ground_s = last_pulls(flown.plans, wing_y, wing_a, flown.last, own, heights, grid,
                                   *_shared(flown, heights, grid))
    seen = look(flown, ground.height_at, threads, None if sink is None else lambda i, k, t, e: sink(first + i, k, t, e))
    notice_s = np.where(np.isfinite(seen.when_s), seen.when_s, np.nan)
    act_s = notice_s[:, 1:] + _reactions()
    end_s = (flown.last * DT_S)[:, None, None]
    contact = own[:, :, None]
    inside = (act_s <= end_s) & (np.isnan(contact) | (act_s < contact))
    low = clearances(flown.plans, wing_y, wing_a, flown.last, np.where(inside, act_s, np.nan), heights, grid)
    # he meets the ground before his hand moves
    low = np.where(~inside & np.isfinite(act_s) & np.isfinite(contact), 0.0, low)
    floor_m = np.array([plan.scene.floor_m for plan in flown.plans])[:, None, None]
    columns["fault_s"][rows], columns["contact_s"][rows] = flown.fault_s, flown.contact_s
    columns["loop_scale"][rows] = flown.scale
    columns["last_pull_floor_s"][rows], columns["last_pull_ground_s"][rows] = floor_s, ground_s
    columns["lead_notice_s"][rows], columns["notice_s"][rows] = notice_s[:, 0], notice_s[:, 1:]
    columns["cue"][rows] = np.vectorize(lambda name: CUES.index(name) if name else -1, otypes=[int])(seen.cue[:, 1:])
    columns["lateness_s"][rows] = act_s - floor_s[:, :, None]
    columns["clearance_ground_m"][rows], columns["clearance_floor_m"][rows] = low, low - floor_m
    twin = flown.twins.raw
    for b, i in enumerate(rows):
        departs = flown.plans[b].scene.briefed is not None
        y, a = (flown.y[0, b], flown.a[0, b]) if departs else (twin.y[flown.twin_of[b], :, 0],
                                                               twin.a[flown.twin_of[b], :, 0])
        script_end = -1.0 if departs else float(twin.mem[flown.twin_of[b], s.M_SCRIPT_END_S])
        points = gate_points(y, a, int(flown.gate_end[b]), script_end)
        columns["gates"][i] = points
        end = int(flown.gate_end[b]) + 1
        columns["load_factor_max"][i], columns["speed_max_mps"][i] = a[:end, r.A_N].max(), a[:end, r.A_CAS].max()
        since = flown.fault_s[b] if np.isfinite(flown.fault_s[b]) else np.nan_to_num(points[2, 0])
        begin = int(np.searchsorted(np.arange(flown.last[b] + 1) * DT_S, since))
        columns["lowest_m"][i] = np.maximum(flown.a[:, b, begin : flown.last[b] + 1, r.A_AGL].min(axis=1), 0.0)
