"""The canal filter against its own closed form (NOTICING.md 2.1)."""

from __future__ import annotations

import numpy as np
import pytest

from render.sight.canal import ADAPTATION_S, CANAL_S, canal_filter, canal_step_response


def test_step_response() -> None:
    # Closed form of H(s)/s by partial fractions; the bilinear rule is within (step/T)^2 of it, and half a
    # step of the discontinuity at 0.
    step = 0.01
    t = np.arange(6001) * step
    felt = canal_filter(np.ones(t.size), step)
    assert felt == pytest.approx(canal_step_response(t + step / 2), abs=2e-5)


def test_time_constants() -> None:
    # J Neurophysiol 102:2232-2244 (2009): 5.7 and 80 s. After 5.7 s about e^-1 is left, and it overshoots later.
    assert (CANAL_S, ADAPTATION_S) == (5.7, 80.0)
    assert canal_step_response(np.array([0.0]))[0] == pytest.approx(1.0)
    assert canal_step_response(np.array([30.0]))[0] < 0.0  # a steady turn is felt as none, then as the opposite


def test_frequency_response() -> None:
    # |H| at 0.3 Hz from H(s) itself; the filter's steady amplitude must be that.
    step, w = 0.01, 2 * np.pi * 0.3
    t = np.arange(30000) * step
    felt = canal_filter(np.sin(w * t), step)
    s = 1j * w
    gain = abs(s * 5.7 * s * 80.0 / ((5.7 * s + 1) * (80.0 * s + 1)))
    assert np.abs(felt[-1000:]).max() == pytest.approx(gain, rel=1e-3)


def test_batch_equals_single() -> None:
    rate = np.random.default_rng(1).normal(size=(4, 3, 200))
    assert canal_filter(rate, 0.04)[2, 1] == pytest.approx(canal_filter(rate[2, 1], 0.04), abs=1e-15)
