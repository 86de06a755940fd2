"""Detector A."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from render.sight.detect import delayed, first_dwell, notice

T = np.arange(251) * 0.04


def test_ramp_is_noticed_a_dwell_after_it_crosses() -> None:
    # |D| = 0.1 t against 2 x 0.2: crosses at 4 s, noticed at 4.3 s; the crossing is between samples.
    assert float(notice(T, 0.1 * T, np.full(T.size, 0.2))) == pytest.approx(4.3, abs=1e-9)
    assert float(notice(T, -0.1 * T, np.full(T.size, 0.2003))) == pytest.approx(4.306, abs=1e-9)


def test_shorter_than_the_dwell_is_not_noticed() -> None:
    blip = np.where((T > 2.0) & (T < 2.25), 3.0, 0.0)
    assert np.isinf(first_dwell(T, blip))
    assert float(first_dwell(T, blip + np.where(T > 5.0, 3.0, 0.0))) == pytest.approx(5.3, abs=0.041)


def test_nothing_is_never_noticed() -> None:
    assert np.isinf(notice(T, np.zeros(T.size), np.full(T.size, 1e-9)))


def test_batch_equals_single() -> None:
    rng = np.random.default_rng(5)
    ratio = np.abs(np.cumsum(rng.normal(size=(6, 4, T.size)), axis=-1)) * 0.2
    got = first_dwell(T, ratio)
    for i in range(6):
        for j in range(4):
            assert got[i, j] == first_dwell(T, ratio[i, j])


@settings(max_examples=60, deadline=None)
@given(st.lists(st.floats(0.0, 3.0), min_size=251, max_size=251), st.floats(1.0, 3.0))
def test_more_noise_is_never_noticed_sooner(values: list[float], factor: float) -> None:
    ratio = np.convolve(values, np.ones(9) / 5.0, mode="same")
    assert first_dwell(T, ratio) <= first_dwell(T, ratio / factor) + 1e-12


def test_delay() -> None:
    # A ramp seen 0.1 s later, on a grid that 0.1 s isn't a multiple of.
    later = delayed(T, 0.04, 0.1)
    assert later[4:] == pytest.approx(T[4:] - 0.1)
    assert later[:2] == pytest.approx(0.0)
