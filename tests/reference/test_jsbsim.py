"""Our flight code beside JSBSim 1.3.x on the same invented aircraft, live and from points kept as a file.

Ours: flat earth, constant gravity. JSBSim: a sphere without rotation. Tolerances: REFERENCES.md section 3
(height 0.2 % of the range flown + 0.5 m, speed 0.4 %, path angle 0.15 deg, over the whole history).
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from render.flight import records as r
from render.frames import Array
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
