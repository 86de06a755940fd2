"""One value of a scene changed by its path; scenes written that build on another."""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from scenes.complaint import SceneError
from scenes.model import Loop, Point, Power, Scene
from scenes.reader import read_airframe, read_scene, read_scene_text, scene_names
from scenes.variants import value_paths, with_value, with_values
from scenes.writer import plain_scene, to_yaml, write_scene_like
from tests.scenes.made import WHOLE

DEG = math.pi / 180.0


@pytest.fixture(scope="module")
def scene() -> Scene:
    return read_scene_text(WHOLE, "made.yaml")


def test_the_paths_of_a_scene(scene: Scene) -> None:
    """By the YAML's own keys; a point by its kind; only the keys that the fault's kind has."""
    paths = {place.path: place for place in value_paths(scene)}
    assert {"floor", "day.temperature", "day.wind.speed", "script.0.level.speed", "script.1.loop.load_factor.330",
            "script.1.loop.power", "script.1.loop.close_at", "fault.at.loop_angle", "formation.right.aft",
            "break_out.load_factor", "break_out.onset", "watch.gauge_look", "film.field", "seed"} <= set(paths)
    assert not {"fault.fraction", "fault.rate", "fault.at.time", "title", "film.size"} & set(paths)
    at = paths["fault.at.loop_angle"]
    assert (at.dim, at.value, at.lo, at.hi, at.unit) == ("angle", 245 * DEG, 0.0, 360 * DEG, "deg")
    slow = dataclasses.replace(scene, fault=dataclasses.replace(scene.fault, kind="slow"))  # type: ignore[type-var]
    assert "fault.rate" in {place.path for place in value_paths(slow)}


def test_paths_are_the_same_in_any_shipped_scene() -> None:
    """Each path set to the value it has gives the same scene."""
    for name in scene_names():
        one = read_scene(name)
        frames = {n: read_airframe(n) for n in [one.airframe]}
        for place in value_paths(one):
            if place.value is not None:
                assert with_value(one, place.path, place.value, frames) == one, (name, place.path)


@pytest.mark.parametrize(
    ("path", "value", "text"),
    [
        ("fault.at.loop_angle", 230 * DEG, "230 deg"), ("floor", 60.96, "200 ft"),
        ("day.temperature", 303.15, "30 degC"),
        ("script.0.level.speed", 360 * (1852 / 3600), "360 kt"), ("script.1.loop.load_factor.180", 0.5, "0.5 g"),
        ("script.1.loop.power", 0.88, "88 %"), ("formation.left.right", -16.0, "-16 m"),
        ("break_out.load_factor", 5.5, "5.5"), ("seed", 3, "3"), ("watch.gauges_every", 8.0, "8 s"),
    ],
)
def test_si_and_text_agree_with_the_yaml(scene: Scene, path: str, value: float, text: str) -> None:
    """The changed scene is the one that the changed YAML gives."""
    by_text = with_value(scene, path, text)
    assert by_text == with_value(scene, path, value)
    assert by_text != scene
    plain: Any = plain_scene(scene)
    node = plain
    keys: list[Any] = [int(key) if key.isdigit() else key for key in path.split(".")]
    for key in keys[:-1]:
        node = node[key]
    assert keys[-1] in node or isinstance(node, list)
    node[keys[-1]] = text
    assert read_scene_text(to_yaml(plain), "made.yaml") == by_text


def test_power_and_tables(scene: Scene) -> None:
    """A part of full; a whole table at once."""
    step = with_value(scene, "script.1.loop.power", 0.5).script[1]
    assert isinstance(step, Loop) and step.power == Power("part", 0.5)
    step = with_values(scene, {"script.1.loop.load_factor": {0: 1.0, 180: 0.5, 350: 4.0}}).script[1]
    assert isinstance(step, Loop)
    assert step.angle_rad == (0.0, 180 * DEG, 350 * DEG) and step.load_factor == (1.0, 0.5, 4.0)


@pytest.mark.parametrize(
    ("values", "text"),
    [
        ({"fault.at.loop_angel": 1.0}, "fault.at.loop_angel: read no such value, wanted a number that the scene "
         "gives (did you mean fault.at.loop_angle?)"),
        ({"fault.at.loop_angle": 7.0}, "fault.at.loop_angle: read 401.0704566 deg, wanted 0 deg to 360 deg"),
        ({"floor": math.nan}, "floor: read nan ft, wanted 0 ft to 9842 ft"),
        ({"floor": "100"}, "floor: read 100, wanted a length with its unit (m, ft, km, NM or cm), such as 300 ft"),
        ({"floor": "100 fet"}, "floor: read 100 fet, wanted a length with its unit (m, ft, km, NM or cm), such as 300 "
         "ft (did you mean 100 ft?)"),
        ({"seed": 1.5}, "seed: read 1.5, wanted a whole number"),
        ({"break_out.load_factor": 8.9}, "break_out.load_factor: read 8.9 g, wanted at most"),
        ({"formation.right.right": 2.0}, "formation.right: read a place inside the lead, 2.0 m from centre to centre"),
        ({"script.1.loop.load_factor": {0: 1.0, 400: 2.0}}, "script.1.loop.load_factor: read 2 loop angles, wanted 2 "
         "to 32 loop angles from 0 to 360 that rise"),
        ({"script.2.loop.load_factor": {0: 1.0, 90: 2.0}}, "script.2.loop.load_factor: read no such table, wanted "
         "script.1.loop.load_factor"),
        ({"script.1.loop.load_factor": {0: 1.0, 90: 20.0}}, "script.1.loop.load_factor: read a load factor out of "
         "range, wanted -4 g to 12 g"),
    ],
)
def test_refused(scene: Scene, values: dict[str, Any], text: str) -> None:
    """By path, with the nearest known one."""
    with pytest.raises(SceneError) as caught:
        with_values(scene, values)
    assert str(caught.value).startswith(f"made.yaml: {text}")


