"""A small study with invented histories, for tests of outputs: no physics, every figure known in advance.

A round loop of 500 m radius at 120 m/s; the pitch rate freezes away after 245 deg, and the path goes into the ground.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from render.types import CueHistory, Flight, Margin, Notice, Study
from scenes.airframe import Airframe
from scenes.model import BreakOut, Day, Fault, FilmPlan, Level, Loop, Point, Scene, Slot, Watch

NAMES = ("lead", "right", "left")
RADIUS_M, SPEED_MPS, BASE_M, RUN_S, STEP_S = 500.0, 120.0, 90.0, 3.0, 0.05
RATE = SPEED_MPS / RADIUS_M
SCENE_TEXT = "title: Right wing, line abreast, stabilator frozen after the top\n"

AIRFRAME = Airframe(
    name="made_up", title="made-up jet", shape="jet", invented="for tests", mass_kg=4000.0, wing_area_m2=17.0,
    wing_span_m=9.4, chord_m=1.9, inertia_pitch_kgm2=18e3, lift_slope=4.6, cl_buffet=0.9, cl_max=1.3, cl_min=-0.8,
    cd_zero=0.022, cd_induced=0.07, cm_zero=0.02, cm_alpha=-0.6, cm_q=-10.0, cm_delta=-0.9, thrust_static_n=22e3,
    thrust_density_exponent=0.8, spool_s=1.5, n_max=8.0, n_min=-4.0, speed_max_mps=240.0, mach_max=0.8,
    roll_rate_max_radps=3.0, roll_s=0.3, stab_min_rad=-0.3, stab_max_rad=0.2, stab_rate_radps=0.7, stab_lag_s=0.05,
    stick_travel_m=0.15, feel_spring_npm=300.0, feel_bob_n=15.0, eye_forward_m=2.5, eye_up_m=0.9, length_m=11.0,
)  # fmt: skip


def made_up_scene(**film: object) -> Scene:
    """The scene of the study; keywords change its film plan."""
    return Scene(
        name="made_up", title="Right wing, line abreast, stabilator frozen after the top", airframe="made_up",
        day=Day(), ground="heath", floor_m=30.48,
        script=(Level(speed_mps=120.0, height_m=90.0, heading_rad=1.4), Loop((0.0, 6.28), (3.0, 3.0))),
        fault=Fault("freeze", Point("loop_angle", float(np.deg2rad(245.0)))),
        formation=(Slot("right", 0.0, 14.0, 0.0), Slot("left", 0.0, -14.0, 0.0)),
        break_out=BreakOut(6.0, 3.0), watch=Watch(), film=replace(FilmPlan(slot="right"), **film),
    )  # fmt: skip


def made_up_path(freeze_s: float | None) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Times, loop angle, and (along, height) of the path, (N,) each; the turn dies away after ``freeze_s``."""
    time = np.arange(0.0, 36.0 + STEP_S / 2, STEP_S)
    rate = np.where(time < RUN_S, 0.0, RATE)
    if freeze_s is not None:
        rate = np.where(time >= freeze_s, RATE * np.exp(-(time - freeze_s) / 1.2), rate)
    angle = np.concatenate(([0.0], np.cumsum(rate[:-1] * STEP_S)))
    angle = np.minimum(angle, 2 * np.pi)
    along = np.concatenate(([0.0], np.cumsum(SPEED_MPS * np.cos(angle[:-1]) * STEP_S)))
    height = BASE_M + np.concatenate(([0.0], np.cumsum(SPEED_MPS * np.sin(angle[:-1]) * STEP_S)))
    return time, angle, along, height


