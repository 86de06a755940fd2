"""Things with corners: farms, villages, hangars, vehicles, what stands beside a runway."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from terrain.land import Land
from terrain.pattern import Array, place_at

Free = Callable[[Array, Array, float], NDArray[np.bool_]]


@dataclass(frozen=True, slots=True, eq=False)
class Boxes:
    """Boxes, arrays (N,): ``length_m`` lies along ``bearing_rad``; ``ridge_m`` is a pitched roof's rise, 0 if flat."""

    kind: NDArray[np.str_]  # house, barn, hangar, tower, car, lorry, board, post
    north_m: Array
    east_m: Array
    bearing_rad: Array
    length_m: Array
    width_m: Array
    height_m: Array
    ridge_m: Array
    tone: Array  # 0..1, for its colour

    def corner(self, along: float, across: float) -> tuple[Array, Array]:
        """North and east of the corner at ``along`` and ``across`` (-1, 0 or 1; to the left) half sizes."""
        c, s = np.cos(self.bearing_rad), np.sin(self.bearing_rad)
        x, y = 0.5 * along * self.length_m, 0.5 * across * self.width_m
        return self.north_m + x * c + y * s, self.east_m + x * s - y * c

    def clear_of(self, north_m: Array, east_m: Array, more_m: Array) -> NDArray[np.bool_]:
        """Whether places lie farther from every box than half its diagonal and ``more_m``."""
        if len(self.north_m) == 0:
            return np.ones(north_m.shape, bool)
        # squared, and one box after another: a tenth of the time of distances from all to all
        clear = np.ones(north_m.shape, bool)
        reach = np.hypot(self.length_m, self.width_m) * 0.5 + 1.0
        for north, east, own in zip(self.north_m, self.east_m, reach, strict=True):
            clear &= (north_m - north) ** 2 + (east_m - east) ** 2 > (own + more_m) ** 2
        return clear


Row = tuple[str, float, float, float, float, float, float, float]


def yards(land: Land, rng: np.random.Generator, reach_m: float, free: Free) -> Boxes:
    """All boxes of a land; farms and houses beside roads, vehicles on them, hangars on the apron's far side."""
    rows = [*_airfield(land, rng), *_farms(land, rng, reach_m, free), *_traffic(land, rng, reach_m, free)]
    columns = list(zip(*rows, strict=True)) or [()] * 8
    kind = np.array(columns[0], dtype="U7")
    north, east, bearing, length, width, height, ridge = (np.array(column, float) for column in columns[1:])
    return Boxes(kind, north, east, bearing, length, width, height, ridge, rng.random(len(kind)))


