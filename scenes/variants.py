"""A scene with one value or some changed, named by their dotted paths in the YAML."""

from __future__ import annotations

import dataclasses
import difflib
import itertools
import math
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from scenes.airframe import Airframe
from scenes.build import declared
from scenes.checks import degrees_key, scene_findings
from scenes.complaint import Complaint, SceneError, any_of, shown
from scenes.model import DEG, POINTS, STEPS, Loop, Power, Scene
from scenes.reader import read_airframe
from scenes.rules import KNOTS
from scenes.units import DIMENSIONS, USUAL, UnitError, in_unit, parse_value, range_text

Chain = tuple[str | int, ...]  # attribute names and indices from the scene down to the value
SAME = {"power": "fraction", "time_or_never": "time", "time_or_none": "time", "engines": "count"}


@dataclass(frozen=True, slots=True)
class ValuePath:
    """A number of a scene that can be set: path, dimension, value (None: not given), range, all in SI."""

    path: str
    dim: str
    value: float | None
    lo: float
    hi: float
    chain: Chain = ()

    @property
    def unit(self) -> str:
        """The unit it is usually given in."""
        return USUAL.get(self.dim, (DIMENSIONS[self.dim].si,))[0]


def value_paths(scene: Scene) -> tuple[ValuePath, ...]:
    """All numbers of a scene that ``with_value`` can set."""
    return tuple(_all(scene))


def _all(scene: Scene) -> Iterator[ValuePath]:
    for script in ("script", "briefed"):
        for i, step in enumerate(getattr(scene, script) or ()):
            name = next(n for n, cls in STEPS.items() if cls is type(step))
            if script == "script" or i > 0:  # the first step is the script's own
                yield from _part(step, f"{script}.{i}.{name}", (script, i))
    for i, slot in enumerate(scene.formation):
        yield from _part(slot, f"formation.{slot.name}", ("formation", i))
    yield from _part(scene, "", ())


def _part(part: Any, path: str, chain: Chain) -> Iterator[ValuePath]:
    for key, f in declared(type(part)).items():
        meta, value = f.metadata, getattr(part, f.name)
        dim = SAME.get(meta["dim"], meta["dim"])
        here, down = f"{path}.{key}" if path else key, (*chain, f.name)
        if meta["kinds"] and part.kind not in meta["kinds"]:
            continue
        if meta["dim"] == "loop_table":
            for k, (angle, load) in enumerate(zip(part.angle_rad, part.load_factor, strict=True)):
                yield ValuePath(f"{here}.{degrees_key(angle)}", "load_factor", load, meta["lo"], meta["hi"],
                                (*chain, "load_factor", k))
        elif meta["dim"] == "power":
            yield ValuePath(here, dim, value.part if value.kind == "part" else None, 0.0, 1.0, down)
        elif meta["dim"] == "point":
            point_dim, lo, hi, _ = POINTS[value.kind]
            yield ValuePath(f"{here}.{value.kind}", point_dim, value.value, lo, hi, (*down, "value"))
        elif meta["part"] is not None:
            if value is not None:
                yield from _part(value, here, down)
        elif dim in DIMENSIONS:
            value = None if meta["dim"] == "engines" and value == 0 else value  # 0 stands for all
            yield ValuePath(here, dim, value, meta["lo"], meta["hi"], down)


def with_value(scene: Scene, path: str, value: float | str, airframes: Mapping[str, Airframe] | None = None) -> Scene:
    """The scene with one value changed. Raises SceneError: no such path, out of range, no longer a scene.

    path: dotted as in the YAML, such as ``fault.at.loop_angle``, ``script.1.loop.load_factor.225``;
    value: SI (radians, parts of one) or text with its unit; airframes: by name, read if not given.
    """
    return with_values(scene, {path: value}, airframes)


