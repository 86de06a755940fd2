"""The loop as briefed, flown once without a fault; heights from which it closes at its base."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from render.errors import FlightError
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import Raw
from render.flight.closing import close_loops
from render.flight.inside import Crossing, begin_at, crossing, demanding, fly_far, loop_step
from render.flight.plan import DT_S, Plan, compile_scene
from render.frames import Array
from scenes.airframe import Airframe
from scenes.model import Level, Loop, Scene

VERTICAL_UP, TOP, VERTICAL_DOWN = 0.5 * math.pi, math.pi, 1.5 * math.pi
GATE_ANGLES = {"top": TOP, "vertical_down": VERTICAL_DOWN}
CLOSED_M = 0.02  # how near to the base a solved gate brings the loop
AHEAD_S = {"top": 24.0, "vertical_down": 16.0}  # how long a pass is flown from a gate, at first


@dataclass(frozen=True, slots=True, eq=False)
class Brief:
    """A scene's loop as briefed: plan without its fault, scale of the back half, where it went through the gates."""

    scene: Scene
    plan: Plan
    scale: float
    base_m: float  # where the loop closes, above the field
    up: Crossing  # vertical up
    gates: dict[str, Crossing]
    speed_max_mps: float  # calibrated, of the lead
    load_factor_max: float

    @property
    def scales(self) -> Array:
        """The scale for one twin, (1,)."""
        return np.array([self.scale])


def without_fault(scene: Scene) -> Scene:
    """The scene as briefed: no fault, and the briefed script if it flies another."""
    return dataclasses.replace(scene, fault=None, script=scene.briefed or scene.script, briefed=None)


def base_of(scene: Scene) -> float:
    """The height a scene's loop is to close at, m above the field: its ``close_at``, else where it enters."""
    for step in scene.script:
        if isinstance(step, Loop) and step.close_at_m is not None:
            return step.close_at_m
    first = scene.script[0]
    assert isinstance(first, Level) and first.height_m is not None
    return first.height_m


def compile_brief(scene: Scene, airframe_of: Callable[[str], Airframe]) -> Plan:
    """The plan of the scene as briefed."""
    scene = without_fault(scene)
    names = [scene.airframe, *(slot.airframe or scene.airframe for slot in scene.formation)]
    known = {name: airframe_of(name) for name in dict.fromkeys(names)}
    plan = compile_scene(scene, tuple(known[name] for name in names))
    loop_step(plan)
    return plan


def brief(scene: Scene, airframe_of: Callable[[str], Airframe], scale: float | None = None) -> Brief:
    """Fly the loop of a scene as briefed. scale: of the back half, if it is not to be found (the pull of another day).

    Raises FlightError if the script has no loop, or the loop doesn't close or come to its gates.
    """
    return briefs([compile_brief(scene, airframe_of)], None if scale is None else np.array([scale]))[0]


def briefs(plans: Sequence[Plan], scale: Array | None = None) -> list[Brief]:
    """``brief`` of many plans of one shape."""
    longest = max(p.longest_s for p in plans)
    if scale is None:
        scale = close_loops(plans, longest)
    raw = fly_far(plans, scale, longest)
    return [
        Brief(p.scene, p, float(scale[b]), base_of(p.scene), crossing(p, raw, b, VERTICAL_UP),
              {name: crossing(p, raw, b, angle) for name, angle in GATE_ANGLES.items()},
              float(np.max(_flown(p, raw, b)[:, r.A_CAS])), float(np.max(_flown(p, raw, b)[:, r.A_N])))
        for b, p in enumerate(plans)
    ]


def _flown(plan: Plan, raw: Raw, b: int) -> Array:
    """What the lead's flight showed up to the end of its script, (T, NA)."""
    end_s = raw.mem[b, s.M_SCRIPT_END_S]
    last = round(end_s / DT_S) if end_s >= 0.0 else raw.a.shape[1] - 1
    shown: Array = raw.a[b, : last + 1, 0]
    return shown


