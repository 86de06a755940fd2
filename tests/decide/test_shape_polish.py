"""Steps of the linear programme on problems whose least is known; a loop led into its limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from render.decide.shape_polish import Judge, Judged, polish
from render.frames import Array


def ball(aim: Array, middle: Array, radius: float, spent: list[int]) -> Judge:
    """Freezes late by the distance from ``aim`` along each axis, either way; one limit: the ball about ``middle``."""

    def judge(loads: Array, always: bool) -> Judged:
        spent.append(len(loads))
        parts = np.linalg.norm(loads - middle, axis=1)[:, None] / radius
        excess = np.maximum(parts[:, 0] - 1.0, 0.0)
        late = np.concatenate([loads - aim, aim - loads], axis=1)
        late[(excess > 0.0) & (not always)] = np.nan
        return Judged(parts, excess, late)

    return judge


@settings(max_examples=25, deadline=None)
@given(st.lists(st.floats(1.5, 4.5), min_size=4, max_size=4), st.lists(st.floats(1.2, 4.8), min_size=4, max_size=4))
def test_the_least_of_a_maximum_is_found_within_a_round_limit(aim: list[float], start: list[float]) -> None:
    aimed, middle, spent = np.array(aim), np.full(4, 3.0), [0]
    found = polish(ball(aimed, middle, 1.0, spent), np.array(start), 0.5, 6.0, lambda: False)
    assert np.linalg.norm(found - middle) <= 1.0
    # the least t for which the box of half side t about the aim meets the ball
    away = np.abs(aimed - middle)
    lo, hi = 0.0, 6.0
    for _ in range(60):
        t = 0.5 * (lo + hi)
        lo, hi = (lo, t) if np.linalg.norm(np.maximum(away - t, 0.0)) <= 1.0 else (t, hi)
    assert np.abs(found - aimed).max() <= hi + 0.04
    assert sum(spent) < 700


def test_it_stops_when_told_and_keeps_what_it_has() -> None:
    spent: list[int] = []
    start = np.full(3, 3.0)
    found = polish(ball(np.full(3, 4.0), start, 0.5, spent), start, 0.5, 6.0, lambda: True)
    assert np.array_equal(found, start) and spent == [1]


def test_what_no_step_betters_is_left_as_it_is() -> None:
    aim = np.full(3, 3.0)
    found = polish(ball(aim, aim, 1.0, []), aim, 0.5, 6.0, lambda: False)
    assert np.array_equal(found, aim)


def test_a_pull_that_cannot_be_flown_is_given_up() -> None:
    def judge(loads: Array, always: bool) -> Judged:
        return Judged(np.full((len(loads), 2), np.nan), np.full(len(loads), np.inf), np.full((len(loads), 3), np.nan))

    start = np.full(3, 3.0)
    assert np.array_equal(polish(judge, start, 0.5, 6.0, lambda: False), start)
    one = Judged(np.ones((1, 2)), np.zeros(1), np.array([[1.0, np.nan]]))
    assert one.merit(0) == pytest.approx(1e3)
