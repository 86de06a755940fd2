"""Beside the gates: the base the present loop would need, the largest float, and what another day changes."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from render.decide.brief import (
    AHEAD_S,
    GATE_ANGLES,
    TOP,
    VERTICAL_DOWN,
    Brief,
    bottoms,
    brief,
    briefs,
    closing_heights,
    compile_brief,
)
from render.decide.gates import (
    KEEP_S,
    NEAR_S,
    RISE_MPS,
    ROUNDS,
    RUNGS_M,
    STEP_RAD,
    TOLERANCE_M,
    Gate,
    Guess,
    Solver,
    solve_gate,
)
from render.decide.solve import least_values
from render.decide.worst import Worst, freeze_angles, worst_freezes
from render.errors import FlightError
from render.flight.air import air_at
from render.flight.inside import Crossing, begin_at, crossing, fly_far, loop_step
from render.frames import Array
from scenes.airframe import Airframe
from scenes.model import Level, Loop, Scene

FOOT_M = 0.3048
HOTTER_K, HIGHER_M = 10.0, 1000.0 * FOOT_M
FLOAT_RAD = np.radians(50.0)  # the float takes g away this far on either side of the top
OVER_TOP_RAD = np.radians([135.0, 225.0])  # its seconds are counted between these
FLOAT_TOLERANCE_G = 0.004


def lifted(scene: Scene, by_m: float) -> Scene:
    """The scene with its entry, its levels and the base of its loop higher by so much."""
    script = []
    for step in scene.script:
        if isinstance(step, Level) and step.height_m is not None:
            step = dataclasses.replace(step, height_m=step.height_m + by_m)
        elif isinstance(step, Loop) and step.close_at_m is not None:
            step = dataclasses.replace(step, close_at_m=step.close_at_m + by_m)
        script.append(step)
    return dataclasses.replace(scene, script=tuple(script))


def base_needed(solver: Solver, airframe_of: Callable[[str], Airframe]) -> tuple[Array, str]:
    """Base height at which the loop, lifted as a whole, leaves the wanted seconds in any freeze from the top on.

    (O,) m above the field for the observers solved for, NaN where there is none, and why for the likely one.
    The loop is closed at each base anew.
    """
    b, who = solver.briefed, list(solver.who)
    every = freeze_angles(TOP, STEP_RAD / 2.0)
    angles, why = every[::2], ""

    def worst_of(by_m: Array, angles: Array) -> Worst:
        flown = briefs([compile_brief(lifted(b.plan.scene, float(d)), airframe_of) for d in by_m])
        twins = [begin_at(f.plan, f.gates["top"]) for f in flown]
        return worst_freezes(twins, np.array([f.scale for f in flown]), angles, solver.ground, AHEAD_S["top"] + 4.0,
                             offset_s=b.gates["top"].time_s, from_hand=solver.from_hand, count=solver.count)

    def left(item: NDArray[np.int_], by_m: Array) -> Array:
        nonlocal why, angles
        worst = worst_of(by_m, angles)
        last = int(np.argmax(by_m))
        if angles.size == every[::2].size:
            # up the whole ladder once; from there on those that come near the worst, and all of them at the end
            near = worst.each_s[:, :, who] <= worst.least_s[:, None, who] + KEEP_S
            keep = np.any(near & np.isfinite(worst.each_s[:, :, who]), axis=(0, 2))
            angles = angles[keep] if np.any(keep) else angles
        why = f"a freeze at {np.degrees(worst.at_rad[last, 1]):.0f} deg leaves too little from any base tried"
        return worst.least_s[:, who] - solver.want_s

    low = np.array([b.scene.floor_m - b.base_m])
    rungs = _flyable(b.plan.scene, float(low[0]), airframe_of)
    if rungs.size < 2:
        return np.full(len(who), np.nan), "the loop does not come round from any other base"
    found, _ = least_values(left, low, rungs, TOLERANCE_M, NEAR_S)
    for _ in range(ROUNDS):
        # the points between, and where one of them is worse, again from there on
        o = np.flatnonzero(np.isfinite(found[0]))
        if o.size == 0:
            break
        worst = worst_of(found[0, o], every)
        mine = np.array(who)[o]
        short = solver.want_s - worst.least_s[np.arange(o.size), mine]
        if not np.any(short > NEAR_S):
            break
        angles = np.union1d(angles, worst.at_rad[np.arange(o.size), mine][short > NEAR_S])
        again = _rungs_from(rungs + low[0], found[0, o], np.clip(short, 0.0, 3.0) * RISE_MPS)
        found, _ = least_values(left, low, again - low[0], TOLERANCE_M, NEAR_S)
    return b.base_m + found[0], "" if np.isfinite(found[0, who.index(1)]) else why


def _rungs_from(ladder: Array, found: Array, more: Array) -> Array:
    """A ladder with rungs close above what was found: it begins and ends as it did."""
    close = np.concatenate([found, found + more + 2.0])
    rungs: Array = np.unique(np.concatenate([ladder[:1], close[close < ladder[-1]], ladder[-1:]]))
    return rungs


def _flyable(scene: Scene, low_m: float, airframe_of: Callable[[str], Airframe]) -> Array:
    """The rungs up to the last from which the lifted loop can still be entered, comes round and closes."""
    good = 0
    for rung in RUNGS_M:
        try:
            brief(lifted(scene, low_m + float(rung)), airframe_of)
        except FlightError:
            break
        good += 1
    return RUNGS_M[:good]


def floated(scene: Scene, less_g: float) -> Scene:
    """The scene with less g demanded over the top of its first loop, fading out 50 deg to either side."""
    script = list(scene.script)
    for i, step in enumerate(script):
        if isinstance(step, Loop):
            x, n = np.array(step.angle_rad), np.array(step.load_factor)
            more = TOP + np.radians(np.arange(-45.0, 46.0, 15.0))
            # a table knot and one of ours must not lie within a hair of each other
            apart = np.min(np.abs(more[:, None] - x), axis=1) > np.radians(1.0)
            at = np.sort(np.concatenate([x, more[apart & (more > x[0]) & (more < x[-1])]]))
            load = PchipInterpolator(x, n)(at) if len(x) > 2 else np.interp(at, x, n)
            fade = np.clip(np.abs(at - TOP) / FLOAT_RAD, 0.0, 1.0)
            load = load - less_g * np.cos(0.5 * np.pi * fade) ** 2
            script[i] = dataclasses.replace(step, angle_rad=tuple(map(float, at)), load_factor=tuple(map(float, load)))
            break
    return dataclasses.replace(scene, script=tuple(script))


@dataclasses.dataclass(frozen=True, slots=True)
class Float:
    """The largest float: less g over the top, and the time that adds there; NaN where even none is too much."""

    less_g: float
    longer_s: float
    whole: bool  # the largest tried: it may be more

    @property
    def none(self) -> bool:
        """Whether even the loop as briefed does not meet what is asked."""
        return not np.isfinite(self.less_g)


def largest_floats(solver: Solver, airframe_of: Callable[[str], Airframe]) -> dict[str, Float]:
    """The largest float after which the loop, pulled as briefed, still clears the floor (``briefed``); the limit
    pull from vertical down still closes at the base (``limit``); any freeze from the top on still leaves the wanted
    seconds and the loop clears the floor (``early``, ``likely``, ``late``, those solved for)."""
    b = solver.briefed
    loop = b.plan.scene.script[loop_step(b.plan)]
    assert isinstance(loop, Loop)
    near = [n for a, n in zip(loop.angle_rad, loop.load_factor, strict=True) if abs(a - TOP) < np.radians(30.0)]
    most = max(min(near, default=1.0), 0.2)  # to no less than nothing on the seat
    rungs = most * np.array([0.0, 0.35, 0.6, 0.8, 0.92, 1.0])
    low = np.array([-most])

    def passes(less: Array) -> tuple[list[Crossing], list[Crossing], Array, Array]:
        plans = [begin_at(compile_brief(floated(b.plan.scene, float(x)), airframe_of), b.up) for x in less]
        raw = fly_far(plans, np.full(len(plans), b.scale), 2.0 * AHEAD_S["top"])
        low_m = bottoms(plans, raw)
        top = [crossing(p, raw, i, TOP) for i, p in enumerate(plans)]
        down = [crossing(p, raw, i, VERTICAL_DOWN) for i, p in enumerate(plans)]
        over = np.array([[crossing(p, raw, i, float(a)).time_s for a in OVER_TOP_RAD] for i, p in enumerate(plans)])
        return top, down, low_m, over[:, 1] - over[:, 0]

    def closes(item: NDArray[np.int_], value: Array) -> Array:
        _, down, low_m, _ = passes(-value)
        cas = np.array([d.cas_mps for d in down])
        need = closing_heights(b, "vertical_down", cas, limit=True)
        return np.column_stack([low_m - b.scene.floor_m, np.array([d.height_m for d in down]) - need])

    def noticed(item: NDArray[np.int_], value: Array) -> Array:
        top, _, low_m, _ = passes(-value)
        twins = [begin_at(compile_brief(floated(b.plan.scene, float(-v)), airframe_of), t)
                 for v, t in zip(value, top, strict=True)]
        worst = worst_freezes(twins, np.full(len(twins), b.scale), freeze_angles(TOP, STEP_RAD / 2.0), solver.ground,
                              AHEAD_S["top"] + 4.0, offset_s=b.gates["top"].time_s, from_hand=solver.from_hand,
                              count=solver.count)
        clear = (low_m >= b.scene.floor_m)[:, None]
        return np.where(clear, worst.least_s[:, list(solver.who)] - solver.want_s, -np.inf)

    first, _ = least_values(closes, low, rungs, FLOAT_TOLERANCE_G, 0.3)
    second, _ = least_values(noticed, low, rungs, FLOAT_TOLERANCE_G, 0.02)
    less = -np.concatenate([first[0], second[0]])
    names = ["briefed", "limit", *(("early", "likely", "late")[i] for i in solver.who)]
    known = np.flatnonzero(np.isfinite(less))
    longer = np.full(less.shape, np.nan)
    if known.size:
        times = passes(np.concatenate([[0.0], less[known]]))[3]
        longer[known] = times[1:] - times[0]
    return {name: Float(float(x), float(t), bool(x >= most - 1e-9)) for name, x, t in
            zip(names, less, longer, strict=True)}


def other_days(scene: Scene) -> dict[str, Scene]:
    """The scene on a day 10 K warmer, and at a field 1,000 ft higher with the air as warm as it was."""
    day = scene.day
    now_k = day.temperature_k
    if now_k is None:
        now_k = float(air_at(day.field_elevation_m, 0.0)[0])
    return {
        "hotter": dataclasses.replace(scene, day=dataclasses.replace(day, temperature_k=now_k + HOTTER_K)),
        "higher": dataclasses.replace(scene, day=dataclasses.replace(
            day, field_elevation_m=day.field_elevation_m + HIGHER_M, temperature_k=now_k)),
    }


def day_changes(solver: Solver, gates: dict[str, Gate], airframe_of: Callable[[str], Airframe]) -> dict[
    str, dict[str, tuple[float, float, float]]
]:
    """By how much another day moves each gate at the calibrated speed the loop has there: (a), (b), (c likely), m.

    The pull is the briefed one, g against loop angle. NaN where the loop does not come round on such a day.
    """
    out: dict[str, dict[str, tuple[float, float, float]]] = {}
    for name, scene in other_days(solver.briefed.plan.scene).items():
        out[name] = {}
        try:
            there: Brief = brief(scene, airframe_of, solver.briefed.scale)
        except FlightError:
            out[name] = {gate: (np.nan, np.nan, np.nan) for gate in gates}
            continue
        for gate, at_home in gates.items():
            i = at_home.flown
            cas, known = at_home.speed_mps[[i]], at_home.worst_rad[i][np.isfinite(at_home.worst_rad[i])]
            gap = at_home.noticed_m[i, 1] - solver.floor_heights(gate, cas)
            guess = Guess(gap[:, None], np.union1d(freeze_angles(GATE_ANGLES[gate], 3.0 * STEP_RAD), known))
            found = solve_gate(dataclasses.replace(solver, briefed=there, who=(1,)), gate, cas, guess)
            out[name][gate] = (float(found.briefed_m[0] - at_home.briefed_m[i]),
                               float(found.limit_m[0] - at_home.limit_m[i]),
                               float(found.noticed_m[0, 0] - at_home.noticed_m[i, 1]))
    return out

