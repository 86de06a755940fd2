"""A scene to a flight: the healthy twin and the faulted flight on one time axis."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import numpy as np

from render.errors import FlightError
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import Raw, fly_batch
from render.flight.closing import close_loops
from render.flight.plan import DT_S, Plan, compile_scene
from render.flight.states import body_motion
from render.frames import Array
from render.types import Flight
from scenes.airframe import Airframe
from scenes.model import Scene
from terrain.ground import Ground

DEPARTS_G = 0.05  # how far the demands are apart where a flight departs from the briefed one
AFTER_SCRIPT_S = 15.0  # a faulted lead may need longer than the script
_WHY = {
    r.TOO_FAST: ("calibrated airspeed", "m/s"),
    r.TOO_HIGH_MACH: ("Mach number", ""),
    r.OUT_OF_AIR: ("height above sea level", "m"),
    r.NOT_FINITE: ("airspeed", "m/s"),
}


def ground_arrays(ground: Ground) -> tuple[Array, Array]:
    """Heights (I, J) and grid (origin north, origin east, spacing) as the kernels take them."""
    heights = np.ascontiguousarray(ground.heights_m, dtype=float).view()
    heights.setflags(write=False)  # always, since a kernel is compiled again for arrays that may be written to
    return heights, np.array([ground.origin_n_m, ground.origin_e_m, ground.spacing_m])


def fly_scene(scene: Scene, airframe_of: Callable[[str], Airframe], ground: Ground) -> tuple[Flight, Flight, Plan]:
    """Fly a scene: healthy twin, faulted flight (the twin itself without a fault), and the plan.

    Raises FlightError if the loop can't close, the fault's point is never reached, the script does
    not end, or the model's validity range is left (with time, value and limit).
    """
    names = [scene.airframe] + [slot.airframe or scene.airframe for slot in scene.formation]
    known = {name: airframe_of(name) for name in set(names)}
    plan = compile_scene(scene, tuple(known[name] for name in names))
    heights, grid = ground_arrays(ground)
    if scene.briefed is not None:
        as_briefed = dataclasses.replace(scene, script=scene.briefed, briefed=None)
        return _fly_departed(plan, compile_scene(as_briefed, plan.airframes), heights, grid)
    scale = close_loops([plan], plan.longest_s)
    steps = round((plan.longest_s + AFTER_SCRIPT_S) / DT_S)
    healthy = fly_batch([plan], scale, steps, heights, grid, healthy=True)
    end_s, cut = healthy_end(plan, healthy)
    if scene.fault is None:
        twin = to_flight(plan, healthy, 0, cut, float(scale[0]))
        return twin, twin, plan
    faulted = fly_batch([plan], scale, steps, heights, grid, healthy=False)
    cut = faulted_end(plan, healthy, faulted, end_s, cut)
    return (to_flight(plan, healthy, 0, cut, float(scale[0])), to_flight(plan, faulted, 0, cut, float(scale[0])), plan)


def healthy_end(plan: Plan, healthy: Raw) -> tuple[float, int]:
    """When the script of one healthy flight ends, s, and the last step worth keeping. Raises FlightError."""
    end_s = float(healthy.mem[0, s.M_SCRIPT_END_S])
    steps = healthy.y.shape[1] - 1
    if healthy.status[0, 0, 0] == r.CONTACT and (end_s < 0.0 or healthy.status[0, 0, 1] * DT_S < end_s):
        end_s = float(healthy.status[0, 0, 1] * DT_S)
    elif end_s < 0.0:
        raise FlightError(f"the script of '{plan.scene.name}' does not end: step {int(healthy.mem[0, s.M_STEP]) + 1} "
                          f"is never finished within {steps * DT_S:.0f} s")
    cut = _cut(healthy, end_s)
    check_raw(plan, healthy, 0, "the healthy flight", cut)
    return end_s, cut


def faulted_end(plan: Plan, healthy: Raw, faulted: Raw, end_s: float, healthy_cut: int) -> int:
    """The last step worth keeping of one faulted flight and its twin. Raises FlightError.

    end_s, healthy_cut: as ``healthy_end`` gives them.
    """
    fault_s = faulted.mem[0, s.M_FAULT_S]
    if fault_s < 0.0 or fault_s > end_s:
        raise FlightError(f"the fault's point is never reached: {_point_words(plan.scene)} is not passed before the "
                          f"script ends at {end_s:.1f} s")
    cut = _cut(faulted, end_s)
    check_raw(plan, faulted, 0, "the faulted flight", cut)
    # the twin's bottom belongs to the picture also where the faulted flight ends before it
    return max(cut, min(healthy_cut, _bottom_step(healthy, healthy_cut) + round(1.0 / DT_S)))


def _fly_departed(plan: Plan, briefed: Plan, heights: Array, grid: Array) -> tuple[Flight, Flight, Plan]:
    """A script that is not the briefed one: the twin flies as briefed, the fault is where the two part."""
    longest_s = max(plan.longest_s, briefed.longest_s)
    steps = round((longest_s + AFTER_SCRIPT_S) / DT_S)
    scales = [close_loops([p], p.longest_s) for p in (briefed, plan)]
    raws = [fly_batch([p], k, steps, heights, grid, healthy=True) for p, k in zip((briefed, plan), scales, strict=True)]
    cut, fault_s = departed_end(briefed, plan, raws[0], raws[1])
    healthy, flown = (to_flight(p, raw, 0, cut, float(k[0])) for p, raw, k in
                      zip((briefed, plan), raws, scales, strict=True))
    return healthy, dataclasses.replace(flown, fault_s=fault_s), plan


def departed_end(briefed: Plan, plan: Plan, healthy: Raw, flown: Raw) -> tuple[int, float]:
    """The last step worth keeping of one flight that is not the briefed one, and when the two part, s.

    Raises FlightError.
    """
    end_s = float(flown.mem[0, s.M_SCRIPT_END_S])
    stop = flown.status[0, 0]
    contact_s = stop[1] * DT_S if stop[0] == r.CONTACT else np.inf
    if end_s < 0.0 and not np.isfinite(contact_s):
        raise FlightError(f"the script of '{plan.scene.name}' does not end within "
                          f"{(flown.y.shape[1] - 1) * DT_S:.0f} s")
    cut = _cut(flown, min(end_s, contact_s) if end_s >= 0.0 else contact_s)
    check_raw(briefed, healthy, 0, "the flight as briefed", cut)
    check_raw(plan, flown, 0, "the flight", cut)
    apart = np.abs(healthy.a[0, : cut + 1, 0, r.A_NCMD] - flown.a[0, : cut + 1, 0, r.A_NCMD]) > DEPARTS_G
    if not apart.any():
        raise FlightError(f"the script of '{plan.scene.name}' never departs from the briefed one by {DEPARTS_G} g")
    return cut, float(np.arange(cut + 1, dtype=np.float64)[int(np.argmax(apart))] * DT_S)


def _cut(raw: Raw, end_s: float) -> int:
    """Last step worth keeping: the script's end, later if the lead still goes down then, or his contact before."""
    end = min(round(end_s / DT_S), raw.y.shape[1] - 1)
    down = np.diff(raw.y[0, end : end + round(AFTER_SCRIPT_S / DT_S) + 1, 0, r.D]) > 0.0
    level = np.flatnonzero(~down)
    cut = end + (int(level[0]) if level.size else len(down))
    if raw.status[0, 0, 0] == r.CONTACT and raw.status[0, 0, 1] <= cut:
        # the wings' contact may come a little later than the lead's
        return min(int(np.max(raw.status[0, :, 1])) + round(1.0 / DT_S), raw.y.shape[1] - 1)
    return cut


