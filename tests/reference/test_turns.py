"""The flight code in level turns: rate, radius, load factor and stall speed of printed tables (E7, E8)."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from render.flight import records as r
from render.flight import script as s
from render.flight.airframe import stab_for_steady
from render.flight.kinematics import derivative
from render.flight.plan import MAX_KNOTS
from render.frames import Array
from tests.flight.made import lead_alone
from tests.reference.bare import alpha_of, bare_airframe, bare_case, fly_load_factor, path_direction, state
from tests.reference.closed_forms import DEG, FT, KT, G

# E7: V kt, bank deg, n, deg/s, R m, R ft; then with the FAA's rounded constants 1,091 and 11.26 (FAA-H-8083-25,
# ch. 5 "rate/radius of turn", figures from memory): deg/s, ft.
TURNS = [
    (120.0, 30.0, 1.1547, 5.2549, 673.100, 2208.33, 5.249, 2215.1),
    (240.0, 30.0, 1.1547, 2.6274, 2692.399, 8833.33, 2.625, 8860.2),
    (300.0, 60.0, 2.0000, 6.3059, 1402.291, 4600.69, 6.299, 4614.7),
]


def rate_and_radius(y: Array, dt_s: float) -> tuple[float, float]:
    """Rate of turn, rad/s, and radius, m, of a flown circle."""
    x = path_direction(y)
    heading = np.unwrap(np.arctan2(x[:, 1], x[:, 0]))
    rate = (heading[-1] - heading[0]) / (dt_s * (len(y) - 1))
    return float(rate), float(np.mean(y[:, r.V]) / rate)


@pytest.mark.parametrize("row", TURNS, ids=lambda row: f"{row[0]:.0f} kt {row[1]:.0f} deg")
def test_level_turn(row: tuple[float, ...]) -> None:
    kt, bank, n, degps, radius_m, radius_ft, faa_degps, faa_ft = row
    exact_n = 1.0 / math.cos(bank * DEG)
    assert exact_n == pytest.approx(n, abs=5e-5)
    y0 = state(kt * KT, 0.0, 1000.0, bank_rad=bank * DEG)
    y = fly_load_factor(y0, bare_airframe(), bare_case(), exact_n, 30.0, steps=600)
    rate, radius = rate_and_radius(y, 0.05)
    assert -y[:, r.D] == pytest.approx(1000.0, abs=0.01)
    assert rate / DEG == pytest.approx(degps, rel=2e-5)
    assert radius == pytest.approx(radius_m, rel=2e-5)
    assert radius / FT == pytest.approx(radius_ft, rel=2e-5)
    assert rate / DEG == pytest.approx(faa_degps, rel=5e-3)
    assert radius / FT == pytest.approx(faa_ft, rel=5e-3)
    # a full circle closes on itself: 360 deg at 2 pi R
    assert 2.0 * math.pi * radius / (kt * KT) == pytest.approx(360.0 / degps, rel=1e-4)


@pytest.mark.parametrize("row", TURNS, ids=lambda row: f"{row[0]:.0f} kt {row[1]:.0f} deg")
def test_level_turn_through_the_leads_hand(row: tuple[float, ...]) -> None:
    """The same turns flown by the lead's stick for 8 s, within 0.1 %; pitch rate in the turn (g/V)(n - 1/n)."""
    kt, bank, _, degps, radius_m, *_ = row
    n = 1.0 / math.cos(bank * DEG)
    af = bare_airframe()
    v, dt, steps = kt * KT, 0.01, 800
    q = G / v * (n - 1.0 / n)
    alpha = alpha_of(af, v, n)
    y0 = state(v, 0.0, 1000.0, bank_rad=bank * DEG, alpha_rad=alpha, pitch_radps=q)
    y0[r.STAB] = stab_for_steady(af, alpha, q, v)
    y0[r.NDEM], y0[r.STICK] = n, -y0[r.STAB] / -af["stab_min_rad"]
    # a "roll" of no rate that never ends holds its load factor
    row_of = np.zeros((1, s.NS))
    row_of[0, s.S_KIND], row_of[0, s.S_LOAD], row_of[0, s.S_ANGLE] = r.ROLL_STEP, n, 9.0
    knots, coeffs = np.arange(float(MAX_KNOTS))[None], np.zeros((1, MAX_KNOTS - 1, 4))
    y, a, _, stopped = lead_alone(y0, af, bare_case(), row_of, knots, coeffs, dt, steps)
    assert stopped == (r.OK, steps)
    rate, radius = rate_and_radius(y, dt)
    assert rate / DEG == pytest.approx(degps, rel=1e-3)
    assert radius == pytest.approx(radius_m, rel=1e-3)
    assert a[:, r.A_N] == pytest.approx(n, rel=1e-3)
    assert y[:, r.PITCH] == pytest.approx(q, rel=1e-3)
    assert -y[-1, r.D] == pytest.approx(1000.0, abs=1.0)


