"""The lines between fields near the display centre, piece by piece."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from terrain.pattern import (
    Array,
    Plan,
    block_key,
    cut_part,
    from_grain,
    grain,
    is_turned,
    next_key,
    place_at,
    row_key,
)


@dataclass(frozen=True, slots=True, eq=False)
class Lines:
    """Straight pieces of field edges: both ends, m from the display centre, arrays (N,)."""

    north_m: Array
    east_m: Array
    to_north_m: Array
    to_east_m: Array


def field_edges(plan: Plan, within_m: float, piece_m: float = 45.0) -> Lines:
    """Every edge between fields of enclosed blocks, in pieces, with a piece's middle within that distance.

    Enumerates the cuts of ``pattern.place_at`` block by block: no search, no gaps.
    """
    reach = within_m + 2.0 * plan.block_m
    side = plan.block_m
    u0, v0 = (float(x) for x in grain(plan, np.zeros(()), np.zeros(())))
    pieces: list[Array] = []
    for row in range(int(np.floor((v0 - reach) / side)), int(np.ceil((v0 + reach) / side)) + 1):
        shift = float(row_key(np.array(float(row)), plan.salt))
        first, last = int(np.floor((u0 - reach) / side)), int(np.ceil((u0 + reach) / side)) + 1
        for column in range(first, last):
            block = float(block_key(np.array(float(column)), np.array(shift)))
            if block < plan.enclosed:
                lines = _block_lines(block, side)
                if is_turned(np.array(block)):
                    lines = lines[:, [1, 0, 3, 2]]
                corner = np.array([(column - shift) * side, row * side])
                pieces.append(_split(lines + np.tile(corner, 2), piece_m))
    if not pieces:
        empty = np.zeros(0)
        return Lines(empty, empty, empty, empty)
    every = np.concatenate(pieces)
    n, e = from_grain(plan, every[:, 0], every[:, 1])
    to_n, to_e = from_grain(plan, every[:, 2], every[:, 3])
    kept = np.hypot(0.5 * (n + to_n), 0.5 * (e + to_e)) < within_m
    # A side shared with an enclosed block comes twice: keep that block's own.
    long = np.hypot(to_n - n, to_e - e) + 1e-9
    mid_n, mid_e = 0.5 * (n + to_n), 0.5 * (e + to_e)
    step_n, step_e = 2.0 * (to_e - e) / long, -2.0 * (to_n - n) / long
    both = (
        place_at(plan, mid_n + step_n, mid_e + step_e).enclosed
        & place_at(plan, mid_n - step_n, mid_e - step_e).enclosed
    )
    kept &= ~(both & (every[:, 4] > 0.5))
    return Lines(n[kept], e[kept], to_n[kept], to_e[kept])


def _block_lines(block: float, side: float) -> Array:
    """Lines x, y, to x, to y (N, 4) of one block's outline (first four) and its seven cuts."""
    lines = [(0.0, 0.0, 0.0, side), (0.0, 0.0, side, 0.0), (side, 0.0, side, side), (0.0, side, side, side)]
    cut = float(cut_part(np.array(block))) * side
    lines.append((cut, 0.0, cut, side))
    for far in (False, True):
        left, right = (cut, side) if far else (0.0, cut)
        key = next_key(np.array(block), np.array(far))
        across = float(cut_part(key)) * side
        lines.append((left, across, right, across))
        for above in (False, True):
            x = left + float(cut_part(next_key(key, np.array(above)))) * (right - left)
            lines.append((x, across, x, side) if above else (x, 0.0, x, across))
    return np.array(lines)


def _split(lines: Array, piece_m: float) -> Array:
    """Lines (N, 4) cut into pieces (M, 5); the last column is 1 for the two outer sides a neighbour may share."""
    parts = []
    for k, (x, y, to_x, to_y) in enumerate(lines):
        count = max(round(np.hypot(to_x - x, to_y - y) / piece_m), 1)
        at = np.linspace(0.0, 1.0, count + 1)
        ends = np.column_stack([x + at * (to_x - x), y + at * (to_y - y)])
        parts.append(np.column_stack([ends[:-1], ends[1:], np.full(count, 1.0 if 2 <= k < 4 else 0.0)]))
    return np.concatenate(parts)


def keep(lines: Lines, chosen: NDArray[np.bool_]) -> Lines:
    """The chosen pieces."""
    return Lines(lines.north_m[chosen], lines.east_m[chosen], lines.to_north_m[chosen], lines.to_east_m[chosen])
