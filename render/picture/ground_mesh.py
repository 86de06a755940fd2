"""The land's surface as one fixed mesh: the heights the margin knows, fine near the display centre, coarse far out.

It does not move with the eye, so hills do not swim; inside the fine part its corners are the corners of the
ground's own grid, so picture and margin differ by less than the bend of one cell. Edges run along the borders of
airfield and runway, so that each triangle needs the shader of one kind of ground only.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import Delaunay

from render.frames import Array
from terrain.ground import Ground
from terrain.land import Airfield, Land
from terrain.pattern import Shore

REACH_M = 60_000.0
#: Half side and spacing of the nested squares about the display centre, m; first those round a relief's fine square.
OUTER_SQUARES = ((5_000.0, 200.0), (10_000.0, 500.0), (20_000.0, 1_500.0), (REACH_M, 5_000.0))
FINE_HALF_M, FINE_STEP_M = 2_500.0, 60.0
FLAT_SQUARES = ((2_400.0, 800.0), (9_000.0, 3_000.0), (REACH_M, 10_000.0))
#: Along a shore: how far from its line, half side of the square about the display centre, spacing.
SHORE_BANDS = ((200.0, 4_000.0, 60.0), (500.0, 10_000.0, 250.0))
EDGE_M = 2.0  # how far past the tarmac the runway's strip goes


@dataclass(frozen=True, slots=True, eq=False)
class GroundMesh:
    """points (P, 3) display axes; upward normals (P, 3); triangles (T, 3) by kind of ground."""

    points: Array
    normals: Array
    triangles: dict[str, NDArray[np.int64]]  # country, mown, runway, shore, sea
    level: bool


def ground_mesh(ground: Ground, land: Land) -> GroundMesh:
    """The mesh of a ground with the land on it."""
    level = float(np.ptp(ground.heights_m)) == 0.0
    flat = level or land.plan.shore is not None
    squares = FLAT_SQUARES if flat else _relief_squares(ground)
    places = _nested(squares)
    if land.plan.shore is not None:
        places = _with_shore(land.plan.shore, places)
    if land.airfield is not None:
        outside = ~_within(land.airfield, places, squares[0][1] * 0.45)
        places = np.concatenate([places[outside], *_airfield_places(land.airfield, 200.0 if flat else 100.0)])
    triangles = Delaunay(places).simplices.astype(np.int64)
    a, b, c = (places[triangles[:, k]] for k in range(3))
    turn = (b[:, 0] - a[:, 0]) * (c[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (c[:, 0] - a[:, 0])
    triangles[turn < 0.0] = triangles[turn < 0.0][:, [0, 2, 1]]
    points = np.column_stack([places, ground.height_at(places[:, 1], places[:, 0])])
    return GroundMesh(points, _normals(ground, places), _by_kind(land, places, triangles), level)


def _relief_squares(ground: Ground) -> tuple[tuple[float, float], ...]:
    """Nested squares whose innermost has its corners on the ground's own grid, or on each second, third ... of it."""
    step = ground.spacing_m * float(np.ceil(FINE_STEP_M / ground.spacing_m))
    return ((round(FINE_HALF_M / step) * step, step), *OUTER_SQUARES)


def _with_shore(shore: Shore, places: Array) -> Array:
    """Places with fine bands along a shore's line in place of what was there."""
    for reach, half, spacing in reversed(SHORE_BANDS):
        axis = np.arange(-half, half + 0.5 * spacing, spacing)
        x, y = (grid.ravel() for grid in np.meshgrid(axis, axis))
        band = np.column_stack([x, y])[np.abs(shore.seaward_m(y, x)) < reach]
        apart = (np.abs(shore.seaward_m(places[:, 1], places[:, 0])) > reach + 0.5 * spacing) | (
            np.abs(places).max(axis=1) > half + 0.5 * spacing
        )
        places = np.concatenate([places[apart], band])
    return places


def _normals(ground: Ground, places: Array, step_m: float = 60.0) -> Array:
    e, n = places[:, 0], places[:, 1]
    slope_e = (ground.height_at(n, e + step_m) - ground.height_at(n, e - step_m)) / (2.0 * step_m)
    slope_n = (ground.height_at(n + step_m, e) - ground.height_at(n - step_m, e)) / (2.0 * step_m)
    normals = np.column_stack([-slope_e, -slope_n, np.ones(len(places))])
    result: Array = normals / np.linalg.norm(normals, axis=1)[:, None]
    return result


