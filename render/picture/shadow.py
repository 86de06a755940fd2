"""The shadow of an aircraft on the ground: a patch of graded darkness, with the sun's half-shadow at its edge.

Earth axes in (north-east-down, m), a mesh in display axes out. The shadow is worked out in the plane square to the
sun, where it keeps the aircraft's true outline, and laid on the ground along the sun's rays from there.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

import numpy as np
import pyvista as pv

from render.frames import Array, quat_to_matrix
from render.picture.axes import to_display
from render.picture.shapes_parts import Part

#: Angular radius of the sun, rad: mean 959.63 arcsec (Astronomical Almanac; from memory).
SUN_RADIUS_RAD = 959.63 / 3600.0 * np.pi / 180.0

Height = Callable[[Array, Array], Array]  # (north_m, east_m) -> ground height, m


def cast_samples(parts: Iterable[Part], spacing_m: float = 0.11) -> Array:
    """Points (N, 3) spread evenly over the opaque parts' surfaces, body axes: what throws the shadow."""
    found = []
    for part in parts:
        if part.opacity < 1.0 or part.mesh.point_data["colour"].shape[1] == 4:
            continue
        corners = np.asarray(part.mesh.points, float)[part.mesh.faces.reshape(-1, 4)[:, 1:]]
        area = np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1) / 2
        # A regular net on each triangle: as many rows as its longest side needs.
        side = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2).max(axis=1)
        rows = np.clip(np.ceil(side / spacing_m), 1, 60).astype(int)
        rows = np.where(area < 1e-8, 1, rows)
        for n in np.unique(rows):
            i, j = np.meshgrid(np.arange(n), np.arange(n), indexing="ij")
            inside = i + j < n
            a, b = (i[inside] + 1 / 3) / n, (j[inside] + 1 / 3) / n
            weights = np.stack([1 - a - b, a, b], -1)
            found.append(np.einsum("wk,tkc->twc", weights, corners[rows == n]).reshape(-1, 3))
    points = np.concatenate(found)
    # One point for each small cube is enough.
    _, first = np.unique(np.round(points / (0.7 * spacing_m)).astype(np.int64), axis=0, return_index=True)
    return points[np.sort(first)]


class Shadow:
    """The shadow patch of one aircraft: a net of points with RGBA colours, to be drawn unlit and see-through."""

    def __init__(self, samples_b_m: Array, darkness: float = 0.62, cells: int = 72) -> None:
        """samples_b_m: (N, 3) from ``cast_samples``; darkness: share of the light the full shadow takes, 0..1."""
        self._samples = np.asarray(samples_b_m, float)
        self._reach_m = float(np.linalg.norm(self._samples, axis=1).max())
        self._darkness = darkness
        self._cells = cells
        k = np.arange(cells * cells).reshape(cells, cells)
        quads = np.stack([k[:-1, :-1], k[1:, :-1], k[1:, 1:], k[:-1, 1:]], -1).reshape(-1, 4)
        faces = np.column_stack([np.full(len(quads), 4), quads]).reshape(-1)
        self.mesh = pv.PolyData(np.zeros((cells * cells, 3), np.float32), faces)
        self.mesh.point_data["colour"] = np.zeros((cells * cells, 4), np.uint8)
        self.mesh.point_data.active_scalars_name = "colour"

    def update(
        self, pos_e_m: Array, quat_eb: Array, to_sun_e: Array, ground: float | Height, lift_m: float = 0.05
    ) -> bool:
        """Lay the shadow of an aircraft at a position (3,) m and attitude (4,); False where there is none.

        to_sun_e: vector towards the sun, earth axes. ground: its height, m, or a function of north, east.
        lift_m: height of the patch above the ground.
        The half-shadow's width follows from the sun's angular radius and the distance along the ray.
        """
        sun = np.asarray(to_sun_e, float) / np.linalg.norm(to_sun_e)
        if sun[2] > -0.05:
            return False
        pos = np.asarray(pos_e_m, float)
        height_of: Height = ground if callable(ground) else lambda north, east: np.full_like(north, float(ground))
        across = np.cross(sun, [0.0, 0.0, 1.0])
        across = np.array([0.0, 1.0, 0.0]) if np.linalg.norm(across) < 1e-6 else across / np.linalg.norm(across)
        basis = np.stack([across, np.cross(across, sun)])  # (2, 3): the plane square to the sun
        centre, normal = _plane_below(pos, sun, height_of, self._reach_m)
        ray_m = float(np.linalg.norm(centre - pos))
        blur_m = max(ray_m * np.tan(SUN_RADIUS_RAD), 0.02)
        half_m = self._reach_m + 2.0 * blur_m + 0.3
        cell_m = 2.0 * half_m / (self._cells - 1)
        outline = self._samples @ quat_to_matrix(np.asarray(quat_eb, float)).T @ basis.T
        share = _coverage(outline, half_m, cell_m, self._cells, blur_m)
        grid = np.linspace(-half_m, half_m, self._cells)
        u, v = np.meshgrid(grid, grid, indexing="ij")
        start = pos + u.reshape(-1, 1) * basis[0] + v.reshape(-1, 1) * basis[1]
        landed = start - (((start - centre) @ normal) / (sun @ normal))[:, None] * sun
        if callable(ground):
            landed[:, 2] = -np.asarray(height_of(landed[:, 0], landed[:, 1]), float)
        landed[:, 2] -= lift_m
        self.mesh.points = to_display(landed).astype(np.float32)
        alpha = np.round(255.0 * self._darkness * share.reshape(-1)).astype(np.uint8)
        colour = np.zeros((len(alpha), 4), np.uint8)
        colour[:, :3] = (10, 14, 20)
        colour[:, 3] = alpha
        self.mesh.point_data["colour"] = colour
        return bool(alpha.any())


