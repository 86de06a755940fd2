"""Frozen types of a scene: what the YAML says, in SI units and radians, no behaviour.

Every field that comes from YAML carries its quantity, its range and one line of
explanation in ``field(metadata=...)``; the reader, the JSON Schema and the README table
are made from these declarations, so that they can't disagree.
"""

from __future__ import annotations

import math
from dataclasses import Field, dataclass, field
from typing import Any

INF = float("inf")
DEG = math.pi / 180.0
TURN = 360.0 * DEG
REQUIRED: Any = ...

# What a field's name ends in for a quantity of a dimension; the YAML key goes without it.
SUFFIXES = {
    "length": "_m", "speed": "_mps", "angle": "_rad", "angular_rate": "_radps", "time": "_s", "temperature": "_k",
    "mass": "_kg", "area": "_m2", "inertia": "_kgm2", "force": "_n", "stiffness": "_npm", "g_rate": "_gps",
    "time_or_never": "_s", "time_or_none": "_s",
}


def quantity(
    dim: str,
    doc: str,
    lo: float = -INF,
    hi: float = INF,
    *,
    key: str | None = None,
    choices: tuple[str, ...] = (),
    default: Any = REQUIRED,
    absent: Any = REQUIRED,
    part: type | None = None,
    fills: tuple[str, ...] = (),
    kinds: tuple[str, ...] = (),
    example: str = "",
) -> Any:
    """Declare a YAML value: its dimension, its range in SI, its key if not the field's name less its unit.

    ``dim`` is one of the dimensions of ``scenes.units``, or ``text``, ``word`` (one of ``choices``),
    ``flag``, ``part`` (a mapping read to ``part``), or one of the rules of ``scenes.rules``.
    ``absent``: what a missing key means (default: the field's default; none: an error asks for it).
    ``fills``: all the fields that this one YAML value fills. ``kinds``: the kinds of fault that need it.
    """
    meta = {"dim": dim, "doc": doc, "lo": lo, "hi": hi, "key": key, "choices": choices, "part": part, "fills": fills,
            "kinds": kinds, "example": example, "absent": default if absent is REQUIRED else absent}
    if default is REQUIRED:
        return field(metadata=meta)
    return field(default=default, metadata=meta)


def filled(default: Any = REQUIRED) -> Any:
    """Declare a field that another field's YAML value fills."""
    return field() if default is REQUIRED else field(default=default)


def yaml_key(declared: Field[Any]) -> str:
    """The YAML key of a declared field."""
    key: str = declared.metadata["key"] or declared.name.removesuffix(SUFFIXES.get(declared.metadata["dim"], "\0"))
    return key


@dataclass(frozen=True, slots=True)
class Wind:
    """Steady wind, the same at every height."""

    from_rad: float = quantity("angle", "true direction the wind comes from", 0.0, TURN, key="from")
    speed_mps: float = quantity("speed", "wind speed", 0.0, 40.0, key="speed")


@dataclass(frozen=True, slots=True)
class Day:
    """Air and light of the day."""

    field_elevation_m: float = quantity("length", "elevation of the field above sea level", -430.0, 4500.0,
                                        key="field_elevation", default=0.0)
    temperature_k: float | None = quantity("temperature", "air temperature at the field; standard if absent",
                                           223.15, 328.15, key="temperature", default=None)
    wind: Wind | None = quantity("part", "steady wind", default=None, part=Wind)
    visibility_m: float = quantity("length", "meteorological visibility", 500.0, 100e3, key="visibility",
                                   default=25e3)
    sun_from_rad: float = quantity("angle", "true direction the sun stands in", 0.0, TURN, key="sun_from",
                                   default=3.7)
    sun_height_rad: float = quantity("angle", "height of the sun above the horizon", 0.02, 90.0 * DEG,
                                     key="sun_height", default=0.8)
    cloud_base_m: float | None = quantity("length", "base of the cloud above the field; no cloud if absent",
                                          50.0, 12e3, default=None)


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
    heading_rad: float | None = quantity("angle", "true heading (first step: required)", 0.0, TURN,
                                         key="heading", default=None)
    for_s: float = quantity("time", "how long", 0.0, 600.0, key="for", default=3.0)
    power: Power = quantity("power", "throttle: full, idle, held (what holds the speed) or a percentage", default=HELD)


