"""Margins of whole flights: floors, ground under the path, faulted leads, and the escape against a perfect pull."""

from __future__ import annotations

import dataclasses
import itertools

import numpy as np
import pytest
from scipy.optimize import brentq

from render.flight import escapes
from render.flight import records as r
from render.flight.fly import fly_scene, ground_arrays
from render.flight.kinematics import derivative, ground_height, limit_demand, load_factor_of
from render.flight.plan import Plan, escape_record
from render.flight.states import state_rows
from render.frames import Array
from render.margin.escape import escape_heights, find_margin
from render.types import Flight, Margin
from tests.flight.made import FT, flat_ground, freeze, invented_jet, loop_scene
from tests.reference.bare import path_direction

FLAT, GRID = ground_arrays(flat_ground())


def as_flown(heights: Array) -> Array:
    """Heights as ``ground_arrays`` has them, so that nothing is compiled for them alone."""
    heights.setflags(write=False)
    return heights


@pytest.fixture(scope="module")
def hero() -> tuple[Flight, Flight, Plan]:
    return fly_scene(loop_scene(freeze(245.0)), lambda _: invented_jet(), flat_ground())


@pytest.fixture(scope="module")
def margin(hero: tuple[Flight, Flight, Plan]) -> Margin:
    return find_margin(hero[2], hero[1], FLAT, GRID)


def with_floor(plan: Plan, floor_m: float) -> Plan:
    return dataclasses.replace(plan, scene=dataclasses.replace(plan.scene, floor_m=floor_m))


def test_margin_runs_off_from_the_fault_to_contact(hero: tuple[Flight, Flight, Plan], margin: Margin) -> None:
    _, faulted, _ = hero
    contact = faulted.contact_s[0]
    assert contact is not None and faulted.fault_s is not None
    dive = (margin.time_s >= faulted.fault_s) & (margin.time_s < contact - 0.1)
    for k in range(1, 3):
        assert np.all(np.diff(margin.clearance_ground_m[dive, k]) < 0.0)
        assert np.diff(margin.seconds_floor_s[dive, k]) == pytest.approx(-0.02, abs=1e-6)
        last = margin.last_pull_floor_s[k]
        assert last is not None and faulted.fault_s < last < contact
    # the lead can still roll, but not pull: his time is over long before theirs
    own, theirs = margin.last_pull_floor_s[0], margin.last_pull_floor_s[1]
    assert own is not None and theirs is not None and own < theirs - 1.0


def test_a_higher_floor_never_gives_more(hero: tuple[Flight, Flight, Plan], margin: Margin) -> None:
    _, faulted, plan = hero
    other = [find_margin(with_floor(plan, feet * FT), faulted, FLAT, GRID) for feet in (0.0, 400.0)]
    found = [other[0], margin, other[1]]  # 0, 100 and 400 ft
    for low, high in itertools.pairwise(found):
        for k in range(1, 3):
            before, after = low.last_pull_floor_s[k], high.last_pull_floor_s[k]
            assert before is not None and after is not None and after < before
            a, b = low.seconds_floor_s[:, k], high.seconds_floor_s[:, k]
            both = np.isfinite(a) & np.isfinite(b)
            assert np.all(b[both] <= a[both] + 1e-9)
            # what runs out above the lower floor runs out above the higher one too
            assert not np.any(np.isfinite(a) & np.isnan(b))
        assert high.last_pull_ground_s == low.last_pull_ground_s


def test_floor_and_ground_differ_by_the_floor(hero: tuple[Flight, Flight, Plan], margin: Margin) -> None:
    floor_m = hero[2].scene.floor_m
    assert floor_m == pytest.approx(100.0 * FT)
    gap = margin.clearance_ground_m - margin.clearance_floor_m
    np.testing.assert_allclose(gap[np.isfinite(gap)], floor_m, rtol=1e-12)
    for k in range(3):
        f, g = margin.last_pull_floor_s[k], margin.last_pull_ground_s[k]
        assert f is not None and g is not None and f <= g
    finite = np.isfinite(margin.seconds_floor_s) & np.isfinite(margin.seconds_ground_s)
    assert np.all(margin.seconds_floor_s[finite] <= margin.seconds_ground_s[finite] + 1e-9)


