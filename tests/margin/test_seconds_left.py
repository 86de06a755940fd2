"""Seconds left out of clearances: hand-worked series."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from render.margin.escape import seconds_left

T = np.arange(5.0)


def test_a_straight_line_runs_out_where_it_crosses() -> None:
    left, last = seconds_left(T, np.array([30.0, 20.0, 10.0, 0.0, -10.0]))
    assert last == pytest.approx(3.0)
    assert left == pytest.approx([3.0, 2.0, 1.0, 0.0, -1.0])


def test_between_two_instants_it_is_a_straight_line() -> None:
    left, last = seconds_left(T, np.array([30.0, 10.0, -30.0, -40.0, -50.0]))
    assert last == pytest.approx(1.25)
    assert left == pytest.approx([1.25, 0.25, -0.75, -1.75, -2.75])


def test_what_never_runs_out_has_no_seconds() -> None:
    left, last = seconds_left(T, np.array([30.0, 20.0, 15.0, 18.0, 40.0]))
    assert last is None
    assert np.all(np.isnan(left))


def test_a_clearance_that_comes_back_counts_again_and_the_last_end_is_the_last_pull() -> None:
    left, last = seconds_left(T, np.array([10.0, -10.0, 10.0, 10.0, -10.0]))
    assert last == pytest.approx(3.5)
    assert left == pytest.approx([0.5, -0.5, 1.5, 0.5, -0.5])


def test_gone_from_the_start_counts_from_the_start() -> None:
    left, last = seconds_left(T, np.array([-1.0, -2.0, -3.0, -4.0, -5.0]))
    assert last == 0.0
    assert left == pytest.approx([0.0, -1.0, -2.0, -3.0, -4.0])


def test_after_contact_there_is_no_value() -> None:
    left, last = seconds_left(T, np.array([10.0, 5.0, -5.0, np.nan, np.nan]))
    assert last == pytest.approx(1.5)
    assert left[:3] == pytest.approx([1.5, 0.5, -0.5])
    assert np.all(np.isnan(left[3:]))


falling = st.lists(st.floats(-50.0, 50.0), min_size=3, max_size=12)


@given(falling, st.floats(0.0, 40.0))
def test_a_higher_floor_never_gives_more_time(clearance: list[float], higher_m: float) -> None:
    c = np.array(clearance)
    t = np.arange(float(c.size))
    low, _ = seconds_left(t, c)
    high, _ = seconds_left(t, c - higher_m)
    # NaN: does not run out, more than any number
    low, high = np.where(np.isnan(low), np.inf, low), np.where(np.isnan(high), np.inf, high)
    here = (c >= 0.0) & (c - higher_m >= 0.0)
    assert np.all(high[here] <= low[here] + 1e-9)
    assert np.all(high[c - higher_m < 0.0] <= 0.0)


@given(falling)
def test_time_runs_off_second_by_second(clearance: list[float]) -> None:
    c = np.array(clearance)
    left, last = seconds_left(np.arange(float(c.size)), c)
    if last is None:
        assert np.all(c >= 0.0)
        return
    for i in range(c.size - 1):
        if c[i] >= 0.0 and c[i + 1] >= 0.0 and np.isfinite(left[i + 1]):
            assert left[i] - left[i + 1] == pytest.approx(1.0)
