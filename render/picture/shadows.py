"""Shadows of what stands on the land, laid on the ground away from the sun."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import ConvexHull
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.light import Light
from render.picture.shading import constants, glsl, mesh, shaded_actor
from terrain.cover import Cover
from terrain.ground import Ground

_CORNERS = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]])
SQUARE_M = 1_300.0
_FACES = np.array([[0, 1, 2], [0, 2, 3]])
#: Toward the eye in depth, so that the ground does not show through: parts of the whole depth range.
_LIFT = "gl_Position.z -= 2e-6 * gl_Position.w;\n"


def shadow_actors(cover: Cover, ground: Ground, light: Light) -> list[vtkActor]:
    """Ellipses for crowns, outlines for boxes, strips for hedges, on ground taken as level round each.

    One actor for each square of land, so that VTK can leave out those that are not in view.
    """
    up = max(float(light.sun_d[2]), 0.12)
    flat = float(np.linalg.norm(light.sun_d[:2]))
    away = -light.sun_d[:2] / (flat + 1e-9) * min(flat / up, 6.0)  # shift of a point's shadow for each metre of height
    parts = [_crowns(cover, away), _strips(cover, away), *_outlines(cover, away)]
    first = np.cumsum([0, *(len(place) for place, _, _ in parts)])
    place, disc = (np.concatenate([part[k] for part in parts]) for k in (0, 1))
    triangles = np.concatenate([faces + start for (_, _, faces), start in zip(parts, first, strict=False)])
    points = np.column_stack([place, ground.height_at(place[:, 1], place[:, 0])])
    strength = 0.62 * np.clip(light.sun_d[2] * 4.0, 0.25, 1.0)
    code = constants({"STRENGTH": float(strength), "SHADE": 0.25 * light.sky}) + glsl("common")
    code += "in vec2 disc;\nin float left;\n"
    main = """
      float r = length(disc), w = fwidth(r);
      float cover = clamp((1.0 - r) / max(w, 0.30), 0.0, 1.0);
      fragOutput0 = vec4(SHADE, STRENGTH * cover * left);
    """
    position = "setShadow(place);\ngl_Position = MCDCMatrix * vertexMC;\n" + _LIFT
    square = np.floor(points[triangles[:, 0], :2] / SQUARE_M).astype(int)
    actors = []
    for key in np.unique(square, axis=0):
        used, renumbered = np.unique(triangles[(square == key).all(axis=1)], return_inverse=True)
        actor = shaded_actor(
            mesh(points[used], renumbered.reshape(-1, 3)),
            code,
            main,
            {"corner": disc[used]},
            glsl("rim") + glsl("shadow_place"),
            position,
        )
        actor.ForceTranslucentOn()
        actors.append(actor)
    return actors


Part = tuple[Array, Array, NDArray[np.int64]]  # places (P, 2) east, north; disc (P, 2); triangles (T, 3)


def _crowns(cover: Cover, away: Array) -> Part:
    """The shadow of an ellipsoid of half height b, half width a is an ellipse: hypot(b cot, a) by a."""
    trees, lit = cover.trees, ~cover.trees.deep
    north, east, height = trees.north_m[lit], trees.east_m[lit], trees.height_m[lit]
    slope = float(np.linalg.norm(away))
    along = away / (slope + 1e-9)
    half, wide = 0.46 * height, 0.5 * trees.width_m[lit]
    middle = np.column_stack([east, north]) + 0.52 * height[:, None] * away
    long = np.hypot(half * slope, wide)
    across = np.array([-along[1], along[0]])
    places = middle[:, None] + _CORNERS[None, :, :1] * (long[:, None] * along)[:, None]
    places = places + _CORNERS[None, :, 1:] * (wide[:, None] * across)[:, None]
    return places.reshape(-1, 2), np.tile(_CORNERS, (len(half), 1)), _quads(len(half))


def _strips(cover: Cover, away: Array) -> Part:
    hedges = cover.hedges
    start, end = (
        np.column_stack([hedges.east_m, hedges.north_m]),
        np.column_stack([hedges.to_east_m, hedges.to_north_m]),
    )
    off = cover.hedge_height_m * away
    places = np.stack([start, end, end + off, start + off], axis=1).reshape(-1, 2)
    return places, np.zeros_like(places), _quads(len(start))


def _outlines(cover: Cover, away: Array) -> list[Part]:
    """A box and its top moved along the shadow: the outline of both."""
    boxes = cover.boxes
    feet = np.stack([np.column_stack(boxes.corner(a, b)[::-1]) for a, b in _CORNERS], axis=1)
    ridge = np.stack([np.column_stack(boxes.corner(a, 0.0)[::-1]) for a in (-1.0, 1.0)], axis=1)
    parts: list[Part] = []
    for k in range(len(boxes.kind)):
        if boxes.height_m[k] < 1.0:
            continue
        top = feet[k] + boxes.height_m[k] * away
        high = ridge[k] + (boxes.height_m[k] + boxes.ridge_m[k]) * away
        every = np.concatenate([feet[k], top, high])
        outline = every[ConvexHull(every).vertices]
        fan = np.array([[0, i, i + 1] for i in range(1, len(outline) - 1)])
        parts.append((outline, np.zeros_like(outline), fan))
    return parts


def _quads(count: int) -> NDArray[np.int64]:
    return (4 * np.arange(count)[:, None, None] + _FACES[None]).reshape(-1, 3)