@dataclass(frozen=True, slots=True)
class Loop:
    """A loop: the load factor demanded against loop angle (0 level entry, 180 top, 360 level again)."""

    angle_rad: tuple[float, ...] = quantity(
        "loop_table", "load factor in g against loop angle in degrees, both bare numbers, angles rising",
        -4.0, 12.0, key="load_factor", fills=("angle_rad", "load_factor"))
    load_factor: tuple[float, ...] = filled()
    power: Power = quantity("power", "throttle: full, idle, held (as at the entry) or a percentage", default=FULL)
    close_at_m: float | None = quantity(
        "length", "height at which the healthy loop bottoms: the back half's demand is scaled to it", 1.0, 3000.0,
        default=None)


@dataclass(frozen=True, slots=True)
class Roll:
    """A steady roll about the flight path at a held load factor."""

    angle_rad: float = quantity("angle", "angle rolled through, right positive", -720.0 * DEG, 720.0 * DEG, key="angle")
    rate_radps: float = quantity("angular_rate", "roll rate", 1.0 * DEG, 400.0 * DEG, key="rate")
    load_factor: float = quantity("load_factor", "load factor held", -3.0, 9.0, default=1.0)
    power: Power = quantity("power", "throttle: full, idle, held (what holds the speed) or a percentage", default=HELD)


@dataclass(frozen=True, slots=True)
class Climb:
    """Pull to a climb angle and hold it."""

    angle_rad: float = quantity("angle", "flight path angle to reach and hold", 0.0, 85.0 * DEG, key="angle")
    load_factor: float = quantity("load_factor", "load factor of the pull", 1.0, 9.0, default=2.0)
    for_s: float = quantity("time", "how long, from the start of the step", 0.1, 600.0, key="for", default=5.0)
    power: Power = quantity("power", "throttle: full, idle, held (what holds the speed) or a percentage", default=FULL)


@dataclass(frozen=True, slots=True)
class Dive:
    """Push to a dive angle and hold it."""

    angle_rad: float = quantity("angle", "dive angle below the horizon to reach and hold", 0.0, 85.0 * DEG,
                               key="angle")
    load_factor: float = quantity("load_factor", "load factor of the push", -2.0, 1.0, default=0.3)
    for_s: float = quantity("time", "how long, from the start of the step", 0.1, 600.0, key="for", default=5.0)
    power: Power = quantity("power", "throttle: full, idle, held (what holds the speed) or a percentage", default=HELD)


@dataclass(frozen=True, slots=True)
class PullOut:
    """Pull at a held load factor until the flight path is level."""

    load_factor: float = quantity("load_factor", "load factor held", 1.0, 9.0, default=3.0)
    power: Power = quantity("power", "throttle: full, idle, held (what holds the speed) or a percentage", default=HELD)


Step = Level | Loop | Roll | Climb | Dive | PullOut
STEPS: dict[str, type] = {"level": Level, "loop": Loop, "roll": Roll, "climb": Climb, "dive": Dive,
                          "pull_out": PullOut}


@dataclass(frozen=True, slots=True)
class Point:
    """A point of the script: by loop angle, time, time after the top, or height.

    ``kind`` is ``loop_angle`` (rad), ``time`` (s from the start), ``after_top`` (s) or
    ``height`` (m above the field; ``going`` says whether it is passed going ``up`` or ``down``).
    """

    kind: str
    value: float
    going: str = "down"