def bottoms(plans: Sequence[Plan], raw: Raw) -> Array:
    """Lowest height of each lead in his loop and the step after it, m above the field, (B,); NaN if it isn't reached.

    Of flights that begin at the top or later, over a ground far below.
    """
    out = np.full(len(plans), np.nan)
    for b, plan in enumerate(plans):
        end_s = raw.mem[b, s.M_SCRIPT_END_S]
        until = round(end_s / DT_S) + 1 if end_s >= 0.0 else raw.y.shape[1]
        inside = np.flatnonzero(raw.a[b, :until, 0, r.A_STEP] <= loop_step(plan) + 1)
        h = -raw.y[b, : inside[-1] + 1, 0, r.D]
        i = int(np.argmin(h))
        if raw.status[b, 0, 0] != r.OK and raw.status[b, 0, 1] <= i + 1:
            continue  # left the model's range on the way down
        if 0 < i < len(h) - 1:
            left, mid, right = h[i - 1], h[i], h[i + 1]
            bend = left - 2.0 * mid + right
            out[b] = mid - (right - left) ** 2 / (8.0 * bend) if bend > 0.0 else mid
        elif end_s >= 0.0:
            out[b] = h[i]  # it sinks a little to the end of the script
    return out


def lead_only(plan: Plan) -> Plan:
    """The plan without its wings."""
    scene = dataclasses.replace(plan.scene, formation=())
    return dataclasses.replace(plan, scene=scene, airframes=plan.airframes[:1], af=plan.af[:1], entry=plan.entry[:1],
                               slots=plan.slots[:0])


def closing_heights(briefed: Brief, gate: str, cas_mps: Array, *, limit: bool) -> Array:
    """Heights at a gate from which the loop just closes at the base, for calibrated speeds (V,); NaN where never.

    By the briefed pull, or (``limit``) by the airframe's load factor limit, short of its buffet and at the lead's
    onset. Fixed point: the height lost hardly depends on the height it begins at (air density alone).
    """
    state = briefed.gates[gate]
    state = dataclasses.replace(state, y=state.y[:1], a=state.a[:1])
    plan = lead_only(briefed.plan)
    scale = np.full(len(cas_mps), briefed.scale)
    if limit:
        plan = demanding(plan, plan.airframes[0].n_max)
        scale = np.ones(len(cas_mps))
    height = np.full(len(cas_mps), state.height_m)
    for _ in range(12):
        begun = [begin_at(plan, state, float(v), float(h)) for v, h in zip(cas_mps, height, strict=True)]
        missed = briefed.base_m - bottoms(begun, fly_far(begun, scale, 1.5 * AHEAD_S[gate]))
        if np.all(np.abs(missed[np.isfinite(missed)]) < CLOSED_M):
            return np.where(np.isfinite(missed), height, np.nan)
        height = np.where(np.isfinite(missed), height + missed, height)
    raise FlightError(f"the height from which '{briefed.scene.name}' closes was not found")


def gate_speeds(
    briefed: Brief, airframe_of: Callable[[str], Airframe], spread_mps: float, count: int
) -> dict[str, Array]:
    """Calibrated speeds at the gates of passes entered slower and faster by up to ``spread_mps``, (count,) each.

    The pull is the briefed one. Where a slow entry does not come over the top, the slowest that does counts.
    """
    first = briefed.plan.scene.script[0]
    assert isinstance(first, Level) and first.speed_mps is not None
    ends: dict[str, list[float]] = {name: [] for name in GATE_ANGLES}
    for side in (-1.0, 1.0):
        for part in (1.0, 0.75, 0.5, 0.25):
            entry = dataclasses.replace(first, speed_mps=first.speed_mps + side * part * spread_mps)
            scene = dataclasses.replace(briefed.scene, script=(entry, *briefed.plan.scene.script[1:]))
            try:
                found = brief(scene, airframe_of, briefed.scale)
            except FlightError:
                continue
            for name in GATE_ANGLES:
                ends[name].append(found.gates[name].cas_mps)
            break
        else:
            for name in GATE_ANGLES:
                ends[name].append(briefed.gates[name].cas_mps)
    half = count // 2
    out = {}
    for name, (low, high) in ends.items():
        mid = briefed.gates[name].cas_mps
        below, above = np.linspace(min(low, mid), mid, half + 1), np.linspace(mid, max(high, mid), half + 1)
        out[name] = np.concatenate([below, above[1:]])
    return out
