"""The ladder and false position on functions whose least value is known."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from render.decide.solve import least_values
from render.frames import Array

RUNGS = np.array([0.0, 10.0, 30.0, 60.0, 100.0])


@settings(max_examples=40, deadline=None)
@given(st.floats(0.5, 99.0), st.floats(0.01, 5.0), st.floats(-20.0, 20.0))
def test_smooth_roots_are_found_from_above(root: float, slope: float, low: float) -> None:
    def left(item: Array, value: Array) -> Array:
        x = value - low - root
        return np.column_stack([slope * x + 0.01 * slope * x * np.abs(x)])

    found, there = least_values(left, np.array([low]), RUNGS, 0.1, 0.01)
    assert 0.0 <= there[0, 0]
    assert found[0, 0] >= low + root - 1e-9
    assert there[0, 0] <= 0.01 or found[0, 0] - low - root <= 0.1


@settings(max_examples=25, deadline=None)
@given(st.floats(0.5, 99.0))
def test_a_jump_is_bracketed(root: float) -> None:
    found, there = least_values(
        lambda item, value: np.where(value >= root, np.inf, -np.inf)[:, None], np.array([0.0]), RUNGS, 0.1, 0.01, 20
    )
    assert root <= found[0, 0] <= root + 0.1 and there[0, 0] == np.inf


def test_none_is_told_from_always_and_each_observer_has_his_own() -> None:
    def left(item: Array, value: Array) -> Array:
        return np.column_stack([np.full(value.shape, 1.0), value - 42.0 - item, np.full(value.shape, -1.0)])

    found, there = least_values(left, np.array([0.0, 5.0]), RUNGS, 0.01, 0.001)
    assert list(found[:, 0]) == [0.0, 5.0] and list(there[:, 0]) == [1.0, 1.0]
    assert found[0, 1] == pytest.approx(42.0, abs=0.01) and found[1, 1] == pytest.approx(43.0, abs=0.01)
    assert np.all(np.isnan(found[:, 2]))


def test_of_two_roots_the_one_above_which_all_holds() -> None:
    def left(item: Array, value: Array) -> Array:
        return (np.abs(value - 20.0) - 15.0)[:, None]  # holds at 0..5, fails to 35

    found, _ = least_values(left, np.array([0.0]), RUNGS, 0.01, 0.001)
    assert found[0, 0] == pytest.approx(35.0, abs=0.01)
