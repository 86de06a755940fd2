"""Shipped scenes worked through: twins that are never noticed, the order of observers, the verdict's form."""

from __future__ import annotations

import dataclasses
import json
import math
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
import pytest

from render.flight.fly import fly_scene
from render.output.tables import verdict_json
from render.sight.notice import notice_all
from render.study import work_through
from render.types import OBSERVERS, Study
from scenes.model import Fault, Point
from scenes.reader import read_airframe, read_scene, scene_names, scene_text
from terrain.ground import read_ground

SCENES = ("late_freeze", "early_pull_freeze", "part_authority", "long_float", "engines_after_takeoff", "turboprop_vic",
          "healthy_loop")
DEG = math.pi / 180.0


@pytest.fixture(scope="module")
def studies() -> dict[str, Study]:
    found = {}
    for name in SCENES:
        scene = read_scene(name)
        found[name] = work_through(scene, read_airframe, read_ground(scene.ground, scene.seed), scene_text(name))
    return found


def harmless(at_deg: tuple[float, ...]) -> Iterator[tuple[str, Fault]]:
    """Faults that take nothing away: flown as faults, the aircraft does all that is asked."""
    for degrees in at_deg:
        at = Point("loop_angle", degrees * DEG)
        yield f"whole authority at {degrees:.0f} deg", Fault("authority", at, fraction=1.0)
        yield f"a rate above the actuator's at {degrees:.0f} deg", Fault("slow", at, rate_radps=50.0)


@pytest.mark.parametrize(("name", "at_deg"), [("healthy_loop", (100.0,)), ("late_freeze", (100.0, 245.0)),
                                              ("early_pull_freeze", (245.0,)), ("turboprop_vic", (100.0, 245.0))])
def test_a_healthy_flight_is_never_noticed(name: str, at_deg: tuple[float, ...]) -> None:
    """Against its twin a flight whose fault takes nothing away shows nothing, to none of the observers."""
    base = read_scene(name)
    ground = read_ground(base.ground, base.seed)
    for words, fault in harmless(at_deg):
        scene = dataclasses.replace(base, fault=fault)
        healthy, faulted, _ = fly_scene(scene, read_airframe, ground)
        assert faulted is not healthy and faulted.fault_s is not None
        assert np.max(np.abs(healthy.pos_e_m - faulted.pos_e_m)) < 0.1, words
        cues, notices = notice_all(healthy, faulted, scene.watch, ground.height_at)
        assert set(notices) == {"lead", *(slot.name for slot in scene.formation)}
        for who, notes in notices.items():
            assert [n.observer for n in notes] == list(OBSERVERS)
            assert [n.time_s for n in notes] == [None] * 3, f"{who}, {words}"
            assert cues[who]


def test_without_a_fault_there_is_nothing_to_notice(studies: Mapping[str, Study]) -> None:
    study = studies["healthy_loop"]
    assert study.scene.fault is None and study.faulted is study.healthy
    assert all(n.time_s is None for notes in study.notices.values() for n in notes)
    assert study.verdict["fault"] is None


@pytest.mark.parametrize("name", [n for n in SCENES if n != "healthy_loop"])
def test_nobody_notices_before_the_fault_and_the_observers_keep_their_order(
    studies: Mapping[str, Study], name: str
) -> None:
    study = studies[name]
    fault_s = study.faulted.fault_s
    assert fault_s is not None
    for notes in study.notices.values():
        times = [math.inf if n.time_s is None else n.time_s for n in notes]
        assert all(t > fault_s for t in times)
        assert times[0] <= times[1] <= times[2]
        reactions = [n.reaction_s for n in notes]
        assert 0.0 < reactions[0] < reactions[1] < reactions[2]
        for note in notes:
            assert (note.time_s is None) == (note.cue is None)


@pytest.mark.parametrize("name", SCENES)
def test_lateness_is_what_it_says(studies: Mapping[str, Study], name: str) -> None:
    """Lateness = noticed + reaction - last pull against the floor; none where nothing runs out."""
    study = studies[name]
    for k, who in enumerate(study.faulted.names):
        pull = study.margin.last_pull_floor_s[k]
        for note in study.notices[who]:
            if note.time_s is None or pull is None:
                assert note.lateness_s is None
            else:
                assert note.lateness_s == pytest.approx(note.time_s + note.reaction_s - pull)


