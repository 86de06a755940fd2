"""Faults that show only when several values of a scene, or of an airframe, are seen together."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Collection, Iterator, Mapping
from dataclasses import dataclass

from scenes.airframe import Airframe
from scenes.model import DEG, INF, Climb, Dive, Level, Loop, PullOut, Roll, Scene, Step
from scenes.overlap import Placed, clear_right
from scenes.units import shortest_text


@dataclass(frozen=True, slots=True)
class Finding:
    """A fault at a dotted path."""

    path: str
    read: str
    wanted: str
    nearest: str | None = None


def scene_findings(scene: Scene, frames: Mapping[str, Airframe], unread: Collection[str] = ()) -> list[Finding]:
    """What is wrong with a scene whose single values are right.

    frames: its airframes by name, those that could be read; unread: fields of the scene that could not be
    read; checks that need either are left out, so that a file's other faults show beside them.
    """
    checks: tuple[tuple[tuple[str, ...], Callable[[Scene, Mapping[str, Airframe]], Iterator[Finding]]], ...] = (
        (("watch",), _watch), (("script", "briefed"), _closing), (("script", "fault"), _points),
        (("script", "briefed", "fault"), _briefed), (("formation", "airframe"), _places),
        (("script", "briefed", "airframe"), _demands),
        (("script", "briefed", "airframe", "formation"), _speeds), (("break_out", "airframe", "formation"), _break_out),
        (("fault", "airframe"), _fault),
    )
    return [finding for needs, check in checks if not set(needs) & set(unread) for finding in check(scene, frames)]


def _watch(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    every, look = scene.watch.gauges_every_s, scene.watch.gauge_look_s
    if every is not None and every <= look:
        yield Finding("watch.gauges_every", f"{every:g} s", f"more than the look itself takes, {look:g} s")


def _steps(scene: Scene) -> Iterator[tuple[str, Step]]:
    """Paths and steps of the script, and of the briefed one if there is one."""
    for name, script in (("script", scene.script), ("briefed", scene.briefed)):
        for i, step in enumerate(script or ()):
            yield f"{name}.{i}", step


def _loops(scene: Scene) -> list[Loop]:
    return [step for step in scene.script if isinstance(step, Loop)]


def _closing(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    for name in ("script", "briefed"):
        loops = [(path, s) for path, s in _steps(scene) if isinstance(s, Loop) and path.startswith(name)]
        for path, loop in loops:
            if len(loops) > 1 and loop.close_at_m is not None:
                yield Finding(f"{path}.loop.close_at", f"close_at in a script of {len(loops)} loops",
                              "a script of one loop")


def _points(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    loops = _loops(scene)
    if scene.fault is None:
        return
    at = scene.fault.at
    path = f"fault.at.{at.kind}"
    if at.kind in ("loop_angle", "after_top") and len(loops) != 1:
        number = "no loop" if not loops else f"{len(loops)} loops"
        yield Finding(path, f"{at.kind} with a script of {number}",
                      "a script of one loop, or a point by time or height")
    if at.kind == "time" and all(isinstance(step, Level | Climb | Dive) for step in scene.script):
        longest = sum(step.for_s for step in scene.script if isinstance(step, Level | Climb | Dive))
        if at.value > longest:
            yield Finding(path, f"{at.value:g} s", f"a time within the script, which ends after {longest:g} s")


def _places(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    lead = frames.get(scene.airframe)
    placed = [Placed("lead", lead)] if lead else []
    for slot in scene.formation:
        frame = frames.get(slot.airframe or scene.airframe)
        if frame:
            placed.append(Placed(slot.name, frame, slot.aft_m, slot.right_m, slot.down_m))
    for one, other in itertools.combinations(placed, 2):
        least = clear_right(one, other)
        if least is None:
            continue
        apart = math.dist(one.centre(), other.centre())
        side = math.copysign(1.0, other.right_m - one.right_m)
        right = one.right_m + side * math.ceil(least * 2.0) / 2.0
        yield Finding(
            f"formation.{other.name}", f"a place inside {one.name if one.name != 'lead' else 'the lead'}, "
            f"{apart:.1f} m from centre to centre", "aircraft clear of each other (spans "
            f"{one.airframe.wing_span_m:g} and {other.airframe.wing_span_m:g} m, lengths "
            f"{one.airframe.length_m:g} and {other.airframe.length_m:g} m)",
            f"right: {right:g} m")


def _briefed(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    if scene.briefed is None:
        return
    if scene.fault is not None:
        yield Finding("briefed", f"a briefed script beside the fault {scene.fault.kind}",
                      "one or the other: a fault is compared with the same script flown without it")
    if scene.briefed[0] != scene.script[0]:
        yield Finding("briefed.0.level", "a first step other than the script's", "the same first step in both")
    if scene.briefed == scene.script:
        yield Finding("briefed", "the script itself", "a script that differs from what is flown, or none")


def _demands(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    lead = frames.get(scene.airframe)
    for at, step in _steps(scene):
        for path, load in _loads(step):
            if lead is not None and not lead.n_min <= load <= lead.n_max:
                yield Finding(f"{at}.{path}", f"{load:g} g",
                              f"{lead.n_min:g} g to {lead.n_max:g} g, the limits of {lead.name}")


def _crew(scene: Scene, frames: Mapping[str, Airframe]) -> list[tuple[str, Airframe]]:
    crew = [("lead", scene.airframe), *((slot.name, slot.airframe or scene.airframe) for slot in scene.formation)]
    return [(name, frames[frame]) for name, frame in crew if frame in frames]


def _speeds(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    for path, step in _steps(scene):
        if isinstance(step, Level) and step.speed_mps is not None:
            over = [(n, f) for n, f in _crew(scene, frames) if step.speed_mps > f.speed_max_mps]
            for name, frame in over[:1]:
                yield Finding(f"{path}.level.speed", shortest_text("speed", step.speed_mps),
                              f"at most {shortest_text('speed', frame.speed_max_mps)}, to which {frame.name} ({name}) "
                              "is valid")


def _break_out(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    over = [(n, f) for n, f in _crew(scene, frames)[1:] if scene.break_out.load_factor > f.n_max]
    for name, frame in over[:1]:
        yield Finding("break_out.load_factor", f"{scene.break_out.load_factor:g} g",
                      f"at most {frame.n_max:g} g, the limit of {frame.name} ({name})")


def _fault(scene: Scene, frames: Mapping[str, Airframe]) -> Iterator[Finding]:
    lead = frames.get(scene.airframe)
    if scene.fault is None or lead is None:
        return
    if scene.fault.kind == "engines" and scene.fault.engines_lost > lead.engines:
        yield Finding("fault.lost", str(scene.fault.engines_lost),
                      f"at most {lead.engines}: {lead.name} has no more engines")
    if scene.fault.kind == "slow" and scene.fault.rate_radps >= lead.stab_rate_radps:
        yield Finding("fault.rate", shortest_text("angular_rate", scene.fault.rate_radps),
                      f"less than {shortest_text('angular_rate', lead.stab_rate_radps)}, the rate of {lead.name} "
                      "with nothing failed")


def _loads(step: object) -> Iterator[tuple[str, float]]:
    if isinstance(step, Loop):
        for angle, load in zip(step.angle_rad, step.load_factor, strict=True):
            yield f"loop.load_factor.{degrees_key(angle)}", load
    for kind, cls in (("roll", Roll), ("climb", Climb), ("dive", Dive), ("pull_out", PullOut)):
        if isinstance(step, cls):
            yield f"{kind}.load_factor", step.load_factor  # type: ignore[attr-defined]


def degrees_key(angle_rad: float) -> str:
    """The key of a loop table for an angle: the shortest number of degrees that reads back to it."""
    value = angle_rad / DEG
    for near in (value, math.nextafter(value, INF), math.nextafter(value, -INF)):
        for digits in range(1, 18):
            number = float(f"{near:.{digits}g}")
            if number * DEG == angle_rad:
                return f"{number:.15g}" if float(f"{number:.15g}") == number else repr(number)
    return repr(value)


def airframe_findings(airframe: Airframe) -> list[Finding]:
    """What is wrong with an airframe whose single values are right."""
    a = airframe
    found = []
    if a.cl_buffet >= a.cl_max:
        found.append(Finding("cl_buffet", f"{a.cl_buffet:g}", f"less than cl_max, {a.cl_max:g}"))
    if a.thrust_stopped > a.thrust_idle:
        found.append(Finding("thrust_stopped", f"{a.thrust_stopped:g}", f"at most thrust_idle, {a.thrust_idle:g}"))
    if not a.stab_min_rad <= a.stab_no_load_rad <= a.stab_max_rad:
        low, high = shortest_text("angle", a.stab_min_rad), shortest_text("angle", a.stab_max_rad)
        found.append(Finding("stab_no_load", shortest_text("angle", a.stab_no_load_rad),
                             f"an angle within the surface's travel, {low} to {high}"))
    mean = a.wing_area_m2 / a.wing_span_m
    if not 0.8 * mean <= a.chord_m <= 2.0 * mean:
        found.append(Finding("chord", f"{a.chord_m:g} m", "a mean aerodynamic chord that fits the wing: at or somewhat "
                             f"above its area over its span, {mean:.3g} m"))
    machs = [a.mach_max * i / 50 for i in range(51)]
    worst = min(machs, key=lambda m: 1.0 + a.thrust_mach_1 * m + a.thrust_mach_2 * m * m)
    if 1.0 + a.thrust_mach_1 * worst + a.thrust_mach_2 * worst**2 <= 0.0:
        found.append(Finding("thrust_mach_1", f"{a.thrust_mach_1:g}",
                             f"thrust that stays positive up to Mach {a.mach_max:g} (it is lost at Mach {worst:.2f})"))
    return found
