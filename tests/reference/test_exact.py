"""The flight code against exact solutions: constant load factor, jammed surface, zero g, phugoid, turns, tables.

Figures: REFERENCES.md section 2, closed forms verified against scipy's DOP853 (rtol 1e-12) to 1e-8.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq

from render.flight import records as r
from render.flight.kinematics import fly_fixed, limit_demand
from render.frames import Array
from tests.reference import closed_forms as exact
from tests.reference.bare import (
    RHO,
    alpha_of,
    at_angle,
    bare_airframe,
    bare_case,
    fly_load_factor,
    path_angle,
    state,
)
from tests.reference.closed_forms import DEG, FT, KT, G

# E1, constant n, thrust = drag: gamma0 deg, V0 kt, n, gamma at the end; t s, V m/s, x m, height change m.
E1 = {
    "E1a": (-60.0, 300.0, 4.0, 0.0, 5.767025, 180.055556, 837.374638, -438.540445),
    "E1b": (-45.0, 250.0, 3.0, 0.0, 5.384452, 147.445772, 692.261101, -265.097554),
    "E1c": (-90.0, 200.0, 3.0, 0.0, 9.284668, 154.333333, 942.156746, -674.677608),
    "E1d": (0.0, 350.0, 4.0, 180.0, 11.914617, 108.033333, 643.587886, 1057.894489),
    "E1e": (0.0, 350.0, 4.0, 360.0, 23.829234, 180.055556, 1287.175773, 0.0),
}
# E2, constant n and constant V: gamma0 deg, V kt, n; t s, x m, height change m.
E2 = {
    "E2a": (-60.0, 300.0, 4.0, 5.205443, 670.018780, -374.407243),
    "E2b": (-30.0, 300.0, 5.0, 2.037295, 300.375514, -80.018004),
}
# E3, jammed surface, n = (V/V1)^2 (Lanchester 1908, Aerodonetics): V1 kt, gamma0 deg, V0 kt, gamma at the end;
# V m/s, height change m, n, t s, x m (None: not given).
E3: dict[str, tuple[float, float, float, float, float, float, float, float | None, float | None]] = {
    "E3a": (300.0, -60.0, 300.0, 0.0, 253.381924, -2058.991696, 2.695453, 19.356866, 3454.8038),
    "E3b": (300.0 / math.sqrt(3.0), -60.0, 300.0, 0.0, 183.886297, -509.623182, 4.258930, 6.223459, 897.3937),
    "E3c": (200.0, -90.0, 150.0, 0.0, 185.044790, -1442.229493, 3.234572, 16.114965, 1529.7258),
    "E3e": (350.0 / math.sqrt(5.0), 0.0, 350.0, 180.0, 86.622771, 1270.387878, 1.157234, None, None),
}


@pytest.mark.parametrize("case", E1)
def test_closed_forms_give_the_reference_figures(case: str) -> None:
    """The closed forms that other tests use are right: no program of ours in this one."""
    gamma0, kt, n, gamma1, t, v, x, dh = E1[case]
    args = (kt * KT, gamma0 * DEG, n, gamma1 * DEG)
    assert exact.pull_time(*args) == pytest.approx(t, rel=1e-6)
    assert exact.pull_speed(*args) == pytest.approx(v, rel=1e-8)
    assert exact.pull_distance(*args) == pytest.approx(x, rel=1e-8)
    assert exact.pull_height_change(*args) == pytest.approx(dh, rel=1e-8, abs=1e-9)


@pytest.mark.parametrize("case", E1)
def test_constant_load_factor_path_equations(case: str) -> None:
    """E1 with the load factor set exactly: only our equations of the path are at work."""
    gamma0, kt, n, gamma1, t, v, x, dh = E1[case]
    y = fly_load_factor(state(kt * KT, gamma0 * DEG, 3000.0), bare_airframe(), bare_case(), n, t, steps=1500)
    assert path_angle(y)[-1] == pytest.approx(gamma1 * DEG, abs=2e-6)
    assert y[-1, r.V] == pytest.approx(v, rel=1e-6)
    assert y[-1, r.N] == pytest.approx(x, rel=1e-6)
    assert -y[-1, r.D] - 3000.0 == pytest.approx(dh, rel=1e-6, abs=1e-3)
    assert np.max(np.abs(y[:, r.E])) < 1e-9


def surface_for_pull(af: Any, kt: float, gamma0: float, n: float, gamma1: float) -> tuple[Array, Array, Array]:
    """Surface history, rad, that keeps n constant along E1's path, and the state it begins with.

    Inverse of the textbook moment equation: Iy q' = qbar S c (Cma a + Cmq q c/2V + Cmd d), q = gamma' + a'.
    """
    h = exact.pull_history(kt * KT, gamma0 * DEG, n, gamma1 * DEG, 4001)
    v, g, dv, dg = h["speed_mps"], h["gamma_rad"], h["speed_rate"], h["gamma_rate"]
    qs = 0.5 * RHO * v**2 * af["wing_area_m2"]
    alpha = n * af["mass_kg"] * G / (qs * af["lift_slope"])
    dalpha = -2.0 * alpha * dv / v
    ddalpha = 2.0 * G * (dalpha * np.sin(g) / v + alpha * np.cos(g) * dg / v - alpha * np.sin(g) * dv / v**2)
    q, dq = dg + dalpha, h["gamma_rate_rate"] + ddalpha
    c = af["chord_m"]
    moment = af["inertia_pitch_kgm2"] * dq / (qs * c)
    surface = (moment - af["cm_alpha"] * alpha - af["cm_q"] * q * c / (2.0 * v)) / af["cm_delta"]
    return h["time_s"], surface, state(kt * KT, gamma0 * DEG, 3000.0, alpha_rad=alpha[0], pitch_radps=q[0])


@pytest.mark.parametrize("case", E1)
def test_constant_load_factor_through_the_whole_flight_code(case: str) -> None:
    """E1 flown by its surface alone: moment, angle of attack and path together, within 0.1 %."""
    gamma0, kt, n, gamma1, t, v, x, dh = E1[case]
    af = bare_airframe()
    times, surface, y0 = surface_for_pull(af, kt, gamma0, n, gamma1)
    steps = 3000
    y = fly_fixed(y0, af, bare_case(), times, surface, 1.0, t / steps, steps)
    assert path_angle(y)[-1] == pytest.approx(gamma1 * DEG, abs=1e-3 * abs(gamma1 - gamma0) * DEG)
    assert y[-1, r.V] == pytest.approx(v, rel=1e-3)
    assert y[-1, r.N] == pytest.approx(x, rel=1e-3)
    assert -y[-1, r.D] - 3000.0 == pytest.approx(dh, rel=1e-3, abs=1e-3 * 1057.9)
    qs = 0.5 * RHO * y[:, r.V] ** 2 * 16.0
    assert qs * 4.0 * y[:, r.ALPHA] / (5300.0 * G) == pytest.approx(n, rel=1e-3)


@pytest.mark.parametrize("case", E2)
def test_constant_load_factor_at_constant_speed(case: str) -> None:
    """E2: the speed is held by the test, the turn of the path is ours; radius at the bottom V^2/(g (n - 1))."""
    gamma0, kt, n, t, x, dh = E2[case]
    y0 = state(kt * KT, gamma0 * DEG, 3000.0)
    y = fly_load_factor(y0, bare_airframe(), bare_case(), n, t, steps=1500, hold_speed=True)
    assert path_angle(y)[-1] == pytest.approx(0.0, abs=2e-6)
    assert y[-1, r.N] == pytest.approx(x, rel=1e-6)
    assert -y[-1, r.D] - 3000.0 == pytest.approx(dh, rel=1e-6)
    rate = np.diff(path_angle(y))[-1] / (t / 1500)
    assert kt * KT / rate == pytest.approx({4.0: 809.613, 5.0: 607.210}[n], rel=1e-3)


def jammed(v1_mps: float) -> tuple[Any, float, float]:
    """Airframe whose jammed surface holds alpha, that surface (rad) and that alpha (rad): n = 1 at V1.

    E3 asks for a constant angle of attack: no pitch damping, and an inertia of a thousandth, so that
    the nose follows the path at once (alpha then stays within 1e-4 of itself).
    """
    af = bare_airframe(cm_q=0.0, inertia_pitch_kgm2=38.0)
    alpha = alpha_of(af, v1_mps, 1.0)
    return af, -af["cm_alpha"] * alpha / af["cm_delta"], alpha


def fly_jammed(v1_mps: float, gamma0_rad: float, v0_mps: float, end_s: float, *, height_m: float = 3000.0,
               case: Any = None, rho: float = RHO) -> tuple[Array, Array]:
    """Time and states of a jammed flight from a path angle and speed, the pitch rate that of the path."""
    af, _, _ = jammed(v1_mps)
    alpha = alpha_of(af, v1_mps, 1.0, rho)
    surface = -af["cm_alpha"] * alpha / af["cm_delta"]
    q0 = G * ((v0_mps / v1_mps) ** 2 - math.cos(gamma0_rad)) / v0_mps
    y0 = state(v0_mps, gamma0_rad, height_m, alpha_rad=alpha, pitch_radps=q0)
    dt = 0.002
    steps = round(end_s / dt)
    y = fly_fixed(y0, af, bare_case() if case is None else case, np.zeros(1), np.array([surface]), 1.0, dt, steps)
    return np.arange(steps + 1, dtype=np.float64) * dt, y


@pytest.mark.parametrize("case", E3)
def test_jammed_surface(case: str) -> None:
    v1, gamma0, v0, gamma1, v, dh, n, t, x = E3[case]
    time_s, y = fly_jammed(v1 * KT, gamma0 * DEG, v0 * KT, 25.0)
    when, end = at_angle(time_s[1:], y[1:], gamma1 * DEG)
    assert end[r.V] == pytest.approx(v, rel=1e-3)
    assert -end[r.D] - 3000.0 == pytest.approx(dh, rel=1e-3)
    assert (end[r.V] / (v1 * KT)) ** 2 == pytest.approx(n, rel=2e-3)  # twice the speed's, as a square
    if t is not None and x is not None:
        assert when == pytest.approx(t, rel=1e-3)
        assert end[r.N] == pytest.approx(x, rel=1e-3)
    # u cos(gamma) - u^3/3 is constant all along (Lanchester 1908)
    u = y[:, r.V] / (v1 * KT)
    kept = u * np.cos(path_angle(y)) - u**3 / 3.0
    assert np.max(np.abs(kept - kept[0])) < 1e-3 * np.max(np.abs(kept))


def test_zero_g_arc_is_a_parabola() -> None:
    """E4: 150 m/s thrown up at 60 deg; no air acts (a wing of no area), range and apex of the parabola to 1e-6."""
    steps, t = 2000, 26.493004
    y0 = state(150.0, 60.0 * DEG, 1000.0)
    y = fly_fixed(y0, bare_airframe(wing_area_m2=1e-12), bare_case(), np.zeros(1), np.zeros(1), 1.0, t / steps, steps)
    assert path_angle(y)[-1] == pytest.approx(-60.0 * DEG, rel=1e-6)
    assert y[-1, r.N] == pytest.approx(1986.975326, rel=1e-6)
    assert -y[-1, r.D] == pytest.approx(1000.0, abs=1e-4)
    assert y[-1, r.V] == pytest.approx(150.0, rel=1e-6)
    assert -y[steps // 2, r.D] - 1000.0 == pytest.approx(860.385555, rel=1e-6)
    assert y[steps // 2, r.V] == pytest.approx(75.0, rel=1e-6)


def period(time_s: Array, y: Array) -> float:
    """Time between the first and the third passage of the level path, s."""
    g = path_angle(y)
    i = np.flatnonzero((g[:-1] < 0.0) != (g[1:] < 0.0))
    i = i[i > 10]
    when = time_s[i] - g[i] * (time_s[i + 1] - time_s[i]) / (g[i + 1] - g[i])
    return float(when[2] - when[0])


# E5: period s of the jammed phugoid at 130 m/s, by amplitude (speed at the level start over V1, less one).
@pytest.mark.parametrize(("amplitude", "seconds"), [(0.001, 58.896239), (0.05, 58.902474), (0.20, 59.000957)])
def test_phugoid_period_in_air_of_one_density(amplitude: float, seconds: float) -> None:
    time_s, y = fly_jammed(130.0, 0.0, 130.0 * (1.0 + amplitude), 110.0)
    assert period(time_s, y) == pytest.approx(seconds, rel=1e-3)


def test_phugoid_is_faster_where_the_air_thins() -> None:
    """E5 with k = -rho'/rho = 1.0297e-4 1/m at 3000 m: T = 2 pi/sqrt(2 g^2/V^2 + g k) = 56.445 s."""
    case = bare_case(density_kgm3=-1.0)
    time_s, y = fly_jammed(130.0, 0.0, 130.0 * 1.001, 110.0, case=case, rho=0.90925)
    assert period(time_s, y) == pytest.approx(56.445, rel=1e-3)


