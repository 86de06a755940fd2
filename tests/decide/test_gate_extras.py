"""Base, float and other days beside the gates."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from render.decide import gate_extras
from render.decide.brief import bottoms, brief, compile_brief
from render.decide.gate_extras import base_needed, floated, largest_floats, lifted, other_days
from render.decide.gates import Solver
from render.flight.air import air_at
from render.flight.inside import begin_at, fly_far
from scenes.model import Level, Loop, Slot
from tests.flight.made import DEG, FT, flat_ground, invented_jet, loop_scene

ONE = (Slot("right", 0.0, 14.0, 0.0),)


@pytest.fixture(autouse=True)
def fewer_freeze_points(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(gate_extras, "STEP_RAD", 40.0 * DEG)


def test_lifting_lifts_entry_and_base() -> None:
    scene = lifted(loop_scene(), 100.0)
    first, loop, last = scene.script
    assert isinstance(first, Level) and isinstance(loop, Loop) and isinstance(last, Level)
    assert first.height_m == pytest.approx(300 * FT + 100.0) and loop.close_at_m == pytest.approx(300 * FT + 100.0)
    assert last.height_m is None


def test_floating_takes_g_away_over_the_top_and_nowhere_else() -> None:
    before, after = loop_scene().script[1], floated(loop_scene(), 0.3).script[1]
    assert isinstance(before, Loop) and isinstance(after, Loop)
    at = np.radians(np.arange(0.0, 358.0, 1.0))
    change = PchipInterpolator(after.angle_rad, after.load_factor)(at) - PchipInterpolator(
        before.angle_rad, before.load_factor)(at)
    over = np.abs(at - np.pi)
    assert change[np.argmin(over)] == pytest.approx(-0.3, abs=1e-9)
    assert np.all(np.abs(change[over > 60.0 * DEG]) < 0.1) and np.all(np.abs(change[over > 100.0 * DEG]) < 1e-9)


def test_another_day_is_warmer_or_higher_with_the_same_air() -> None:
    days = other_days(loop_scene())
    standard = air_at(0.0, 0.0)[0]
    assert days["hotter"].day.temperature_k == pytest.approx(standard + 10.0)
    assert days["higher"].day.field_elevation_m == pytest.approx(304.8)
    assert days["higher"].day.temperature_k == pytest.approx(standard)


def test_the_largest_float_brings_the_loop_to_the_floor() -> None:
    flown = brief(loop_scene(slots=ONE), lambda _: invented_jet())
    floats = largest_floats(Solver(flown, flat_ground(), 1.5, True, who=(1,)), lambda _: invented_jet())
    assert set(floats) == {"briefed", "limit", "likely"}
    found = floats["briefed"]
    assert 0.0 < found.less_g < 0.6 and found.longer_s > 0.0 and not found.whole

    def bottom(less_g: float) -> float:
        plan = begin_at(compile_brief(floated(flown.plan.scene, less_g), lambda _: invented_jet()), flown.up)
        return float(bottoms([plan], fly_far([plan], flown.scales, 48.0))[0])

    floor = flown.scene.floor_m
    assert bottom(found.less_g) >= floor and bottom(found.less_g + 0.01) < floor
    # a freeze can't leave the wanted seconds in a loop that breaks the floor by itself
    assert floats["likely"].none or floats["likely"].less_g <= found.less_g + 0.01


def test_a_base_too_high_to_enter_is_not_asked_for() -> None:
    # so little thrust that level flight at the entry speed ends some hundred metres up
    weak = invented_jet(thrust_static_n=23.0e3, thrust_density_exponent=3.0)
    flown = brief(loop_scene(slots=ONE), lambda _: weak)
    base, why = base_needed(Solver(flown, flat_ground(), 60.0, True, who=(1,)), lambda _: weak)
    assert base.shape == (1,)
    assert np.isfinite(base[0]) or why
