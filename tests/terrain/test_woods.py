"""The canopy stands where the plan has woods, covers them, and nothing else."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial import KDTree

from terrain.cover import WOODS_REACH_M, cover_of, open_ground
from terrain.ground import read_ground
from terrain.land import land_of
from terrain.pattern import place_at
from terrain.woods import SHAKE_M, STEP_M, depth_of_wood

WOODED = ("heath", "farmland", "hills", "coast")


@pytest.mark.parametrize("name", WOODED)
def test_every_crown_is_in_a_wood_and_off_roads_airfield_and_sea(name: str) -> None:
    ground = read_ground(name, 3)
    land, canopy = land_of(ground.recipe, 3), cover_of(ground, 3).canopy
    up = canopy.height_m > 0.0
    north, east = canopy.north_m[up], canopy.east_m[up]
    place = place_at(land.plan, north, east)
    assert up.sum() > 500 and place.wood.all()
    assert np.all(place.road_m > 0.5 * land.plan.road_m + 3.9)
    assert open_ground(land, north, east, 7.9).all()
    low, high = land.standing.wood_height_m
    assert np.all(canopy.height_m[up] > 0.4 * low) and np.all(canopy.height_m < high)


@pytest.mark.parametrize("name", WOODED)
def test_triangles_face_the_sky_and_overlap_nowhere(name: str) -> None:
    canopy = cover_of(read_ground(name, 3), 3).canopy
    e, n = (x[canopy.triangles] for x in (canopy.east_m, canopy.north_m))
    twice = (e[:, 1] - e[:, 0]) * (n[:, 2] - n[:, 0]) - (n[:, 1] - n[:, 0]) * (e[:, 2] - e[:, 0])
    assert np.all(twice > 0.0)
    edges = np.sort(np.concatenate([canopy.triangles[:, [a, b]] for a, b in ((0, 1), (1, 2), (2, 0))]), axis=1)
    _, used = np.unique(edges, axis=0, return_counts=True)
    assert used.max() == 2
    # on the open side of every free edge the canopy has come down to the ground, or its reach has ended
    free = np.unique(edges, axis=0)[used == 1]
    far = np.hypot(canopy.north_m, canopy.east_m)[free].max(axis=1)
    assert np.all(canopy.height_m[free[far < WOODS_REACH_M - 2.0 * STEP_M]] == 0.0)


@pytest.mark.parametrize("name", WOODED)
def test_a_place_deep_in_a_wood_has_crowns_over_it(name: str) -> None:
    ground = read_ground(name, 3)
    land, cover = land_of(ground.recipe, 3), cover_of(ground, 3)
    rng = np.random.default_rng(1)
    north, east = rng.uniform(-1500.0, 1500.0, (2, 60_000))
    deep = (depth_of_wood(land.plan, north, east) > 30.0) & (place_at(land.plan, north, east).road_m > 40.0)
    deep &= open_ground(land, north, east, 40.0) & cover.boxes.clear_of(north, east, np.full(len(north), 40.0))
    north, east = north[deep], east[deep]
    assert len(north) > 50
    up = cover.canopy.height_m > 0.0
    crowns = KDTree(np.column_stack([cover.canopy.north_m, cover.canopy.east_m])[up])
    away, _ = crowns.query(np.column_stack([north, east]))
    # half the diagonal of a square of the grid and what its corner is shaken, stretched by the bend (wave's slope is 6)
    stretch = 1.0 + 6.0 * 0.00097 * land.plan.bend_m
    assert away.max() < (0.5 * np.hypot(STEP_M, STEP_M) + np.hypot(SHAKE_M, SHAKE_M)) * stretch


def test_the_dry_plain_has_no_woods() -> None:
    assert len(cover_of(read_ground("dry_plain", 3), 3).canopy.triangles) == 0
