"""Many flights at once against one flight worked through; what the words of Left mean."""

from __future__ import annotations

import math

import numpy as np
import pytest

from render.decide.left import all_slots, only, unlike_slots, work_left
from render.flight.closing import close_loops
from render.flight.inside import begin_at, crossing, fly_far, frozen_at
from render.flight.plan import compile_scene
from render.study import work_through
from tests.flight.made import DEG, flat_ground, freeze, invented_jet, loop_scene


@pytest.mark.parametrize("angle_deg", [200.0, 250.0, 300.0])
def test_a_batch_says_what_one_flight_says(angle_deg: float) -> None:
    study = work_through(loop_scene(freeze(angle_deg)), lambda _: invented_jet(), flat_ground(), "")
    plan = compile_scene(loop_scene(), (invented_jet(),) * 3)
    scale = close_loops([plan], plan.longest_s)
    left = work_left([plan], scale, [frozen_at(plan, angle_deg * DEG)], [0], flat_ground(), 55.0)
    assert left.fault_s[0] == pytest.approx(study.faulted.fault_s, abs=1e-9)
    for k, slot in enumerate(("right", "left")):
        last = study.margin.last_pull_floor_s[k + 1]
        # both interpolate the clearance between instants a tenth of a second apart, not the same ones
        assert left.last_pull_s[0, k] == pytest.approx(math.inf if last is None else last, abs=0.01)
        for o, note in enumerate(study.notices[slot]):
            # the eye samples every 0.04 s, not at the same instants
            want = math.inf if note.time_s is None else note.time_s
            assert left.notice_s[0, k, o] == pytest.approx(want, abs=0.05)
            if note.lateness_s is not None and np.isfinite(last or np.nan):
                assert -left.in_hand_s()[0, k, o] == pytest.approx(note.lateness_s, abs=0.06)


def test_a_flight_begun_at_the_top_goes_on_as_it_was() -> None:
    plan = compile_scene(loop_scene(), (invented_jet(),) * 3)
    scale = close_loops([plan], plan.longest_s)
    raw = fly_far([plan], scale, 60.0)
    gate = crossing(plan, raw, 0, math.pi)
    begun = fly_far([begin_at(plan, gate)], scale, 15.0)
    steps = np.arange(begun.y.shape[1]) + gate.time_s / 0.02
    for q, tolerance in ((2, 0.02), (3, 0.005)):  # height, m; speed, m/s: half a step of the hand's memory apart
        whole = np.interp(steps, np.arange(raw.y.shape[1]), raw.y[0, :, 0, q])
        assert np.max(np.abs(whole - begun.y[0, :, 0, q])) < tolerance
        wing = np.interp(steps, np.arange(raw.y.shape[1]), raw.y[0, :, 1, q])
        # what he has learnt to hold against is forgotten at the gate: a metre, as much as he holds his slot to
        assert np.max(np.abs(wing - begun.y[0, :, 1, q])) < 1.0


def test_mirror_slots_are_left_out_of_searches_only() -> None:
    plan = compile_scene(loop_scene(), (invented_jet(),) * 3)
    assert all_slots(plan) == (1, 2)
    assert unlike_slots(plan) == (1,)
    assert [slot.name for slot in only(plan, (2,)).scene.formation] == ["left"]


def test_never_noticed_and_never_run_out_are_told_apart() -> None:
    plan = compile_scene(loop_scene(), (invented_jet(),) * 3)
    scale = close_loops([plan], plan.longest_s)
    left = work_left([plan], scale, [frozen_at(plan, a * DEG) for a in (230.0, 345.0)], [0, 0], flat_ground(), 55.0)
    hand = left.in_hand_s()
    assert np.all(np.isfinite(left.last_pull_s[0])) and np.all(hand[0] < np.inf)
    assert np.all(np.isinf(left.last_pull_s[1])) and np.all(hand[1] == np.inf)
    assert np.all(hand[0, :, 0] >= hand[0, :, 1]) and np.all(hand[0, :, 1] >= hand[0, :, 2])