def made_up_flight(freeze_s: float | None) -> Flight:
    """One flight of three aircraft abreast heading 80 deg over flat ground."""
    time, angle, along, height = made_up_path(freeze_s)
    hit = np.flatnonzero(height <= 0.0)
    contact = float(time[hit[0]]) if len(hit) else None
    if contact is not None:
        along, height = (np.where(time >= contact, values[hit[0]], values) for values in (along, height))
        height = np.maximum(height, 0.0)
    heading = np.deg2rad(80.0)
    ahead, right = np.array([np.cos(heading), np.sin(heading)]), np.array([-np.sin(heading), np.cos(heading)])
    offsets = np.array([0.0, 14.0, -14.0])
    n, k = len(time), len(NAMES)
    pos = np.empty((n, k, 3))
    pos[:, :, :2] = along[:, None, None] * ahead + offsets[None, :, None] * right
    pos[:, :, 2] = -height[:, None]
    each = lambda values: np.repeat(np.asarray(values, dtype=float)[:, None], k, axis=1)  # noqa: E731
    vel = np.gradient(pos, time, axis=0)
    events = {"entry": RUN_S, "vertical_up": RUN_S + np.pi / 2 / RATE, "top": RUN_S + np.pi / RATE}
    if freeze_s is None:
        events |= {"vertical_down": RUN_S + 1.5 * np.pi / RATE, "bottom": RUN_S + 2 * np.pi / RATE}
    loop = each(angle)
    loop[:, 1:] = np.nan
    quat = np.zeros((n, k, 4))
    quat[..., 0] = 1.0
    zero = np.zeros((n, k))
    return Flight(
        time_s=time, pos_e_m=pos, vel_e_mps=vel, quat_eb=quat, rate_b_radps=np.zeros((n, k, 3)),
        speed_mps=zero + SPEED_MPS, cas_mps=each(115.0 + 20.0 * np.cos(angle)), alpha_rad=zero + 0.05,
        load_factor=each(np.cos(angle) + SPEED_MPS * RATE / 9.80665), load_factor_demand=zero + 3.0,
        stick=zero, stick_force_n=zero, stabilator_rad=zero, thrust_n=zero + 15e3, throttle=zero + 1.0,
        engine=zero + 1.0,
        gamma_rad=each(np.arcsin(np.sin(angle))), loop_angle_rad=loop, height_m=-pos[..., 2].copy(),
        height_agl_m=-pos[..., 2].copy(), step=np.where(time < RUN_S, 0.0, 1.0), airframes=(AIRFRAME,) * k,
        names=NAMES, fault_s=freeze_s, contact_s=(contact,) * k, events=events, loop_scale=1.0,
    )  # fmt: skip


def made_up_margin(flight: Flight, last_floor_s: float | None, last_ground_s: float | None) -> Margin:
    """Margins that fall second by second to the last pull, 60 m of clearance lost each second."""
    n, k = len(flight.time_s), len(flight.names)
    left = []
    for last in (last_floor_s, last_ground_s):
        left.append(np.full((n, k), np.nan) if last is None else np.repeat((last - flight.time_s)[:, None], k, axis=1))
    clear = np.full((n, k), 60.0) if last_floor_s is None else 60.0 * left[0]
    return Margin(
        time_s=flight.time_s, clearance_floor_m=clear, clearance_ground_m=clear + 30.48, seconds_floor_s=left[0],
        seconds_ground_s=left[1], last_pull_floor_s=(last_floor_s,) * k, last_pull_ground_s=(last_ground_s,) * k,
        no_pull_left=(flight.fault_s is not None, False, False),
    )  # fmt: skip


def made_up_study(*, fault: bool = True, **film: object) -> Study:
    """The study: fault at 245 deg (20.817 s), last pull 2.0 s (floor) and 2.5 s (ground) later.

    Noticed 1.5, 2.6 and never; reaction 0.8, 1.5 and 3.0 s.
    """
    healthy = made_up_flight(None)
    fault_s = RUN_S + float(np.deg2rad(245.0)) / RATE
    scene = made_up_scene(**film)
    endless = made_up_margin(healthy, None, None)
    if not fault:
        quiet = tuple(Notice(o, None, None, r, None, None, None) for o, r in zip(OBS, REACTION_S, strict=True))
        return Study(
            scene=replace(scene, fault=None, title="Healthy loop"), healthy=healthy, faulted=healthy, margin=endless,
            margin_healthy=endless, notices={name: quiet for name in NAMES}, cues={}, versions=VERSIONS,
            scene_text=SCENE_TEXT, verdict={"scene": "made_up"},
        )  # fmt: skip
    faulted = made_up_flight(fault_s)
    margin = made_up_margin(faulted, fault_s + 2.0, fault_s + 2.5)
    notices = (
        Notice("early", fault_s + 1.5, "tilt", 0.8, 0.3, -18.0, 12.48),
        Notice("likely", fault_s + 2.6, "closing", 1.5, 2.1, -126.0, -95.52),
        Notice("late", None, None, 3.0, None, None, None),
    )
    cue = CueHistory(
        "tilt", np.linspace(0.0, 0.2, len(faulted.time_s)), "rad",
        {o: np.full(len(faulted.time_s), 0.02) for o in OBS}, "invented for tests",
    )  # fmt: skip
    return Study(
        scene=scene, healthy=healthy, faulted=faulted, margin=margin, margin_healthy=endless,
        notices={name: notices for name in NAMES}, cues={"right": (cue,)}, versions=VERSIONS, scene_text=SCENE_TEXT,
        verdict={"scene": "made_up", "slots": {"right": {"last_pull_s": float(fault_s + 2.0)}}},
    )  # fmt: skip


OBS = ("early", "likely", "late")
REACTION_S = (0.8, 1.5, 3.0)
VERSIONS = {"latepull": "0.1.0", "numpy": "2.0"}
