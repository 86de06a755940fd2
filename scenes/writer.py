"""Scenes back to YAML: values as short texts that read back exactly, and scenes that build on another."""

from __future__ import annotations

import dataclasses
import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import yaml

from scenes import shelf
from scenes.build import declared
from scenes.checks import degrees_key
from scenes.complaint import Complaint, SceneError, any_of, nearest
from scenes.model import STEPS, Loop, Point, Power, Scene, Step
from scenes.reader import read_scene
from scenes.units import DIMENSIONS, shortest_text
from scenes.variants import with_values
from terrain.ground import ground_names

WORDS = ("title", "notes", "ground", "airframe")  # values that are no numbers, replaced as they are


def plain_value(dim: str, value: Any) -> Any:
    """One value of a scene as YAML takes it."""
    if dim in ("number", "count"):
        return int(value) if value == int(value) else value
    if dim in DIMENSIONS:
        return shortest_text(dim, value)
    if dim in ("time_or_never", "time_or_none"):
        return dim.rsplit("_", 1)[1] if value is None else shortest_text("time", value)
    if dim == "engines":
        return "all" if value == 0 else value
    if isinstance(value, Power):
        return shortest_text("fraction", value.part) if value.kind == "part" else value.kind
    if isinstance(value, Point):
        going = {"going": value.going} if value.kind == "height" else {}
        return {value.kind: shortest_text(_point_dim(value.kind), value.value), **going}
    return value


def _point_dim(kind: str) -> str:
    return {"loop_angle": "angle", "height": "length"}.get(kind, "time")


def plain_part(part: Any) -> dict[str, Any]:
    """A declared type as a mapping of YAML keys, absent values left out."""
    result: dict[str, Any] = {}
    for key, f in declared(type(part)).items():
        dim, value = f.metadata["dim"], getattr(part, f.name)
        kinds = f.metadata["kinds"]
        if kinds and part.kind not in kinds:
            continue
        if dim == "loop_table":
            result[key] = plain_table(part)
        elif dim == "size":
            result[key] = f"{part.width_px}x{part.height_px}"
        elif value is None and dim not in ("time_or_never", "time_or_none"):
            continue
        elif dataclasses.is_dataclass(value) and not isinstance(value, Power | Point):
            result[key] = plain_part(value)
        else:
            result[key] = plain_value(dim, value)
    return result


def plain_table(loop: Loop) -> dict[float, float]:
    """A loop's table: degrees to g."""
    return {
        plain_value("number", float(degrees_key(angle))): plain_value("number", load)
        for angle, load in zip(loop.angle_rad, loop.load_factor, strict=True)
    }


def plain_step(step: Step) -> dict[str, Any]:
    """A step of the script."""
    name = next(name for name, cls in STEPS.items() if cls is type(step))
    return {name: plain_part(step)}


def plain_scene(scene: Scene) -> dict[str, Any]:
    """A whole scene as YAML takes it, building on no other."""
    result: dict[str, Any] = {}
    for key, f in declared(Scene).items():
        value = getattr(scene, f.name)
        if f.metadata["dim"] == "script" and value is not None:
            result[key] = [plain_step(step) for step in value]
        elif key == "formation":
            result[key] = {slot.name: plain_part(slot) for slot in value}
        elif value is None:
            result[key] = "none"
        elif dataclasses.is_dataclass(value):
            result[key] = plain_part(value)
        elif value != "":
            result[key] = plain_value(f.metadata["dim"], value)
    return result


def to_yaml(plain: Mapping[str, Any]) -> str:
    """Plain data as YAML text in the order given."""
    parts = []
    for key, value in plain.items():
        flow = None if isinstance(value, dict | list) else False  # None: flow style for the innermost only
        parts.append(yaml.safe_dump({key: value}, sort_keys=False, allow_unicode=True, width=110,
                                    default_flow_style=flow))
    return "".join(parts)


def write_scene_like(base: str, overrides: Mapping[str, Any], beside: Path | None = None) -> str:
    """YAML text of a scene that builds on another (``like:``) with some values of its own.

    base: a shipped name or a path; overrides: a value by dotted path as ``with_value`` takes it (SI or text with
    its unit), a loop's whole table as a mapping of degrees to g, ``title``, ``notes``, ``ground``, ``airframe``, or
    ``fault: None``; beside: the folder the text will be saved in, to which the path of the base is made relative.
    Raises SceneError for a value that the scene can't take.
    """
    scene = read_scene(base)
    values: dict[str, Any] = {}
    plain: dict[str, Any] = {"like": _like(base, beside)}
    for path, value in overrides.items():
        if path in WORDS or (path == "fault" and value is None):
            plain[path] = "none" if value is None else str(value)
        else:
            values[path] = value
    words = {key: plain[key] for key in WORDS if key in plain}
    _check_words(scene, words)
    simple: dict[str, Any] = {**words, **({"fault": None} if plain.get("fault") == "none" else {})}
    changed = with_values(dataclasses.replace(scene, **simple), values)
    before, whole = plain_scene(scene), plain_scene(changed)
    for path in values:
        keys = path.split(".")
        if keys[0] in ("script", "briefed"):
            # lists replace; the first step is the same in both
            plain |= {key: whole[key] for key in ("script", "briefed") if whole[key] != before[key]}
            continue
        if keys[:2] == ["fault", "at"]:
            keys = keys[:2]
        _copy(whole, plain, keys)
    return to_yaml(plain)


def _copy(source: Mapping[str, Any], target: dict[str, Any], keys: list[str]) -> None:
    for key in keys[:-1]:
        source, target = source[key], target.setdefault(key, {})
    target[keys[-1]] = source[keys[-1]]


def _like(base: str, beside: Path | None) -> str:
    if not shelf.is_path(base):
        return base
    return os.path.abspath(base) if beside is None else os.path.relpath(base, beside)


def _check_words(scene: Scene, words: Mapping[str, str]) -> None:
    known = {"ground": ground_names(), "airframe": shelf.names("airframe")}
    bad = [
        Complaint(scene.source, 0, 0, key, words[key], any_of(known[key]), nearest(words[key], known[key]))
        for key in known
        if key in words and words[key] not in known[key] and not (key == "airframe" and shelf.is_path(words[key]))
    ]
    if bad:
        raise SceneError(bad)