def test_a_frozen_lead_gains_nothing_by_pulling(hero: tuple[Flight, Flight, Plan], margin: Margin) -> None:
    """Wings level and pulling, his lowest point is that of the flight as it is, whenever he begins."""
    _, faulted, plan = hero
    assert margin.no_pull_left == (True, False, False)
    fault_s, contact = faulted.fault_s or 0.0, faulted.contact_s[0] or 0.0
    times = np.linspace(fault_s + 0.05, contact - 0.3, 12)
    y, n = state_rows(faulted, 0, times), len(times)
    held = np.full(n, float(np.interp(fault_s + 0.05, faulted.time_s, faulted.stabilator_rad[:, 0])))
    lowest, when = np.empty(n), np.empty(n)
    throttle = np.interp(times, faulted.time_s, faulted.throttle[:, 0])
    esc = escape_record(plan.scene.break_out, roll_first=False)
    escapes.fly_escapes(y, plan.af[:1], plan.case, esc, np.zeros(n), throttle, np.ones(n), held, FLAT, GRID, 0.02, 1200,
                       np.zeros(n), lowest, when)
    assert np.all(lowest < 0.0)
    # full power, which the break-out asks for, adds speed and with it a little lift: metres in hundreds
    assert np.ptp(lowest) < 0.05 * float(np.interp(fault_s, faulted.time_s, faulted.height_m[:, 0]))


def test_raised_ground_takes_away_its_height(hero: tuple[Flight, Flight, Plan]) -> None:
    _, faulted, plan = hero
    times = np.array([faulted.fault_s or 0.0, (faulted.fault_s or 0.0) + 2.0])
    flat = escape_heights(plan, faulted, 1, times, FLAT, GRID)
    raised = escape_heights(plan, faulted, 1, times, as_flown(FLAT + 40.0), GRID)
    np.testing.assert_allclose(flat - raised, 40.0, atol=1e-9)


def ridge(plan: Plan, faulted: Flight, time_s: float, ahead_m: float, height_m: float,
          width_m: float = 150.0) -> tuple[Array, Array]:
    """Ground with one ridge across the display line, its crest ahead_m beyond the wing's place at a time."""
    i = int(np.searchsorted(faulted.time_s, time_s))
    course = faulted.vel_e_mps[0, 1, :2] / np.linalg.norm(faulted.vel_e_mps[0, 1, :2])
    crest = float(faulted.pos_e_m[i, 1, :2] @ course) + ahead_m
    axis = np.arange(-8000.0, 8001.0, 50.0)
    n, e = np.meshgrid(axis, axis, indexing="ij")
    away = n * course[0] + e * course[1] - crest
    return as_flown(height_m * np.exp(-((away / width_m) ** 2))), np.array([axis[0], axis[0], 50.0])


def escape_path(plan: Plan, faulted: Flight, time_s: float, *, roll_first: bool = False, heights: Array = FLAT,
                grid: Array = GRID) -> Array:
    """Places and load factors (P, 4) of one of the right wing's two escapes, as far as it is flown."""
    y = state_rows(faulted, 1, np.array([time_s]))
    path = np.full((1200, 4), np.nan)
    esc = escape_record(plan.scene.break_out, roll_first=roll_first)
    throttle = float(np.interp(time_s, faulted.time_s, faulted.throttle[:, 1]))
    escapes.fly_escape(y[0], plan.af[1], plan.case[0], esc[0], 1.0, throttle, False, 0.0, heights, grid, 0.02, 1200,
                       path)
    return path[np.isfinite(path[:, 0])]


def above_ridge(plan: Plan, faulted: Flight, time_s: float, heights: Array, grid: Array) -> float:
    """Lowest height above a ground of the better of the two paths, worked out here point by point."""
    lowest = []
    for roll_first in (False, True):
        path = escape_path(plan, faulted, time_s, roll_first=roll_first, heights=heights, grid=grid)
        lowest.append(min(-d - ground_height(heights, grid, n, e) for n, e, d, _ in path))
    return float(max(lowest))


def bottom_ahead(plan: Plan, faulted: Flight, time_s: float) -> float:
    """How far ahead of the wing its escape (pulling as he is) is lowest, m, along the display line."""
    path = escape_path(plan, faulted, time_s)
    course = faulted.vel_e_mps[0, 1, :2] / np.linalg.norm(faulted.vel_e_mps[0, 1, :2])
    return float((path[np.argmax(path[:, 2]), :2] - path[0, :2]) @ course)


