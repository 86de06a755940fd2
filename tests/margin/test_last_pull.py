"""The search for the last pull against the whole curve, and flights begun from their twin against whole ones."""

from __future__ import annotations

import numpy as np
import pytest

from render.flight.batch import fly_batch, fly_faulted, fly_kept
from render.flight.closing import close_each, close_loops
from render.flight.fly import fly_scene, ground_arrays
from render.flight.plan import DT_S, Plan, compile_scene
from render.flight.script import M_SCRIPT_END_S
from render.frames import Array
from render.margin.escape import escape_heights, find_margin
from render.margin.last_pull import clearances, last_pulls
from render.types import Flight
from scenes.model import Scene
from scenes.reader import read_airframe, read_scene
from scenes.variants import with_value
from terrain.ground import read_ground

# Where the fault comes on, deg: into the ground, under the floor alone, nearly, and clear of it, of each scene.
ANGLES = {
    "late_freeze": (190.0, 262.0, 272.0, 276.0, 310.0), "early_pull_freeze": (20.0, 276.0),
    "part_authority": (20.0, 190.0, 262.0), "turboprop_vic": (190.0, 262.0, 272.0),
    "trailing_surface": (20.0, 190.0, 310.0),
}


def plan_of(scene: Scene) -> Plan:
    return compile_scene(scene, tuple(read_airframe(slot.airframe or scene.airframe) for slot in
                                      (*scene.formation, scene.formation[0])))


def rows(flight: Flight, plan: Plan, heights: Array, grid: Array) -> tuple[Array, Array]:
    """The wings' states again, (S, 1, T, NY) and (S, 1, T, NA)."""
    raw = fly_batch([plan], np.array([flight.loop_scale]), len(flight.time_s) + 60, heights, grid, healthy=False)
    return tuple(np.ascontiguousarray(v.transpose(2, 0, 1, 3)[1:]) for v in (raw.y, raw.a))  # type: ignore[return-value]


@pytest.mark.parametrize("name", ANGLES)
def test_the_search_finds_what_the_whole_curve_has(name: str) -> None:
    """Contact, dips under the floor alone, dips that only nearly are, and nothing at all; flat ground and hills."""
    base = read_scene(name)
    heights, grid = ground_arrays(ground := read_ground(base.ground, base.seed))
    kinds = set()
    for angle in ANGLES[name]:
        scene = with_value(base, "fault.at.loop_angle", f"{angle} deg")
        _, flight, plan = fly_scene(scene, read_airframe, ground)
        margin = find_margin(plan, flight, heights, grid)
        y, a = rows(flight, plan, heights, grid)
        contact = np.array([[np.nan if c is None else c for c in flight.contact_s[1:]]])
        found = last_pulls([plan], y, a, np.array([len(flight.time_s) - 1]), contact, heights, grid)
        for got, wanted in zip(found, (margin.last_pull_floor_s, margin.last_pull_ground_s), strict=True):
            want = [np.nan if w is None else w for w in wanted[1:]]
            np.testing.assert_allclose(got[0], want, rtol=0.0, atol=1e-10, equal_nan=True, err_msg=f"{name} {angle}")
            kinds.add((bool(np.isfinite(contact[0, 0])), bool(np.isfinite(got[0, 0]))))
    # contact or not, runs out or not
    assert len(kinds) >= (1 if name == "early_pull_freeze" else 2)


def test_a_clearance_is_that_of_one_escape() -> None:
    scene = read_scene("late_freeze")
    heights, grid = ground_arrays(ground := read_ground(scene.ground, scene.seed))
    _, flight, plan = fly_scene(scene, read_airframe, ground)
    y, a = rows(flight, plan, heights, grid)
    at_s = np.array([[[31.017, 33.5, np.nan], [36.913, 30.3, 25.0]]])
    got = clearances([plan], y, a, np.array([len(flight.time_s) - 1]), at_s, heights, grid)
    for k in (0, 1):
        for o in range(3):
            if np.isfinite(at_s[0, k, o]):
                one = escape_heights(plan, flight, k + 1, at_s[0, k, o : o + 1], heights, grid, delay_s=0.0)
                assert got[0, k, o] == pytest.approx(float(one[0]), abs=1e-9)
    assert np.isnan(got[0, 0, 2])


def test_flights_begun_from_their_twin_are_whole_flights_to_the_last_bit() -> None:
    base = read_scene("late_freeze")
    heights, grid = ground_arrays(read_ground(base.ground, base.seed))
    plans = [plan_of(with_value(base, "fault.at.loop_angle", f"{a} deg")) for a in (20, 200, 245, 300)]
    scale = close_loops(plans[:1], plans[0].longest_s)
    twin = fly_kept(plans[:1], scale, 2600, heights, grid, tail=400)
    end = round(float(twin.raw.mem[0, M_SCRIPT_END_S]) / DT_S)
    raw, begin = fly_faulted(plans, twin, np.zeros(4, dtype=np.int64), np.full(4, end), 2500, heights, grid)
    whole = fly_batch(plans, np.repeat(scale, 4), 2500, heights, grid, healthy=False)
    assert np.all(np.diff(begin) > 0)
    for b in range(4):
        last = int(raw.status[b, :, 1].min())
        assert last > begin[b] + 200
        np.testing.assert_array_equal(raw.y[b, :last], whole.y[b, :last])
        np.testing.assert_array_equal(raw.a[b, :last], whole.a[b, :last])


def test_a_fault_whose_point_is_never_reached_never_comes_on() -> None:
    base = read_scene("late_freeze")
    heights, grid = ground_arrays(read_ground(base.ground, base.seed))
    plans = [plan_of(base), plan_of(with_value(base, "fault.at.loop_angle", "359.9 deg"))]
    scale = close_loops(plans[:1], plans[0].longest_s)
    twin = fly_kept(plans[:1], scale, 2600, heights, grid, tail=400)
    _, begin = fly_faulted(plans, twin, np.zeros(2, dtype=np.int64), np.full(2, 2100), 2500, heights, grid)
    assert begin[0] > 0 and begin[1] == -1


def test_loops_closed_side_by_side_close_as_alone_and_say_which_cannot() -> None:
    base = read_scene("late_freeze")
    scenes = [base, with_value(base, "script.1.loop.close_at", "4000 ft"),
              with_value(base, "script.1.loop.close_at", "500 ft"), with_value(base, "script.0.level.speed", "250 kt")]
    plans = [plan_of(scene) for scene in scenes]
    scale, why = close_each(plans, plans[0].longest_s)
    assert [w is None for w in why] == [True, False, True, False]
    assert "can't close at 4000 ft" in str(why[1])
    for i in (0, 2):
        assert scale[i] == close_loops([plans[i]], plans[i].longest_s)[0]
    assert scale[2] != scale[0]