def with_values(scene: Scene, values: Mapping[str, Any], airframes: Mapping[str, Airframe] | None = None) -> Scene:
    """The scene with several values changed, checked when all of them are.

    A loop's whole table can be given too: path ``script.1.loop.load_factor``, a mapping of degrees to g.
    """
    known = {place.path: place for place in _all(scene)}
    bad: list[Complaint] = []
    changed = scene
    for path, value in values.items():
        try:
            if isinstance(value, Mapping):
                changed = _with_table(changed, path, value)
                continue
            place = known.get(path)
            if place is None:
                raise _Refused("no such value", "a number that the scene gives", _near(path, known))
            changed = _put(changed, place.chain, _number(place, value))
            if place.chain[:2] == ("script", 0) and changed.briefed is not None:
                changed = dataclasses.replace(changed, briefed=(changed.script[0], *changed.briefed[1:]))
        except _Refused as exc:
            bad.append(Complaint(scene.source or scene.name, 0, 0, path, exc.read, exc.wanted, exc.nearest))
    if not bad:
        frames = _frames(changed) if airframes is None else airframes
        bad = [Complaint(scene.source or scene.name, 0, 0, f.path, f.read, f.wanted, f.nearest)
               for f in scene_findings(changed, frames)]
    if bad:
        raise SceneError(bad)
    return changed


class _Refused(Exception):
    def __init__(self, read: str, wanted: str, nearest: str | None = None) -> None:
        super().__init__(read)
        self.read, self.wanted, self.nearest = read, wanted, nearest


def _near(path: str, known: Mapping[str, ValuePath]) -> str | None:
    found = difflib.get_close_matches(path, known, 3, 0.5)
    return any_of(found) if found else None


def _number(place: ValuePath, value: float | str) -> float | int:
    if isinstance(value, str):
        try:
            number, unit = parse_value(place.dim, value)
        except UnitError as exc:
            raise _Refused(shown(value), exc.wanted, exc.nearest) from None
        read = shown(value)
    else:
        number, unit = float(value), place.unit
        read = f"{in_unit(place.dim, number, unit):.10g} {unit}".rstrip()
    if not math.isfinite(number) or not place.lo <= number <= place.hi:
        raise _Refused(read, range_text(place.dim, place.lo, place.hi, unit))
    if place.dim == "count":
        if number != round(number):
            raise _Refused(read, "a whole number")
        return int(number)
    return number


def _put(node: Any, chain: Chain, value: Any) -> Any:
    if not chain:
        return Power("part", value) if isinstance(node, Power) else value
    first, rest = chain[0], chain[1:]
    if isinstance(first, int):
        return (*node[:first], _put(node[first], rest, value), *node[first + 1 :])
    return dataclasses.replace(node, **{first: _put(getattr(node, first), rest, value)})


def _with_table(scene: Scene, path: str, table: Mapping[Any, Any]) -> Scene:
    keys = path.split(".")
    loops = [f"{name}.{i}.loop.load_factor" for name in ("script", "briefed")
             for i, step in enumerate(getattr(scene, name) or ()) if isinstance(step, Loop)]
    if path not in loops:
        raise _Refused("no such table", any_of(loops) if loops else "a scene with a loop")
    meta = declared(Loop)["load_factor"].metadata
    angles, loads = [float(a) for a in table], [float(n) for n in table.values()]
    rising = all(a < b for a, b in itertools.pairwise(angles))
    if not rising or not KNOTS[0] <= len(angles) <= KNOTS[1] or not all(0.0 <= a <= 360.0 for a in angles):
        raise _Refused(f"{len(angles)} loop angles", f"{KNOTS[0]} to {KNOTS[1]} loop angles from 0 to 360 that rise")
    if not all(meta["lo"] <= n <= meta["hi"] for n in loads):
        raise _Refused("a load factor out of range", range_text("load_factor", meta["lo"], meta["hi"], "g"))
    chain: Chain = (keys[0], int(keys[1]))
    changed: Scene = _put(scene, (*chain, "angle_rad"), tuple(a * DEG for a in angles))
    changed = _put(changed, (*chain, "load_factor"), tuple(loads))
    return changed


def _frames(scene: Scene, read: Callable[[str], Airframe] = read_airframe) -> dict[str, Airframe]:
    """A scene's airframes by name; one that can't be read (a scene made in code) is left out."""
    frames = {}
    for name in dict.fromkeys([scene.airframe, *(s.airframe for s in scene.formation if s.airframe)]):
        try:
            frames[name] = read(name)
        except SceneError:
            continue
    return frames