def test_lanchesters_period_of_the_large_transport() -> None:
    """T1: sqrt(2) pi V/g = 106.792 s at 774 ft/s (Etkin & Reid 6.3; 107 s on heli-air.net, "6.3")."""
    time_s, y = fly_jammed(774.0 * FT, 0.0, 774.0 * FT * 1.001, 190.0)
    found = period(time_s, y)
    # the book rounds g to 32.2 ft/s2, 0.08 % more than here
    assert found * G / (32.2 * FT) == pytest.approx(106.792, rel=1e-3)
    assert found == pytest.approx(107.0, abs=0.5)


def test_energy_height_is_kept() -> None:
    """E6: 1000 m and 350 kt are 2652.9601 m of energy height, all along a pull with thrust = drag."""
    y = fly_load_factor(state(350.0 * KT, 0.0, 1000.0), bare_airframe(), bare_case(), 4.0, 23.8, steps=2000)
    assert -y[:, r.D] + y[:, r.V] ** 2 / (2.0 * G) == pytest.approx(2652.9601, rel=1e-6)


def greatest(cl_max: float, speed_mps: float, **changes: Any) -> float:
    """Load factor that lift allows at a speed at sea level, by our demand limit."""
    af = bare_airframe(cl_buffet=cl_max, cl_max=cl_max, **changes)
    n, _ = limit_demand(state(speed_mps, 0.0, 0.0), af, bare_case(), 50.0, cl_max)
    return float(n)


