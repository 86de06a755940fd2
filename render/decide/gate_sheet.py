"""All figures of a gate card, solved one after another."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from render.decide.brief import GATE_ANGLES, Brief, brief, gate_speeds
from render.decide.gate_extras import Float, base_needed, day_changes, largest_floats
from render.decide.gates import Gate, Solver, held, solve_gate
from render.decide.worst import Count, Worst
from render.frames import Array
from render.types import freeze_arrays
from scenes.airframe import Airframe
from scenes.model import Scene
from terrain.ground import Ground

SPEEDS = 5


@dataclass(frozen=True, slots=True, eq=False)
class GateSheet:
    """What the gate card says; SI, heights above the field, calibrated speeds; observers early, likely, late."""

    scene: Scene
    airframe: Airframe
    briefed: Brief
    want_s: float
    from_hand: bool  # the seconds are counted from when his hand moves, not from when he notices
    gates: Mapping[str, Gate]
    held: Mapping[str, Worst]  # what the loop as briefed leaves in the worst freeze from each gate on
    base_m: Array  # (3,) base height at which the loop, lifted as a whole, leaves the wanted seconds; NaN: none
    base_none: str
    floats: Mapping[str, Float]
    days: Mapping[str, Mapping[str, tuple[float, float, float]]]  # day -> gate -> change of (a), (b), (c likely), m

    def __post_init__(self) -> None:
        freeze_arrays(self)


def solve_gates(
    scene: Scene, airframe_of: Callable[[str], Airframe], ground: Ground, want_s: float, *, from_hand: bool = True,
    spread_mps: float = 10.0, count: Count | None = None, tell: Callable[[str], None] | None = None,
) -> GateSheet:
    """Solve the gates of a scene's loop as briefed, whatever fault the scene has.

    want_s: seconds that are to be left in any freeze; spread_mps: how much slower and faster the curves' ends are
    entered. Raises FlightError if the script has no loop or the loop does not come round.
    """
    def say(what: str) -> None:
        if tell is not None:
            tell(what)

    say("the loop as briefed")
    briefed = brief(scene, airframe_of)
    solver = Solver(briefed, ground, want_s, from_hand, count=count)
    speeds = gate_speeds(briefed, airframe_of, spread_mps, SPEEDS)
    gates, left = {}, {}
    for name in GATE_ANGLES:
        say(f"the gate at {name.replace('_', ' ')}")
        gates[name] = solve_gate(solver, name, speeds[name])
        left[name] = held(solver, name)
    say("the base height")
    base, why = base_needed(solver, airframe_of)
    say("the largest float")
    floats = largest_floats(solver, airframe_of)
    say("another day")
    days = day_changes(solver, gates, airframe_of)
    return GateSheet(scene, airframe_of(scene.airframe), briefed, want_s, from_hand, gates, left, np.array(base), why,
                     floats, days)
