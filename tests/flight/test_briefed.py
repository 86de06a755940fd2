"""A flight that is not the briefed one: the twin flies as briefed, and it is seen against that."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from render.errors import FlightError
from render.study import work_through
from scenes.model import Loop
from tests.flight.made import DEG, flat_ground, invented_jet, loop_scene


def floated(less_g: float) -> object:
    """The made loop with less load factor about the top, the made loop itself as briefed."""
    scene = loop_scene()
    loop = scene.script[1]
    assert isinstance(loop, Loop)
    load = tuple(n - less_g if 160 * DEG < a < 230 * DEG else n
                 for a, n in zip(loop.angle_rad, loop.load_factor, strict=True))
    flown = dataclasses.replace(loop, load_factor=load, close_at_m=None)
    return dataclasses.replace(scene, script=(scene.script[0], flown, scene.script[2]), briefed=scene.script)


def test_a_float_is_seen_against_the_briefed_flight_from_where_they_part() -> None:
    study = work_through(floated(0.4), lambda _: invented_jet(), flat_ground(), "")
    assert study.verdict["fault"]["kind"] == "departed"
    parted = study.faulted.fault_s
    # the tables' curves are one up to the knot at 90 deg and less than 0.05 g apart from there to where they part
    before = study.faulted.time_s <= parted
    apart_m = np.max(np.abs(study.healthy.pos_e_m[before] - study.faulted.pos_e_m[before]))
    since_s = parted - study.healthy.events["vertical_up"]
    assert 0.0 < apart_m < 0.5 * 0.05 * 9.80665 * since_s**2
    notes = study.notices["right"]
    assert notes[0].time_s is not None and notes[0].time_s > parted
    # the table of the float parts from the briefed one at the last knot before it, 130 deg
    assert 125.0 < study.verdict["fault"]["loop_angle_deg"] < 165.0


def test_a_script_that_never_departs_is_an_error() -> None:
    scene = loop_scene()
    with pytest.raises(FlightError, match="never departs from the briefed one"):
        work_through(dataclasses.replace(scene, briefed=scene.script), lambda _: invented_jet(), flat_ground(), "")
