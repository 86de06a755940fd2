"""The plan of a land: where its fields, hedges, roads, woods and shore lie, worked out at any place from a seed.

The picture's ground shader (render/picture/shaders/plan.glsl) does the same arithmetic for each pixel. The hash
is a permutation polynomial on integers below 2**24, so that single precision there and double precision here
give the same numbers, and a tree planted here stands on the hedge painted there.

    x east, y north -> u along the land's own grain, v across it
    block: BU x BV metres, rows shifted by a hash; each block is cut three times into fields
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
BLOCK_OF_FIELD = np.array([2.83, 2.83])  # a block cut three times has 8 fields: sqrt(8) field sizes a side
CUTS = 3


def permute(x: Array) -> Array:
    """A fixed shuffle of the integers 0..288; exact for inputs below 700 in single precision.

    Source: (34 x + 10) x mod 289, the permutation polynomial of webgl-noise (Gustavson, McEwan et al. 2012,
    "Efficient computational noise in GLSL"; from memory).
    """
    y = (34.0 * x + 10.0) * x
    return y - np.floor((y + 0.5) / 289.0) * 289.0


def wrap(x: Array) -> Array:
    """Integers (any size, either sign) to 0..288."""
    return x - np.floor((x + 0.5) / 289.0) * 289.0


def hash2(i: Array, j: Array, salt: float) -> Array:
    """Integers 0..288 from a lattice place; salt tells uses apart."""
    return permute(permute(wrap(i + salt)) + wrap(j))


def value_noise(u: Array, v: Array, salt: float) -> Array:
    """Smooth noise in 0..1 with unit lattice spacing."""
    i, j = np.floor(u), np.floor(v)
    f, g = u - i, v - j
    f, g = f * f * (3.0 - 2.0 * f), g * g * (3.0 - 2.0 * g)
    low = hash2(i, j, salt) * (1.0 - f) + hash2(i + 1.0, j, salt) * f
    high = hash2(i, j + 1.0, salt) * (1.0 - f) + hash2(i + 1.0, j + 1.0, salt) * f
    result: Array = (low * (1.0 - g) + high * g) / 289.0
    return result


@dataclass(frozen=True, slots=True)
class Plan:
    """Sizes and chances of a land's plan, from its recipe (see ``plan_of``); lengths in metres."""

    salt: float  # 0..288, from the seed
    grain_rad: float  # direction of u, from east toward north
    field_u_m: float
    field_v_m: float
    bend_m: float  # how far straight lines are bent
    enclosed: float  # part of the blocks that are cut into fields
    hedge_m: float  # hedge width; 0 none
    road_m: float  # road width
    road_rows: float  # part of the rows of blocks with a road along them
    road_every_m: float  # spacing of the roads across; 0 none
    wood_part: float  # part of the fields that are woods
    wild_wood: float  # noise level above which open land is wooded; above 1 none

    @property
    def block_u_m(self) -> float:
        """Length of a block along u."""
        return float(self.field_u_m * BLOCK_OF_FIELD[0])

    @property
    def block_v_m(self) -> float:
        """Length of a block along v."""
        return float(self.field_v_m * BLOCK_OF_FIELD[1])


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """What the plan says of places (all fields of one shape)."""

    u_m: Array
    v_m: Array
    key: Array  # 0..288, one for each field
    enclosed: NDArray[np.bool_]  # inside a block that is cut into fields
    edge_m: Array  # distance to the nearest edge of the field (block, where it is not enclosed)
    road_m: Array  # distance to the middle of the nearest road
    wood: NDArray[np.bool_]


def grain(plan: Plan, north_m: Array, east_m: Array) -> tuple[Array, Array]:
    """The land's own bent coordinates u, v."""
    c, s = np.cos(plan.grain_rad), np.sin(plan.grain_rad)
    u, v = c * east_m + s * north_m, -s * east_m + c * north_m
    return u + plan.bend_m * np.sin(v * 0.0061 + 1.0), v + plan.bend_m * np.sin(u * 0.0053 + 2.0)


def from_grain(plan: Plan, u_m: Array, v_m: Array) -> tuple[Array, Array]:
    """North and east of places given in u, v (the inverse of ``grain``, by fixed-point steps to 1e-6 m)."""
    u, v = np.array(u_m, float), np.array(v_m, float)
    for _ in range(40):
        u = u_m - plan.bend_m * np.sin(v * 0.0061 + 1.0)
        v = v_m - plan.bend_m * np.sin(u * 0.0053 + 2.0)
    c, s = np.cos(plan.grain_rad), np.sin(plan.grain_rad)
    return s * u + c * v, c * u - s * v


def place_at(plan: Plan, north_m: Array, east_m: Array) -> Place:
    """The plan at places of any (broadcast) shape."""
    n, e = np.broadcast_arrays(np.asarray(north_m, float), np.asarray(east_m, float))
    u, v = grain(plan, n, e)
    bu, bv = plan.block_u_m, plan.block_v_m
    row = np.floor(v / bv)
    shift = permute(wrap(row + plan.salt)) / 289.0
    column = np.floor(u / bu + shift)
    x, y = u - (column - shift) * bu, v - row * bv
    block = hash2(column, row, plan.salt)
    key = block.copy()
    enclosed = block < plan.enclosed * 289.0
    low_x, low_y = np.zeros_like(x), np.zeros_like(y)
    high_x, high_y = np.full_like(x, bu), np.full_like(y, bv)
    for _ in range(CUTS):
        key = permute(key + 7.0)
        part = 0.36 + 0.28 * key / 289.0
        along = (high_x - low_x) > (high_y - low_y)
        cut_x, cut_y = low_x + part * (high_x - low_x), low_y + part * (high_y - low_y)
        far = np.where(along, x > cut_x, y > cut_y)
        low_x, high_x = np.where(along & far, cut_x, low_x), np.where(along & ~far, cut_x, high_x)
        low_y, high_y = np.where(~along & far, cut_y, low_y), np.where(~along & ~far, cut_y, high_y)
        key = permute(key + np.where(far, 101.0, 13.0))
    inner = np.minimum(np.minimum(x - low_x, high_x - x), np.minimum(y - low_y, high_y - y))
    outer = np.minimum(np.minimum(x, bu - x), np.minimum(y, bv - y))
    road = _road_m(plan, u, v)
    wood = np.where(
        enclosed, permute(key + 57.0) < plan.wood_part * 289.0,
        value_noise(u / 600.0, v / 600.0, plan.salt) > plan.wild_wood,
    )
    return Place(u, v, key, enclosed, np.where(enclosed, inner, outer), road, wood)


def _road_m(plan: Plan, u: Array, v: Array) -> Array:
    """Distance to the middle of the nearest road: along some rows of blocks, and winding across them."""
    near = np.floor(v / plan.block_v_m + 0.5)
    has = permute(wrap(near + plan.salt + 31.0)) < plan.road_rows * 289.0
    along = np.where(has, np.abs(v - near * plan.block_v_m), 1e9)
    if plan.road_every_m <= 0.0:
        return along
    across = u + 70.0 * np.sin(v * 0.0043)
    turn = across / plan.road_every_m + 0.5
    return np.minimum(along, np.abs(turn - np.floor(turn) - 0.5) * plan.road_every_m)