# kind of point: dimension, least, greatest (SI), what it is
POINTS: dict[str, tuple[str, float, float, str]] = {
    "loop_angle": ("angle", 0.0, TURN, "angle of the loop: 0 level entry, 180 deg top, 360 deg level again"),
    "time": ("time", 0.0, 600.0, "time from the start of the script"),
    "after_top": ("time", 0.0, 60.0, "time after the top of the loop"),
    "height": ("length", 0.0, 12e3, "height above the field, passed going up or down"),
}
GOING = ("down", "up")
FAULT_KINDS: dict[str, str] = {
    "freeze": "the surface stops where it is",
    "authority": "only a part of the asked movement arrives",
    "slow": "the surface's rate is limited",
    "trail": "the surface drifts to its no-load angle",
    "engines": "one engine or all stop",
    "idle": "the lead closes the throttle",
}


@dataclass(frozen=True, slots=True)
class Fault:
    """What fails, where, and how much.

    kind: freeze | authority | slow | trail | engines | idle.
    """

    kind: str = quantity("word", "what fails", choices=tuple(FAULT_KINDS))
    at: Point = quantity("point", "where in the script")
    fraction: float = quantity("fraction", "part of the asked movement that arrives", 0.0, 1.0, default=0.0,
                               kinds=("authority",))
    rate_radps: float = quantity("angular_rate", "greatest rate of the surface", 0.0, 60.0 * DEG, default=0.0,
                                 kinds=("slow",), example="0.5 deg/s")
    over_s: float = quantity("time", "time constant of the drift to the no-load angle", 0.05, 30.0, default=1.0,
                             kinds=("trail",), example="1 s")
    engines_lost: int = quantity("engines", "how many engines stop: all or a number", 1, 4, key="lost", default=0,
                                 kinds=("engines",))  # 0 = all


@dataclass(frozen=True, slots=True)
class Slot:
    """A wing pilot's place: behind the lead along the path he has flown, to the right of it and below it."""

    name: str
    aft_m: float = quantity("length", "behind the lead, along the path he has flown", -200.0, 500.0, example="8 m")
    right_m: float = quantity("length", "to the right of the lead, left negative", -500.0, 500.0,
                              example="14 m")
    down_m: float = quantity("length", "below the lead, above negative", -200.0, 200.0, example="1 m")
    airframe: str | None = quantity("airframe", "the wing's airframe; the lead's if absent", default=None)


@dataclass(frozen=True, slots=True)
class BreakOut:
    """The escape: roll the lift toward the sky and pull."""

    load_factor: float = quantity("load_factor", "load factor pulled to", 1.5, 9.0)
    onset_gps: float = quantity("g_rate", "load factor onset, g per second", 0.2, 10.0, key="onset")
    bank_away_rad: float = quantity("angle", "bank away from the formation in the pull", 0.0, 80.0 * DEG,
                                    key="bank_away", default=0.0)
    power: Power = quantity("power", "throttle: full, idle, held (what holds the speed) or a percentage", default=FULL)
    delay_s: float = quantity("time", "delay before the escape acts, for the margin", 0.0, 5.0, key="delay",
                              default=0.0)


@dataclass(frozen=True, slots=True)
class Watch:
    """What the wing pilots do with their eyes, and whether the lead calls."""

    look_at: str = quantity("word", "where the eyes rest", choices=("lead", "ahead"), default="lead")
    gauges_every_s: float | None = quantity("time_or_never", "time between looks inside, or never", 1.0, 600.0,
                                            default=None, example="8 s")
    gauge_look_s: float = quantity("time", "time a look inside takes (common practice about 2.5 s)", 0.5, 10.0,
                                   key="gauge_look", default=2.5)
    call_after_s: float | None = quantity("time_or_none", "the lead's call, time after he feels the fault, or none",
                                          0.0, 60.0, key="call", default=None, example="2 s")


@dataclass(frozen=True, slots=True)
class Captions:
    """Words of the held moments, in the team's own language; ``{seconds}`` stands for the time since the fault."""

    fault: str = quantity("text", "words at the fault", default="")
    early: str = quantity("text", "words where the early observer could notice", default="")
    likely: str = quantity("text", "words where the likely observer could notice", default="")
    late: str = quantity("text", "words where the late observer could notice", default="")
    last_pull: str = quantity("text", "words at the last pull", default="")


