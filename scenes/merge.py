"""``like: other``: a file and those it builds on, and one root mapping out of them."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from scenes import shelf
from scenes.complaint import Log, Mark, SceneError
from scenes.yamlnode import Mapping, Node, Scalar, compose, read_text, what

MAX_LAYERS = 16
ATOMIC = (("fault", "at"),)  # mappings of which one alternative stands: replaced as a whole


@dataclass(frozen=True, slots=True)
class Layer:
    """One file of a scene: its text and its root."""

    file: Path
    text: str
    root: Mapping


def layers(kind: str, file: Path, text: str | None = None) -> tuple[Layer, ...]:
    """A file and the files it builds on, the file itself first. Raises SceneError.

    kind: scene or airframe; text: the file's text if it is not to be read from disk.
    """
    found: list[Layer] = []
    log = Log()
    seen: dict[Path, str] = {}
    while True:
        body = read_text(file) if text is None else text
        layer = Layer(file, body, compose(body, str(file)))
        text = None
        found.append(layer)
        seen[file.resolve()] = file.name
        base = layer.root.get("like")
        if base is None or (isinstance(base, Scalar) and base.is_none):
            return tuple(found)
        if not isinstance(base, Scalar) or not base.text:
            log.add(base.mark, "like", what(base), f"the name of a shipped {kind}, or a path")
            raise SceneError(log.complaints)
        below = shelf.find(kind, base.text, file.parent, base.mark, "like", log)
        if below is None:
            raise SceneError(log.complaints)
        if below.resolve() in seen or len(found) >= MAX_LAYERS:
            circle = " -> ".join([*(one.file.name for one in found), below.name])
            wanted = "files that don't build on each other in a circle" if below.resolve() in seen else (
                f"at most {MAX_LAYERS} files built on each other")
            log.add(base.mark, "like", circle, wanted)
            raise SceneError(log.complaints)
        file = below


def merged(found: tuple[Layer, ...]) -> Mapping:
    """One root out of the layers: mappings merge, lists and single values replace, ``none`` removes."""
    root = found[-1].root
    for layer in reversed(found[:-1]):
        root = _merge(root, layer.root, ())
    return root


def _merge(below: Mapping, above: Mapping, path: tuple[str, ...]) -> Mapping:
    items: dict[str, tuple[Mark, Node]] = dict(_kept(below, above, path).items)
    for key, (mark, node) in above.items.items():
        old = items.get(key)
        here = (*path, key)
        if old is not None and isinstance(old[1], Mapping) and isinstance(node, Mapping) and here not in ATOMIC:
            items[key] = mark, _merge(old[1], node, here)
        else:
            items[key] = mark, node
    return Mapping(above.mark, items)


def _kept(below: Mapping, above: Mapping, path: tuple[str, ...]) -> Mapping:
    """What stays of the mapping below: of a fault of another kind only its point."""
    old, new = below.get("kind"), above.get("kind")
    if path != ("fault",) or not (isinstance(old, Scalar) and isinstance(new, Scalar)) or old.text == new.text:
        return below
    return Mapping(below.mark, {key: value for key, value in below.items.items() if key == "at"})
