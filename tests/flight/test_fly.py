"""A whole scene flown: the loop closes, the twins part only at the fault, mirrors mirror, batches equal singles."""

from __future__ import annotations

import numpy as np
import pytest

from render.errors import FlightError
from render.flight.batch import DT_S, fly_batch
from render.flight.closing import close_loops
from render.flight.fly import fly_scene, ground_arrays
from render.flight.plan import compile_scene
from render.flight.records import A_THROTTLE, Array
from render.flight.station import slot_place
from render.study import work_through
from render.types import OBSERVERS, Study
from scenes.model import Scene, Slot
from tests.flight.made import DEG, FT, flat_ground, freeze, invented_jet, loop_scene


@pytest.fixture(scope="module")
def hero() -> Study:
    return work_through(loop_scene(freeze(245.0)), lambda _: invented_jet(), flat_ground(), "")


def test_the_healthy_loop_closes_within_a_foot(hero: Study) -> None:
    bottom = np.interp(hero.healthy.events["bottom"], hero.healthy.time_s, hero.healthy.height_m[:, 0])
    assert abs(bottom - 300 * FT) < 1.0 * FT


def test_a_display_loop_near_385_kt_has_the_size_and_speeds_of_the_trade(hero: Study) -> None:
    # common practice, no source: entered near 385 kt a loop tops out well above 4,500 ft up
    h = hero.healthy
    rise = np.interp(h.events["top"], h.time_s, h.height_m[:, 0]) - h.height_m[0, 0]
    assert 4500 * FT < rise < 7000 * FT


def test_twins_are_one_flight_until_the_fault(hero: Study) -> None:
    before = hero.healthy.time_s <= hero.faulted.fault_s
    assert np.array_equal(hero.healthy.pos_e_m[before], hero.faulted.pos_e_m[before])


def test_with_a_frozen_surface_speed_load_factor_and_pitch_rate_go_on_rising(hero: Study) -> None:
    f = hero.faulted
    dive = (f.time_s > f.fault_s + 0.8) & (f.time_s < f.contact_s[0] - 0.1)
    assert np.all(np.diff(f.load_factor[dive, 0]) > 0.0)
    assert np.all(np.diff(f.cas_mps[dive, 0]) > 0.0)
    assert f.rate_b_radps[dive, 0, 1][-1] > f.rate_b_radps[dive, 0, 1][0]
    frozen = f.stabilator_rad[f.time_s > f.fault_s + 0.05, 0]
    assert np.ptp(frozen) == 0.0


def test_the_hero_is_contact_and_too_late_even_for_the_early_observer(hero: Study) -> None:
    slot = hero.verdict["slots"]["right"]
    assert hero.verdict["lead"]["contact_time_s"] is not None
    assert slot["lateness_s"]["early"] > 0.0
    times = [slot["notice"][o]["time_s"] for o in OBSERVERS]
    assert hero.faulted.fault_s < times[0] <= times[1] <= times[2]


def missed_m(scene: Scene) -> tuple[Array, Array]:
    """How far each wing pilot was from his slot, m, and his throttle, (W, I), up to the bottom of the healthy loop."""
    heights, grid = ground_arrays(flat_ground())
    healthy, _, plan = fly_scene(scene, lambda _: invented_jet(), flat_ground())
    until = int(healthy.events["bottom"] / DT_S)
    raw = fly_batch([plan], np.array([healthy.loop_scale]), until, heights, grid, healthy=True)
    y, rows = raw.y[0], range(0, until, 10)
    gaps = [[np.linalg.norm(y[i, k, :3] - slot_place(y[:, 0], plan.case[0], float(i), DT_S, slot)) for i in rows]
            for k, slot in enumerate(plan.slots, start=1)]
    return np.array(gaps), raw.a[0, list(rows), 1:, A_THROTTLE].T


def test_wings_hold_line_abreast_echelon_vic_and_box_slots_to_three_metres() -> None:
    # common practice, no source: formation scatter of a practised pilot is a metre or few
    slots = (Slot("abreast", 0.0, 14.0, 0.0), Slot("echelon", 8.0, 12.0, 1.0), Slot("vic", 8.0, -12.0, 0.0),
             Slot("box", 14.0, 0.0, 3.0))
    missed, _ = missed_m(loop_scene(slots=slots))
    assert np.max(missed) < 3.0 and np.min(np.max(missed, axis=1)) > 0.01


