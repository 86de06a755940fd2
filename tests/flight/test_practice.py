"""What the trade knows of loops, on the shipped jet trainer. Common practice, no source; wide bounds."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from render.flight.fly import fly_scene
from render.types import Flight
from scenes.model import Day, Level, Loop, Power
from scenes.reader import read_airframe, read_scene
from terrain.ground import read_ground
from tests.flight.made import DEG, FT, KT, flat_ground


def shipped(name: str) -> tuple[Flight, Flight]:
    """Healthy twin and faulted flight of a shipped scene."""
    scene = read_scene(name)
    healthy, faulted, _ = fly_scene(scene, read_airframe, read_ground(scene.ground, scene.seed))
    return healthy, faulted


def lead_at(flight: Flight, values: np.ndarray, event: str) -> float:
    return float(np.interp(flight.events[event], flight.time_s, values[:, 0]))


def test_a_loop_from_near_500_kt_and_6_g_needs_about_10000_ft() -> None:
    """Common practice, no source: full dry power, 6 g to begin with, eased to 2.4 g upright and 0.8 g at the top."""
    eased = {0.0: 1.2, 8.0: 6.0, 25.0: 5.5, 60.0: 3.6, 90.0: 2.4, 130.0: 1.3, 180.0: 0.8, 360.0: 1.0}
    loop = Loop(tuple(a * DEG for a in eased), tuple(eased.values()), Power("full"))
    base = read_scene("healthy_loop")
    # from well up, since nothing brings this loop round by itself
    script = (Level(495.0 * KT, 1000.0 * FT, 80.0 * DEG, 2.0), loop)
    airframe = dataclasses.replace(read_airframe(base.airframe), speed_max_mps=700.0 * KT, mach_max=0.95)
    scene = dataclasses.replace(base, script=script, day=Day(), fault=None, formation=())
    flight, _, _ = fly_scene(scene, lambda _: airframe, flat_ground())
    rise = lead_at(flight, flight.height_m, "top") - lead_at(flight, flight.height_m, "entry")
    assert rise == pytest.approx(10_000.0 * FT, rel=0.10)
    up = (flight.time_s > flight.events["entry"]) & (flight.time_s < flight.events["vertical_up"])
    assert np.max(flight.load_factor[up, 0]) == pytest.approx(6.0, abs=0.5)


@pytest.fixture(scope="module")
def display() -> Flight:
    return shipped("healthy_loop")[0]


def test_a_display_loop_tops_out_5500_to_7000_ft_higher(display: Flight) -> None:
    """Common practice, no source: entered near 385 kt."""
    assert lead_at(display, display.cas_mps, "entry") / KT == pytest.approx(385.0, abs=8.0)
    rise = lead_at(display, display.height_m, "top") - lead_at(display, display.height_m, "entry")
    assert 5500.0 * FT < rise < 7000.0 * FT


def test_a_display_loop_is_as_fast_straight_down_as_straight_up(display: Flight) -> None:
    """Common practice, no source: alike within 20 kt or so."""
    up, down = (lead_at(display, display.cas_mps, e) / KT for e in ("vertical_up", "vertical_down"))
    assert abs(up - down) < 20.0


@pytest.mark.parametrize("name", ["late_freeze"])
def test_a_frozen_surface_goes_on_pulling_harder_as_speed_grows(name: str) -> None:
    """Common practice, no source: nothing looks wrong, since load factor and pitch rate rise with speed."""
    _, faulted = shipped(name)
    assert faulted.fault_s is not None
    end_s = faulted.contact_s[0] or float(faulted.time_s[-1])
    # once the nose has settled after the fault (a short period or so)
    dive = (faulted.time_s > faulted.fault_s + 1.5) & (faulted.time_s < end_s - 0.1)
    speed, load, pitch = faulted.cas_mps[dive, 0], faulted.load_factor[dive, 0], faulted.rate_b_radps[dive, 0, 1]
    assert np.count_nonzero(dive) > 100
    assert np.all(np.diff(speed) > 0.0)
    assert np.all(np.diff(load) > 0.0)
    assert pitch[-1] > 1.1 * pitch[0] and np.all(np.diff(pitch) > 0.0)
    # about as speed squared, since the angle of attack hardly moves
    power = np.log(load[-1] / load[0]) / np.log(speed[-1] / speed[0])
    assert 1.5 < power < 2.5
