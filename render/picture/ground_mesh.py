"""The land's surface as one fixed mesh: the heights the margin knows, fine near the display centre, coarse far out.

It does not move with the eye, so hills do not swim, and inside the fine part its corners are the corners of the
ground's own grid: picture and margin differ by less than the bend of one cell.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import Delaunay

from render.frames import Array
from terrain.ground import Ground

REACH_M = 60_000.0
#: Half side and spacing of the nested squares about the display centre, m.
RELIEF_SQUARES = ((4_000.0, 100.0), (9_000.0, 250.0), (18_000.0, 750.0), (REACH_M, 5_000.0))
FLAT_SQUARES = ((2_400.0, 400.0), (9_000.0, 1_500.0), (REACH_M, 8_500.0))


def ground_mesh(ground: Ground) -> tuple[Array, NDArray[np.int64], Array]:
    """Points (P, 3) display axes, triangles (T, 3) counter-clockwise from above, upward normals (P, 3)."""
    level = float(np.ptp(ground.heights_m)) == 0.0
    places = _nested(FLAT_SQUARES if level else RELIEF_SQUARES)
    triangles = Delaunay(places).simplices.astype(np.int64)
    a, b, c = (places[triangles[:, k]] for k in range(3))
    turn = (b[:, 0] - a[:, 0]) * (c[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (c[:, 0] - a[:, 0])
    triangles[turn < 0.0] = triangles[turn < 0.0][:, [0, 2, 1]]
    points = np.column_stack([places, ground.height_at(places[:, 1], places[:, 0])])
    step = 60.0
    slope_e = (ground.height_at(places[:, 1], places[:, 0] + step) - ground.height_at(places[:, 1], places[:, 0] - step))
    slope_n = (ground.height_at(places[:, 1] + step, places[:, 0]) - ground.height_at(places[:, 1] - step, places[:, 0]))
    normals = np.column_stack([-slope_e / (2 * step), -slope_n / (2 * step), np.ones(len(places))])
    return points, triangles, normals / np.linalg.norm(normals, axis=1)[:, None]


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