@pytest.mark.parametrize(("beyond_m", "crest_m"), [(0.0, 200.0), (350.0, 300.0), (-300.0, 100.0)])
def test_hills_under_the_path_count(hero: tuple[Flight, Flight, Plan], beyond_m: float, crest_m: float) -> None:
    """A ridge at the bottom of the escape, one that still rises ahead after it, one before it."""
    _, faulted, plan = hero
    when = (faulted.fault_s or 0.0) + 2.5
    flat = float(escape_heights(plan, faulted, 1, np.array([when]), FLAT, GRID)[0])
    heights, grid = ridge(plan, faulted, when, bottom_ahead(plan, faulted, when) + beyond_m, crest_m)
    over = float(escape_heights(plan, faulted, 1, np.array([when]), heights, grid)[0])
    assert over == pytest.approx(above_ridge(plan, faulted, when, heights, grid), abs=1.0)
    assert flat - over > 30.0


def test_a_hill_out_of_the_way_does_not_count(hero: tuple[Flight, Flight, Plan]) -> None:
    _, faulted, plan = hero
    when = (faulted.fault_s or 0.0) + 2.5
    flat = float(escape_heights(plan, faulted, 1, np.array([when]), FLAT, GRID)[0])
    heights, grid = ridge(plan, faulted, when, 6000.0, 60.0)
    over = float(escape_heights(plan, faulted, 1, np.array([when]), heights, grid)[0])
    assert over == pytest.approx(flat, abs=1e-6)


def perfect_pull(plan: Plan, y0: Array, late_s: float) -> Array:
    """States of a pull whose load factor follows the asked ramp exactly, late_s after the decision, until level.

    The angle of attack is set for it at every stage: no stick, no surface, no overshoot. Forces are ours.
    """
    af, case, asked = plan.af[1], plan.case[0], plan.scene.break_out
    n0 = load_factor_of(y0, af, case)[0]

    def rate(y: Array, t: float) -> Array:
        z, dy = y.copy(), np.empty(r.NY)
        n = min(n0 + asked.onset_gps * max(t - late_s, 0.0), asked.load_factor)
        n, _ = limit_demand(z, af, case, n, 0.97 * af["cl_max"])

        def short(alpha: float) -> float:
            z[r.ALPHA] = alpha
            return float(load_factor_of(z, af, case)[0] - n)

        z[r.ALPHA] = brentq(short, -0.05, 0.30, xtol=1e-9)
        derivative(z, af, case, 1.0, 1.0, 0.0, 1.0, False, 0.0, False, 0.0, dy)
        dy[[r.ALPHA, r.PITCH, r.ROLL]] = 0.0
        return dy

    y, t, h = y0.copy(), 0.0, 0.02
    states = [y]
    while path_direction(y)[2] > 0.0:
        middle = rate(y + 0.5 * h * rate(y, t), t + 0.5 * h)
        y = y + h * middle
        t += h
        states.append(y)
    return np.array(states)


AFTER_FAULT_S = (-1.0, 0.0, 1.0, 2.0, 3.0)


def pulls(hero: tuple[Flight, Flight, Plan], late_s: float) -> list[tuple[float, float, float]]:
    """Height, lowest height simulated, lowest height of the perfect pull, for the right wing."""
    _, faulted, plan = hero
    rows = []
    for after in AFTER_FAULT_S:
        t = (faulted.fault_s or 0.0) + after
        y0 = state_rows(faulted, 1, np.array([t]))[0]
        y0[r.ENGINE] = 1.0
        path = np.empty((0, 4))
        esc = escape_record(plan.scene.break_out, roll_first=False)
        low, _ = escapes.fly_escape(y0, plan.af[1], plan.case[0], esc[0], 0.0, 1.0, False, 0.0, FLAT, GRID, 0.02, 1200,
                                   path)
        rows.append((float(-y0[r.D]), low, float(np.min(-perfect_pull(plan, y0, late_s)[:, r.D]))))
    return rows


def test_an_escape_is_better_than_a_perfect_pull_half_a_second_late(hero: tuple[Flight, Flight, Plan]) -> None:
    """The lags of hand and surface (0.12 s, 0.10 s, 0.05 s and the nose) cost less than half a second."""
    for _, low, perfect in pulls(hero, 0.5):
        assert low > perfect


def test_an_escape_is_never_better_than_a_perfect_pull(hero: tuple[Flight, Flight, Plan]) -> None:
    """A margin must not flatter: the simulated pull needs at least the height of the perfect one, to 0.2 % of it."""
    for height, low, perfect in pulls(hero, 0.0):
        assert low <= perfect + 2e-3 * (height - perfect)