def test_a_trail_slot_is_held_as_long_as_there_is_thrust() -> None:
    """Over the top the one astern still climbs while the lead goes down already: he needs more thrust than the lead."""
    missed, throttle = missed_m(loop_scene(slots=(Slot("trail", 30.0, 0.0, 3.0),)))
    at_the_stop = np.array([np.max(throttle[0][max(0, i - 15) : i + 1]) > 0.999 for i in range(len(throttle[0]))])
    worst = int(np.argmax(missed[0]))
    assert 3.0 < missed[0][worst] < 6.0 and at_the_stop[worst]


def test_a_slot_astern_lies_on_the_path_the_lead_has_flown() -> None:
    """Closed form: straight flight in a wind; 30 m astern is 30 m back along the airspeed, beside and below it."""
    plan = compile_scene(loop_scene(), (invented_jet(),) * 3)
    case = plan.case.copy()
    case["wind_n_mps"], case["wind_e_mps"] = 3.0, -4.0
    lead = np.repeat(plan.entry[:1], 101, axis=0)
    t = np.arange(101) * DT_S
    heading = 80.0 * DEG
    lead[:, 0] += (lead[0, 3] * np.cos(heading) + 3.0) * t
    lead[:, 1] += (lead[0, 3] * np.sin(heading) - 4.0) * t
    for row in (0.0, 3.0, 50.0, 99.5):
        place = np.array(slot_place(lead, case[0], row, DT_S, np.array([30.0, 5.0, 2.0])))
        here = np.array([np.interp(row, np.arange(101), lead[:, m]) for m in range(3)])
        along = -30.0 * np.array([np.cos(heading), np.sin(heading), 0.0])
        beside = 5.0 * np.array([-np.sin(heading), np.cos(heading), 0.0])
        assert place == pytest.approx(here + along + beside + [0.0, 0.0, 2.0], abs=1e-9)


def test_a_mirrored_formation_mirrors(hero: Study) -> None:
    right, left = hero.verdict["slots"]["right"], hero.verdict["slots"]["left"]
    assert right["last_pull_s"] == pytest.approx(left["last_pull_s"], abs=1e-6)
    for observer in OBSERVERS:
        assert right["notice"][observer]["time_s"] == pytest.approx(left["notice"][observer]["time_s"], abs=1e-6)


def test_a_batch_equals_its_single_flights(all_threads: None) -> None:
    heights, grid = ground_arrays(flat_ground())
    plans = [compile_scene(loop_scene(freeze(a)), (invented_jet(),) * 3) for a in np.linspace(200.0, 300.0, 8)]
    scale = np.ones(len(plans))
    together = fly_batch(plans, scale, 1500, heights, grid, healthy=False)
    for i, plan in enumerate(plans):
        alone = fly_batch([plan], scale[:1], 1500, heights, grid, healthy=False)
        assert np.max(np.abs(together.y[i] - alone.y[0])) < 1e-9


def test_a_slower_base_scales_the_back_half_monotonically() -> None:
    plans = [compile_scene(loop_scene(close_ft=f, slots=()), (invented_jet(),)) for f in (300.0, 600.0, 900.0)]
    scale = close_loops(plans, plans[0].longest_s)
    assert np.all(np.diff(scale) > 0.0)


def test_a_loop_that_cannot_close_says_what_is_reachable() -> None:
    with pytest.raises(FlightError, match=r"can't close at 20000 ft: .* are reachable; limited by"):
        fly_scene(loop_scene(close_ft=20000.0), lambda _: invented_jet(), flat_ground())


def test_a_loop_without_the_speed_says_that_the_top_is_never_reached() -> None:
    with pytest.raises(FlightError, match="never reaches its top"):
        fly_scene(loop_scene(kt=200.0), lambda _: invented_jet(), flat_ground())


def test_a_fault_point_that_is_never_reached_is_an_error() -> None:
    from scenes.model import Fault, Point

    with pytest.raises(FlightError, match="height 20000 ft going up is not passed"):
        fly_scene(loop_scene(Fault("freeze", Point("height", 20000 * FT, "up"))), lambda _: invented_jet(),
                  flat_ground())


def test_energy_balances_thrust_and_drag_work() -> None:
    from render.flight import records as r

    heights, grid = ground_arrays(flat_ground())
    plan = compile_scene(loop_scene(slots=()), (invented_jet(),))
    raw = fly_batch([plan], np.ones(1), 1500, heights, grid, healthy=True)
    y = raw.y[0, :, 0]
    energy = 5300.0 * (0.5 * y[:, r.V] ** 2 - 9.80665 * y[:, r.D])
    work = y[:, r.WORK_T] - y[:, r.WORK_D]
    # closed form: the change of total energy is the work of thrust along the path less that of drag
    assert np.max(np.abs(energy - energy[0] - work)) < 1e-4 * np.max(np.abs(y[:, r.WORK_T]))