@dataclass(frozen=True, slots=True)
class FilmPlan:
    """How the scene is filmed."""

    slot: str = quantity("seat", "the slot whose eye is the camera, or lead", key="from")
    field_rad: float = quantity("angle", "horizontal field of view", 20.0 * DEG, 150.0 * DEG,
                                default=75.0 * DEG)
    width_px: int = quantity("size", "width x height of the picture in pixels, both even", key="size", default=1280,
                             fills=("width_px", "height_px"))
    height_px: int = filled(720)
    rate_fps: int = quantity("count", "frames a second", 5, 60, key="rate", default=30)
    units: str = quantity("word", "units of the overlay", choices=("feet", "metres"), default="feet")
    smoke: bool = quantity("flag", "whether the aircraft trail smoke", default=False)
    captions: Captions | None = quantity("part", "words of the held moments, where not in English", default=None,
                                         part=Captions)


@dataclass(frozen=True, slots=True)
class Scatter:
    """How a team's passes differ from one another: one standard deviation of each quantity."""

    entry_speed_mps: float = quantity("speed", "of the entry speed", 0.0, 30.0, default=0.0, example="4 kt")
    entry_height_m: float = quantity("length", "of the entry height", 0.0, 100.0, default=0.0, example="20 ft")
    load_factor: float = quantity("fraction", "of the g pulled on the way up, and of how early it is pulled on the way "
                                  "down", 0.0, 0.3, default=0.0, example="4 %")
    base_m: float = quantity("length", "of the height the loop closes at", 0.0, 100.0, default=0.0, example="20 ft")
    power: float = quantity("fraction", "of the power in the loop, never above full", 0.0, 0.3, default=0.0,
                            example="2 %")
    wind_mps: float = quantity("speed", "of each horizontal part of the wind", 0.0, 15.0, default=0.0, example="3 kt")
    station_m: float = quantity("length", "of a wing pilot's place along each axis, kept through a pass", 0.0, 10.0,
                                default=0.0, example="0.7 m")
    attention: float = quantity("fraction", "of a wing pilot's attention to what he doesn't look at, a ratio", 0.0, 1.0,
                                default=0.0, example="30 %")
    reaction: float = quantity("fraction", "of a wing pilot's reaction, of its mean", 0.0, 1.0, default=0.0,
                               example="45 %")


@dataclass(frozen=True, slots=True)
class Scene:
    """One scene, as read from YAML."""

    name: str
    title: str = quantity("text", "what the scene shows, in a line", example="Right wing, nothing fails")
    airframe: str = quantity("airframe", "the lead's airframe: a shipped name or a path")
    day: Day = quantity("part", "air and light of the day; standard day if absent", absent=Day(), part=Day)
    ground: str = quantity("ground", "what is under it: a shipped terrain")
    floor_m: float = quantity("length", "the team's own minimum height above the ground; there is no default", 0.0,
                              3000.0, example="100 ft")
    script: tuple[Step, ...] = quantity("script", "what the lead flies, step by step; the first is a level step")
    fault: Fault | None = quantity("fault", "what fails, where and how much; nothing if absent", absent=None,
                                   part=Fault)
    formation: tuple[Slot, ...] = quantity("formation", "the wing pilots' places by name, in the lead's axes")
    break_out: BreakOut = quantity("part", "the escape the wing pilots are briefed to fly", part=BreakOut)
    watch: Watch = quantity("part", "what the wing pilots do with their eyes, and whether the lead calls",
                            absent=Watch(), part=Watch)
    film: FilmPlan = quantity("part", "how the scene is filmed; from the first slot if absent", absent=None,
                              part=FilmPlan)
    briefed: tuple[Step, ...] | None = quantity("script", "what was briefed, if the script flies something else: what "
                                                "the wing pilots expect; the scene has no fault then", default=None)
    scatter: Scatter | None = quantity("part", "how the team's passes differ from one another; for latepull scatter",
                                       default=None, part=Scatter)
    seed: int = quantity("count", "seed of the terrain and of everything drawn by lot", 0, 2**31 - 1, default=1)
    source: str = ""  # path the scene was read from
    notes: str = quantity("text", "anything worth keeping with the scene", default="")
