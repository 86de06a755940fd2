"""Paint: colour borders cut exactly into a mesh along implicit functions; meshes to VTK."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
import pyvista as pv

from render.frames import Array
from render.picture.loft import Colour, Surf, merge

#: A side of a border: points (N, 3) m -> (N,), negative on the side meant.
Side = Callable[[Array], Array]


def cut(surf: Surf, side: Side) -> Surf:
    """The same surface with its triangles divided where ``side`` changes sign; colours kept."""
    value = np.asarray(side(surf.points), float)
    value = np.where(np.abs(value) < 1e-7, 1e-7, value)
    below = value < 0.0
    count = below[surf.tris].sum(axis=1)
    mixed = (count == 1) | (count == 2)
    if not mixed.any():
        return surf
    tris, colour = surf.tris[mixed], surf.colour[mixed]
    # Turn each triangle so that the vertex alone on its side comes first.
    inside = below[tris]
    lone = np.where(count[mixed][:, None] == 1, inside, ~inside).argmax(axis=1)
    tris = np.take_along_axis(tris, (lone[:, None] + np.arange(3)) % 3, axis=1)
    pairs = np.sort(np.concatenate([tris[:, [0, 1]], tris[:, [0, 2]]]), axis=1)
    edges, inverse = np.unique(pairs, axis=0, return_inverse=True)
    inverse = inverse.reshape(-1)
    points, normals = _crossings(surf, side, value, edges)
    e1, e2 = len(surf.points) + inverse[: len(tris)], len(surf.points) + inverse[len(tris) :]
    new = np.concatenate(
        [
            np.stack([tris[:, 0], e1, e2], -1),
            np.stack([e1, tris[:, 1], tris[:, 2]], -1),
            np.stack([e1, tris[:, 2], e2], -1),
        ]
    )
    return Surf(
        np.concatenate([surf.points, points]),
        np.concatenate([surf.normals, normals]),
        np.concatenate([surf.tris[~mixed], new]),
        np.concatenate([surf.colour[~mixed], colour, colour, colour]),
    )


def _crossings(surf: Surf, side: Side, value: Array, edges: np.ndarray) -> tuple[Array, Array]:
    """Points and normals where the function is zero on each edge, by regula falsi."""
    low, high = np.zeros(len(edges)), np.ones(len(edges))
    f_low, f_high = value[edges[:, 0]], value[edges[:, 1]]
    a, b = surf.points[edges[:, 0]], surf.points[edges[:, 1]]
    for _ in range(4):
        t = np.clip(low - f_low * (high - low) / (f_high - f_low), 1e-4, 1.0 - 1e-4)
        f = np.asarray(side(a + t[:, None] * (b - a)), float)
        same = np.sign(f) == np.sign(f_low)
        low, f_low = np.where(same, t, low), np.where(same, f, f_low)
        high, f_high = np.where(same, high, t), np.where(same, f_high, f)
        f_high = np.where(f_high == f_low, f_low + 1e-12, f_high)
    normals = surf.normals[edges[:, 0]] * (1 - t[:, None]) + surf.normals[edges[:, 1]] * t[:, None]
    normals /= np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-9)
    return a + t[:, None] * (b - a), normals


def station(at: float | Array, normal: Sequence[float] = (1.0, 0.0, 0.0)) -> Side:
    """Distance (m) from a plane along its normal: x - at by default."""
    direction = np.asarray(normal, float)

    def side(p: Array) -> Array:
        result: Array = p @ direction - at
        return result

    return side


def paint(surf: Surf, side: Side, colour: Colour, only: Colour | None = None) -> Surf:
    """Colour where ``side`` is negative, cut exactly; with ``only``, no face but those of that colour."""
    if only is not None:
        same, other = _of_colour(surf, only)
        return merge([paint(same, side, colour), other])
    return _coloured(cut(surf, side), side, colour)


def line(surf: Surf, along: Side, width_m: float, colour: Colour, only: Colour | None = None) -> Surf:
    """A line of given width where ``along`` (a distance, m) is zero.

    Both borders are cut one by one: a line narrower than a triangle would be missed otherwise.
    """
    if only is not None:
        same, other = _of_colour(surf, only)
        return merge([line(same, along, width_m, colour), other])
    half = width_m / 2
    surf = cut(cut(surf, lambda p: along(p) - half), lambda p: along(p) + half)
    return _coloured(surf, lambda p: np.abs(along(p)) - half, colour)


def patch(surf: Surf, edges: Sequence[Side], colour: Colour) -> Surf:
    """Colour where all of the sides are negative, each cut exactly and no further than the others reach."""
    for k, edge in enumerate(edges):
        others = [e for i, e in enumerate(edges) if i != k]
        near, far = _near(surf, others, 0.4)
        surf = merge([cut(near, edge), far])
    return _coloured(surf, lambda p: np.max([e(p) for e in edges], axis=0), colour)


def _of_colour(surf: Surf, colour: Colour) -> tuple[Surf, Surf]:
    """(faces of that colour, the others)."""
    same = (surf.colour == np.array(colour, np.uint8)).all(axis=1)
    return faces(surf, same), faces(surf, ~same)


def _coloured(surf: Surf, side: Side, colour: Colour) -> Surf:
    hit = np.asarray(side(surf.centroids()), float) < 0.0
    return replace(surf, colour=np.where(hit[:, None], np.array(colour, np.uint8), surf.colour))


def _near(surf: Surf, sides: Sequence[Side], reach_m: float) -> tuple[Surf, Surf]:
    """(whole faces within reach of the region where all the sides are negative, the others)."""
    inside = np.max([side(surf.points) for side in sides], axis=0) < reach_m
    keep = inside[surf.tris].any(axis=1)
    return faces(surf, keep), faces(surf, ~keep)


def divided(surf: Surf, side: Side) -> tuple[Surf, Surf]:
    """The two pieces (where negative, where positive)."""
    surf = cut(surf, side)
    inside: np.ndarray = np.asarray(side(surf.centroids()), float) < 0.0
    return faces(surf, inside), faces(surf, ~inside)


def faces(surf: Surf, keep: np.ndarray) -> Surf:
    """The faces kept, as a mesh of their own."""
    used, inverse = np.unique(surf.tris[keep], return_inverse=True)
    return Surf(surf.points[used], surf.normals[used], inverse.reshape(-1, 3).astype(np.int64), surf.colour[keep])


def to_mesh(surf: Surf, shade: Callable[[Array, Array], Array] | None = None) -> pv.PolyData:
    """VTK mesh with point normals and point data ``colour`` (uint8 RGB).

    Vertices are doubled where faces of two colours meet, so borders stay sharp under smooth shading.
    shade: (points, normals) -> factors (N,), darkens the paint (baked soot, contact shade).
    """
    packed = surf.colour.astype(np.int64) @ np.array([65536, 256, 1])
    key = surf.tris.reshape(-1).astype(np.int64) * (1 << 24) + np.repeat(packed, 3)
    _, first, inverse = np.unique(key, return_index=True, return_inverse=True)
    vertex = surf.tris.reshape(-1)[first]
    colour = np.repeat(surf.colour, 3, axis=0)[first].astype(float)
    points, normals = surf.points[vertex], surf.normals[vertex]
    if shade is not None:
        colour = colour * np.asarray(shade(points, normals), float)[:, None]
    tris = inverse.reshape(-1, 3)
    mesh = pv.PolyData(points.astype(np.float32), np.column_stack([np.full(len(tris), 3), tris]).reshape(-1))
    mesh.point_data["Normals"] = normals.astype(np.float32)
    mesh.point_data.active_normals_name = "Normals"
    mesh.point_data["colour"] = np.clip(np.round(colour), 0, 255).astype(np.uint8)
    mesh.point_data.active_scalars_name = "colour"
    return mesh
