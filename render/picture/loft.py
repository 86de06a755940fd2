"""Surfaces from sections: triangle meshes with smooth outward normals and a colour per face.

Body axes (x forward, y right, z down), metres. Triangles wind so that their normal points outward.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from render.frames import Array

Ints = NDArray[np.int64]
Colour = tuple[int, int, int]

#: Neighbouring faces that meet at more than this keep a sharp edge, rad.
SHARP_RAD = float(np.radians(38.0))


@dataclass(frozen=True, slots=True, eq=False)
class Surf:
    """A triangle mesh: points (N, 3) m, unit normals (N, 3), tris (M, 3), face colour (M, 3) uint8."""

    points: Array
    normals: Array
    tris: Ints
    colour: NDArray[np.uint8]

    def volume_m3(self) -> float:
        """Signed volume; positive where a closed surface's triangles face outward (divergence theorem)."""
        a, b, c = (self.points[self.tris[:, i]] for i in range(3))
        return float(np.einsum("ij,ij->", a, np.cross(b, c)) / 6.0)

    def centroids(self) -> Array:
        """Centres of the faces, (M, 3)."""
        result: Array = self.points[self.tris].mean(axis=1)
        return result


def surface(points: Array, tris: Ints, colour: Colour | NDArray[np.uint8]) -> Surf:
    """A mesh of one colour, or one per triangle (M, 3), smooth up to its sharp edges; no empty triangles."""
    points, tris = _welded(np.asarray(points, float), np.asarray(tris, np.int64))
    a, b, c = (points[tris[:, i]] for i in range(3))
    area = np.linalg.norm(np.cross(b - a, c - a), axis=1)
    colours = np.broadcast_to(np.asarray(colour, np.uint8), tris.shape)[area > 1e-9]
    points, tris, normals = _smooth(points, tris[area > 1e-9])
    return Surf(points, normals, tris, colours.copy())


def closed(points: Array, tris: Ints, colour: Colour | NDArray[np.uint8]) -> Surf:
    """As ``surface``, of a closed mesh: turned inside out where its volume comes out negative."""
    a, b, c = (points[tris[:, i]] for i in range(3))
    if np.einsum("ij,ij->", a, np.cross(b, c)) < 0.0:
        tris = tris[:, ::-1]
    return surface(points, tris, colour)


def _welded(points: Array, tris: Ints) -> tuple[Array, Ints]:
    """Points closer than 0.01 mm made one."""
    _, first, inverse = np.unique(np.round(points, 5), axis=0, return_index=True, return_inverse=True)
    return points[first], inverse.reshape(-1)[tris]


def _smooth(points: Array, tris: Ints) -> tuple[Array, Ints, Array]:
    """Corner normals averaged over the faces of a vertex within the sharp angle; vertices split as needed."""
    a, b, c = (points[tris[:, i]] for i in range(3))
    weighted = np.cross(b - a, c - a)
    unit = weighted / np.linalg.norm(weighted, axis=1, keepdims=True)
    corner_vertex = tris.reshape(-1)
    corner_face = np.repeat(np.arange(len(tris)), 3)
    # All pairs of corners that share a vertex.
    order = np.argsort(corner_vertex, kind="stable")
    starts = np.searchsorted(corner_vertex[order], np.arange(len(points) + 1))
    size = np.diff(starts)[corner_vertex]
    first_corner = np.repeat(np.arange(len(corner_vertex)), size)
    offset = np.arange(size.sum()) - np.repeat(np.cumsum(size) - size, size)
    other_face = corner_face[order[starts[corner_vertex[first_corner]] + offset]]
    near = np.einsum("ij,ij->i", unit[corner_face[first_corner]], unit[other_face]) > np.cos(SHARP_RAD)
    share = weighted[other_face] * near[:, None]
    normals: Array = np.stack([np.bincount(first_corner, share[:, i], len(corner_vertex)) for i in range(3)], -1)
    normals = normals / np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-30)
    key = np.column_stack([corner_vertex, np.round(normals * 500.0)])
    _, first, inverse = np.unique(key, axis=0, return_index=True, return_inverse=True)
    return points[corner_vertex[first]], inverse.reshape(-1, 3).astype(np.int64), normals[first]


def merge(surfs: Sequence[Surf]) -> Surf:
    """Several meshes as one."""
    shift = np.cumsum([0, *(len(s.points) for s in surfs)])
    return Surf(
        np.concatenate([s.points for s in surfs]),
        np.concatenate([s.normals for s in surfs]),
        np.concatenate([s.tris + k for s, k in zip(surfs, shift[:-1], strict=True)]),
        np.concatenate([s.colour for s in surfs]),
    )


def moved(
    surf: Surf, scale: Sequence[float] = (1.0, 1.0, 1.0), shift: Sequence[float] | Array = (0.0, 0.0, 0.0)
) -> Surf:
    """Scaled about the origin, each axis by its own factor (may mirror), then shifted by m."""
    factor = np.asarray(scale, float)
    normals = surf.normals / factor  # the inverse transpose of the scaling
    normals = normals / np.linalg.norm(normals, axis=1, keepdims=True)
    tris = surf.tris if np.prod(factor) > 0 else surf.tris[:, ::-1]
    return replace(surf, points=surf.points * factor + np.asarray(shift, float), normals=normals, tris=tris)


def mirrored(surf: Surf) -> Surf:
    """The left of a right-hand piece."""
    return moved(surf, (1.0, -1.0, 1.0))


def grid_tris(rows: int, cols: int, around: bool) -> Ints:
    """Triangles of a grid of rows x cols points; ``around`` joins the last column to the first."""
    r, c = np.meshgrid(np.arange(rows - 1), np.arange(cols if around else cols - 1), indexing="ij")
    n = (c + 1) % cols
    a, b, d, e = r * cols + c, r * cols + n, (r + 1) * cols + c, (r + 1) * cols + n
    return np.concatenate([np.stack([a, b, e], -1).reshape(-1, 3), np.stack([a, e, d], -1).reshape(-1, 3)])


def rings(points: Array, colour: Colour | Sequence[Colour]) -> Surf:
    """A closed body through rings (R, C, 3), each end closed by a fan to its middle.

    colour: one, or one for each of the R - 1 bands (the caps take their neighbour's).
    """
    rows, cols = points.shape[:2]
    flat = np.concatenate([points.reshape(-1, 3), points[:1].mean(axis=1), points[-1:].mean(axis=1)])
    i = np.arange(cols)
    j = (i + 1) % cols
    first = np.stack([np.full(cols, rows * cols), j, i], -1)
    last = np.stack([np.full(cols, rows * cols + 1), (rows - 1) * cols + i, (rows - 1) * cols + j], -1)
    bands = np.broadcast_to(np.array(colour, np.uint8), (rows - 1, 3))
    side = np.repeat(bands, cols, axis=0)
    ends = [np.repeat(bands[k : k + 1], cols, axis=0) for k in (0, rows - 2)]
    tris = np.concatenate([grid_tris(rows, cols, True), first, last])
    return closed(flat, tris, np.concatenate([side, side, *ends]))


def sheet(points: Array, colour: Colour) -> Surf:
    """An open surface through a grid (R, C, 3); faces the side of row x column."""
    return surface(points.reshape(-1, 3), grid_tris(points.shape[0], points.shape[1], False)[:, ::-1], colour)
