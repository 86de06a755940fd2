"""From marked YAML nodes to frozen scene types, by their declarations; every fault noted, none raised."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Mapping
from typing import Any

from scenes.airframe import Airframe
from scenes.complaint import Log, Mark, any_of, nearest, shown
from scenes.model import FAULT_KINDS, REQUIRED, STEPS, Fault, FilmPlan, Level, Scene, Slot, Step, yaml_key
from scenes.rules import BAD, RULES, wanted_of
from scenes.yamlnode import Mapping as MappingNode
from scenes.yamlnode import Node, Scalar, Sequence, what

MAX_STEPS = 40
MAX_SLOTS = 8
LEAD = "lead"
SLOT_NAME = r"[^\W\d]\w{0,23}"


def declared(cls: type) -> dict[str, dataclasses.Field[Any]]:
    """The YAML keys of a type and the fields they fill."""
    return {yaml_key(f): f for f in dataclasses.fields(cls) if f.metadata}


def at_path(path: str, key: str) -> str:
    """A key below a path."""
    return f"{path}.{key}" if path else key


def unknown_keys(node: MappingNode, known: Mapping[str, Any], path: str, log: Log, more: tuple[str, ...] = ()) -> None:
    """Complain of each key that is not known."""
    for key, (mark, _) in node.items.items():
        if key not in known and key not in more:
            log.add(mark, at_path(path, key), f"the key {shown(key)}", f"one of {any_of(known)}", nearest(key, known))


def read_fields(cls: type, node: MappingNode, path: str, log: Log, *, skip: tuple[str, ...] = (),
                needed: tuple[str, ...] = ()) -> dict[str, Any]:
    """The declared fields of a type from a mapping: BAD where a value could not be read.

    skip: keys that the caller reads; needed: keys required here although the type has a default.
    """
    values: dict[str, Any] = {}
    for key, f in declared(cls).items():
        if key in skip:
            continue
        meta, here, given = f.metadata, at_path(path, key), node.get(key)
        none = isinstance(given, Scalar) and given.is_none
        if given is None or none:
            if meta["absent"] is REQUIRED or key in needed:
                missing(node.mark if given is None else given.mark, here, meta, log, "none" if none else "nothing")
                values.update(dict.fromkeys(meta["fills"] or (f.name,), BAD))
            elif not meta["fills"]:
                values[f.name] = meta["absent"]
            continue
        if meta["dim"] == "part":
            value = read_part(meta["part"], given, here, log)
        else:
            value = RULES[meta["dim"]](given, here, meta, log)
        if meta["fills"]:
            parts = (BAD,) * len(meta["fills"]) if value is BAD else value
            values.update(zip(meta["fills"], parts, strict=True))
        else:
            values[f.name] = value
    return values


def missing(mark: Mark, path: str, meta: Mapping[str, Any], log: Log, read: str = "nothing") -> None:
    """Complain of a key that is not there."""
    log.add(mark, path, read, f"{meta['doc']}: {wanted_of(meta)}")


def made(cls: type, values: dict[str, Any]) -> Any:
    """An instance, or BAD if any of its values is."""
    return BAD if any(v is BAD for v in values.values()) else cls(**values)


def read_part(cls: type, node: Node, path: str, log: Log, needed: tuple[str, ...] = ()) -> Any:
    """A mapping to an instance of a declared type, or BAD."""
    if not isinstance(node, MappingNode):
        log.add(node.mark, path, what(node), f"a mapping of {any_of(declared(cls))}")
        return BAD
    unknown_keys(node, declared(cls), path, log)
    return made(cls, read_fields(cls, node, path, log, needed=needed))


def read_script(node: Node, path: str, log: Log) -> Any:
    """The script's steps, or BAD."""
    meta = declared(Scene)["script"].metadata
    if not isinstance(node, Sequence) or not node.items:
        log.add(node.mark, path, "an empty list" if isinstance(node, Sequence) else what(node), wanted_of(meta))
        return BAD
    if len(node.items) > MAX_STEPS:
        log.add(node.mark, path, f"{len(node.items)} steps", f"at most {MAX_STEPS}")
        return BAD
    steps: list[Step] = []
    for i, item in enumerate(node.items):
        here = f"{path}.{i}"
        if not isinstance(item, MappingNode) or len(item.items) != 1:
            read = f"{len(item.items)} keys ({any_of(list(map(shown, item.items)))})" if (
                isinstance(item, MappingNode) and item.items) else what(item)
            log.add(item.mark, here, read, f"one step of {any_of(STEPS)}, such as level: {{for: 3 s}}")
            steps.append(BAD)
            continue
        (kind, (mark, given)), = item.items.items()
        if kind not in STEPS:
            log.add(mark, f"{here}.{kind}", f"the step {shown(kind)}", any_of(STEPS), nearest(kind, STEPS))
            steps.append(BAD)
            continue
        if i == 0 and kind != "level":
            log.add(mark, f"{here}.{kind}", f"the step {kind} first", wanted_of(meta))
        needed = ("speed", "height", "heading") if i == 0 and kind == "level" else ()
        steps.append(read_part(STEPS[kind], given, f"{here}.{kind}", log, needed))
    bad = any(s is BAD for s in steps) or not isinstance(steps[0], Level)
    return BAD if bad else tuple(steps)


