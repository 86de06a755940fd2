"""From one YAML node to one value: numbers with units, words, texts, power, points, loop tables, sizes."""

from __future__ import annotations

import os
import re
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from scenes import shelf, units
from scenes.complaint import Log, any_of, nearest, shown
from scenes.model import FULL, GOING, HELD, IDLE, POINTS, Point, Power, quantity
from scenes.yamlnode import Mapping as MappingNode
from scenes.yamlnode import Node, Scalar, what
from terrain.ground import GroundError, ground_names, is_elevation
from terrain.ground import read_ground as terrain_ground

BAD: Any = object()  # stands for a value that could not be read
Meta = Mapping[str, Any]

MAX_TEXT = {"title": 200, "notes": 10_000}
KNOTS = (2, 32)  # least and most entries of a loop table
# ITU-T H.264, Table A-1: level 5.2 takes frames of up to 36 864 macroblocks of 16 x 16 (the tests ask the encoder);
# higher levels are not played everywhere. yuv420p wants even sizes. The least size is our own: the overlay needs room.
MACROBLOCKS = 36_864
LEAST_SIZE = (160, 90)
MOST_SIZE = (4096, 4096)


def meta_of(dim: str, lo: float, hi: float, example: str = "") -> Meta:
    """A declaration outside a dataclass."""
    meta: Meta = quantity(dim, "", lo, hi, example=example).metadata
    return meta


def wanted_of(meta: Meta) -> str:
    """What a declared value must look like, in words."""
    dim = meta["dim"]
    if dim in units.DIMENSIONS:
        text = units.units_text(dim)
        return text.rsplit(" such as ", 1)[0].rstrip(",") + f", such as {meta['example']}" if meta["example"] else text
    return WANTED[dim](meta)


def read_number(node: Node, path: str, meta: Meta, log: Log, wanted: str | None = None) -> Any:
    """A number with its unit, in range, in SI; wanted: what to ask for, if not by the declaration."""
    dim = meta["dim"]
    wanted = wanted or wanted_of(meta)
    if not isinstance(node, Scalar):
        log.add(node.mark, path, what(node), wanted)
        return BAD
    try:
        value, unit = units.parse_value(dim, node.text)
    except units.UnitError as exc:
        finite = ", finite" if exc.wanted.endswith("finite") else ""
        log.add(node.mark, path, what(node), wanted + finite, exc.nearest)
        return BAD
    if not meta["lo"] <= value <= meta["hi"]:
        log.add(node.mark, path, what(node), units.range_text(dim, meta["lo"], meta["hi"], unit),
                _percent(dim, value, unit))
        return BAD
    return int(value) if dim == "count" else value


def _percent(dim: str, value: float, unit: str) -> str | None:
    return f"{value:g} %" if dim == "fraction" and unit == "" and 1.0 < value <= 100.0 else None