def _nested(squares: tuple[tuple[float, float], ...]) -> Array:
    """Places (P, 2) east, north of nested square grids, each without the square inside it."""
    kept, inner = [], 0.0
    for half, spacing in squares:
        count = max(round(2.0 * half / spacing), 2)
        axis = np.linspace(-half, half, count + 1)
        x, y = (grid.ravel() for grid in np.meshgrid(axis, axis))
        outside = np.maximum(np.abs(x), np.abs(y)) > inner + 0.25 * spacing
        kept.append(np.column_stack([x, y])[outside])
        inner = half
    return np.concatenate(kept)


def _within(field: Airfield, places: Array, more_m: float) -> NDArray[np.bool_]:
    """Whether places east, north lie inside the airfield's bounds grown by ``more_m``."""
    along, across = field.along_across(places[:, 1], places[:, 0])
    low, high = field.across_m
    result: NDArray[np.bool_] = (
        (np.abs(along) < field.half_along_m + more_m) & (across > low - more_m) & (across < high + more_m)
    )
    return result


def _airfield_places(field: Airfield, spacing_m: float) -> tuple[Array, Array]:
    """Places east, north on the airfield's bounds, and inside them."""
    low, high = field.across_m
    half = field.half_along_m
    along = np.linspace(-half, half, round(2.0 * half / 40.0) + 1)
    across = np.linspace(low, high, round((high - low) / 40.0) + 1)
    border = [(along, np.full_like(along, low)), (along, np.full_like(along, high))]
    border += [(np.full(len(across) - 2, x), across[1:-1]) for x in (-half, half)]
    wide, long = 0.5 * field.width_m + EDGE_M, 0.5 * field.length_m + EDGE_M
    steps = np.linspace(-long, long, round(2.0 * long / 45.0) + 1)
    strip = [(steps, np.full_like(steps, side * wide)) for side in (-1.0, 1.0)]
    a, b = (
        grid.ravel()
        for grid in np.meshgrid(
            np.linspace(-half, half, round(2.0 * half / spacing_m) + 1)[1:-1],
            np.linspace(low, high, round((high - low) / min(spacing_m, 100.0)) + 1)[1:-1],
        )
    )
    clear = (np.abs(b) > wide + 40.0) | (np.abs(a) > long + 40.0)
    inside = [*strip, (a[clear], b[clear])]

    def flat(parts: list[tuple[Array, Array]]) -> Array:
        n, e = field.north_east(np.concatenate([p[0] for p in parts]), np.concatenate([p[1] for p in parts]))
        return np.column_stack([e, n])

    return flat(border), flat(inside)


def _by_kind(land: Land, places: Array, triangles: NDArray[np.int64]) -> dict[str, NDArray[np.int64]]:
    kinds: dict[str, NDArray[np.bool_]] = {}
    rest: NDArray[np.bool_] = np.ones(len(triangles), bool)
    if land.airfield is not None:
        field = land.airfield
        along, across = field.along_across(places[:, 1], places[:, 0])
        inside = np.asarray(_within(field, places, 0.5)[triangles].all(axis=1))
        wide, long = 0.5 * field.width_m + EDGE_M, 0.5 * field.length_m + EDGE_M
        strip = np.asarray(((np.abs(across) < wide + 0.5) & (np.abs(along) < long + 0.5))[triangles].all(axis=1))
        kinds = {"runway": strip, "mown": inside & ~strip}
        rest &= ~inside
    if land.plan.shore is not None:
        seaward = land.plan.shore.seaward_m(places[:, 1], places[:, 0])[triangles]
        reach = land.plan.shore.blend_m
        kinds["sea"] = rest & (seaward.min(axis=1) > reach)
        kinds["shore"] = rest & (seaward.max(axis=1) > -reach) & ~kinds["sea"]
        rest &= ~(kinds["sea"] | kinds["shore"])
    kinds["country"] = rest
    return {kind: triangles[chosen] for kind, chosen in kinds.items() if chosen.any()}
