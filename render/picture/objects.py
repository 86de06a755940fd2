"""Buildings, vehicles, boards and hedges as one mesh of true sizes, with the sun's light in its corner colours."""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.light import Light
from render.picture.shading import glsl, mesh, shaded_actor
from terrain.cover import Cover
from terrain.ground import Ground
from terrain.land import Land

_WALLS = {
    "house": ((0.74, 0.66, 0.56), (0.62, 0.40, 0.30), (0.82, 0.79, 0.72)),
    "barn": ((0.52, 0.50, 0.46), (0.42, 0.46, 0.42), (0.60, 0.54, 0.46)),
    "hangar": ((0.60, 0.64, 0.66), (0.66, 0.68, 0.66)),
    "tower": ((0.82, 0.82, 0.79),),
    "board": ((0.80, 0.62, 0.12),),
    "post": ((0.86, 0.84, 0.80),),
    "lorry": ((0.80, 0.80, 0.78), (0.30, 0.38, 0.52), (0.55, 0.16, 0.14)),
    "car": ((0.72, 0.73, 0.75), (0.12, 0.13, 0.15), (0.55, 0.13, 0.12), (0.20, 0.28, 0.46), (0.86, 0.86, 0.85)),
}
_ROOFS = {
    "house": ((0.45, 0.25, 0.19), (0.34, 0.33, 0.34), (0.52, 0.34, 0.26)),
    "barn": ((0.44, 0.45, 0.46), (0.56, 0.57, 0.57), (0.40, 0.30, 0.26)),
    "hangar": ((0.68, 0.71, 0.73),),
    "tower": ((0.35, 0.37, 0.39),),
}


SQUARE_M = 1_300.0
_PLAIN, _PANES, _DOOR, _GLASS, _SCREEN, _LEAVES = (float(k) for k in range(6))  # as in shaders/object.glsl
_SIDES = {"house": _PANES, "hangar": _DOOR, "tower": _GLASS, "car": _SCREEN}


class _Faces:
    """Four-cornered faces, collected and lit."""

    def __init__(self, light: Light) -> None:
        self._light = light
        self.points: list[Array] = []
        self.colours: list[Array] = []
        self.walls: list[Array] = []

    def add(self, corners: Array, colour: Array, kind: Array | float = _PLAIN) -> None:
        """Faces (N, 4, 3) counter-clockwise from outside, the first two corners below; one colour (N, 3) each."""
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 3] - corners[:, 0])
        normal = normal / (np.linalg.norm(normal, axis=1)[:, None] + 1e-9)
        sun = np.maximum(normal @ self._light.sun_d, 0.0)[:, None]
        lit = colour * (self._light.sun * sun + self._light.sky * (0.72 + 0.28 * normal[:, 2:]))
        self.points.append(corners.reshape(-1, 3))
        self.colours.append(np.repeat(np.clip(lit, 0.0, 1.0), 4, axis=0))
        long = np.linalg.norm(corners[:, 1] - corners[:, 0], axis=1)
        up = np.linalg.norm(corners[:, 3] - corners[:, 0], axis=1)
        zero, kinds = np.zeros(len(corners)), np.broadcast_to(np.asarray(kind, float), long.shape)
        wall = [(zero, zero), (long, zero), (long, up), (zero, up)]
        self.walls.append(np.stack([np.column_stack([x, y, long, kinds]) for x, y in wall], axis=1).reshape(-1, 4))


