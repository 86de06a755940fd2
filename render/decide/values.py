"""A grid over values of a scene: which, named by their dotted paths, and in which units they are shown.

``PATH=FROM:TO:STEP`` with a unit, ``PATH=FROM:TO/COUNT`` or ``PATH=A,B,C``; a path may be shortened to its last
parts where that fits one value alone.
"""

from __future__ import annotations

import difflib
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from render.decide.cases import Cases, per_case, work_cases
from render.errors import LatepullError
from scenes.airframe import Airframe
from scenes.complaint import SceneError
from scenes.model import INF, Scene
from scenes.units import DIMENSIONS, UnitError, in_unit, parse_value, split_value
from scenes.variants import ValuePath, value_paths, with_values
from terrain.ground import Ground

MOST = 2000  # values on one axis: more can't be read, and is a slip of the pen
FORMS = "PATH=FROM:TO:STEP with a unit (loop_angle=180:330:5deg), PATH=FROM:TO/COUNT, or PATH=A,B,C"


@dataclass(frozen=True, slots=True)
class Axis:
    """Values of one number of a scene, SI, in the order they were given."""

    path: str
    dim: str
    unit: str  # the one it is shown in
    values: tuple[float, ...]

    @property
    def name(self) -> str:
        """The column's name with its unit: ``fault.at.loop_angle_deg``, ``fault.fraction_percent``."""
        unit = {"%": "percent"}.get(self.unit, self.unit.replace("/", "_per_"))
        return f"{self.path}_{unit}" if unit else self.path

    def shown(self) -> tuple[float, ...]:
        """The values in the unit."""
        return tuple(round(in_unit(self.dim, v, self.unit), 9) for v in self.values)

    def text(self, index: int) -> str:
        """One value with its unit: ``245 deg``, ``0.2 deg/s``."""
        value = f"{self.shown()[index]:.6g}"
        return f"{value} {self.unit}".rstrip()


def find_path(scene: Scene, path: str, option: str) -> ValuePath:
    """The value a path or its last parts name. Raises LatepullError with the nearest ones."""
    known = {place.path: place for place in value_paths(scene)}
    if path in known:
        return known[path]
    ends = [p for p in known if p.endswith(f".{path}")]
    if len(ends) == 1:
        return known[ends[0]]
    if ends:
        raise LatepullError(f"{option}: read {path}, which fits {_some(ends)}; wanted one of them")
    near = sorted(known, key=lambda p: -max(_alike(path, p), _alike(path.rsplit(".", 1)[-1], p.rsplit(".", 1)[-1])))[:3]
    raise LatepullError(f"{option}: read {path}, which is no number of '{scene.name}'; nearest {_some(near)}")


def _alike(one: str, other: str) -> float:
    return difflib.SequenceMatcher(None, one, other).ratio()


def _some(paths: Sequence[str], most: int = 8) -> str:
    more = f" and {len(paths) - most} more" if len(paths) > most else ""
    return ", ".join(paths[:most]) + more


def read_axis(scene: Scene, text: str, option: str) -> Axis:
    """An axis from an option such as ``loop_angle=180:330:5deg``. Raises LatepullError."""
    path, sign, grid = text.partition("=")
    if not sign or not path.strip() or not grid.strip():
        raise LatepullError(f"{option}: read {text!r}, wanted {FORMS}")
    place = find_path(scene, path.strip(), option)
    if place.dim not in DIMENSIONS:
        raise LatepullError(f"{option}: {place.path} can't be put on an axis")
    numbers, unit = _numbers(place, grid.strip(), option, text)
    if len(numbers) > MOST:
        raise LatepullError(f"{option}: read {len(numbers):,} values; at most {MOST:,} are wanted on an axis")
    outside = [v for v in numbers if not place.lo <= v <= place.hi]
    if outside:
        raise LatepullError(
            f"{option}: {place.path} of {_in(place.dim, outside[0], unit)} is out of range; wanted "
            f"{_in(place.dim, place.lo, unit)} to {_in(place.dim, place.hi, unit)}"
        )
    if place.dim == "count" and any(v != round(v) for v in numbers):
        raise LatepullError(f"{option}: {place.path} is counted; wanted whole numbers")
    # a bare load factor is one in g
    return Axis(place.path, place.dim, unit or DIMENSIONS[place.dim].si, tuple(numbers))