def _bottom_step(raw: Raw, cut: int) -> int:
    """The step of the lead's lowest point after the top of his loop, up to step ``cut``; 0 without one."""
    top_s = float(raw.mem[0, s.M_TOP_S])
    top = round(top_s / DT_S)
    return 0 if top_s < 0.0 else top + int(np.argmax(raw.y[0, top : cut + 1, 0, r.D]))


def check_raw(plan: Plan, raw: Raw, b: int, which: str, cut: int) -> None:
    """Raise FlightError if an aircraft left the range the model is valid in, up to step ``cut``."""
    for k, airframe in enumerate(plan.airframes):
        why, last = int(raw.status[b, k, 0]), int(raw.status[b, k, 1])
        if why not in _WHY or last > cut:
            continue
        value = {
            r.TOO_FAST: raw.a[b, last, k, r.A_CAS], r.TOO_HIGH_MACH: np.nan,
            r.OUT_OF_AIR: plan.scene.day.field_elevation_m - raw.y[b, last, k, r.D],
            r.NOT_FINITE: raw.y[b, last, k, r.V],
        }[why]
        limit = {r.TOO_FAST: airframe.speed_max_mps, r.TOO_HIGH_MACH: airframe.mach_max, r.OUT_OF_AIR: 15_000.0,
                 r.NOT_FINITE: 5.0}[why]
        what, unit = _WHY[why]
        who = "lead" if k == 0 else plan.scene.formation[k - 1].name
        raise FlightError(f"{which} leaves the range the model is valid in: {who}, {what} {value:.4g} {unit} at "
                          f"{last * DT_S:.2f} s, limit {limit:.4g} {unit}")


def _point_words(scene: Scene) -> str:
    assert scene.fault is not None
    at = scene.fault.at
    if at.kind == "loop_angle":
        return f"loop angle {np.degrees(at.value):.0f} deg"
    if at.kind == "height":
        return f"height {at.value / 0.3048:.0f} ft going {at.going}"
    return f"{'time' if at.kind == 'time' else 'time after the top'} {at.value:.1f} s"


