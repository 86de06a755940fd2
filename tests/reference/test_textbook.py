"""Worked examples of textbooks, through our own derivative and our own trim (REFERENCES.md section 2, T1-T6)."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq

from render.flight.air import air_at, air_at_geopotential, geometric
from render.flight.plan import trim_level
from tests.flight.made import invented_jet
from tests.reference.bare import RHO, alpha_of, bare_airframe, bare_case, state
from tests.reference.closed_forms import DEG, FT, G
from tests.reference.linear import longitudinal, modes, path_rates, short_period_block, steady_pull

SLUG = 14.5939029372064
LBF = 4.4482216152605


def trainer(**changes: Any) -> Any:
    """The reference trainer with its thrust along the path and equal to the drag."""
    return bare_airframe(**changes)


# T5, stick-fixed surface per g in a pull-up, d(delta)/dn = [Cma dalpha + Cmq g c/(2 V^2)]/-Cmd: method of the USAF
# Test Pilot School, Flying Qualities ch. 6 (ADA319977); trainer, rho 1.225: V m/s, deg per g.
@pytest.mark.parametrize(("speed_mps", "deg_per_g"), [(100.0, -3.0867), (154.333, -1.2959), (180.0, -0.9527)])
def test_surface_angle_per_g(speed_mps: float, deg_per_g: float) -> None:
    af, case = trainer(), bare_case()
    (a1, d1), (a3, d3) = steady_pull(af, case, speed_mps, 1.0), steady_pull(af, case, speed_mps, 3.0)
    assert (d3 - d1) / 2.0 / DEG == pytest.approx(deg_per_g, rel=1e-4)
    if speed_mps == 154.333:
        assert (a3 - a1) / 2.0 == pytest.approx(0.055666, rel=1e-4)
        assert (d3 - d1) / 2.0 == pytest.approx(-0.022618, rel=1e-4)


def test_surface_angle_per_g_falls_as_one_over_speed_squared() -> None:
    af, case = trainer(), bare_case()

    def per_g(v: float) -> float:
        return steady_pull(af, case, v, 3.0)[1] - steady_pull(af, case, v, 1.0)[1]

    assert per_g(200.0) / per_g(100.0) == pytest.approx(0.25, rel=1e-6)


# T6, short-period approximation (Etkin & Reid; Nelson): wn^2 = -Ma - Mq La/(mV), 2 zeta wn = La/(mV) - Mq.
def test_short_period_of_the_trainer() -> None:
    af, case = trainer(), bare_case()
    block = short_period_block(af, case, 154.333)
    assert block[0, 0] == pytest.approx(-1.14148, rel=1e-4)
    assert block[0, 1] == pytest.approx(1.0, rel=1e-9)
    assert block[1, 0] == pytest.approx(-6.49594, rel=1e-4)
    assert block[1, 1] == pytest.approx(-0.98912, rel=1e-4)
    wn = math.sqrt(np.linalg.det(block))
    assert wn == pytest.approx(2.76134, rel=5e-3)
    assert -np.trace(block) / (2.0 * wn) == pytest.approx(0.38579, rel=5e-3)


def test_short_period_grows_with_speed_and_keeps_its_damping() -> None:
    af, case = trainer(), bare_case()
    block = short_period_block(af, case, 100.0)
    wn = math.sqrt(np.linalg.det(block))
    assert wn == pytest.approx(1.78921, rel=5e-3)
    assert -np.trace(block) / (2.0 * wn) == pytest.approx(0.38579, rel=5e-3)


def test_short_period_of_the_large_transport() -> None:
    """T1, Etkin & Reid 3rd ed. 6.2-6.3 (40 000 ft, M 0.8), matrix on solutioninn.com 1102608.

    Zw -.3151, Mw -.001026, Mq -.4285 (ft, s), u0 773.98 ft/s (their q column of w'); our coefficients are
    worked out from these for a made-up mass and wing: the two-by-two block's root is -.371800 +- .889319i.
    """
    speed, zw, mw, mq = 773.98 * FT, -0.3151, -0.001026 / FT, -0.4285
    mass, area, chord, inertia = 2.5e5, 500.0, 8.0, 4.5e7
    qs = 0.5 * RHO * speed**2 * area
    af = trainer(
        mass_kg=mass, wing_area_m2=area, chord_m=chord, inertia_pitch_kgm2=inertia, lift_slope=-zw * mass * speed / qs,
        cm_alpha=mw * speed * inertia / (qs * chord), cm_q=mq * inertia * 2.0 * speed / (qs * chord**2), cd_induced=0.0,
    )
    root = modes(short_period_block(af, bare_case(), speed))[0]
    assert root.real == pytest.approx(-0.371800, abs=1e-4)
    assert root.imag == pytest.approx(0.889319, abs=1e-4)
    # of the full matrix, read in the book from memory: -.3719 +- .8875i
    assert root == pytest.approx(-0.3719 + 0.8875j, abs=3e-3)


def test_modes_of_the_light_single() -> None:
    """T2, Nelson, Flight Stability and Automatic Control, a light single at 176 ft/s (from memory, recomputed).

    Its data: 2750 lb, 184 ft2, chord 5.7 ft, Iy 3000 slug ft2, CL .41, CD .05, CLa 4.44, CDa .33, Cma -.683,
    Cmq -9.96, Cma' -4.36. Our model has no Cma' (downwash lag): the test adds it from our own row of w'.
    Published: A = [-.045 .036 0 -32.2; -.369 -2.02 176 0; .0019 -.0396 -2.948 0; 0 0 1 0] (ft, s), roots
    -.0171 +- .213i and -2.5 +- 2.59i.
    """
    mass, area, chord, inertia, speed = 2750.0 * LBF / G, 184.0 * FT**2, 5.7 * FT, 3000.0 * SLUG * FT**2, 176.0 * FT
    rho = 2.0 * mass * G / (0.41 * area * speed**2)
    k = 0.33 / (2.0 * 0.41 * 4.44)
    drag = 0.05 * 0.5 * rho * speed**2 * area
    af = bare_airframe(
        thrust_equals_drag=False, mass_kg=mass, wing_area_m2=area, chord_m=chord, inertia_pitch_kgm2=inertia,
        lift_slope=4.44, alpha_zero_rad=-0.41 / 4.44, cd_zero=0.05 - k * 0.41**2, cd_induced=k, cm_alpha=-0.683,
        cm_q=-9.96, thrust_static_n=drag, thrust_density_exponent=0.0,
    )
    matrix = longitudinal(af, bare_case(density_kgm3=rho), speed, 0.0, 0.0, 1.0)
    qsc = 0.5 * rho * speed**2 * area * chord
    lag = -4.36 * qsc * chord / (2.0 * speed**2 * inertia)  # Mw', 1/m
    matrix[2] += lag * matrix[1]
    published = np.array([[-0.045, 0.036, 0.0, -32.2 * FT], [-0.369, -2.02, 176.0 * FT, 0.0],
                          [0.0019 / FT, -0.0396 / FT, -2.948, 0.0], [0.0, 0.0, 1.0, 0.0]])
    slow, fast = modes(matrix)
    assert slow == pytest.approx(-0.0171 + 0.213j, rel=1e-2)
    assert fast == pytest.approx(-2.5 + 2.59j, rel=1e-2)
    assert matrix == pytest.approx(published, rel=2e-2, abs=2e-3)


# T3, Stevens & Lewis, Aircraft Control and Simulation, longitudinal transport model (from memory, recomputed):
# V ft/s, h ft; throttle, alpha deg, elevator deg. S 2170 ft2, c 17.5 ft, m 5000 slug, CL = .20 + .085 alpha deg,
# CD = .016 + .042 CL^2, Cm = .05 - .022 alpha - .016 delta (deg) + thrust at 2 ft, T = (60000 - 38 V) lbf,
# rho = .002377 (1 - .703e-5 h)^4.14, g 32.17 ft/s2.
@pytest.mark.parametrize(
    ("v_fps", "h_ft", "throttle", "alpha_deg", "stab_deg"),
    [(170.0, 0.0, 0.2965, 22.0936, -25.7323), (500.0, 0.0, 0.2927, 0.5798, 2.4607),
     (500.0, 30e3, 0.2038, 5.4334, -4.0992)],
)
def test_trim_of_the_longitudinal_transport(v_fps: float, h_ft: float, throttle: float, alpha_deg: float,
                                            stab_deg: float) -> None:
    rho = 0.002377 * (1.0 - 0.703e-5 * h_ft) ** 4.14 * SLUG / FT**3
    height_m = brentq(lambda h: air_at(h, 0.0)[2] - rho, -400.0, 12e3)  # where our air has the model's density
    sound = air_at(height_m, 0.0)[3]
    speed, area, chord = v_fps * FT, 2170.0 * FT**2, 17.5 * FT
    # full thrust falls in a straight line with speed; ours does so with Mach
    figures: dict[str, Any] = dict(
        mass_kg=5000.0 * SLUG * 32.17 * FT / G, wing_area_m2=area, chord_m=chord,
        inertia_pitch_kgm2=4.1e6 * SLUG * FT**2,
        lift_slope=0.085 / DEG, alpha_zero_rad=-0.20 / 0.085 * DEG, cl_buffet=9.0, cl_max=9.0, cl_min=-9.0,
        cd_zero=0.016, cd_induced=0.042, cm_alpha=-0.022 / DEG, cm_q=-1.0, cm_delta=-0.016 / DEG,
        thrust_static_n=60e3 * LBF, thrust_density_exponent=0.0, thrust_mach_1=-38.0 * sound / FT / 60e3,
        thrust_mach_2=0.0, stab_min_rad=-1.0,
    )
    alpha, _, part = trim_level(invented_jet(**figures), height_m, 0.0, speed)
    thrust = part * (60e3 - 38.0 * v_fps) * LBF
    lifting = 2.0 * FT * thrust / (0.5 * rho * speed**2 * area * chord)  # our model has the thrust through the centre
    _, stab, _ = trim_level(invented_jet(**figures, cm_zero=0.05 + lifting), height_m, 0.0, speed)
    assert part == pytest.approx(throttle, abs=1e-3)
    assert alpha / DEG == pytest.approx(alpha_deg, abs=0.01)
    assert stab / DEG == pytest.approx(stab_deg, abs=0.01)


def test_trim_of_the_reference_trainer() -> None:
    """REFERENCES.md section 3: 130 m/s, 3000 m, flat earth: alpha .104497 rad, 5741.873 N, surface -.036172 rad."""
    jet = invented_jet(cl_buffet=1.05, cl_max=1.05, cd_induced=0.14, cm_zero=0.0, thrust_static_n=23e3,
                       thrust_mach_1=0.0, thrust_mach_2=0.0)
    alpha, stab, part = trim_level(jet, geometric(3000.0), 0.0, 130.0)
    full = 23e3 * (air_at_geopotential(3000.0, 0.0)[2] / 1.225) ** 0.7
    assert alpha == pytest.approx(0.104497, abs=2e-6)
    assert stab == pytest.approx(-0.036172, abs=2e-6)
    assert part * full == pytest.approx(5741.873, rel=1e-4)


def test_manoeuvre_rates() -> None:
    """T4, Megson, Aircraft Structures, ch. 13 (problem with Vs 46.5 m/s, 4 g, from memory; printed to 2 %).

    Pull-out from a 60 deg dive at Vs sqrt(4) = 93 m/s: 0.37 rad/s. Level turn at 4 g: yaw 0.103 rad/s; its
    pitch rate (g/V)(n - 1/n) = 0.3954 rad/s recomputed.
    """
    af, case, speed = trainer(), bare_case(), 46.5 * math.sqrt(4.0)
    alpha = alpha_of(af, speed, 4.0)
    dive = path_rates(state(speed, -60.0 * DEG, 0.0, alpha_rad=alpha), af, case)
    assert dive[1] == pytest.approx(0.37, rel=2e-2)
    assert dive[1] == pytest.approx(0.3691, rel=2e-4)
    turn = path_rates(state(speed, 0.0, 0.0, bank_rad=math.acos(0.25), alpha_rad=alpha), af, case)
    assert turn[2] == pytest.approx(0.103, rel=2e-2)
    assert turn[2] == pytest.approx(0.1021, rel=5e-4)
    assert turn[1] == pytest.approx(0.3954, rel=5e-4)