def _in(dim: str, value: float, unit: str) -> str:
    if not math.isfinite(value):
        return "any" if value in (INF, -INF) else str(value)
    return f"{in_unit(dim, value, unit):.6g} {unit}".rstrip()


def _numbers(place: ValuePath, grid: str, option: str, text: str) -> tuple[list[float], str]:
    """The values, SI, and the unit they are shown in. A part without a unit takes the last one's."""

    def bad(why: str) -> LatepullError:
        return LatepullError(f"{option}: read {text!r}{why}")

    if ":" not in grid:
        values, unit = _parse(place, grid.split(","), option, text)
        if len(set(values)) != len(values):
            raise bad(", where a value comes twice")
        return values, unit
    parts = grid.split(":")
    count = None
    if len(parts) == 2 and "/" in parts[1] and parts[1].rpartition("/")[2].strip().isdigit():
        # FROM:TO/COUNT; the slash of a unit such as deg/s stands before a letter
        parts[1], _, count_text = parts[1].rpartition("/")
        count = int(count_text)
    if len(parts) != (2 if count is not None else 3):
        raise bad(f", wanted {FORMS}")
    values, unit = _parse(place, parts, option, text)
    start, stop = values[:2]
    if stop <= start:
        raise bad(", which does not rise; wanted FROM below TO")
    if count is None:
        # a step is a difference: 5 degC of it are 5 K
        zero = _parse(place, [f"0 {unit}"], option, text)[0][0]
        step = values[2] - zero
        if step <= 0.0:
            raise bad(", wanted a step above zero")
        count = math.floor((stop - start) / step + 1e-9) + 1
        stop = start + (count - 1) * step
    if count < 2:
        raise bad(", which is one value; wanted two or more")
    if count > MOST:
        raise bad(f", which is {count:,} values; at most {MOST:,} are wanted on an axis")
    return [start + i * (stop - start) / (count - 1) for i in range(count)], unit


def _parse(place: ValuePath, parts: Sequence[str], option: str, text: str) -> tuple[list[float], str]:
    last = split_value(parts[-1])
    shared = last[1] if last is not None else ""
    values, unit = [], place.unit
    for part in parts:
        read = split_value(part)
        full = f"{part.strip()} {shared}" if read is not None and not read[1] and shared else part.strip()
        try:
            value, unit = parse_value(place.dim, full)
        except UnitError as exc:
            near = f" (nearest {exc.nearest})" if exc.nearest else ""
            raise LatepullError(f"{option}: read {text!r}, where {part.strip()!r} is no value of {place.path}; wanted "
                                f"{exc.wanted}{near}") from None
        values.append(float(value))
    return values, unit


@dataclass(frozen=True, slots=True, eq=False)
class Common:
    """What all cases of one table share."""

    scene: Scene
    airframes: Mapping[str, Airframe]
    ground: Ground
    threads: int = 2


def common_of(scene: Scene, airframe_of: Callable[[str], Airframe], ground: Ground, threads: int = 2) -> Common:
    """What cases of a scene share: its airframes read, its ground."""
    names = {scene.airframe, *(slot.airframe for slot in scene.formation if slot.airframe)}
    return Common(scene, {name: airframe_of(name) for name in sorted(names)}, ground, threads)


def work_values(common: Common, values: Sequence[Mapping[str, float]]) -> Cases:
    """Cases of a scene with some of its values changed, {path: SI} each; a chunk of work for a runner.

    A case whose values are no scene together is a row with its error.
    """
    scenes: list[Scene] = []
    wrong: dict[int, str] = {}
    for i, changes in enumerate(values):
        try:
            scenes.append(with_values(common.scene, changes, common.airframes))
        except SceneError as exc:
            wrong[i] = str(exc)
            scenes.append(common.scene)
    cases = work_cases(scenes, common.airframes.__getitem__, common.ground, chunk=len(scenes), threads=common.threads)
    return cases if not wrong else spoilt(cases, wrong)


def spoilt(cases: Cases, wrong: Mapping[int, str]) -> Cases:
    """The table with some of its rows made void, for a reason each."""
    columns: dict[str, Any] = {}
    for name in per_case():
        column = getattr(cases, name).copy()
        column[list(wrong)] = -1 if name == "cue" else np.nan
        columns[name] = column
    return replace(cases, error=tuple(wrong.get(i, e) for i, e in enumerate(cases.error)), **columns)