def read_text(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """A text."""
    most = MAX_TEXT.get(path, 1000)
    if not isinstance(node, Scalar) or node.kind != "str" or not node.text.strip():
        hint = f'"{node.text}"' if isinstance(node, Scalar) and node.kind not in ("str", "null") else None
        log.add(node.mark, path, what(node), WANTED["text"](meta), hint)
        return BAD
    if len(node.text) > most:
        log.add(node.mark, path, f"{len(node.text)} characters", f"at most {most} characters")
        return BAD
    return node.text.strip()


def read_word(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """One of a few words."""
    if not isinstance(node, Scalar) or node.text not in meta["choices"]:
        guess = nearest(node.text, meta["choices"]) if isinstance(node, Scalar) else None
        log.add(node.mark, path, what(node), any_of(meta["choices"]), guess)
        return BAD
    return node.text


def read_flag(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """true or false."""
    if not isinstance(node, Scalar) or node.kind != "bool" or node.text not in ("true", "false"):
        log.add(node.mark, path, what(node), "true or false")
        return BAD
    return node.text == "true"


def read_power(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """full, idle, held, or a part of full."""
    words = {"full": FULL, "idle": IDLE, "held": HELD}
    if isinstance(node, Scalar):
        if node.text in words:
            return words[node.text]
        try:
            value, unit = units.parse_value("fraction", node.text)
        except units.UnitError as exc:
            log.add(node.mark, path, what(node), WANTED["power"](meta), exc.nearest or nearest(node.text, words))
            return BAD
        if not 0.0 <= value <= 1.0:
            log.add(node.mark, path, what(node), "0 % to 100 %", _percent("fraction", value, unit))
            return BAD
        return Power("part", value)
    log.add(node.mark, path, what(node), WANTED["power"](meta))
    return BAD


def read_or_word(word: str) -> Callable[[Node, str, Meta, Log], Any]:
    """A rule: a time, or a word that means None."""
    def rule(node: Node, path: str, meta: Meta, log: Log) -> Any:
        if isinstance(node, Scalar) and node.text == word:
            return None
        if isinstance(node, Scalar) and nearest(node.text, (word,)):
            log.add(node.mark, path, what(node), wanted_of(meta), word)
            return BAD
        return read_number(node, path, {**meta, "dim": "time"}, log, wanted_of(meta))

    return rule


def read_engines(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """all, or how many; 0 stands for all."""
    if isinstance(node, Scalar) and node.text == "all":
        return 0
    if isinstance(node, Scalar) and re.fullmatch(r"[0-9]{1,3}", node.text) and (
        meta["lo"] <= int(node.text) <= meta["hi"]
    ):
        return int(node.text)
    log.add(node.mark, path, what(node), WANTED["engines"](meta))
    return BAD


def read_ground(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """A shipped terrain's name, or an elevation file's path (relative to the scene's file) with its display centre."""
    known = ground_names()
    if isinstance(node, Scalar) and node.text in known:
        return node.text
    if isinstance(node, Scalar) and is_elevation(node.text):
        text = os.path.abspath(Path(node.mark.file).parent / node.text)
        try:
            terrain_ground(text)
        except GroundError as exc:
            log.add(node.mark, path, what(node), str(exc).removeprefix("ground: "))
            return BAD
        return text
    guess = nearest(node.text, known) if isinstance(node, Scalar) else None
    log.add(node.mark, path, what(node), f"a terrain: {any_of(known)}, or the path of an elevation file", guess)
    return BAD


def read_airframe_name(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """A shipped airframe's name, or the absolute path of a file given relative to the scene's."""
    if not isinstance(node, Scalar) or not node.text:
        log.add(node.mark, path, what(node), f"an airframe: {any_of(shelf.names('airframe'))}, or a path")
        return BAD
    file = shelf.find("airframe", node.text, Path(node.mark.file).parent, node.mark, path, log)
    if file is None:
        return BAD
    return os.path.abspath(file) if shelf.is_path(node.text) else node.text


def read_size(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """Width and height of the picture in pixels."""
    match = re.fullmatch(r"([0-9]{1,6})x([0-9]{1,6})", node.text) if isinstance(node, Scalar) else None
    if match is None:
        log.add(node.mark, path, what(node), WANTED["size"](meta))
        return BAD
    size = int(match[1]), int(match[2])
    fits = nearest_size(*size)
    if size != fits:
        log.add(node.mark, path, what(node), "a size that an H.264 film takes: both even, from "
                f"{LEAST_SIZE[0]}x{LEAST_SIZE[1]}, not more than {MACROBLOCKS} blocks of 16x16 pixels",
                f"{fits[0]}x{fits[1]}")
        return BAD
    return size


def nearest_size(width: int, height: int) -> tuple[int, int]:
    """The nearest size that H.264 takes; the size itself if it does."""
    w, h = (max(lo, min(n, hi)) // 2 * 2 for n, lo, hi in zip((width, height), LEAST_SIZE, MOST_SIZE, strict=True))
    blocks = -(-w // 16) * -(-h // 16)
    if blocks <= MACROBLOCKS:
        return w, h
    return w, MACROBLOCKS // -(-w // 16) * 16


def read_point(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """A point of the script: one of loop_angle, time, after_top, height (with going)."""
    if not isinstance(node, MappingNode):
        log.add(node.mark, path, what(node), WANTED["point"](meta))
        return BAD
    kinds = [key for key in node.items if key in POINTS]
    good = True
    for key, (mark, _) in node.items.items():
        if key not in POINTS and key != "going":
            log.add(mark, f"{path}.{key}", f"the key {shown(key)}", f"one of {any_of(POINTS)}",
                    nearest(key, [*POINTS, "going"]))
            good = False
    if len(kinds) != 1:
        if kinds or good:
            log.add(node.mark, path, " and ".join(kinds) or "none of them", f"just one of {any_of(POINTS)}")
        return BAD
    kind = kinds[0]
    dim, lo, hi, _ = POINTS[kind]
    value = read_number(node.items[kind][1], f"{path}.{kind}", meta_of(dim, lo, hi), log)
    going = "down"
    if "going" in node.items:
        mark, given = node.items["going"]
        if kind != "height":
            log.add(mark, f"{path}.going", "the key going", f"no going with {kind}: it goes with height")
            return BAD
        going = read_word(given, f"{path}.going", {"choices": GOING}, log)
    return BAD if not good or value is BAD or going is BAD else Point(kind, value, going)


def read_loop_table(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """Loop angles (rad, rising) and load factors from a mapping of degrees to g."""
    if not isinstance(node, MappingNode):
        log.add(node.mark, path, what(node), WANTED["loop_table"](meta))
        return BAD
    angles: list[float] = []
    loads: list[float] = []
    good = True
    for key, (mark, given) in node.items.items():
        here = f"{path}.{key}"
        load = read_number(given, here, meta_of("load_factor", meta["lo"], meta["hi"], "4.6"), log)
        try:
            angle, _ = units.parse_value("number", key)
        except units.UnitError:
            log.add(mark, here, shown(key), "a loop angle as a bare number of degrees, such as 245")
            good = False
            continue
        if not 0.0 <= angle <= 360.0:
            log.add(mark, here, shown(key), "a loop angle from 0 to 360")
            good = False
        elif angles and angle <= angles[-1]:
            log.add(mark, here, f"{shown(key)} after {angles[-1]:g}", "loop angles that rise")
            good = False
        angles.append(angle)
        good = good and load is not BAD
        loads.append(load)
    if good and not KNOTS[0] <= len(angles) <= KNOTS[1]:
        some = "1 loop angle" if len(angles) == 1 else f"{len(angles)} loop angles"
        log.add(node.mark, path, some, f"{KNOTS[0]} to {KNOTS[1]} of them")
        good = False
    return (tuple(a * units.DEG_RAD for a in angles), tuple(loads)) if good else BAD


WANTED: Mapping[str, Callable[[Meta], str]] = {
    "text": lambda m: f"a text, such as {m['example']}" if m.get("example") else "a text",
    "word": lambda m: any_of(m["choices"]),
    "flag": lambda m: "true or false",
    "power": lambda m: "full, idle, held or a percentage such as 88 %",
    "time_or_never": lambda m: f"never or {units.units_text('time')}",
    "time_or_none": lambda m: f"none or {units.units_text('time')}",
    "engines": lambda m: f"all, or a whole number from {m['lo']} to {m['hi']}",
    "ground": lambda m: f"a terrain: {any_of(ground_names())}, or the path of an elevation file",
    "airframe": lambda m: f"an airframe: {any_of(shelf.names('airframe'))}, or a path",
    "seat": lambda m: "a slot of the formation, or lead",
    "size": lambda m: "width x height in pixels, such as 1280x720",
    "point": lambda m: f"a mapping with one of {any_of(POINTS)}, such as {{loop_angle: 245 deg}}",
    "loop_table": lambda m: "a mapping of loop angle in degrees to load factor in g, such as {0: 1.2, 8: 4.6}",
    "part": lambda m: "a mapping of its keys",
    "fault": lambda m: "a mapping such as {kind: freeze, at: {loop_angle: 245 deg}}",
    "script": lambda m: "a list of steps, the first of them a level step with speed, height and heading",
    "formation": lambda m: "a mapping of slots, such as right: {aft: 8 m, right: 11 m, down: 1 m}",
}


def read_seat(node: Node, path: str, meta: Meta, log: Log) -> Any:
    """A slot's name; whether there is such a slot is checked with the formation."""
    if not isinstance(node, Scalar) or node.kind == "null":
        log.add(node.mark, path, what(node), WANTED["seat"](meta))
        return BAD
    return node.text


RULES: Mapping[str, Callable[[Node, str, Meta, Log], Any]] = {
    **{dim: read_number for dim in units.DIMENSIONS},
    "text": read_text, "word": read_word, "flag": read_flag, "power": read_power,
    "time_or_never": read_or_word("never"), "time_or_none": read_or_word("none"), "engines": read_engines,
    "ground": read_ground, "airframe": read_airframe_name, "seat": read_seat, "size": read_size,
    "point": read_point, "loop_table": read_loop_table,
}
