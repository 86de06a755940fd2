"""The JSON Schema takes what the reader takes and refuses, in the simple cases, what it refuses.

jsonschema is the outside judge: an implementation of the published 2020-12 dialect.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
import yaml
from jsonschema import Draft202012Validator

from scenes import shelf
from scenes.model import FAULT_KINDS
from scenes.reader import airframe_names, scene_names
from scenes.schema import airframe_schema, scene_schema
from scenes.writer import plain_scene, to_yaml
from tests.scenes.made import faults, with_line


def as_json(text: str) -> Any:
    """YAML text as an editor's checker sees it: JSON, whose keys are all text."""
    return json.loads(json.dumps(yaml.safe_load(text)))


@pytest.fixture(scope="module")
def validator() -> Draft202012Validator:
    return Draft202012Validator(scene_schema())


def test_the_schemas_are_schemas_and_json() -> None:
    """By the dialect's own schema."""
    for schema in (scene_schema(), airframe_schema()):
        Draft202012Validator.check_schema(schema)
        assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
        assert json.loads(json.dumps(schema, allow_nan=False)) == schema


@pytest.mark.parametrize("name", scene_names())
def test_shipped_scenes_validate(validator: Draft202012Validator, name: str) -> None:
    """Each as it stands, with and without a base."""
    validator.validate(as_json((shelf.SHIPPED / f"{name}.yaml").read_text(encoding="utf-8")))


@pytest.mark.parametrize("name", airframe_names())
def test_shipped_airframes_validate(name: str) -> None:
    """And an airframe that builds on one."""
    judge = Draft202012Validator(airframe_schema())
    judge.validate(as_json((shelf.FOLDERS["airframe"] / f"{name}.yaml").read_text(encoding="utf-8")))
    judge.validate({"like": name, "mass": "6 t"})
    assert not judge.is_valid({"mass": "6 t"}) and not judge.is_valid({"like": name, "mass": 6000})


def test_whole_scenes_written_out_validate(validator: Draft202012Validator) -> None:
    """What the writer writes."""
    from scenes.reader import read_scene

    for name in scene_names():
        validator.validate(as_json(to_yaml(plain_scene(read_scene(name)))))


REFUSED = [
    ("floor: 100 ft\n", ""), ("floor: 100 ft", "floor: 100"), ("floor: 100 ft", "floor: 100 kt"),
    ("floor: 100 ft", "floor: .5"), ("floor: 100 ft", "floor: [1]"), ("floor: 100 ft", "floor: none"),
    ("title: A loop", "title: 12"), ("title: A loop", "titel: A loop"), ("ground: heath", "ground: heeth"),
    ("airframe: jet_trainer", "airframe: jet_trainr"), ("24 degC", "24"), ("8 kt", "8 m"),
    ("height: 300 ft, ", ""), ("power: full\n", "power: 88\n"), ("power: full\n", "power: flat out\n"),
    ("close_at", "closes_at"), ("90: 3.1", "90 deg: 3.1"), ("90: 3.1", "90: 99"), ("90: 3.1", "90: high"),
    ("{0: 1.2, 8: 4.6, 90: 3.1, 180: 0.6, 270: 2.8, 330: 4.9, 358: 1.2}", "{0: 1.2}"),
    ("kind: freeze", "kind: jam"), ("kind: freeze, ", ""), ("kind: freeze", "kind: authority"),
    ("kind: freeze", "kind: freeze, fraction: 40 %"), ("kind: freeze", "kind: authority, fraction: 40"),
    ("kind: freeze", "kind: engines, lost: both"), ("{loop_angle: 245 deg}", "{loop_angle: 245}"),
    ("{loop_angle: 245 deg}", "{loop_angle: 245 deg, time: 3 s}"), ("{loop_angle: 245 deg}", "{}"),
    ("{loop_angle: 245 deg}", "{time: 3 s, going: up}"), ("{loop_angle: 245 deg}", "245 deg"),
    ("right: {aft: 0 m, right: 14 m, down: 0 m}", "right: {right: 14 m}"),
    ("right: {aft: 0 m, right: 14 m, down: 0 m}", "lead: {aft: 0 m, right: 14 m, down: 0 m}"),
    ("onset: 3 g/s", "onset: 3"), ("load_factor: 6.0", "load_factor: 60"),
    ("gauges_every: never", "gauges_every: nver"),
    ("size: 1280x720", "size: 1281x720"), ("rate: 30", "rate: 500"), ("rate: 30", "rate: 29.97"),
    ("field: 75 deg", "field: 75"), ("  - level: {for: 3 s}", "  - lvel: {for: 3 s}"),
    ("  - level: {for: 3 s}", "  - level"), ("look_at: lead", "look_at: led"),
    ("  - level: {speed: 370 kt, height: 300 ft, heading: 80 deg, for: 3 s}\n", ""),
]


@pytest.mark.parametrize(("old", "new"), REFUSED)
def test_refuses_what_the_reader_refuses(validator: Draft202012Validator, old: str, new: str) -> None:
    """The same text, both judges."""
    text = with_line(old, new)
    assert faults(text)
    assert not validator.is_valid(as_json(text))


def test_a_file_that_builds_on_another_needs_only_what_it_changes(validator: Draft202012Validator) -> None:
    """But what it gives must be right."""
    validator.validate(as_json("like: healthy_loop\n"))
    validator.validate(as_json("like: healthy_loop\nfilm: {from: left}\nformation: {left: none, right: {aft: 5 m}}\n"))
    assert not validator.is_valid(as_json("like: healthy_loop\nfilm: {form: left}\n"))
    assert not validator.is_valid(as_json("like: healthy_loop\nformation: {right: {aft: 5}}\n"))
    assert not validator.is_valid(as_json("title: a\n"))


def test_every_value_is_explained() -> None:
    """Each property of the whole scene has words for an editor to show, each kind of fault its own."""
    whole = scene_schema()["else"]["properties"]

    def undescribed(properties: dict[str, Any], path: str) -> list[str]:
        found = []
        for key, schema in properties.items():
            if "description" not in schema:
                found.append(f"{path}{key}")
            for one in schema.get("anyOf", [schema]):
                found += undescribed(one.get("properties", {}), f"{path}{key}.")
        return found

    assert undescribed(whole, "") == []
    kinds = next(one for one in whole["fault"]["anyOf"] if "properties" in one)["properties"]["kind"]["oneOf"]
    assert {one["const"]: one["description"] for one in kinds} == dict(FAULT_KINDS)


def test_the_schema_does_not_depend_on_where_it_is_made(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The same from any folder."""
    here = scene_schema()
    monkeypatch.chdir(tmp_path)
    assert scene_schema() == here
