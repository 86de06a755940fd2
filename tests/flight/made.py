"""Scenes built in code for the flight tests: an invented jet, a loop of a growing pull, flat ground."""

from __future__ import annotations

import math
from types import SimpleNamespace
from typing import Any

import numpy as np

from render.flight import passes
from render.flight import records as r
from render.flight import script as s
from render.frames import Array
from scenes.airframe import Airframe
from scenes.model import BreakOut, Day, Fault, FilmPlan, Level, Loop, Point, Power, Scene, Slot, Watch

DEG, KT, FT = math.pi / 180.0, 1852.0 / 3600.0, 0.3048
GROWING = {0: 1.2, 12: 4.4, 40: 4.3, 90: 3.1, 130: 1.6, 165: 0.6, 195: 0.7, 225: 1.3, 250: 2.0, 270: 2.8, 300: 4.0,
           330: 4.9, 350: 4.9, 358: 1.2}


def invented_jet(**changes: Any) -> Airframe:
    """An invented jet trainer; every figure is invented."""
    figures: dict[str, Any] = dict(
        name="jet", title="invented", shape="jet", invented="all figures invented", mass_kg=5300.0, wing_area_m2=16.0,
        wing_span_m=9.4, chord_m=2.35, inertia_pitch_kgm2=38000.0, lift_slope=4.0, cl_buffet=0.85, cl_max=1.15,
        cl_min=-0.7, cd_zero=0.022, cd_induced=0.12, cm_zero=0.02, cm_alpha=-0.45, cm_q=-9.0, cm_delta=-1.3,
        thrust_static_n=25e3, thrust_density_exponent=0.7, thrust_mach_1=-0.35, thrust_mach_2=0.25, spool_s=1.2,
        engines=2, n_max=7.5, n_min=-3.0, speed_max_mps=480 * KT, mach_max=0.8, roll_rate_max_radps=140 * DEG,
        roll_s=0.25, stab_min_rad=-20 * DEG, stab_max_rad=10 * DEG, stab_rate_radps=60 * DEG, stab_lag_s=0.05,
        stick_travel_m=0.15, feel_spring_npm=400.0, feel_bob_n=12.0, eye_forward_m=2.6, eye_up_m=0.9, length_m=12.0,
    )
    figures.update(changes)
    return Airframe(**figures)


def flat_ground() -> Any:
    """Level ground at the field's height."""
    return SimpleNamespace(
        heights_m=np.zeros((1, 1)), origin_n_m=0.0, origin_e_m=0.0, spacing_m=1.0,
        height_at=lambda n, e: np.zeros(np.broadcast(n, e).shape),
    )


def loop_scene(fault: Fault | None = None, *, close_ft: float = 300.0, kt: float = 388.0,
               slots: tuple[Slot, ...] = (Slot("right", 0.0, 14.0, 0.0), Slot("left", 0.0, -14.0, 0.0))) -> Scene:
    """A loop of the growing pull entered at 300 ft."""
    loop = Loop(tuple(a * DEG for a in GROWING), tuple(GROWING.values()), Power("part", 0.88), close_ft * FT)
    script = (Level(kt * KT, 300 * FT, 80 * DEG, 3.0), loop, Level(for_s=3.0))
    return Scene("made", "made", "jet", Day(), "flat", 100 * FT, script, fault, slots, BreakOut(6.0, 3.0), Watch(),
                 FilmPlan("right"))


def freeze(angle_deg: float) -> Fault:
    """A freeze at a loop angle."""
    return Fault("freeze", Point("loop_angle", angle_deg * DEG))


def lead_alone(y0: Array, af: Any, case: Any, script: Array, knots: Array, coeffs: Array, dt_s: float,
               steps: int) -> tuple[Array, Array, Array, tuple[int, int]]:
    """A lead flown over ground far below, at any step: y (T, NY), a (T, NA), memory, why he stopped and where.

    As a batch of one, for which the kernel is there already.
    """
    y, a = np.empty((1, steps + 1, r.NY)), np.empty((1, steps + 1, r.NA))
    mem, status, none = np.zeros((1, s.NM)), np.zeros((1, 2)), np.zeros(1)
    far = np.full((1, 1), -9e4)
    far.setflags(write=False)
    passes.fly_leads(
        y0[None].copy(), np.array([af], af.dtype), np.array([case], case.dtype), script[None].copy(),
        knots[None].copy(), coeffs[None].copy(), none, far, np.array([0.0, 0.0, 1.0]), dt_s, none, none - 1.0, -1, y, a,
        mem, status, np.empty((1, 0, 0)),
    )
    return y[0], a[0], mem[0], (int(status[0, 0]), int(status[0, 1]))