def test_he_who_is_in_time_clears_the_floor_and_he_who_is_late_does_not(studies: Mapping[str, Study]) -> None:
    seen = set()
    for study in studies.values():
        contact = study.faulted.contact_s
        for k, who in enumerate(study.faulted.names[1:], start=1):
            for note in study.notices[who]:
                if note.lateness_s is None or note.clearance_m is None or note.time_s is None:
                    continue
                acts_s = note.time_s + note.reaction_s
                left = np.interp(acts_s, study.margin.time_s, study.margin.clearance_floor_m[:, k])
                if contact[k] is None or acts_s < (contact[k] or 0.0) - 0.2:
                    # the study flies that escape from its own instant, the margin between its instants
                    assert note.clearance_m == pytest.approx(float(left), abs=3.0)
                seen.add(note.lateness_s > 0.0)
                if note.lateness_s > 0.2 and study.scene.name != "long_float":
                    assert note.clearance_m < 0.0
                if note.lateness_s < -0.2:
                    assert note.clearance_m > 0.0
    assert seen == {True, False}


POINT = {"time_s", "height_m", "speed_mps", "load_factor"}
SLOT = {"last_pull_s", "notice", "reaction_s", "lateness_s", "clearance_m"}
UNITS = ("_s", "_m", "_mps", "_deg", "load_factor")


def figures(value: Any, key: str = "") -> Iterator[tuple[str, float]]:
    """Every number of a verdict with the name it stands under; an observer's number under its group's name."""
    if isinstance(value, dict):
        for inner, x in value.items():
            yield from figures(x, key if inner in OBSERVERS and not isinstance(x, dict) else inner)
    elif isinstance(value, int | float) and not isinstance(value, bool):
        yield key, float(value)


@pytest.mark.parametrize("name", SCENES)
def test_verdict_has_exactly_the_keys_of_the_design(studies: Mapping[str, Study], name: str) -> None:
    study = studies[name]
    verdict = json.loads(verdict_json(study))
    assert set(verdict) == {"scene", "caution", "points", "fault", "lead", "slots"}
    assert verdict["scene"] == name
    assert "not a clearance" in verdict["caution"]
    assert set(verdict["points"]) <= {"entry", "vertical_up", "top", "vertical_down", "bottom"}
    for point in verdict["points"].values():
        assert set(point) == POINT
    if verdict["fault"] is not None:
        assert set(verdict["fault"]) == {"kind", "time_s", "loop_angle_deg", "height_m", "speed_mps"}
    assert set(verdict["lead"]) == {"lowest_height_m", "contact_time_s"}
    assert list(verdict["slots"]) == [slot.name for slot in study.scene.formation]
    for slot in verdict["slots"].values():
        assert set(slot) == SLOT
        for key in SLOT - {"last_pull_s"}:
            assert list(slot[key]) == list(OBSERVERS)
        for note in slot["notice"].values():
            assert set(note) == {"time_s", "cue"}
    for key, number in figures(verdict):
        assert key.endswith(UNITS), key
        assert math.isfinite(number)


def test_a_loop_has_all_its_points_in_order(studies: Mapping[str, Study]) -> None:
    points = studies["late_freeze"].verdict["points"]
    assert list(points) == ["entry", "vertical_up", "top", "vertical_down", "bottom"]
    times = [point["time_s"] for point in points.values()]
    assert times == sorted(times)
    heights = [point["height_m"] for point in points.values()]
    assert max(heights) == heights[2] and heights[0] < heights[1] and heights[4] < heights[3]


def test_the_hero_scene_tells_what_it_is_for(studies: Mapping[str, Study]) -> None:
    """Issue A: frozen between the top and vertical down, nobody acts, contact, the early observer hardly in time."""
    study = studies["late_freeze"]
    verdict = study.verdict
    assert 180.0 < verdict["fault"]["loop_angle_deg"] < 270.0
    assert verdict["lead"]["contact_time_s"] is not None
    for slot in verdict["slots"].values():
        assert slot["last_pull_s"] > verdict["fault"]["time_s"]
        assert slot["lateness_s"]["early"] > -0.5


def test_the_same_freeze_under_an_early_pull_is_noticed_in_time_or_clears(studies: Mapping[str, Study]) -> None:
    late, early = studies["late_freeze"], studies["early_pull_freeze"]
    assert early.scene.fault == late.scene.fault
    for name, slot in early.verdict["slots"].items():
        assert slot["last_pull_s"] is None or slot["lateness_s"]["likely"] < 0.0
        assert early.verdict["lead"]["contact_time_s"] is None or slot["clearance_m"]["likely"] > 0.0, name


def test_shipped_scenes_are_at_least_nine() -> None:
    assert len(scene_names()) >= 9