def _airfield(land: Land, rng: np.random.Generator) -> list[Row]:
    """Beside the apron: two hangars, a tower, sheds, parked cars; beside the runway: boards, lamps, a mast."""
    field = land.airfield
    if field is None:
        return []
    rows: list[Row] = []

    def add(
        kind: str, along: float, across: float, turn: float, size: tuple[float, float, float], ridge: float = 0.0
    ) -> None:
        n, e = field.north_east(along, across)
        rows.append((kind, float(n), float(e), field.heading_rad + turn, *size, ridge))

    add("hangar", -95.0, 275.0, 0.0, (52.0, 36.0, 8.5), 4.0)
    add("hangar", -20.0, 275.0, 0.0, (44.0, 34.0, 8.0), 3.6)
    add("tower", 70.0, 268.0, 0.0, (8.0, 8.0, 15.0))
    add("barn", 92.0, 270.0, 0.0, (26.0, 12.0, 3.6), 1.6)
    add("barn", 140.0, 274.0, 0.0, (34.0, 11.0, 3.4), 1.5)
    for k in range(36):
        if rng.random() < 0.75:
            add("car", 175.0 + 2.8 * (k % 18), 270.0 + 12.0 * (k // 18), 0.5 * np.pi, (4.4, 1.8, 1.5))
    add("lorry", 20.0, 246.0, 0.1, (8.5, 2.5, 3.1))
    add("lorry", 31.0, 244.0, 0.1, (7.0, 2.4, 2.8))
    edge = 0.5 * field.width_m + 1.5
    for along in np.arange(-0.5 * field.length_m, 0.5 * field.length_m + 1.0, 60.0):
        for side in (-edge, edge):
            add("post", float(along), side, 0.0, (0.35, 0.35, 0.45))
    for k, along in enumerate(np.arange(-0.5 * field.length_m + 300.0, 0.5 * field.length_m - 200.0, 300.0)):
        add("board", float(along), -edge - 12.0 if k % 2 else edge + 12.0, 0.5 * np.pi, (1.6, 0.3, 1.2))
    add("post", -0.3 * field.length_m, edge + 45.0, 0.0, (0.25, 0.25, 6.0))
    for k in range(4):
        add("post", -0.5 * field.length_m + 330.0, edge + 15.0 + 9.0 * k, 0.0, (0.9, 0.9, 0.6))
    return rows


def _beside_roads(
    land: Land, rng: np.random.Generator, reach_m: float, count: int, off_m: float
) -> tuple[Array, Array, Array]:
    """Places (about) ``off_m`` from the middle of a road, and the road's bearing there."""
    radius, turn = reach_m * np.sqrt(rng.random(6000)), rng.uniform(0.0, 2.0 * np.pi, 6000)
    n, e = radius * np.cos(turn), radius * np.sin(turn)
    road = place_at(land.plan, n, e).road_m
    step = 1.0
    slope_n = (place_at(land.plan, n + step, e).road_m - road) / step
    slope_e = (place_at(land.plan, n, e + step).road_m - road) / step
    long = np.hypot(slope_n, slope_e)
    near = (road < 140.0) & (long > 0.8) & (long < 1.25)
    n, e, road, slope_n, slope_e = (x[near][:count] for x in (n, e, road, slope_n / long, slope_e / long))
    n, e = n + slope_n * (off_m - road), e + slope_e * (off_m - road)
    right = np.abs(place_at(land.plan, n, e).road_m - off_m) < 2.0
    return n[right], e[right], np.arctan2(slope_e, slope_n)[right] + 0.5 * np.pi


def _farms(land: Land, rng: np.random.Generator, reach_m: float, free: Free) -> list[Row]:
    rows: list[Row] = []
    n, e, bearing = _beside_roads(land, rng, reach_m, land.standing.farms, 38.0)
    ok = free(n, e, 60.0)
    for north, east, road in zip(n[ok], e[ok], bearing[ok], strict=True):
        away_n, away_e = np.cos(road + 0.5 * np.pi), np.sin(road + 0.5 * np.pi)
        far = place_at(land.plan, np.array(north + 20.0 * away_n), np.array(east + 20.0 * away_e)).road_m
        side = 1.0 if far > 38.0 else -1.0
        for k in range(int(rng.integers(2, 5))):
            out, on = side * rng.uniform(2.0, 34.0), (k - 1.5) * 32.0 + rng.uniform(-4.0, 4.0)
            x, y = north + out * away_n + on * np.cos(road), east + out * away_e + on * np.sin(road)
            turn = road + (0.5 * np.pi if rng.random() < 0.4 else 0.0)
            if k == 0:
                rows.append(("house", x, y, turn, 12.0, 8.0, 5.2, 3.0))
            else:
                rows.append(
                    ("barn", x, y, turn, rng.uniform(18.0, 36.0), rng.uniform(10.0, 18.0), 4.8, rng.uniform(2.0, 3.5))
                )
    n, e, bearing = _beside_roads(land, rng, reach_m, land.standing.houses, 16.0)
    ok = free(n, e, 25.0)
    for north, east, road in zip(n[ok], e[ok], bearing[ok], strict=True):
        rows.append(
            ("house", north, east, road + rng.choice([0.0, 0.5]) * np.pi, rng.uniform(9.0, 14.0), 7.5, 5.0, 2.8)
        )
    return _apart(rows)


def _apart(rows: list[Row]) -> list[Row]:
    """Rows that do not stand in one another, the earlier kept."""
    kept: list[Row] = []
    for row in rows:
        half = 0.5 * np.hypot(row[4], row[5])
        if all(np.hypot(row[1] - k[1], row[2] - k[2]) > half + 0.5 * np.hypot(k[4], k[5]) for k in kept):
            kept.append(row)
    return kept


def _traffic(land: Land, rng: np.random.Generator, reach_m: float, free: Free) -> list[Row]:
    """Cars and lorries on the lanes of roads."""
    rows: list[Row] = []
    n, e, bearing = _beside_roads(land, rng, reach_m, land.standing.vehicles, 0.27 * land.plan.road_m)
    ok = free(n, e, 8.0)
    for north, east, road in zip(n[ok], e[ok], bearing[ok], strict=True):
        if rng.random() < 0.2:
            rows.append(("lorry", north, east, road, 10.0, 2.5, 3.4, 0.0))
        else:
            rows.append(("car", north, east, road, 4.4, 1.8, 1.5, 0.0))
    return _apart(rows)
