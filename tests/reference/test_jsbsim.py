"""Our flight code beside JSBSim 1.3.x on the same invented aircraft, live and from points kept as a file.

Ours: flat earth, constant gravity. JSBSim: a sphere without rotation. Tolerances: REFERENCES.md section 3
(height 0.2 % of the range flown + 0.5 m, speed 0.4 %, path angle 0.15 deg, over the whole history).
"""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from render.flight import records as r
from render.flight.fly import fly_scene
from render.frames import Array
from scenes.airframe import Airframe
from scenes.model import Day, Level
from scenes.reader import read_airframe, read_scene
from terrain.ground import read_ground
from tests.reference import jsbsim_rig as rig
from tests.reference.bare import at_angle, path_angle
from tests.reference.plane_cases import CASES, Case, fly_ours, sampled

POINTS = Path(__file__).parent / "data" / "pitch_plane_points.csv"


def shape_of(case: Case) -> rig.Shape:
    f = {"mass_kg": 5300.0, "wing_area_m2": 16.0, "chord_m": 2.35, "inertia_pitch_kgm2": 38000.0, "lift_slope": 4.0,
         "cm_alpha": -0.45, "cm_q": -9.0, "cm_delta": -1.3} | case.figures
    return rig.linear_shape(
        mass_kg=f["mass_kg"], wing_area_m2=f["wing_area_m2"], chord_m=f["chord_m"],
        inertia_pitch_kgm2=f["inertia_pitch_kgm2"], slope=f["lift_slope"], cl_max=f["cl_max"], cd_zero=f["cd_zero"],
        cd_induced=f["cd_induced"], cm=(0.0, f["cm_alpha"], f["cm_q"], f["cm_delta"]),
    )


def assert_close(height_m: Array, speed_mps: Array, gamma_rad: Array, theirs: rig.Flown) -> None:
    """The tolerances of the reference, over the whole history."""
    span = float(np.ptp(theirs.height_m))
    assert np.max(np.abs(height_m - theirs.height_m)) < 2e-3 * span + 0.5
    assert np.max(np.abs(speed_mps / theirs.speed_mps - 1.0)) < 4e-3
    assert np.max(np.abs(gamma_rad - theirs.gamma_rad)) < np.radians(0.15)


@pytest.mark.parametrize("name", CASES)
def test_plane_case_live(name: str, tmp_path: Path) -> None:
    case = CASES[name]
    theirs = rig.fly(tmp_path, shape_of(case), speed_mps=case.speed_mps, gamma_rad=case.gamma_rad,
                     height_m=case.height_m, alpha_rad=case.alpha_rad, end_s=case.end_s, stab_of=case.stab_at,
                     thrust_of=case.thrust_at)
    time_s, y = fly_ours(case)
    at = theirs.time_s
    assert_close(sampled(time_s, -y[:, r.D], at), sampled(time_s, y[:, r.V], at), sampled(time_s, path_angle(y), at),
                 theirs)
    # angle of attack and pitch rate come from the same moment equation
    assert sampled(time_s, y[:, r.ALPHA], at) == pytest.approx(theirs.alpha_rad, abs=1e-3)
    assert sampled(time_s, y[:, r.PITCH], at) == pytest.approx(theirs.pitch_radps, abs=2e-3)


def kept_points(name: str) -> list[dict[str, float]]:
    """Rows of the kept file for one case: JSBSim 1.3.3 at 1200 Hz on the sphere."""
    with POINTS.open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["case"] == name]
    return [{"event": row["point"]} | {k: float(v) for k, v in row.items() if k not in ("case", "point")}  # type: ignore[dict-item]
            for row in rows]


@pytest.mark.parametrize("name", CASES)
def test_plane_case_against_the_kept_points(name: str) -> None:
    case = CASES[name]
    time_s, y = fly_ours(case)
    points = kept_points(name)
    heights = [p["h_m"] for p in points]
    tol_m = 2e-3 * (max(heights) - min(heights)) + 0.5
    tol_x_m = 2e-3 * max(p["x_m"] for p in points) + 0.5
    gamma = path_angle(y)
    for p in points:
        at = np.array([p["t_s"]])
        assert sampled(time_s, -y[:, r.D], at)[0] == pytest.approx(p["h_m"], abs=tol_m)
        assert sampled(time_s, y[:, r.N], at)[0] == pytest.approx(p["x_m"], abs=tol_x_m)
        assert sampled(time_s, y[:, r.V], at)[0] == pytest.approx(p["V_ms"], rel=4e-3)
        assert np.degrees(sampled(time_s, gamma, at)[0]) == pytest.approx(p["gamma_deg"], abs=0.15)
        assert np.degrees(sampled(time_s, y[:, r.ALPHA], at)[0]) == pytest.approx(p["alpha_deg"], abs=0.05)
        assert np.degrees(sampled(time_s, y[:, r.PITCH], at)[0]) == pytest.approx(p["q_degs"], abs=0.1)


