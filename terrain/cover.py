"""What stands on a land near the display centre: trees, hedges, buildings, vehicles, things beside the runway.

All of it follows from recipe and seed, and from the same plan as the ground's look: hedges stand on field edges,
woods' trees in woods; nothing stands on the runway, on taxiways or in the sea.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from terrain.ground import Ground
from terrain.hedges import Lines, field_edges, keep
from terrain.land import Land, land_of
from terrain.pattern import Array, place_at
from terrain.woods import Canopy, canopy_of, depth_of_wood
from terrain.yards import Boxes, yards

REACH_M = 2_600.0
WOODS_REACH_M = 2_300.0  # woods farther off are painted on the ground


@dataclass(frozen=True, slots=True, eq=False)
class Trees:
    """Trees and bushes, arrays (N,): kind is ``broadleaf``, ``conifer`` or ``bush``."""

    kind: NDArray[np.str_]
    north_m: Array
    east_m: Array
    height_m: Array
    width_m: Array
    tone: Array  # 0..1, for its colour
    deep: NDArray[np.bool_]  # inside a wood, where its shadow falls on other trees


@dataclass(frozen=True, slots=True, eq=False)
class Cover:
    """Everything that stands on the land."""

    trees: Trees
    hedges: Lines
    hedge_height_m: float
    boxes: Boxes
    canopy: Canopy


def cover_of(ground: Ground, seed: int) -> Cover:
    """The cover of a ground whose recipe has one, from the recipe and the seed the ground was read with."""
    land = land_of(ground.recipe, seed)
    rng = np.random.default_rng([seed, 7])
    edges = field_edges(land.plan, REACH_M)
    free = open_ground(land, edges.north_m, edges.east_m, 4.0) & open_ground(
        land, edges.to_north_m, edges.to_east_m, 4.0
    )
    middle = place_at(land.plan, 0.5 * (edges.north_m + edges.to_north_m), 0.5 * (edges.east_m + edges.to_east_m))
    edges = keep(edges, free & (middle.road_m > 0.5 * land.plan.road_m + 4.0))
    boxes = yards(land, rng, REACH_M, lambda n, e, margin: open_ground(land, n, e, margin))
    trees = _trees(land, rng, edges, boxes)
    gaps = rng.random(len(edges.north_m)) < land.standing.hedge_gaps
    near = np.hypot(edges.north_m, edges.east_m) < land.standing.hedge_reach_m

    def may_stand(north_m: Array, east_m: Array) -> NDArray[np.bool_]:
        return open_ground(land, north_m, east_m, 8.0) & boxes.clear_of(north_m, east_m, np.full(len(north_m), 4.0))

    canopy = canopy_of(land.plan, land.standing.wood_height_m, WOODS_REACH_M, may_stand, rng)
    return Cover(trees, keep(edges, ~gaps & near), land.standing.hedge_height_m, boxes, canopy)


def open_ground(land: Land, north_m: Array, east_m: Array, margin_m: float) -> NDArray[np.bool_]:
    """Whether places lie outside the airfield's bounds and the sea by that margin."""
    outside = np.ones(np.shape(north_m), bool)
    if land.airfield is not None:
        along, across = land.airfield.along_across(north_m, east_m)
        low, high = land.airfield.across_m
        outside = np.abs(along) > land.airfield.half_along_m + margin_m
        outside |= (across < low - margin_m) | (across > high + margin_m)
    if land.plan.shore is not None:
        outside &= land.plan.shore.seaward_m(north_m, east_m) < -margin_m - 45.0
    result: NDArray[np.bool_] = outside
    return result


_Group = tuple[Array, Array, str, tuple[float, float], float]  # north, east, kind, heights, width for height


def _trees(land: Land, rng: np.random.Generator, edges: Lines, boxes: Boxes) -> Trees:
    plan, stand = land.plan, land.standing
    groups: list[_Group] = []
    # along hedges
    along = rng.random(len(edges.north_m))
    chosen = rng.random(len(along)) < stand.hedge_trees
    n = edges.north_m + along * (edges.to_north_m - edges.north_m)
    e = edges.east_m + along * (edges.to_east_m - edges.east_m)
    groups.append((n[chosen], e[chosen], "broadleaf", stand.tree_height_m, 0.75))
    # in woods: thick along the edge of the wood and near, thin inside and far
    near, wide = _scatter(rng, 1_000.0, stand.wood_tries), _scatter(rng, REACH_M, stand.wood_tries // 2)
    n, e = np.concatenate([near[0], wide[0]]), np.concatenate([near[1], wide[1]])
    depth = depth_of_wood(plan, n, e)
    far = np.hypot(n, e)
    inner = np.clip(1.1 - far / 1_300.0, 0.12, 1.0)
    thin = np.where(depth < 22.0, 1.0, inner) * np.clip(1.35 - far / REACH_M, 0.2, 1.0)
    chosen = (depth > 0.0) & (rng.random(len(n)) < thin)
    groups.append(
        (n[chosen], e[chosen], stand.wood_kind, stand.wood_height_m, 0.55 if stand.wood_kind == "conifer" else 0.8)
    )
    # alone on open land, and bushes
    for count, kind, height, broad in (
        (stand.lone_trees, "broadleaf", stand.tree_height_m, 0.85),
        (stand.bushes, "bush", stand.bush_height_m, 1.5),
    ):
        n, e = _scatter(rng, REACH_M if kind != "bush" else 1_500.0, count)
        wild = ~place_at(plan, n, e).enclosed
        groups.append((n[wild], e[wild], kind, height, broad))
    north, east = np.concatenate([g[0] for g in groups]), np.concatenate([g[1] for g in groups])
    kinds = np.concatenate([np.full(len(g[0]), g[2], dtype="U9") for g in groups])
    heights = np.concatenate([rng.uniform(*g[3], len(g[0])) for g in groups])
    widths = heights * np.concatenate([g[4] * rng.uniform(0.75, 1.2, len(g[0])) for g in groups])
    free = open_ground(land, north, east, 6.0) & (place_at(plan, north, east).road_m > 0.5 * plan.road_m + 0.4 * widths)
    free &= boxes.clear_of(north, east, 0.5 * widths)
    north, east = north[free], east[free]
    deep = depth_of_wood(plan, north, east) > 14.0
    return Trees(kinds[free], north, east, heights[free], widths[free], rng.random(len(north)), deep)


def _scatter(rng: np.random.Generator, reach_m: float, count: int) -> tuple[Array, Array]:
    """Places in a disc, denser toward the middle."""
    radius, turn = reach_m * rng.random(count) ** 0.62, rng.uniform(0.0, 2.0 * np.pi, count)
    return radius * np.cos(turn), radius * np.sin(turn)
