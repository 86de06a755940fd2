"""The map: one case for each point of a grid over two values of a scene, and what became of it.

By default where in the loop the fault comes on against how much of the control is left.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from render.decide.cases import Cases, per_case
from render.decide.values import Axis, find_path, read_axis
from render.errors import LatepullError
from render.frames import Array
from render.types import freeze_arrays
from scenes.model import DEG, Loop, Point, Scene
from scenes.units import in_unit
from scenes.variants import value_paths


class Outcome(IntEnum):
    """What became of a wing at one point of the map, from best to worst."""

    UNKNOWN = -1  # the case can't be flown
    CLEARS = 0  # the flight as it is stays above the floor: nobody needs to break out
    ALL_IN_TIME = 1  # even the late observer acts before the last pull
    LIKELY_IN_TIME = 2  # the early and the likely one
    EARLY_IN_TIME = 3  # the early one alone
    TOO_LATE = 4  # not even the early one


def outcomes(cases: Cases, floor_m: Array | float) -> NDArray[np.int64]:
    """Outcomes of cases, (B, S); floor_m: of each case, or of all of them."""
    floor = np.broadcast_to(np.asarray(floor_m, dtype=np.float64), len(cases.error))[:, None]
    clears = cases.lowest_m[:, 1:] >= floor
    # NaN, never noticed, is not in time
    in_time = np.count_nonzero(cases.lateness_s <= 0.0, axis=2)
    found = np.where(clears, Outcome.CLEARS, Outcome.TOO_LATE - in_time)
    return np.where(cases.flown[:, None], found, Outcome.UNKNOWN).astype(np.int64)


@dataclass(frozen=True, slots=True, eq=False)
class Map:
    """A grid of cases, the case of x i and y j in row i * len(y) + j; X x Y points, S slots, O observers."""

    scene: Scene  # as mapped: with the fault the grid varies
    x: Axis
    y: Axis
    cases: Cases
    outcome: NDArray[np.int64]  # (X, Y, S)
    here: tuple[float | None, float | None]  # where the scene itself stands, in the axes' units, if within them

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def shape(self) -> tuple[int, int]:
        """Points along x and y."""
        return len(self.x.values), len(self.y.values)

    def grid(self, column: str) -> Array:
        """A column of the cases as a grid, (X, Y, ...)."""
        found: Array = getattr(self.cases, column)
        return found.reshape(*self.shape, *found.shape[1:])


# What amounts of a fault are worth a look, by its kind: the path's end, and the axis.
_AMOUNTS = {
    "authority": "fault.fraction=0:90:10%",
    "slow": "fault.rate=0.05,0.1,0.2,0.5,1,2,5 deg/s",
    "trail": "fault.over=0.25,0.5,1,2,4,8 s",
}
_BACK_HALF, _WHOLE_LOOP = "fault.at.loop_angle=180:330:5deg", "fault.at.loop_angle=0:330:10deg"
_SPEEDS_MPS = tuple(n * 1852.0 / 3600.0 for n in (-20.0, -15.0, -10.0, -5.0, 0.0, 5.0, 10.0, 15.0, 20.0))


def mapped_scene(scene: Scene, x: str | None, y: str | None) -> Scene:
    """The scene a map varies: its fault placed by loop angle, and a freeze taken as an authority of nothing.

    Only where the axes are not given and need it. Raises LatepullError if there is no fault to map.
    """
    if scene.fault is None and (x is None or y is None or "fault." in f"{x} {y}"):
        raise LatepullError(f"'{scene.name}' has no fault to map; give it one, or give --x and --y")
    fault = scene.fault
    if fault is None:
        return scene
    if x is None and _has_loop(scene) and fault.at.kind != "loop_angle":
        fault = replace(fault, at=Point("loop_angle", 180.0 * DEG if fault.at.kind == "after_top" else 0.0))
    wants_fraction = y is None or "fraction" in f"{x} {y}"
    if fault.kind == "freeze" and wants_fraction:
        # a surface that answers nothing of what is asked is a frozen one, to the last bit
        fault = replace(fault, kind="authority", fraction=0.0)
    return replace(scene, fault=fault)


def _has_loop(scene: Scene) -> bool:
    return any(isinstance(step, Loop) for step in scene.script)


def map_axes(scene: Scene, x: str | None, y: str | None) -> tuple[Scene, Axis, Axis]:
    """The scene to map and its axes from the options ``--x`` and ``--y`` (None: the default for its fault).

    Raises LatepullError.
    """
    mapped = mapped_scene(scene, x, y)
    fault = mapped.fault
    x_axis = read_axis(mapped, x, "--x") if x is not None else _default_x(mapped)
    if y is not None:
        y_axis = read_axis(mapped, y, "--y")
    elif fault is not None and fault.kind in _AMOUNTS:
        y_axis = _with_own(mapped, read_axis(mapped, _AMOUNTS[fault.kind], "--y"))
    else:
        y_axis = _around(mapped, "script.0.level.speed")
    if x_axis.path == y_axis.path:
        raise LatepullError(f"--x and --y are both {x_axis.path}; wanted two different values")
    return mapped, x_axis, y_axis


def _default_x(scene: Scene) -> Axis:
    assert scene.fault is not None
    if scene.fault.at.kind == "loop_angle":
        return read_axis(scene, _BACK_HALF if scene.fault.at.value >= 180.0 * DEG else _WHOLE_LOOP, "--x")
    # no loop: half to twice the point the scene has
    place = find_path(scene, f"fault.at.{scene.fault.at.kind}", "--x")
    value = scene.fault.at.value or 10.0
    values = [v for v in np.linspace(0.5 * value, 2.0 * value, 13) if place.lo <= v <= place.hi]
    return Axis(place.path, place.dim, place.unit, tuple(float(v) for v in values))


def _with_own(scene: Scene, axis: Axis) -> Axis:
    """The axis with the scene's own value among the others, in order."""
    own = find_path(scene, axis.path, "--y").value
    if own is None or any(abs(own - v) < 1e-9 for v in axis.values):
        return axis
    return replace(axis, values=tuple(sorted((*axis.values, own))))


