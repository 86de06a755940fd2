"""What moves on a drawn aircraft: signs and sizes of ailerons, heads, stabilator."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from render.frames import quat_from_euler, quat_rotate
from render.picture.instant import AILERON_MAX_RAD, Instant, instant_at
from render.picture.stage import moved_parts
from render.types import Flight
from tests.output.made_up import made_up_flight


def rolling(rate_radps: np.ndarray) -> Flight:
    """A flight whose roll rate (T,) is given, all aircraft alike."""
    flight = made_up_flight(None)
    rates = np.zeros_like(flight.rate_b_radps)
    rates[:, :, 0] = rate_radps[:, None]
    return replace(flight, rate_b_radps=rates)


def test_a_steady_roll_right_at_the_greatest_rate_takes_all_aileron() -> None:
    most = made_up_flight(None).airframes[0].roll_rate_max_radps
    instant = instant_at(rolling(np.full(721, 0.5 * most)), 10.0)
    assert instant.aileron_rad == pytest.approx(np.full(3, 0.5 * AILERON_MAX_RAD))
    moved = moved_parts(instant, 0)
    # positive trailing edge down: the left one goes down, the right one up, and the aircraft rolls right
    assert moved["aileron_left"] > 0.0 > moved["aileron_right"] == -moved["aileron_left"]


def test_a_roll_that_dies_away_by_itself_shows_no_aileron() -> None:
    # the free answer of a first-order lag, exp(-t / T), is what neutral ailerons give
    flight = made_up_flight(None)
    lag = flight.airframes[0].roll_s
    instant = instant_at(rolling(np.exp(-(flight.time_s - 10.0) / lag)), 10.0)
    # of the rate 1 rad/s itself: sinh(0.2) / 0.2 - 1 = 0.7 % by the difference, 0.3 % each by samples 0.05 s apart
    assert np.abs(instant.aileron_rad).max() < 0.013 * AILERON_MAX_RAD / flight.airframes[0].roll_rate_max_radps


def test_wing_pilots_heads_turn_to_the_lead_and_his_stays_ahead() -> None:
    quat = np.stack([quat_from_euler(1.0, 0.4, 0.2)] * 3)
    offsets = np.array([[0.0, 0.0, 0.0], [-8.0, 14.0, 0.0], [0.0, -14.0, 0.0]])
    pos = np.stack([quat_rotate(quat[k], offsets[k]) for k in range(3)])
    instant = Instant(0.0, pos, quat, np.array([-0.1, 0.0, 0.0]), np.zeros(3), (True,) * 3)
    assert moved_parts(instant, 0)["head"] == 0.0
    assert moved_parts(instant, 1)["head"] == pytest.approx(-np.arctan2(14.0, 8.0))  # he is on the left of that one
    assert np.degrees(moved_parts(instant, 2)["head"]) == pytest.approx(80.0)  # as far as a neck turns
    assert moved_parts(instant, 0)["stabilator"] == -0.1
