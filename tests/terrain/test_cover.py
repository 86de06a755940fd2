"""What stands on a land stands where the plan says, and nowhere else."""

from __future__ import annotations

import numpy as np
import pytest

from terrain.cover import cover_of
from terrain.ground import ground_names, read_ground
from terrain.hedges import field_edges
from terrain.land import land_of
from terrain.pattern import from_grain, grain, place_at, shuffle


@pytest.mark.parametrize("name", ground_names())
def test_nothing_stands_on_the_runway_or_in_the_sea_or_on_a_lane(name: str) -> None:
    ground = read_ground(name, 4)
    land, cover = land_of(ground.recipe, 4), cover_of(ground, 4)
    field = land.airfield
    assert field is not None
    for north, east, half in (
        (cover.trees.north_m, cover.trees.east_m, 0.5 * cover.trees.width_m),
        (cover.boxes.north_m, cover.boxes.east_m, 0.5 * np.minimum(cover.boxes.length_m, cover.boxes.width_m)),
    ):
        along, across = field.along_across(north, east)
        on = (np.abs(along) < 0.5 * field.length_m + half) & (np.abs(across) < 0.5 * field.width_m + half)
        assert not on.any()
        assert not ((np.abs(along) < 0.5 * field.length_m) & (np.abs(across - 150.0) < 7.5 + half)).any()
        if land.plan.shore is not None:
            assert np.max(land.plan.shore.seaward_m(north, east)) < 0.0
    assert np.all(place_at(land.plan, cover.trees.north_m, cover.trees.east_m).road_m > 0.5 * land.plan.road_m)
    assert len(cover.trees.kind) > 300
    assert {"hangar", "tower", "car", "post"} <= set(cover.boxes.kind)


@pytest.mark.parametrize("name", ground_names())
def test_cover_is_its_seed(name: str) -> None:
    ground = read_ground(name, 4)
    one, two, other = cover_of(ground, 4), cover_of(ground, 4), cover_of(ground, 5)
    assert np.array_equal(one.trees.north_m, two.trees.north_m)
    assert np.array_equal(one.boxes.east_m, two.boxes.east_m)
    assert len(one.trees.kind) != len(other.trees.kind)


def test_hedges_lie_on_field_edges_and_leave_none_out() -> None:
    plan = land_of(read_ground("farmland").recipe, 1).plan
    edges = field_edges(plan, 1200.0)
    middle = place_at(plan, 0.5 * (edges.north_m + edges.to_north_m), 0.5 * (edges.east_m + edges.to_east_m))
    assert np.max(middle.edge_m) < 0.5  # a straight piece of 45 m against a bend of 22 m in 1 km
    # Any place close to an edge has a piece of hedge close by.
    rng = np.random.default_rng(3)
    north, east = rng.uniform(-700.0, 700.0, (2, 4000))
    near = place_at(plan, north, east).edge_m < 1.0
    assert near.sum() > 20
    for n, e in zip(north[near], east[near], strict=True):
        d_n, d_e = edges.to_north_m - edges.north_m, edges.to_east_m - edges.east_m
        part = ((n - edges.north_m) * d_n + (e - edges.east_m) * d_e) / (d_n**2 + d_e**2)
        part = np.clip(part, 0.0, 1.0)
        off = np.hypot(edges.north_m + part * d_n - n, edges.east_m + part * d_e - e)
        assert off.min() < 1.6


def test_no_hedge_twice() -> None:
    plan = land_of(read_ground("farmland").recipe, 1).plan
    edges = field_edges(plan, 1500.0)
    middles = np.column_stack([0.5 * (edges.north_m + edges.to_north_m), 0.5 * (edges.east_m + edges.to_east_m)])
    assert len(np.unique(middles.round(1), axis=0)) == len(middles)


def test_the_mean_field_has_the_recipes_size() -> None:
    """Counted by random places: a block of 8 fields has 8 times the recipe's area."""
    recipe = read_ground("farmland").recipe
    plan = land_of(recipe, 1).plan
    assert plan.block_m**2 / 8.0 == pytest.approx(recipe["plan"]["field"][0] * recipe["plan"]["field"][1])


def test_grain_and_back() -> None:
    plan = land_of(read_ground("hills").recipe, 1).plan
    rng = np.random.default_rng(0)
    north, east = rng.uniform(-8000.0, 8000.0, (2, 500))
    back_n, back_e = from_grain(plan, *grain(plan, north, east))
    assert np.allclose(back_n, north, atol=1e-6) and np.allclose(back_e, east, atol=1e-6)


def test_the_hash_is_exact_and_the_same_in_single_precision() -> None:
    """All 512ths within 620 of zero, against Python's whole numbers and as the ground's shader works them out."""
    x = np.arange(-620, 621)
    exact = [(38 * int(k) + 197) * int(k) % 512 / 512 for k in x]
    assert np.array_equal(shuffle(x / 512.0), exact)
    key = (x / 512.0).astype("f4")
    y = (np.float32(512.0 * 38.0) * key + np.float32(197.0)) * key
    assert y.dtype == np.float32
    assert np.array_equal(y - np.floor(y), np.array(exact, "f4"))
    assert sorted(exact[620 : 620 + 512]) == [k / 512 for k in range(512)]
