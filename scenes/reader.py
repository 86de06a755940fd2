"""YAML files to scenes and airframes: ``like`` followed, all faults of a file reported at once."""

from __future__ import annotations

import hashlib
from pathlib import Path

from scenes import shelf
from scenes.airframe import Airframe
from scenes.build import build_airframe, scene_values
from scenes.checks import Finding, airframe_findings, scene_findings
from scenes.complaint import Complaint, Log, Mark, SceneError
from scenes.merge import Layer, layers, merged
from scenes.model import Scene
from scenes.rules import BAD
from scenes.yamlnode import Mapping, Node, Scalar, Sequence
from terrain.ground import RECIPES, ground_names

__all__ = ["Complaint", "SceneError", "airframe_names", "read_airframe", "read_scene", "read_scene_text",
           "scene_names", "scene_text"]


def scene_names() -> tuple[str, ...]:
    """Names of the shipped scenes."""
    return shelf.names("scene")


def airframe_names() -> tuple[str, ...]:
    """Names of the shipped airframes."""
    return shelf.names("airframe")


def read_scene(name_or_path: str | Path) -> Scene:
    """A scene from a shipped name or a path. Raises SceneError with all its faults."""
    return _scene_of(layers("scene", _file("scene", name_or_path)))


def read_scene_text(text: str, file: str | Path = "scene.yaml") -> Scene:
    """A scene from YAML text; ``file`` is what complaints name and what ``like`` is relative to."""
    return _scene_of(layers("scene", Path(file), text))


def read_airframe(name_or_path: str | Path) -> Airframe:
    """An airframe from a shipped name or a path. Raises SceneError with all its faults."""
    file = _file("airframe", name_or_path)
    log = Log()
    root = merged(layers("airframe", file))
    airframe = build_airframe(root, file.stem, log)
    if airframe is not BAD:
        note(airframe_findings(airframe), root, log)
    log.raise_if_any()
    result: Airframe = airframe
    return result


def scene_text(name_or_path: str | Path) -> str:
    """All the text a scene is made of: its file, those it builds on, its airframes and its terrain recipe.

    Files by name, not by place, so that it changes if and only if something in it does. Raises SceneError.
    """
    found = layers("scene", _file("scene", name_or_path))
    scene = _scene_of(found)
    texts = [(layer.file.name, layer.text) for layer in found]
    frames = dict.fromkeys([scene.airframe, *(slot.airframe for slot in scene.formation if slot.airframe)])
    for frame in frames:
        texts += [(layer.file.name, layer.text) for layer in layers("airframe", _file("airframe", frame))]
    if scene.ground in ground_names():
        recipe = RECIPES / f"{scene.ground}.yaml"
        texts.append((recipe.name, recipe.read_text(encoding="utf-8")))
    else:
        file = Path(scene.ground.rpartition("@")[0] or scene.ground)
        texts.append((file.name, f"sha256 {hashlib.sha256(file.read_bytes()).hexdigest()}"))
    return "\n".join(f"# ---- {name}\n{text}" for name, text in texts)


def _file(kind: str, name_or_path: str | Path) -> Path:
    log = Log()
    text = str(name_or_path)
    if isinstance(name_or_path, Path) and not shelf.is_path(text):
        text = f"./{text}"
    file = shelf.find(kind, text, None, Mark(""), "", log)
    log.raise_if_any()
    assert file is not None
    return file


def _scene_of(found: tuple[Layer, ...]) -> Scene:
    log = Log()
    root = merged(found)
    file = found[0].file
    values = scene_values(root, log)
    unread = [name for name, value in values.items() if value is BAD]
    scene = Scene(name=file.stem, source=str(file), **{**values, **dict.fromkeys(unread)})
    names = [] if "airframe" in unread else [scene.airframe]
    names += [] if "formation" in unread else [slot.airframe for slot in scene.formation if slot.airframe]
    frames: dict[str, Airframe] = {}
    for name in dict.fromkeys(names):
        try:
            frames[name] = read_airframe(name)
        except SceneError as exc:
            log.complaints.extend(exc.complaints)
    note(scene_findings(scene, frames, unread), root, log)
    log.raise_if_any()
    return scene


def note(findings: list[Finding], root: Mapping, log: Log) -> None:
    """Findings to complaints, each at the place its path stands in the file."""
    for finding in findings:
        log.add(mark_of(root, finding.path), finding.path, finding.read, finding.wanted, finding.nearest)


def mark_of(root: Mapping, path: str) -> Mark:
    """Where a dotted path stands, or the nearest thing above it that stands in the file."""
    node: Node = root
    for key in path.split(".") if path else ():
        below: Node | None = None
        if isinstance(node, Mapping):
            below = node.get(key)
        elif isinstance(node, Sequence) and key.isdigit() and int(key) < len(node.items):
            below = node.items[int(key)]
        if below is None or (isinstance(below, Scalar) and below.is_none):
            return node.mark if below is None else below.mark
        node = below
    return node.mark