def test_stall_and_corner_speed_of_the_reference_trainer() -> None:
    """E6: 5300 kg, 16 m2, CLmax 1.05: Vs 138.150 kt, 7 g from 365.512 kt on, 4.7156 g at 300 kt."""
    assert brentq(lambda v: greatest(1.05, v) - 1.0, 30.0, 200.0) / KT == pytest.approx(138.150, rel=1e-5)
    assert brentq(lambda v: greatest(1.05, v) - 7.0, 30.0, 300.0) / KT == pytest.approx(365.512, rel=1e-5)
    assert greatest(1.05, 300.0 * KT) == pytest.approx(4.7156, rel=2e-5)


# E8: 50 kt stall -> 100 kt at 4 g -> 150 kt at 9 g, exact (FAA "Flight Training Handbook" text on avstop.com);
# 60 kt x 1.7 = 102 kt is 2.89 g.
@pytest.mark.parametrize(("stall_kt", "kt", "n"), [(50, 100, 4.0), (50, 150, 9.0), (60, 102, 2.89)])
def test_stall_speed_against_load_factor(stall_kt: float, kt: float, n: float) -> None:
    cl_max = 2.0 * 5300.0 * G / (RHO * 16.0 * (stall_kt * KT) ** 2)
    assert greatest(cl_max, kt * KT) == pytest.approx(n, rel=1e-9)