def object_actors(cover: Cover, ground: Ground, land: Land, light: Light) -> list[vtkActor]:
    """Opaque actors of all boxes and standing hedges, one for each square of land, so that VTK can leave out
    those that are not in view."""
    faces = _Faces(light)
    _add_boxes(faces, cover, ground)
    _add_hedges(faces, cover, ground, land)
    points, colours, walls = (np.concatenate(x) for x in (faces.points, faces.colours, faces.walls))
    square = np.floor(points[::4, :2] / SQUARE_M).astype(int)
    vertex = glsl("rim") + "in vec3 paintIn;\nin vec4 wallIn;\nout vec3 paint;\nout vec4 wall;\n"
    actors = []
    for key in np.unique(square, axis=0):
        chosen = np.repeat((square == key).all(axis=1), 4)
        first = 4 * np.arange(int(chosen.sum()) // 4)[:, None]
        triangles = (first + np.array([0, 1, 2, 0, 2, 3])).reshape(-1, 3)
        actors.append(
            shaded_actor(
                mesh(points[chosen], triangles),
                glsl("common") + glsl("object"),
                "fragOutput0 = vec4(objectColour(), 1.0);\n",
                {"paintIn": colours[chosen], "wallIn": walls[chosen]},
                vertex,
                "setRim(place);\npaint = paintIn;\nwall = wallIn;\n",
            )
        )
    return actors


def _add_boxes(faces: _Faces, cover: Cover, ground: Ground) -> None:
    boxes = cover.boxes
    foot = ground.height_at(boxes.north_m, boxes.east_m)
    wall = np.array([_pick(_WALLS[k], t) for k, t in zip(boxes.kind, boxes.tone, strict=True)])
    roof = np.array([_pick(_ROOFS.get(k, _WALLS[k]), t) for k, t in zip(boxes.kind, boxes.tone, strict=True)])
    side_kind = np.array([_SIDES.get(k, _PLAIN) for k in boxes.kind])

    def corner(along: float, across: float, up: Array) -> Array:
        north, east = boxes.corner(along, across)
        return np.column_stack([east, north, foot + up])

    low, eaves, ridge = np.zeros(len(foot)), boxes.height_m, boxes.height_m + boxes.ridge_m
    sides = [(1, -1), (1, 1), (-1, 1), (-1, -1)]
    for (a, b), (c, d) in zip(sides, sides[1:] + sides[:1], strict=True):
        quad = np.stack([corner(a, b, low), corner(c, d, low), corner(c, d, eaves), corner(a, b, eaves)], axis=1)
        faces.add(quad, wall, side_kind)
    for side in (1, -1):
        quad = np.stack(
            [corner(side, side, eaves), corner(-side, side, eaves), corner(-side, 0, ridge), corner(side, 0, ridge)],
            axis=1,
        )
        faces.add(quad, roof)
    pitched = boxes.ridge_m > 0.0
    for end in (1, -1):
        top = corner(end, 0, ridge)
        gable = np.stack([corner(end, -end, eaves), corner(end, end, eaves), top, top], axis=1)
        faces.add(gable[pitched], wall[pitched])


def _pick(colours: tuple[tuple[float, float, float], ...], tone: float) -> Array:
    wide = tone * len(colours)
    shade = 0.9 + 0.2 * (wide % 1.0)
    return np.array(colours[min(int(wide), len(colours) - 1)]) * shade


def _add_hedges(faces: _Faces, cover: Cover, ground: Ground, land: Land) -> None:
    """Each piece of hedge as two leaning sides and a top."""
    h = cover.hedges
    if len(h.north_m) == 0 or land.plan.hedge_m <= 0.0:
        return
    start, end = np.column_stack([h.east_m, h.north_m]), np.column_stack([h.to_east_m, h.to_north_m])
    along = end - start
    side = np.column_stack([-along[:, 1], along[:, 0]])
    side = side / (np.linalg.norm(side, axis=1)[:, None] + 1e-9) * (0.5 * land.plan.hedge_m)

    def up(places: Array, height: float) -> Array:
        return np.column_stack([places, ground.height_at(places[:, 1], places[:, 0]) + height])

    tall = cover.hedge_height_m
    left_a, left_b = up(start + 0.6 * side, tall), up(end + 0.6 * side, tall)
    right_a, right_b = up(start - 0.6 * side, tall), up(end - 0.6 * side, tall)
    colour = np.tile(np.array(land.hedge), (len(start), 1))
    faces.add(np.stack([up(end + side, -0.2), up(start + side, -0.2), left_a, left_b], axis=1), colour, _LEAVES)
    faces.add(np.stack([up(start - side, -0.2), up(end - side, -0.2), right_b, right_a], axis=1), colour, _LEAVES)
    faces.add(np.stack([right_a, right_b, left_b, left_a], axis=1), colour, _LEAVES)