def read_fault(node: Node | None, path: str, log: Log) -> Any:
    """The fault, None or BAD."""
    if node is None or (isinstance(node, Scalar) and node.is_none):
        return None
    keys = declared(Fault)
    if not isinstance(node, MappingNode):
        guess = "{kind: " + node.text + ", at: ...}" if isinstance(node, Scalar) and node.text in FAULT_KINDS else None
        log.add(node.mark, path, what(node), f"none, or {wanted_of(declared(Scene)['fault'].metadata)}", guess)
        return BAD
    own = {key: f.metadata["kinds"] for key, f in keys.items() if f.metadata["kinds"]}
    kind_node = node.get("kind")
    kind = kind_node.text if isinstance(kind_node, Scalar) else ""
    if kind not in FAULT_KINDS:
        unknown_keys(node, keys, path, log)
        read_fields(Fault, node, path, log, skip=tuple(k for k in own if k not in node.items))
        return BAD
    fitting = {key: f for key, f in keys.items() if key not in own or kind in own[key]}
    unknown_keys(node, fitting, path, log, more=tuple(own))
    good = True
    for key in own:
        if key in node.items and key not in fitting:
            log.add(node.items[key][0], at_path(path, key), f"the key {key} with the kind {kind}",
                    f"it only with the kind {any_of(own[key])}")
            good = False
    needed = tuple(k for k in own if k in fitting)
    values = read_fields(Fault, node, path, log, skip=tuple(k for k in own if k not in fitting), needed=needed)
    return made(Fault, values) if good else BAD


def read_formation(node: Node, path: str, log: Log) -> Any:
    """The slots, or BAD."""
    if not isinstance(node, MappingNode):
        log.add(node.mark, path, what(node), wanted_of(declared(Scene)["formation"].metadata))
        return BAD
    slots: list[Any] = []
    for name, (mark, given) in node.items.items():
        here = at_path(path, name)
        if isinstance(given, Scalar) and given.is_none:
            continue
        if name == LEAD or not re.fullmatch(SLOT_NAME, name):
            log.add(mark, here, f"a slot named {shown(name)}",
                    "a name of letters, digits and _, other than lead, at most 24 long")
            slots.append(BAD)
            continue
        if not isinstance(given, MappingNode):
            log.add(given.mark, here, what(given), f"a mapping of {any_of(declared(Slot))}, or none")
            slots.append(BAD)
            continue
        unknown_keys(given, declared(Slot), here, log)
        slots.append(made(Slot, {"name": name, **read_fields(Slot, given, here, log)}))
    if len(slots) > MAX_SLOTS:
        log.add(node.mark, path, f"{len(slots)} slots", f"at most {MAX_SLOTS}")
        return BAD
    return BAD if any(s is BAD for s in slots) else tuple(slots)


def check_seat(film: Node | None, seats: list[str], log: Log) -> None:
    """Complain of a camera in a seat that the formation hasn't."""
    seat = film.get("from") if isinstance(film, MappingNode) else None
    if isinstance(seat, Scalar) and seat.kind != "null" and not seat.is_none and seat.text not in seats:
        known = any_of(dict.fromkeys(seats))
        log.add(seat.mark, "film.from", shown(seat.text), f"a slot of the formation or the lead: {known}",
                nearest(seat.text, seats))


def scene_values(root: MappingNode, log: Log) -> dict[str, Any]:
    """The fields of a scene from its root mapping, BAD where one could not be read; complaints in the log."""
    keys = declared(Scene)
    unknown_keys(root, keys, "", log, more=("like",))
    own = ("script", "fault", "formation", "briefed")
    values = read_fields(Scene, root, "", log, skip=own)
    for key, read in (("script", read_script), ("formation", read_formation)):
        given = root.get(key)
        if given is None:
            missing(root.mark, key, keys[key].metadata, log)
            values[key] = BAD
        else:
            values[key] = read(given, key, log)
    values["fault"] = read_fault(root.get("fault"), "fault", log)
    briefed = root.get("briefed")
    none = briefed is None or (isinstance(briefed, Scalar) and briefed.is_none)
    values["briefed"] = None if none or briefed is None else read_script(briefed, "briefed", log)
    slots = root.get("formation")
    if isinstance(slots, MappingNode):
        there = [name for name, (_, n) in slots.items.items() if not (isinstance(n, Scalar) and n.is_none)]
        check_seat(root.get("film"), [LEAD, *there], log)
    if values["film"] is None:
        read = values["formation"]
        values["film"] = BAD if read is BAD else FilmPlan(read[0].name if read else LEAD)
    return values


def build_airframe(root: MappingNode, name: str, log: Log) -> Any:
    """The airframe of a root mapping, or BAD; complaints in the log."""
    unknown_keys(root, declared(Airframe), "", log, more=("like",))
    return made(Airframe, {"name": name, **read_fields(Airframe, root, "", log)})
