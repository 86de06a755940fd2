"""Last pull and clearance against the closed form of the constant-load-factor pull-out."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from render.flight.fly import ground_arrays
from render.margin.escape import escape_heights, find_margin
from tests.flight.made import flat_ground
from tests.margin.dives import exact_plan, straight_dive
from tests.reference.closed_forms import DEG, G, pull_distance, pull_height_change, pull_speed

FLAT, GRID = ground_arrays(flat_ground())

# speed m/s and height m at the start of the dive, dive deg, load factor of the pull-out
DIVES = [(260.0, 2500.0, 60.0, 6.0), (280.0, 2500.0, 45.0, 9.0), (230.0, 1500.0, 30.0, 5.0)]


def height_needed(speed_mps: float, dive_rad: float, n: float) -> float:
    """Height lost by the pull-out, m: V (n - cos gamma) is constant, energy is kept (thrust = drag)."""
    return -pull_height_change(speed_mps, -dive_rad, n)


@pytest.mark.parametrize(("speed", "start_m", "dive_deg", "n"), DIVES)
def test_clearance_of_a_pull_out(speed: float, start_m: float, dive_deg: float, n: float) -> None:
    """E1: V (n - cos gamma) = C, height lost (V1^2 - V0^2)/2g; within 0.5 % of the height lost."""
    plan, dive = exact_plan(n), dive_deg * DEG
    flight = straight_dive(plan, speed_mps=speed, dive_rad=dive, height_m=start_m, end_s=8.0, n=n)
    times = np.arange(0.0, 8.1, 1.0)
    found = escape_heights(plan, flight, 0, times, FLAT, GRID)
    for t, clearance in zip(times, found, strict=True):
        v = speed + G * math.sin(dive) * t
        height = float(np.interp(t, flight.time_s, flight.height_m[:, 0]))
        assert height - clearance == pytest.approx(height_needed(v, dive, n), rel=5e-3)


@pytest.mark.parametrize(("speed", "start_m", "dive_deg", "n"), DIVES)
@pytest.mark.parametrize("floor_m", [0.0, 30.0, 150.0])
def test_last_pull_against_the_closed_form(
    speed: float, start_m: float, dive_deg: float, n: float, floor_m: float
) -> None:
    """The height at the last pull is the height the pull-out needs, within 0.5 %; so is its time."""
    plan, dive = exact_plan(n, floor_m=floor_m), dive_deg * DEG
    flight = straight_dive(plan, speed_mps=speed, dive_rad=dive, height_m=start_m, end_s=11.0, n=n)
    margin = find_margin(plan, flight, FLAT, GRID)

    def spare(t: float) -> float:
        v = speed + G * math.sin(dive) * t
        fallen = (v * v - speed * speed) / (2.0 * G)
        return start_m - fallen - floor_m - height_needed(v, dive, n)

    exact_s = float(brentq(spare, 0.0, 30.0))
    assert exact_s < 10.9  # or the case shows nothing
    found_s = margin.last_pull_floor_s[0]
    assert found_s == pytest.approx(exact_s, rel=5e-3)
    height = float(np.interp(found_s or 0.0, flight.time_s, flight.height_m[:, 0]))
    assert height - floor_m == pytest.approx(height_needed(speed + G * math.sin(dive) * exact_s, dive, n), rel=5e-3)
    # and the seconds left beside it, at the start and in the middle
    for t in (0.0, exact_s / 2.0):
        left = float(np.interp(t, margin.time_s, margin.seconds_floor_s[:, 0]))
        assert left == pytest.approx(exact_s - t, abs=5e-3 * exact_s)


def test_height_needed_grows_with_the_square_of_speed() -> None:
    """Doubling the speed quadruples the height (any text); by our escapes, not by the closed form."""
    lost = []
    for speed in (200.0, 400.0):
        plan = exact_plan(9.0)
        flight = straight_dive(plan, speed_mps=speed, dive_rad=45.0 * DEG, height_m=3000.0, end_s=0.1, n=9.0)
        lost.append(3000.0 - float(escape_heights(plan, flight, 0, np.array([0.0]), FLAT, GRID)[0]))
    assert lost[1] / lost[0] == pytest.approx(4.0, rel=1e-2)
    assert pull_speed(200.0, -45.0 * DEG, 9.0, 0.0) > 200.0


@pytest.mark.parametrize("delay_s", [0.5, 1.0, 2.0])
def test_a_delay_costs_the_dive_flown_meanwhile(delay_s: float) -> None:
    """Kinematics: a pull begun d later is the pull of the place and speed d later. 2 s at 300 kt, 60 deg: 267 m."""
    speed, dive = 300.0 * 1852.0 / 3600.0, 60.0 * DEG
    now = exact_plan(4.0)
    flight = straight_dive(now, speed_mps=speed, dive_rad=dive, height_m=2500.0, end_s=5.0)
    late = escape_heights(now, flight, 0, np.array([1.0]), FLAT, GRID, delay_s=delay_s)
    then = escape_heights(now, flight, 0, np.array([1.0 + delay_s]), FLAT, GRID, delay_s=0.0)
    lost = float(np.interp(1.0 + delay_s, flight.time_s, flight.height_m[:, 0])) - then[0]
    assert late[0] == pytest.approx(then[0], abs=5e-3 * lost)
    at_once = escape_heights(now, flight, 0, np.array([1.0]), FLAT, GRID, delay_s=0.0)
    # at least the height of the dive at the speed of the start (the rule of thumb), more as it gathers speed
    assert at_once[0] - late[0] > (speed + G * math.sin(dive)) * math.sin(dive) * delay_s


@pytest.mark.parametrize("foot_m", [500.0, 700.0, 900.0])
@pytest.mark.parametrize("slope_deg", [12.0, 20.0, 27.0])
def test_rising_ground_ahead_counts_after_the_path_has_turned_up(foot_m: float, slope_deg: float) -> None:
    """A 2.5 g pull from level flight at 200 m/s, 150 m up, over a plain that rises from a foot ahead on.

    The path is E1's: where it is nearest to the slope is worked out from the closed form, to 2 m.
    """
    speed, height, n = 200.0, 150.0, 2.5
    plan = exact_plan(n)
    flight = straight_dive(plan, speed_mps=speed, dive_rad=0.0, height_m=height, end_s=0.1, n=n)
    north = np.arange(-100.0, 12_001.0, 10.0)
    rise = np.maximum(north - foot_m, 0.0) * math.tan(slope_deg * DEG)
    heights, grid = np.stack([rise, rise], axis=1), np.array([-100.0, 0.0, 10.0])
    heights.setflags(write=False)  # as ``ground_arrays`` has it: the kernel is there already
    gammas = np.linspace(0.0, 60.0 * DEG, 600)
    above = []
    for gamma in gammas:
        x = pull_distance(speed, 0.0, n, gamma)
        ground = max(x - foot_m, 0.0) * math.tan(slope_deg * DEG)
        above.append(height + pull_height_change(speed, 0.0, n, gamma) - ground)
    found = float(escape_heights(plan, flight, 0, np.array([0.0]), heights, grid)[0])
    assert found == pytest.approx(min(above), abs=2.0)