def _plane_below(pos_e_m: Array, sun: Array, height_of: Height, reach_m: float) -> tuple[Array, Array]:
    """(point (3,), normal (3,)) of the ground's plane where the sun's ray through a position meets it, earth axes."""
    landed = pos_e_m
    for _ in range(24):
        # Down the ray, against the sun, to the height found below the last try.
        height = float(height_of(landed[None, 0], landed[None, 1])[0])
        landed = pos_e_m - (pos_e_m[2] + height) / sun[2] * sun
    steps = np.array([[reach_m, 0.0], [-reach_m, 0.0], [0.0, reach_m], [0.0, -reach_m]])
    around = np.asarray(height_of(landed[0] + steps[:, 0], landed[1] + steps[:, 1]), float)
    slope_n, slope_e = (around[0] - around[1]) / (2 * reach_m), (around[2] - around[3]) / (2 * reach_m)
    return landed, np.array([slope_n, slope_e, 1.0])


def _coverage(outline: Array, half_m: float, cell_m: float, cells: int, blur_m: float) -> Array:
    """Share of the sun's disc hidden at each net point (cells, cells), from the outline's points (N, 2) m."""
    at = (outline + half_m) / cell_m
    low = np.floor(at).astype(int)
    part = at - low
    filled = np.zeros(cells * cells)
    for di in (0, 1):
        for dj in (0, 1):
            weight = np.abs(1 - di - part[:, 0]) * np.abs(1 - dj - part[:, 1])
            index = (low[:, 0] + di) * cells + low[:, 1] + dj
            filled += np.bincount(index, weight, cells * cells)
    # Full where the points lie as densely as on a face square to the sun, or denser.
    share = np.clip(filled.reshape(cells, cells) / 0.5, 0.0, 1.0)
    # The half-shadow: the sun's disc as a box blur run twice, of the same spread (disc radius r: variance r^2/4).
    width = float(blur_m / cell_m * np.sqrt(12.0 / 4.0 / 2.0))
    for axis in (0, 1):
        for _ in range(2):
            share = np.asarray(_box(share, width, axis), float)
    return share


def _box(values: Array, width: float, axis: int) -> Array:
    """Running mean over a width in cells (any real width), ends empty."""
    moved = np.moveaxis(values, axis, 0)
    whole = np.concatenate([np.zeros((1, moved.shape[1])), np.cumsum(moved, axis=0)])
    half = max(width, 1.0) / 2.0
    edges = np.arange(len(moved), dtype=float) + 0.5

    def total(at: Array) -> Array:
        inside = np.asarray(np.clip(at, 0.0, float(len(moved))), float)
        low = np.minimum(inside.astype(int), len(moved) - 1)
        result: Array = whole[low] + (inside - low)[:, None] * moved[low]
        return result

    mean: Array = (total(edges + half) - total(edges - half)) / (2.0 * half)
    return np.moveaxis(mean, 0, axis)