def level_load_factor(bank_deg: float) -> float:
    """Load factor at which our derivative keeps a banked path level."""
    af, case = bare_airframe(), bare_case()

    def bending(n: float) -> float:
        y = state(100.0, 0.0, 1000.0, bank_rad=bank_deg * DEG)
        y[r.ALPHA] = alpha_of(af, 100.0, n)
        dy = np.empty(r.NY)
        derivative(y, af, case, 1.0, 1.0, 0.0, 1.0, False, 0.0, False, 0.0, dy)
        ahead, back = y + 1e-6 * dy, y - 1e-6 * dy
        return float((path_direction(ahead) - path_direction(back))[2])

    return float(brentq(bending, 0.5, 100.0, xtol=1e-10))


# Load factor table of the FAA's Flight Training Handbook text (avstop.com, aeronauticalhandbook.blogspot.com),
# tolerance half a unit of the last digit; 30 deg is printed 1.154 (exact 1.1547) and 80 deg 5.747 (exact 5.7588).
@pytest.mark.parametrize(
    ("bank_deg", "printed", "tol"),
    [(10, 1.015, 5e-4), (30, 1.154, 8e-4), (45, 1.414, 5e-4), (60, 2.000, 5e-4), (70, 2.923, 1e-3),
     (80, 5.747, 3e-3 * 5.747), (85, 11.473, 1e-3)],
)
def test_load_factor_of_a_level_turn(bank_deg: float, printed: float, tol: float) -> None:
    assert level_load_factor(bank_deg) == pytest.approx(printed, abs=tol)


# Soaring table (Welch, Welch & Irving; stolaf.edu): bank deg, load factor, stall speed ratio.
@pytest.mark.parametrize(
    ("bank_deg", "n", "ratio"), [(60, 2.00, 1.41), (70, 2.92, 1.71), (75, 3.86, 1.97), (80, 5.76, 2.40)]
)
def test_stall_speed_in_a_turn(bank_deg: float, n: float, ratio: float) -> None:
    found = level_load_factor(bank_deg)
    assert found == pytest.approx(n, abs=5.1e-3)
    assert math.sqrt(found) == pytest.approx(ratio, abs=5.1e-3)


def test_pages_about_turns() -> None:
    """aerovia.org: 120 kt at 30 deg 1.155 g, stall x 1.075, 68.5 s a circle; aviation formulary: 100 kt at 45 deg."""
    n = level_load_factor(30.0)
    assert n == pytest.approx(1.155, abs=5e-4)
    assert math.sqrt(n) == pytest.approx(1.075, abs=5e-4)
    y = fly_load_factor(state(120.0 * KT, 0.0, 1000.0, bank_rad=30.0 * DEG), bare_airframe(), bare_case(), n, 20.0,
                        steps=400)
    rate, _ = rate_and_radius(y, 0.05)
    assert 2.0 * math.pi / rate == pytest.approx(68.5, abs=0.05)
    n = level_load_factor(45.0)
    y = fly_load_factor(state(100.0 * KT, 0.0, 1000.0, bank_rad=45.0 * DEG), bare_airframe(), bare_case(), n, 20.0,
                        steps=400)
    rate, radius = rate_and_radius(y, 0.05)
    # aviation formulary: 891 ft and 10.9 deg/s (exact 885.4 ft, 10.922 deg/s; its constants are rounded to 1 %)
    assert radius / FT == pytest.approx(891.0, rel=1e-2)
    assert rate / DEG == pytest.approx(10.9, rel=1e-2)


def test_banks_of_two_load_factors() -> None:
    """70.53 deg is 3 g (a page says 'just past 72'), 75.52 deg doubles the stall speed (AC 1-20: 'just over 75')."""
    assert level_load_factor(70.5288) == pytest.approx(3.0, rel=1e-5)
    assert level_load_factor(72.0) == pytest.approx(3.24, abs=5e-3)
    assert math.sqrt(level_load_factor(75.5225)) == pytest.approx(2.0, rel=1e-5)