def test_two_bad_values_are_reported_together(scene: Scene) -> None:
    """All at once here too."""
    with pytest.raises(SceneError) as caught:
        with_values(scene, {"floor": "3", "seed": -1.0})
    assert [c.path for c in caught.value.complaints] == ["floor", "seed"]


def test_values_that_only_go_together(scene: Scene) -> None:
    """Checked when all are set: looks and their spacing both moved."""
    close = with_values(scene, {"watch.gauge_look": 1.0, "watch.gauges_every": 2.0})
    assert close.watch.gauges_every_s == 2.0
    with pytest.raises(SceneError):
        with_value(scene, "watch.gauges_every", 2.0)


def test_the_entry_of_a_briefed_script_moves_along() -> None:
    """The first step is common to what is flown and what was briefed."""
    floated = read_scene("long_float")
    faster = with_value(floated, "script.0.level.speed", "380 kt")
    assert faster.briefed is not None and faster.briefed[0] == faster.script[0]
    again = read_scene_text(write_scene_like("long_float", {"script.0.level.speed": "380 kt"}))
    assert (again.script, again.briefed) == (faster.script, faster.briefed)


@pytest.mark.parametrize("name", scene_names())
def test_a_scene_written_whole_reads_back_the_same(name: str) -> None:
    """Every value to the last bit."""
    one = read_scene(name)
    again = read_scene_text(to_yaml(plain_scene(one)), f"{name}.yaml")
    assert dataclasses.replace(again, source=one.source) == one


LOADS = st.lists(st.floats(min_value=-2.5, max_value=6.5), min_size=2, max_size=32)


@settings(max_examples=25)
@given(LOADS, st.floats(min_value=0.0, max_value=360.0), st.floats(min_value=0.0, max_value=3000.0))
def test_a_scene_built_on_another_reads_back_the_same(loads: list[float], at_deg: float, floor_m: float) -> None:
    """Any table, point and floor."""
    table = {360.0 * i / len(loads): load for i, load in enumerate(loads)}
    values = {"script.1.loop.load_factor": table, "fault.at.loop_angle": at_deg * DEG, "floor": floor_m}
    text = write_scene_like("late_freeze", {"title": "Shaped: a \"new\" one #2", **values})
    again = read_scene_text(text, "shaped.yaml")
    wanted = with_values(read_scene("late_freeze"), values)
    assert dataclasses.replace(again, name=wanted.name, source=wanted.source, title=wanted.title) == wanted
    assert again.title == 'Shaped: a "new" one #2'


def test_what_is_written_is_short_and_builds_on_its_base(tmp_path: Path) -> None:
    """Only what was changed; a base that is a file is named relative to where the text will stand."""
    text = write_scene_like("late_freeze", {"title": "Later", "fault.at.loop_angle": "250 deg", "floor": 60.96})
    assert text == "like: late_freeze\ntitle: Later\nfault:\n  at: {loop_angle: 250 deg}\nfloor: 200 ft\n"
    base = tmp_path / "own" / "base.yaml"
    base.parent.mkdir()
    base.write_text(WHOLE)
    out = tmp_path / "made"
    out.mkdir()
    file = out / "new.yaml"
    file.write_text(write_scene_like(str(base), {"fault": None, "ground": "coast"}, beside=out))
    assert file.read_text() == "like: ../own/base.yaml\nfault: none\nground: coast\n"
    new = read_scene(file)
    assert new.fault is None and new.ground == "coast"


def test_another_point_is_no_path() -> None:
    """A point is moved along its own kind; another kind is another scene."""
    with pytest.raises(SceneError, match="did you mean"):
        write_scene_like("late_freeze", {"fault.at.time": 3.0})
    with pytest.raises(SceneError, match=r"ground: read heeth, wanted coast, .* \(did you mean heath\?\)"):
        write_scene_like("late_freeze", {"ground": "heeth"})
    freeze = read_scene("late_freeze").fault
    assert freeze is not None and isinstance(freeze.at, Point)
