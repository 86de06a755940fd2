"""Frozen types of a scene: what the YAML says, in SI units and radians, no behaviour.

Every field that comes from YAML carries its quantity, its range and one line of
explanation in ``field(metadata=...)``; the reader, the JSON Schema and the README table
are made from these declarations, so that they can't disagree.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

INF = float("inf")


def quantity(
    dim: str,
    doc: str,
    lo: float = -INF,
    hi: float = INF,
    *,
    key: str | None = None,
    choices: tuple[str, ...] = (),
    default: Any = ...,
) -> Any:
    """Declare a YAML value: its dimension, its range in SI, its key if not the field's name.

    ``dim`` is one of the dimensions of ``scenes.units``, or ``number``, ``text``, ``word``
    (one of ``choices``), ``flag``, ``count`` or ``custom`` (the reader has its own rule).
    """
    meta = {"dim": dim, "doc": doc, "lo": lo, "hi": hi, "key": key, "choices": choices}
    if default is ...:
        return field(metadata=meta)
    return field(default=default, metadata=meta)


@dataclass(frozen=True, slots=True)
class Wind:
    """Steady wind, the same at every height."""

    from_rad: float = quantity("angle", "true direction the wind comes from", 0.0, 6.2832, key="from")
    speed_mps: float = quantity("speed", "wind speed", 0.0, 40.0, key="speed")


@dataclass(frozen=True, slots=True)
class Day:
    """Air and light of the day."""

    field_elevation_m: float = quantity("length", "elevation of the field above sea level", -430.0, 4500.0,
                                        key="field_elevation", default=0.0)
    temperature_k: float | None = quantity("temperature", "air temperature at the field; standard if absent",
                                           223.15, 328.15, key="temperature", default=None)
    wind: Wind | None = quantity("custom", "steady wind", default=None)
    visibility_m: float = quantity("length", "meteorological visibility", 500.0, 100e3, key="visibility",
                                   default=25e3)
    sun_from_rad: float = quantity("angle", "true direction the sun stands in", 0.0, 6.2832, key="sun_from",
                                   default=3.7)
    sun_height_rad: float = quantity("angle", "height of the sun above the horizon", 0.02, 1.5708,
                                     key="sun_height", default=0.8)


@dataclass(frozen=True, slots=True)
class Power:
    """Throttle setting: ``full``, ``idle``, ``held`` (what holds the step's speed) or a part of full."""

    kind: str  # full | idle | held | part
    part: float = 1.0  # of full, for kind "part"


FULL = Power("full")
IDLE = Power("idle")
HELD = Power("held")


@dataclass(frozen=True, slots=True)
class Level:
    """Straight and level flight; in the first step the entry state."""

    speed_mps: float | None = quantity("speed", "calibrated airspeed (first step: required)", 20.0, 350.0,
                                       key="speed", default=None)
    height_m: float | None = quantity("length", "height above the field (first step: required)", 0.0, 12e3,
                                      key="height", default=None)
    heading_rad: float | None = quantity("angle", "true heading (first step: required)", 0.0, 6.2832,
                                         key="heading", default=None)
    for_s: float = quantity("time", "how long", 0.0, 600.0, key="for", default=3.0)
    power: Power = quantity("custom", "power: full, idle, held or a percentage", default=HELD)


@dataclass(frozen=True, slots=True)
class Loop:
    """A loop: the load factor demanded against loop angle (0 level entry, 180 top, 360 level again)."""

    angle_rad: tuple[float, ...]
    load_factor: tuple[float, ...]
    power: Power = FULL
    close_at_m: float | None = None  # the back half's demand is scaled until the healthy loop bottoms here


@dataclass(frozen=True, slots=True)
class Roll:
    """A steady roll about the flight path at a held load factor."""

    angle_rad: float = quantity("angle", "angle rolled through, right positive", -12.6, 12.6, key="angle")
    rate_radps: float = quantity("angular_rate", "roll rate", 0.01, 7.0, key="rate")
    load_factor: float = quantity("load_factor", "load factor held", -3.0, 9.0, default=1.0)
    power: Power = quantity("custom", "power: full, idle, held or a percentage", default=HELD)


@dataclass(frozen=True, slots=True)
class Climb:
    """Pull to a climb angle and hold it."""

    angle_rad: float = quantity("angle", "flight path angle to reach and hold", 0.0, 1.5, key="angle")
    load_factor: float = quantity("load_factor", "load factor of the pull", 1.0, 9.0, default=2.0)
    for_s: float = quantity("time", "how long, from the start of the step", 0.1, 600.0, key="for", default=5.0)
    power: Power = quantity("custom", "power: full, idle, held or a percentage", default=FULL)


@dataclass(frozen=True, slots=True)
class Dive:
    """Push to a dive angle and hold it."""

    angle_rad: float = quantity("angle", "dive angle below the horizon to reach and hold", 0.0, 1.5, key="angle")
    load_factor: float = quantity("load_factor", "load factor of the push", -2.0, 1.0, default=0.3)
    for_s: float = quantity("time", "how long, from the start of the step", 0.1, 600.0, key="for", default=5.0)
    power: Power = quantity("custom", "power: full, idle, held or a percentage", default=HELD)


@dataclass(frozen=True, slots=True)
class PullOut:
    """Pull at a held load factor until the flight path is level."""

    load_factor: float = quantity("load_factor", "load factor held", 1.0, 9.0, default=3.0)
    power: Power = quantity("custom", "power: full, idle, held or a percentage", default=HELD)


Step = Level | Loop | Roll | Climb | Dive | PullOut


@dataclass(frozen=True, slots=True)
class Point:
    """A point of the script: by loop angle, time, time after the top, or height.

    ``kind`` is ``loop_angle`` (rad), ``time`` (s from the start), ``after_top`` (s) or
    ``height`` (m above the field; ``going`` says whether it is passed going ``up`` or ``down``).
    """

    kind: str
    value: float
    going: str = "down"


@dataclass(frozen=True, slots=True)
class Fault:
    """What fails, where, and how much.

    kind: freeze | authority | slow | trail | engines | idle.
    """

    kind: str
    at: Point
    fraction: float = 0.0  # authority: part of the asked movement that arrives, 0..1
    rate_radps: float = 0.0  # slow: the surface's rate limit
    over_s: float = 1.0  # trail: time constant of the drift to the no-load angle
    engines_lost: int = 0  # engines: how many stop (0 = all)


@dataclass(frozen=True, slots=True)
class Slot:
    """A wing pilot's place in lead's axes: behind, to the right and below the lead, eye to eye."""

    name: str
    aft_m: float
    right_m: float
    down_m: float
    airframe: str | None = None  # None: the lead's


@dataclass(frozen=True, slots=True)
class BreakOut:
    """The escape: roll the lift toward the sky and pull."""

    load_factor: float = quantity("load_factor", "load factor pulled to", 1.5, 9.0)
    onset_gps: float = quantity("g_rate", "load factor onset, g per second", 0.2, 10.0, key="onset")
    bank_away_rad: float = quantity("angle", "bank away from the formation in the pull", 0.0, 1.4,
                                    key="bank_away", default=0.0)
    power: Power = quantity("custom", "power: full, idle, held or a percentage", default=FULL)
    delay_s: float = quantity("time", "delay before the escape acts, for the margin", 0.0, 5.0, key="delay",
                              default=0.0)


@dataclass(frozen=True, slots=True)
class Watch:
    """What the wing pilots do with their eyes, and whether the lead calls."""

    look_at: str = quantity("word", "where the eyes rest", choices=("lead", "ahead"), default="lead")
    gauges_every_s: float | None = quantity("custom", "time between looks inside, or never", key="gauges_every",
                                            default=None)
    gauge_look_s: float = quantity("time", "time a look inside takes (common practice about 2.5 s)", 0.5, 10.0,
                                   key="gauge_look", default=2.5)
    call_after_s: float | None = quantity("custom", "the lead's call, time after he feels the fault, or none",
                                          key="call", default=None)


@dataclass(frozen=True, slots=True)
class FilmPlan:
    """How the scene is filmed."""

    slot: str = quantity("custom", "the slot whose eye is the camera", key="from")
    field_rad: float = quantity("angle", "horizontal field of view", 0.35, 2.3, key="field", default=1.309)
    width_px: int = 1280
    height_px: int = 720
    rate_fps: int = quantity("count", "frames a second", 5, 60, key="rate", default=30)
    units: str = quantity("word", "units of the overlay", choices=("feet", "metres"), default="feet")


@dataclass(frozen=True, slots=True)
class Scene:
    """One scene, as read from YAML."""

    name: str
    title: str
    airframe: str
    day: Day
    ground: str
    floor_m: float
    script: tuple[Step, ...]
    fault: Fault | None
    formation: tuple[Slot, ...]
    break_out: BreakOut
    watch: Watch
    film: FilmPlan
    seed: int = 1
    source: str = ""  # path the scene was read from
    notes: str = ""
