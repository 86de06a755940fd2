"""Where a spectator on the ground stands: clear of trees, buildings and water, abeam the loop's bottom."""

from __future__ import annotations

import numpy as np

from render.frames import Array
from render.sight.geometry import unit
from render.types import Flight
from terrain.cover import cover_of
from terrain.ground import Ground
from terrain.land import land_of

EYES_M = 1.7
WISHED_M = 300.0  # from the line of flight
CLEAR_M = 120.0  # nothing taller than he is nearer than this, if it can be had
#: A reachable distance costs a metre a metre; a metre of clearance that is missing costs as much.
DISTANCES_M = np.arange(220.0, 640.0, 30.0)
ALONG_M = np.arange(-400.0, 401.0, 40.0)


def spectator_stand(healthy: Flight, ground: Ground, seed: int) -> Array:
    """A spectator's eyes, (3,) m in earth axes: on either side of the healthy loop's lowest point, eyes at 1.7 m.

    Of places on a net about it the one that is nearest to 300 m off and abeam with 120 m clear around it.
    """
    late = healthy.time_s >= healthy.events.get("top", float(healthy.time_s[0]))
    lowest = int(np.flatnonzero(late)[np.argmin(healthy.height_m[late, 0])])
    ahead = unit(healthy.vel_e_mps[lowest, 0] * np.array([1.0, 1.0, 0.0]))[:2]
    left = np.array([ahead[1], -ahead[0]])
    off, along = (grid.ravel() for grid in np.meshgrid(np.concatenate([DISTANCES_M, -DISTANCES_M]), ALONG_M))
    places = healthy.pos_e_m[lowest, 0, :2] + off[:, None] * left + along[:, None] * ahead
    missing = np.maximum(CLEAR_M - _clear_m(places, ground, seed), 0.0)
    best = places[int(np.argmin(np.abs(np.abs(off) - WISHED_M) + np.abs(along) + 4.0 * missing))]
    height = float(ground.height_at(best[0], best[1]))
    return np.array([best[0], best[1], -(height + EYES_M)])


def _clear_m(places: Array, ground: Ground, seed: int) -> Array:
    """Distance from places (P, 2) to the nearest tree, building or hedge, at most to be trusted up to 120 m; (P,)."""
    cover, land = cover_of(ground, seed), land_of(ground.recipe, seed)
    north = np.concatenate([cover.trees.north_m, cover.boxes.north_m, cover.hedges.north_m, cover.hedges.to_north_m])
    east = np.concatenate([cover.trees.east_m, cover.boxes.east_m, cover.hedges.east_m, cover.hedges.to_east_m])
    near = np.hypot(north - places[:, 0].mean(), east - places[:, 1].mean()) < 1_200.0
    things = np.stack([north[near], east[near]], axis=-1)
    if len(things) == 0:
        clear = np.full(len(places), np.inf)
    else:
        clear = np.array([np.hypot(*(things - place).T).min() for place in places])
    if land.plan.shore is not None:
        clear = np.where(land.plan.shore.seaward_m(places[:, 0], places[:, 1]) > -20.0, -1e3, clear)
    return clear
