"""The plan of a land: where its fields, hedges, roads, woods and shore lie, worked out at any place from a seed.

The picture's ground shader (render/picture/shaders/plan.glsl) does the same arithmetic for each pixel. The hash
is a permutation polynomial on integers below 2**24, so that single precision there and double precision here
give the same numbers, and a tree planted here stands on the hedge painted there.

    x east, y north -> u along the land's own grain, v across it
    block: a square, rows shifted by a hash; each block is cut three times into 8 fields
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
FIELDS_OF_BLOCK = 8  # each square block is cut in two, each half in two across, each quarter in two again


def permute(x: Array) -> Array:
    """A fixed shuffle of the integers to 0..288; exact for whole numbers within 460 of zero in single precision.

    Source: (34 x + 10) x mod 289, the permutation polynomial of webgl-noise (Gustavson, McEwan et al. 2012,
    "Efficient computational noise in GLSL"; from memory).
    """
    y = (34.0 * x + 10.0) * x
    return y - np.floor((y + 0.5) / 289.0) * 289.0


def wrap(x: Array) -> Array:
    """Whole numbers to 0..288."""
    return x - np.floor((x + 0.5) / 289.0) * 289.0


def row_key(row: Array, salt: float) -> Array:
    """0..288 for a row of blocks within 140 of zero; salt tells lands apart."""
    return permute(row + salt)


def value_noise(u: Array, v: Array, salt: float) -> Array:
    """Smooth noise in 0..1 with unit lattice spacing."""
    i, j = np.floor(u), np.floor(v)
    f, g = u - i, v - j
    f, g = f * f * (3.0 - 2.0 * f), g * g * (3.0 - 2.0 * g)
    corner = wrap(17.0 * i + 29.0 * j + salt)
    low = permute(corner) * (1.0 - f) + permute(corner + 17.0) * f
    high = permute(corner + 29.0) * (1.0 - f) + permute(corner + 46.0) * f
    result: Array = (low * (1.0 - g) + high * g) / 289.0
    return result


def wave(x: Array) -> Array:
    """A smooth wave of period 1 between -1 and 1, cheaper than a sine in a shader: 1 at 0, -1 at 1/2."""
    t = 2.0 * np.abs(x - np.floor(x) - 0.5)
    result: Array = 2.0 * t * t * (3.0 - 2.0 * t) - 1.0
    return result


@dataclass(frozen=True, slots=True)
class Shore:
    """A sea beyond a winding line."""

    bearing_rad: float  # from the display centre to the sea
    distance_m: float
    below_m: float  # the sea's surface below the field
    blend_m: float = 420.0  # nothing of the shore's look lies farther from the line than this

    def seaward_m(self, north_m: Array, east_m: Array) -> Array:
        """How far out to sea, m; negative on land. Same arithmetic as shaders/water.glsl."""
        c, s = np.cos(self.bearing_rad), np.sin(self.bearing_rad)
        out = np.asarray(north_m, float) * c + np.asarray(east_m, float) * s - self.distance_m
        t = np.asarray(east_m, float) * c - np.asarray(north_m, float) * s
        bays = 130.0 * wave(t * 0.00021 + 0.1) + 55.0 * wave(t * 0.00075 + 0.6) + 14.0 * wave(t * 0.0027)
        result: Array = out - bays
        return result


@dataclass(frozen=True, slots=True)
class Plan:
    """Sizes and chances of a land's plan, from its recipe (see ``plan_of``); lengths in metres."""

    salt: float  # 0..288, from the seed
    grain_rad: float  # direction of u, from east toward north
    block_m: float  # side of a block
    bend_m: float  # how far straight lines are bent
    enclosed: float  # part of the blocks that are cut into fields
    hedge_m: float  # hedge width; 0 none
    road_m: float  # road width
    road_rows: float  # part of the rows of blocks with a road along them
    shore: Shore | None
    road_every_m: float  # spacing of the roads across; 0 none
    wood_part: float  # part of the fields that are woods
    wild_wood: float  # noise level above which open land is wooded; above 1 none


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
    return u + plan.bend_m * wave(v * 0.00097 + 0.2), v + plan.bend_m * wave(u * 0.00084 + 0.7)


def from_grain(plan: Plan, u_m: Array, v_m: Array) -> tuple[Array, Array]:
    """North and east of places given in u, v (the inverse of ``grain``, by fixed-point steps to 1e-6 m)."""
    u, v = np.array(u_m, float), np.array(v_m, float)
    for _ in range(15):
        u = u_m - plan.bend_m * wave(v * 0.00097 + 0.2)
        v = v_m - plan.bend_m * wave(u * 0.00084 + 0.7)
    c, s = np.cos(plan.grain_rad), np.sin(plan.grain_rad)
    return s * u + c * v, c * u - s * v


def place_at(plan: Plan, north_m: Array, east_m: Array) -> Place:
    """The plan at places of any (broadcast) shape."""
    n, e = np.broadcast_arrays(np.asarray(north_m, float), np.asarray(east_m, float))
    u, v = grain(plan, n, e)
    side = plan.block_m
    row = np.floor(v / side)
    shift = row_key(row, plan.salt)
    column = np.floor(u / side + shift / 289.0)
    x, y = u - (column - shift / 289.0) * side, v - row * side
    block = permute(column + shift)
    turned = np.mod(block, 2.0) > 0.5
    x, y = np.where(turned, y, x), np.where(turned, x, y)
    edge_of_block = np.minimum(np.minimum(x, side - x), np.minimum(y, side - y))
    to_left, to_right, key = _cut(x, np.zeros_like(x), np.full_like(x, side), block)
    below, above, key = _cut(y, np.zeros_like(y), np.full_like(y, side), key)
    to_left, to_right, key = _cut(x, x - to_left, x + to_right, key)
    enclosed = block < plan.enclosed * 289.0
    edge = np.minimum(np.minimum(to_left, to_right), np.minimum(below, above))
    wood = np.where(
        enclosed,
        permute(key + 57.0) < plan.wood_part * 289.0,
        value_noise(u / 600.0, v / 600.0, plan.salt) > plan.wild_wood,
    )
    return Place(
        u,
        v,
        key,
        enclosed,
        np.where(enclosed, edge, edge_of_block),
        _road_m(plan, u, v),
        wood,
    )


def _cut(x: Array, low: Array, high: Array, key: Array) -> tuple[Array, Array, Array]:
    """Cut low..high in two where the key says: distances to the near and far end of x's part, and its key."""
    cut = low + (0.36 + 0.28 / 289.0 * key) * (high - low)
    far = x > cut
    part_low, part_high = np.where(far, cut, low), np.where(far, high, cut)
    return x - part_low, part_high - x, permute(key + np.where(far, 101.0, 13.0))


def _road_m(plan: Plan, u: Array, v: Array) -> Array:
    """Distance to the middle of the nearest road: along some rows of blocks, and winding across them."""
    near = np.floor(v / plan.block_m + 0.5)
    has = permute(near + plan.salt + 31.0) < plan.road_rows * 289.0
    along = np.where(has, np.abs(v - near * plan.block_m), 1e9)
    if plan.road_every_m <= 0.0:
        return along
    turn = (u + 70.0 * wave(v * 0.00068)) / plan.road_every_m + 0.5
    return np.minimum(along, np.abs(turn - np.floor(turn) - 0.5) * plan.road_every_m)
