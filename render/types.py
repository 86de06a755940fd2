"""The frozen types that pass from room to room: Flight, Margin, Notice, Study.

Shapes: T instants, K aircraft (0 = the lead, then the slots in the scene's order), vectors last.
Arrays are float64 and read-only. Times in seconds from the start of the script.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from render.frames import Array
from scenes.airframe import Airframe
from scenes.model import Scene

OBSERVERS = ("early", "likely", "late")


def freeze_arrays(obj: object) -> None:
    """Make every array field of a frozen dataclass read-only (called from ``__post_init__``)."""
    for f in fields(obj):  # type: ignore[arg-type]
        value = getattr(obj, f.name)
        if isinstance(value, np.ndarray):
            value.setflags(write=False)


@dataclass(frozen=True, slots=True, eq=False)
class Flight:
    """One flown scene: lead and wings on one time axis.

    After contact an aircraft's arrays hold its state at contact; ``contact_s`` says when.
    """

    time_s: Array  # (T,)
    pos_e_m: Array  # (T, K, 3) north, east, down; origin: the display centre at field elevation
    vel_e_mps: Array  # (T, K, 3) over the ground
    quat_eb: Array  # (T, K, 4) body -> earth, w first
    rate_b_radps: Array  # (T, K, 3) roll, pitch, yaw rate in body axes
    speed_mps: Array  # (T, K) true airspeed
    cas_mps: Array  # (T, K) calibrated airspeed
    alpha_rad: Array  # (T, K)
    load_factor: Array  # (T, K) along the lift axis (L + T sin a)/(m g0)
    load_factor_demand: Array  # (T, K) what the pilot asks for
    stick: Array  # (T, K) aft stop = 1, neutral (trimmed at the start) = 0, forward stop = -1
    stick_force_n: Array  # (T, K) pull positive
    stabilator_rad: Array  # (T, K)
    thrust_n: Array  # (T, K)
    throttle: Array  # (T, K) asked, 0 idle .. 1 full
    engine: Array  # (T, K) thrust as a part of full
    gamma_rad: Array  # (T, K) flight path angle, climb positive
    loop_angle_rad: Array  # (T, K) angle of the lead's path in the loop, 0 before it, 2 pi after; NaN for wings
    height_m: Array  # (T, K) above the field elevation datum
    height_agl_m: Array  # (T, K) above the ground underneath
    step: Array  # (T,) index of the script step the lead is in
    airframes: tuple[Airframe, ...]  # (K,)
    names: tuple[str, ...]  # (K,) "lead", then slot names
    fault_s: float | None  # when the fault came on, None in the healthy twin
    contact_s: tuple[float | None, ...]  # (K,) when the ground was met
    events: Mapping[str, float]  # entry, vertical_up, top, vertical_down, bottom: times where they happened
    loop_scale: float  # factor the back half's demand was scaled by to close the loop

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, slots=True, eq=False)
class Margin:
    """What is left before the ground, per instant and aircraft.

    ``seconds_*`` is NaN where it does not run out within the flight; negative once it is gone.
    """

    time_s: Array  # (T,) same axis as the flight
    clearance_floor_m: Array  # (T, K) lowest height above the floor of an escape started now
    clearance_ground_m: Array  # (T, K) the same above the ground
    seconds_floor_s: Array  # (T, K) ground-rush margin against the floor
    seconds_ground_s: Array  # (T, K) against the ground
    last_pull_floor_s: tuple[float | None, ...]  # (K,) None: never runs out
    last_pull_ground_s: tuple[float | None, ...]
    no_pull_left: tuple[bool, ...]  # (K,) a faulted lead whose escape does nothing

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, slots=True, eq=False)
class CueHistory:
    """One cue of one aircraft over time, faulted against healthy."""

    name: str  # tilt, turning, flow, closing, growth, load, felt rate, lead, gauge, call, stick force
    difference: Array  # (T,) faulted against the twin, in the cue's own unit or as ln ratio
    unit: str
    sigma: Mapping[str, Array]  # observer -> (T,) effective noise; notice when |difference| > 2 sigma for 0.3 s
    source: str  # where the threshold comes from, in words for the briefing

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, slots=True, eq=False)
class Notice:
    """When one observer in one aircraft could have noticed, and by what."""

    observer: str  # early | likely | late
    time_s: float | None  # None: never before contact
    cue: str | None
    reaction_s: float
    lateness_s: float | None  # time + reaction - last pull (floor); None if never noticed or nothing runs out
    clearance_m: float | None  # lowest height above the floor if he breaks out then
    clearance_ground_m: float | None  # the same above the ground


@dataclass(frozen=True, slots=True, eq=False)
class Study:
    """One scene worked through: what every output is made from."""

    scene: Scene
    healthy: Flight
    faulted: Flight  # the healthy flight itself where the scene has no fault
    margin: Margin  # of the faulted flight
    margin_healthy: Margin
    notices: Mapping[str, tuple[Notice, ...]]  # "lead" and slot names -> early, likely, late
    cues: Mapping[str, tuple[CueHistory, ...]]
    versions: Mapping[str, str]
    scene_text: str  # the YAML it came from
    verdict: Mapping[str, Any]  # as DESIGN.md says
