"""The canopy of woods near the display centre as a height over the ground, from the same plan as the ground's look."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from terrain.pattern import Array, Place, Plan, from_grain, grain, place_at, value_noise

Ints = NDArray[np.int64]
STEP_M, COARSE_M = 12.0, 60.0  # between the canopy's corners; of the squares in which woods are looked for first
SHAKE_M = 3.5  # the corners' own disorder, so that no rows show
WIDE = 1 << 20  # more columns than there are, to number corners
INSIDE_M = 1.0  # a wood's canopy begins so far inside it


@dataclass(frozen=True, slots=True, eq=False)
class Canopy:
    """Corners (P,) with their height over the ground (0 at the foot of a wood's edge), and triangles (T, 3)."""

    north_m: Array
    east_m: Array
    height_m: Array
    triangles: Ints


def depth_of_wood(plan: Plan, north_m: Array, east_m: Array) -> Array:
    """About how far inside a wood a place is, m; negative outside."""
    return _depth(plan, place_at(plan, north_m, east_m))


def _depth(plan: Plan, place: Place) -> Array:
    level = value_noise(place.u_m / 600.0, place.v_m / 600.0, plan.salt) - plan.wild_wood
    result: Array = np.where(place.wood, np.where(place.enclosed, place.edge_m - 3.0, 500.0 * level), -1.0)
    return result


def canopy_of(
    plan: Plan,
    tree_height_m: tuple[float, float],
    reach_m: float,
    open_to: Callable[[Array, Array], NDArray[np.bool_]],
    rng: np.random.Generator,
) -> Canopy:
    """The canopy of all woods within ``reach_m`` of the display centre.

    tree_height_m: least and greatest height of its trees; open_to(north, east): where trees may stand at all.
    """
    row, column = _wooded(plan, reach_m)
    numbers = np.concatenate([(row + a) * WIDE + column + b for a in (0, 1) for b in (0, 1)])
    corners, inverse = np.unique(numbers, return_inverse=True)
    rows, columns = corners // WIDE, corners % WIDE - WIDE // 2
    shake = rng.uniform(-SHAKE_M, SHAKE_M, (2, len(corners)))
    north, east = from_grain(plan, columns * STEP_M + shake[1], rows * STEP_M + shake[0])
    place = place_at(plan, north, east)
    depth = np.minimum(_depth(plan, place), place.road_m - 0.5 * plan.road_m - 4.0)
    inside = (depth > INSIDE_M) & (np.hypot(north, east) < reach_m)
    inside[inside] = open_to(north[inside], east[inside])
    low, high = tree_height_m
    full = (low + (high - low) * rng.uniform(0.35, 0.60, len(depth))) * 0.85
    height = np.where(inside, full * np.clip(0.55 + depth / 22.0, 0.0, 1.0), 0.0)
    a, b, c, d = inverse.reshape(4, -1)  # (row, column), (row, column + 1), (row + 1, column), both + 1
    triangles = np.concatenate([np.column_stack([a, b, c]), np.column_stack([b, d, c])])
    triangles = triangles[inside[triangles].any(axis=1)]
    used, renumbered = np.unique(triangles, return_inverse=True)
    return Canopy(north[used], east[used], height[used], renumbered.reshape(-1, 3))


def _wooded(plan: Plan, reach_m: float) -> tuple[Ints, Ints]:
    """Rows, along v, and columns, along u (from WIDE / 2), of the small squares of the plan that may hold wood."""
    far = reach_m + COARSE_M
    axis = np.arange(-far, far, 0.5 * COARSE_M)
    n, e = (grid.ravel() for grid in np.meshgrid(axis, axis, indexing="ij"))
    hit = depth_of_wood(plan, n, e) > 0.0
    u, v = grain(plan, n[hit], e[hit])
    rows, columns = (np.floor(x / COARSE_M).astype(np.int64) for x in (v, u))
    # with their neighbours: a wood's edge may lie in a square whose sampled places lie outside it
    around = [(rows + i) * WIDE + columns + j + WIDE // 2 for i in (-1, 0, 1) for j in (-1, 0, 1)]
    squares = np.unique(np.concatenate(around))
    per = int(COARSE_M / STEP_M)
    i, j = (grid.ravel() for grid in np.meshgrid(np.arange(per), np.arange(per), indexing="ij"))
    rows, columns = squares // WIDE, squares % WIDE - WIDE // 2
    return (rows[:, None] * per + i).ravel(), (columns[:, None] * per + j + WIDE // 2).ravel()
