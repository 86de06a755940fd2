"""The plan of a land: where its fields, hedges, roads, woods and shore lie, worked out at any place from a seed.

The picture's ground shader (render/picture/shaders/plan.glsl) does the same arithmetic for each pixel. The hash
is a permutation polynomial on 512ths, exact in single precision there and in double precision here: the numbers are
the same, and a tree planted here stands on the hedge painted there.

    x east, y north -> u along the land's own grain, v across it
    block: a square, rows shifted by a hash; each block is cut three times into 8 fields
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
FIELDS_OF_BLOCK = 8  # each square block is cut in two, each half in two across, each quarter in two again


def shuffle(key: Array) -> Array:
    """A fixed shuffle of the 512ths 0, 1/512 .. 511/512; takes any 512th within 620/512 of zero.

    ``(38 x + 197) x mod 512`` with x = 512 key: an even and an odd factor make it a permutation modulo a
    power of two. Source: Rivest 2001, "Permutation polynomials modulo 2^w", theorem 1 (from memory).
    Every step is a whole number below 2**24 divided by a power of two, so single precision is exact.
    """
    y = (512.0 * 38.0 * key + 197.0) * key
    return y - np.floor(y)


def value_noise(u: Array, v: Array, salt: float) -> Array:
    """Smooth noise in 0..1 with unit lattice spacing."""
    i, j = np.floor(u), np.floor(v)
    f, g = u - i, v - j
    f, g = f * f * (3.0 - 2.0 * f), g * g * (3.0 - 2.0 * g)
    corner = (17.0 * i + 29.0 * j) / 512.0 + salt
    corner = corner - np.floor(corner)
    low = shuffle(corner) * (1.0 - f) + shuffle(corner + 17.0 / 512.0) * f
    high = shuffle(corner + 29.0 / 512.0) * (1.0 - f) + shuffle(corner + 46.0 / 512.0) * f
    result: Array = low * (1.0 - g) + high * g
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

    salt: float  # a 512th, from the seed
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
    key: Array  # a 512th, one for each field
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


def row_key(row: Array, salt: float) -> Array:
    """The key of a row of blocks, which is also how far it is shifted, in blocks."""
    return shuffle(row / 512.0 + salt)


def block_key(column: Array, shift: Array) -> Array:
    """The key of a block in a row of that key."""
    return shuffle(column / 512.0 + shift)


def is_turned(block: Array) -> NDArray[np.bool_]:
    """Whether a block's first cut runs across instead of along."""
    return np.asarray(np.mod(block, 0.25) >= 0.125)


def cut_part(key: Array) -> Array:
    """Where between its ends a length is cut, 0..1."""
    return 0.36 + 0.28 * key


def next_key(key: Array, far: NDArray[np.bool_]) -> Array:
    """The key of the near or the far part of a cut."""
    return shuffle(key + np.where(far, 101.0, 13.0) / 512.0)


def place_at(plan: Plan, north_m: Array, east_m: Array) -> Place:
    """The plan at places of any (broadcast) shape."""
    n, e = np.broadcast_arrays(np.asarray(north_m, float), np.asarray(east_m, float))
    u, v = grain(plan, n, e)
    side = plan.block_m
    row = np.floor(v / side)
    shift = row_key(row, plan.salt)
    column = np.floor(u / side + shift)
    x, y = u - (column - shift) * side, v - row * side
    block = block_key(column, shift)
    turned = is_turned(block)
    x, y = np.where(turned, y, x), np.where(turned, x, y)
    edge_of_block = np.minimum(np.minimum(x, side - x), np.minimum(y, side - y))
    to_left, to_right, key = _cut(x, np.zeros_like(x), np.full_like(x, side), block)
    below, above, key = _cut(y, np.zeros_like(y), np.full_like(y, side), key)
    to_left, to_right, key = _cut(x, x - to_left, x + to_right, key)
    enclosed = block < plan.enclosed
    edge = np.minimum(np.minimum(to_left, to_right), np.minimum(below, above))
    wood = np.where(
        enclosed,
        shuffle(key + 57.0 / 512.0) < plan.wood_part,
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
    cut = low + cut_part(key) * (high - low)
    far = x > cut
    part_low, part_high = np.where(far, cut, low), np.where(far, high, cut)
    return x - part_low, part_high - x, next_key(key, far)


def _road_m(plan: Plan, u: Array, v: Array) -> Array:
    """Distance to the middle of the nearest road: along some rows of blocks, and winding across them."""
    near = np.floor(v / plan.block_m + 0.5)
    has = shuffle((near + 31.0) / 512.0 + plan.salt) < plan.road_rows
    along = np.where(has, np.abs(v - near * plan.block_m), 1e9)
    if plan.road_every_m <= 0.0:
        return along
    turn = (u + 70.0 * wave(v * 0.00068)) / plan.road_every_m + 0.5
    return np.minimum(along, np.abs(turn - np.floor(turn) - 0.5) * plan.road_every_m)