def _crossing(time_s: Array, value: Array, level: float) -> float | None:
    i = np.flatnonzero((value[:-1] < level) & (value[1:] >= level))
    if i.size == 0:
        return None
    j = int(i[0])
    return float(time_s[j] + (time_s[j + 1] - time_s[j]) * (level - value[j]) / (value[j + 1] - value[j]))


def find_events(
    time_s: Array, loop_rad: Array, height_m: Array, step: Array, script_end_s: float = -1.0
) -> dict[str, float]:
    """Times of entry, vertical up, top, vertical down and bottom of the first loop, s; those that happened.

    The bottom is the lowest point after the top, in the loop's step or the one after it, found by a
    parabola through three samples. step (T,): index of the script's step. script_end_s: after that nothing
    counts; negative if the script did not end.
    """
    events: dict[str, float] = {}
    inside = np.flatnonzero(loop_rad > 0.0)
    if inside.size:
        events["entry"] = float(time_s[max(inside[0] - 1, 0)])
    # a second loop starts again at zero: look at the first one only
    again = np.flatnonzero(np.diff(loop_rad) < -3.0)
    stop = int(again[0]) + 1 if again.size else len(time_s)
    for name, angle in (("vertical_up", 0.5), ("top", 1.0), ("vertical_down", 1.5)):
        t = _crossing(time_s[:stop], loop_rad[:stop], angle * np.pi)
        if t is not None:
            events[name] = t
    if "top" in events:
        i0 = int(np.searchsorted(time_s, events["top"]))
        counts = step[i0:] <= step[i0] + 1
        if script_end_s >= 0.0:
            counts &= time_s[i0:] <= script_end_s + 0.5 * (time_s[1] - time_s[0])
        own = height_m[i0:][counts]
        i = i0 + int(np.argmin(own))
        shift = 0.0
        if i0 < i < len(time_s) - 1:
            left, mid, right = height_m[i - 1], height_m[i], height_m[i + 1]
            bend = left - 2.0 * mid + right
            shift = 0.5 * (left - right) / bend if bend > 0.0 else 0.0
        events["bottom"] = float(time_s[i] + shift * (time_s[1] - time_s[0]))
    return events


def to_flight(plan: Plan, raw: Raw, b: int, last: int, scale: float) -> Flight:
    """One flight of a batch as a Flight, cut after step ``last``."""
    y = raw.y[b, : last + 1]
    a = raw.a[b, : last + 1]
    time_s: Array = np.arange(last + 1, dtype=np.float64) * DT_S
    quat_eb, rate_b, vel_e = body_motion(y, plan.wind_e_mps)
    gamma = np.arcsin(np.clip(-(vel_e[..., 2] / y[..., r.V]), -1.0, 1.0))
    loop = a[:, :, r.A_LOOP].copy()
    loop[:, 1:] = np.nan
    contact: list[float | None] = []
    for k in range(len(plan.airframes)):
        why, at = int(raw.status[b, k, 0]), int(raw.status[b, k, 1])
        contact.append(contact_time(a[:, k, r.A_AGL], at) if why == r.CONTACT and at <= last else None)
    names = ("lead", *(slot.name for slot in plan.scene.formation))
    fault_s = float(raw.mem[b, s.M_FAULT_S])
    return Flight(
        time_s=time_s, pos_e_m=y[..., r.N : r.D + 1].copy(), vel_e_mps=vel_e,
        quat_eb=quat_eb, rate_b_radps=rate_b, speed_mps=y[..., r.V].copy(),
        cas_mps=a[..., r.A_CAS].copy(), alpha_rad=y[..., r.ALPHA].copy(), load_factor=a[..., r.A_N].copy(),
        load_factor_demand=a[..., r.A_NCMD].copy(), stick=y[..., r.STICK].copy(),
        stick_force_n=a[..., r.A_STICK_FORCE].copy(), stabilator_rad=y[..., r.STAB].copy(),
        thrust_n=a[..., r.A_THRUST].copy(), throttle=a[..., r.A_THROTTLE].copy(), engine=y[..., r.ENGINE].copy(),
        gamma_rad=gamma, loop_angle_rad=loop, height_m=-y[..., r.D],
        height_agl_m=a[..., r.A_AGL].copy(), step=a[:, 0, r.A_STEP].copy(), airframes=plan.airframes, names=names,
        fault_s=fault_s if fault_s >= 0.0 else None, contact_s=tuple(contact),
        events=find_events(time_s, a[:, 0, r.A_LOOP], -y[:, 0, r.D], a[:, 0, r.A_STEP],
                           float(raw.mem[b, s.M_SCRIPT_END_S])), loop_scale=scale,
    )


def contact_time(agl_m: Array, at: int) -> float:
    """When the ground was met: between the last step above it and the first below, linear."""
    if at == 0:
        return 0.0
    above, below = agl_m[at - 1], agl_m[at]
    return float((at - 1 + above / max(above - below, 1e-9)) * DT_S)
