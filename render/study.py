"""One scene worked through: flown, margins and notices found, the verdict drawn."""

from __future__ import annotations

import dataclasses
import platform
from collections.abc import Callable, Mapping
from typing import Any

import numba
import numpy as np
import scipy

from render.flight.fly import fly_scene, ground_arrays
from render.flight.plan import Plan
from render.frames import Array
from render.margin.escape import escape_heights, find_margin
from render.sight.notice import notice_all
from render.types import OBSERVERS, Flight, Margin, Notice, Study
from scenes.airframe import Airframe
from scenes.model import Scene
from terrain.ground import Ground

CAUTION = (
    "A training illustration, not a clearance. The authority's rules, the aircraft's manual and licensed practice "
    "come first."
)
VERSION = "0.1.0"
DEPARTED = "departed"  # the verdict's kind of a flight that is not the briefed one


def versions() -> dict[str, str]:
    """Versions of what the figures come from."""
    return {"latepull": VERSION, "python": platform.python_version(), "numpy": np.__version__,
            "scipy": scipy.__version__, "numba": numba.__version__}


def work_through(scene: Scene, airframe_of: Callable[[str], Airframe], ground: Ground, scene_text: str) -> Study:
    """Fly a scene, find margins and notices, draw the verdict.

    airframe_of: a name to its Airframe; ground: the scene's terrain; scene_text: the YAML it came from.
    Raises FlightError as fly_scene does.
    """
    healthy, faulted, plan = fly_scene(scene, airframe_of, ground)
    heights, grid = ground_arrays(ground)
    margin_healthy = find_margin(plan, healthy, heights, grid)
    margin = margin_healthy if faulted is healthy else find_margin(plan, faulted, heights, grid)
    cues, found = notice_all(healthy, faulted, scene.watch, ground.height_at, margin.last_pull_floor_s)
    notices = {name: _with_clearance(plan, faulted, name, notes, heights, grid) for name, notes in found.items()}
    return Study(
        scene=scene, healthy=healthy, faulted=faulted, margin=margin, margin_healthy=margin_healthy, notices=notices,
        cues=cues, versions=versions(), scene_text=scene_text,
        verdict=draw_verdict(scene, healthy, faulted, margin, notices),
    )


def _with_clearance(
    plan: Plan, flight: Flight, name: str, notes: tuple[Notice, ...], heights: Array, grid: Array
) -> tuple[Notice, ...]:
    """Fill in what is left when each observer breaks out, his reaction after he noticed."""
    k = flight.names.index(name)
    contact = flight.contact_s[k]
    filled = []
    for note in notes:
        if note.time_s is None:
            filled.append(note)
            continue
        at = note.time_s + note.reaction_s
        low = None
        if at <= flight.time_s[-1] and (contact is None or at < contact):
            low = float(escape_heights(plan, flight, k, np.array([at]), heights, grid, delay_s=0.0)[0])
        elif contact is not None:
            low = 0.0  # he meets the ground before his hand moves
        floor = None if low is None else low - plan.scene.floor_m
        filled.append(dataclasses.replace(note, clearance_m=floor, clearance_ground_m=low))
    return tuple(filled)


def _at(flight: Flight, values: Array, time_s: float) -> float:
    return float(np.interp(time_s, flight.time_s, values[:, 0]))


def draw_verdict(
    scene: Scene, healthy: Flight, faulted: Flight, margin: Margin, notices: Mapping[str, tuple[Notice, ...]]
) -> dict[str, Any]:
    """The verdict as written to verdict.json: units in key names, times from the start of the script."""
    points = {
        name: {
            "time_s": time_s, "height_m": _at(healthy, healthy.height_agl_m, time_s),
            "speed_mps": _at(healthy, healthy.cas_mps, time_s),
            "load_factor": _at(healthy, healthy.load_factor, time_s),
        }
        for name, time_s in healthy.events.items()
    }
    fault = None
    if faulted.fault_s is not None:
        angle = _at(faulted, faulted.loop_angle_rad, faulted.fault_s)
        fault = {
            "kind": scene.fault.kind if scene.fault is not None else DEPARTED,
            "time_s": faulted.fault_s, "loop_angle_deg": float(np.degrees(angle)),
            "height_m": _at(faulted, faulted.height_agl_m, faulted.fault_s),
            "speed_mps": _at(faulted, faulted.cas_mps, faulted.fault_s),
        }
    after = faulted.time_s >= (faulted.fault_s if faulted.fault_s is not None else healthy.events.get("top", 0.0))
    slots = {}
    for k, name in enumerate(faulted.names):
        if k == 0:
            continue
        notes = dict(zip(OBSERVERS, notices[name], strict=True))
        slots[name] = {
            "last_pull_s": margin.last_pull_floor_s[k],
            "notice": {o: {"time_s": n.time_s, "cue": n.cue} for o, n in notes.items()},
            "reaction_s": {o: n.reaction_s for o, n in notes.items()},
            "lateness_s": {o: n.lateness_s for o, n in notes.items()},
            "clearance_m": {o: n.clearance_m for o, n in notes.items()},
        }
    return {
        "scene": scene.name, "caution": CAUTION, "points": points, "fault": fault,
        # the last sample lies a hair below the ground at contact
        "lead": {"lowest_height_m": max(float(np.min(faulted.height_agl_m[after, 0])), 0.0),
                 "contact_time_s": faulted.contact_s[0]},
        "slots": slots,
    }