def _around(scene: Scene, path: str) -> Axis:
    place = find_path(scene, path, "--y")
    assert place.value is not None
    values = tuple(v for v in (place.value + d for d in _SPEEDS_MPS) if place.lo <= v <= place.hi)
    return Axis(place.path, place.dim, place.unit, values)


def grid_values(x: Axis, y: Axis) -> list[Mapping[str, float]]:
    """The changes of the scene at each point, x outermost."""
    return [{x.path: a, y.path: b} for a in x.values for b in y.values]


def own_twins(x: Axis, y: Axis) -> bool:
    """Whether the healthy flight differs between points, which costs most of the time."""
    return not all(axis.path.startswith(("fault.", "watch.", "break_out.", "floor")) for axis in (x, y))


def make_map(scene: Scene, mapped: Scene, x: Axis, y: Axis, cases: Cases) -> Map:
    """The map of cases worked through in the order of ``grid_values``."""
    floor = np.full(len(cases.error), mapped.floor_m)
    for axis, values in ((x, np.repeat(x.values, len(y.values))), (y, np.tile(y.values, len(x.values)))):
        if axis.path == "floor":
            floor = np.asarray(values, dtype=np.float64)
    grid = outcomes(cases, floor).reshape(len(x.values), len(y.values), -1)
    return Map(mapped, x, y, cases, grid, _here(scene, x, y))


def _here(scene: Scene, x: Axis, y: Axis) -> tuple[float | None, float | None]:
    """Where the scene itself stands on each axis, in its unit."""
    known = {place.path: place.value for place in value_paths(scene)}
    if scene.fault is not None and scene.fault.kind == "freeze":
        known["fault.fraction"] = 0.0
    at: list[float | None] = []
    for axis in (x, y):
        value = known.get(axis.path)
        on = value is not None and min(axis.values) - 1e-9 <= value <= max(axis.values) + 1e-9
        at.append(round(in_unit(axis.dim, value, axis.unit), 9) if on and value is not None else None)
    return at[0], at[1]


def same_slots(found: Map, digits: int = 1) -> list[tuple[int, ...]]:
    """Slots whose outcomes and likely lateness are the same on the map, together, in the scene's order."""
    groups: list[list[int]] = []
    late = np.round(found.cases.lateness_s[:, :, 1], digits)
    for k in range(len(found.cases.names)):
        for group in groups:
            j = group[0]
            same = np.array_equal(found.outcome[..., k], found.outcome[..., j])
            close = np.abs(late[:, k] - late[:, j]) <= 1.5 * 10.0**-digits
            if same and np.all(close | (np.isnan(late[:, k]) & np.isnan(late[:, j]))):
                group.append(k)
                break
        else:
            groups.append([k])
    return [tuple(group) for group in groups]


def columns(found: Map) -> dict[str, Array | NDArray[np.int64]]:
    """The map as plain arrays, for ``map.npz``: axes in SI, columns of the cases as (X, Y, ...), outcomes."""
    return {
        "x": np.array(found.x.values), "y": np.array(found.y.values), "outcome": found.outcome,
        **{name: found.grid(name) for name in per_case()},
    }