# Events of JSBSim 1200 Hz on the sphere (REFERENCES.md section 3): path angle deg; t s, x m, h m, V m/s, alpha deg.
EVENTS = [
    ("A_jam_1g_trim_60dive", 0.0, 20.829, 4040.59, 369.38, 292.377, 2.862),
    ("B_jam_3g_trim_60dive", 0.0, 7.676, 1139.07, 830.15, 192.916, 8.539),
    ("F_light_loop", 90.0, 7.666, 326.14, 732.75, 36.150, 7.51),
    ("F_light_loop", 180.0, 13.068, 256.29, 832.94, 23.546, -3.645),
]


@pytest.mark.parametrize("row", EVENTS, ids=lambda row: f"{row[0][0]} {row[1]:.0f} deg")
def test_events_of_the_plane_cases(row: tuple[str, float, float, float, float, float, float]) -> None:
    name, angle, t, x, h, v, alpha = row
    time_s, y = fly_ours(CASES[name])
    late = time_s > 2.0
    when, end = at_angle(time_s[late], y[late], np.radians(angle))
    assert when == pytest.approx(t, rel=2e-3)
    assert end[r.N] == pytest.approx(x, rel=2e-3, abs=0.5)
    assert -end[r.D] == pytest.approx(h, abs=2e-3 * 2630.0 if name[0] == "A" else 1.5)
    assert end[r.V] == pytest.approx(v, rel=4e-3)
    assert np.degrees(end[r.ALPHA]) == pytest.approx(alpha, abs=0.05)


def scene_shape(airframe: Airframe) -> rig.Shape:
    """Shape of an airframe for JSBSim; lift and drag are written again from what the airframe's file means."""
    alpha = np.round(np.linspace(-0.5, 0.5, 2001), 10)
    a = alpha - airframe.alpha_zero_rad
    width = 2.0 * (airframe.cl_max - airframe.cl_buffet) / airframe.lift_slope
    x = np.clip((a - airframe.cl_buffet / airframe.lift_slope) / width, 0.0, 1.0)
    lift = np.where(x > 0.0, airframe.cl_buffet + (airframe.cl_max - airframe.cl_buffet) * x * (2.0 - x),
                    airframe.lift_slope * a)
    return rig.Shape(
        airframe.mass_kg, airframe.wing_area_m2, airframe.chord_m, airframe.inertia_pitch_kgm2, alpha, lift,
        airframe.cd_zero + airframe.cd_induced * lift**2,
        (airframe.cm_zero, airframe.cm_alpha, airframe.cm_q, airframe.cm_delta),
    )


@pytest.mark.parametrize("scene_name", ["late_freeze", "part_authority"])
def test_a_shipped_scene_replayed(scene_name: str, tmp_path: Path) -> None:
    """The lead's exported stabilator angle and thrust, flown by JSBSim: the same path, up to contact."""
    scene = read_scene(scene_name)
    _, flight, _ = fly_scene(scene, read_airframe, read_ground(scene.ground, scene.seed))
    airframe = flight.airframes[0]
    contact = flight.contact_s[0]
    end_s = np.floor((flight.time_s[-1] if contact is None else contact) * 20.0) / 20.0
    # within the lift curve that is written above
    kept = flight.time_s <= end_s
    top = (2.0 * airframe.cl_max - airframe.cl_buffet) / airframe.lift_slope
    assert -0.1 < np.min(flight.alpha_rad[kept, 0]) and np.max(flight.alpha_rad[kept, 0]) < top
    day = scene.day
    standard_k = 288.15 - 0.0065 * day.field_elevation_m
    warmer_k = 0.0 if day.temperature_k is None else day.temperature_k - standard_k

    def exported(values: Array) -> Callable[[float], float]:
        return lambda t: float(np.interp(t, flight.time_s, values[:, 0]))

    stab, thrust = exported(flight.stabilator_rad), exported(flight.thrust_n)
    theirs = rig.fly(
        tmp_path, scene_shape(airframe), speed_mps=float(flight.speed_mps[0, 0]), gamma_rad=0.0,
        height_m=day.field_elevation_m + float(flight.height_m[0, 0]), alpha_rad=float(flight.alpha_rad[0, 0]),
        end_s=float(end_s), stab_of=stab, thrust_of=lambda t, rho, v: thrust(t), warmer_k=warmer_k,
    )
    at = theirs.time_s
    # the path through the air, in the plane of the entry heading: wind carries it as a whole
    air = flight.vel_e_mps[:, 0] - wind_e_mps(day)
    level = scene.script[0]
    assert isinstance(level, Level) and level.heading_rad is not None
    ahead = air[:, 0] * np.cos(level.heading_rad) + air[:, 1] * np.sin(level.heading_rad)
    gamma = np.unwrap(np.arctan2(-air[:, 2], ahead))
    assert_close(sampled(flight.time_s, flight.height_m[:, 0], at) + day.field_elevation_m,
                 sampled(flight.time_s, flight.speed_mps[:, 0], at), sampled(flight.time_s, gamma, at), theirs)


def wind_e_mps(day: Day) -> Array:
    """Where the wind blows to, north, east, down, m/s: it is named after where it comes from."""
    if day.wind is None:
        return np.zeros(3)
    return -day.wind.speed_mps * np.array([np.cos(day.wind.from_rad), np.sin(day.wind.from_rad), 0.0])
