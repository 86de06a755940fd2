"""What physics demands: later is never better once the nose is down, higher is never worse."""

from __future__ import annotations

import itertools
from functools import lru_cache

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from render.decide.brief import Brief, brief
from render.decide.left import Left, only, work_left
from render.flight.fly import ground_arrays
from render.flight.inside import begin_at, frozen_at
from render.margin.escape import escape_heights
from render.study import work_through
from render.types import Study
from tests.flight.made import DEG, flat_ground, freeze, invented_jet, loop_scene


@lru_cache
def study(angle_deg: float) -> Study:
    return work_through(loop_scene(freeze(angle_deg)), lambda _: invented_jet(), flat_ground(), "")


@lru_cache
def flown() -> Brief:
    return brief(loop_scene(), lambda _: invented_jet())


@settings(max_examples=25, deadline=None)
@given(st.sampled_from([205.0, 235.0, 260.0]), st.floats(0.0, 1.0), st.floats(0.0, 1.0), st.sampled_from([1, 2]))
def test_acting_later_never_ends_higher(angle_deg: float, a: float, b: float, k: int) -> None:
    found = study(angle_deg)
    flight = found.faulted
    end = flight.contact_s[k]
    assert end is not None
    down = float(flight.time_s[np.argmax(flight.loop_angle_rad[:, 0] > 235.0 * DEG)])
    first, later = sorted(max(down, flight.fault_s or 0.0) + x * (end - down) * 0.98 for x in (a, b))
    later = min(later, end)
    heights, grid = ground_arrays(flat_ground())
    low = escape_heights(flown().plan, flight, k, np.array([min(first, end), later]), heights, grid)
    # a twentieth of a metre: states between steps are interpolated
    assert low[1] <= low[0] + 0.05


def test_noticing_later_is_never_less_late() -> None:
    for angle in (205.0, 235.0, 260.0):
        for notes in (study(angle).notices["right"], study(angle).notices["left"]):
            late = [n.lateness_s for n in notes if n.lateness_s is not None]
            when = [n.time_s for n in notes if n.time_s is not None]
            assert when == sorted(when) and late == sorted(late)
            clear = [n.clearance_m for n in notes if n.clearance_m is not None]
            assert all(x >= y - 0.05 for x, y in itertools.pairwise(clear) if y > -30.0)


def left_at(height_m: float, angle_deg: float) -> Left:
    b = flown()
    twin = only(begin_at(b.plan, b.gates["top"], height_m=height_m), (1,))
    return work_left([twin], b.scales, [frozen_at(twin, angle_deg * DEG)], [0], flat_ground(), 28.0)


@settings(max_examples=12, deadline=None)
@given(st.floats(185.0, 330.0), st.floats(-60.0, 300.0), st.floats(5.0, 200.0))
def test_a_higher_pass_never_has_its_last_pull_sooner(angle_deg: float, by_m: float, higher_m: float) -> None:
    at = flown().gates["top"].height_m + by_m
    low, high = left_at(at, angle_deg), left_at(at + higher_m, angle_deg)
    if np.isfinite(low.fault_s[0]):
        assert high.last_pull_s[0, 0] >= low.last_pull_s[0, 0] - 0.01
        assert high.low_m[0, 0] >= low.low_m[0, 0] - 0.05
