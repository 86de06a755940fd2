"""Buildings, vehicles, boards and hedges as one mesh of true sizes, with the sun's light in its corner colours."""

from __future__ import annotations

import numpy as np
import vtk

from render.frames import Array
from render.picture.light import Light
from render.picture.shading import constants, glsl, mesh, shaded_actor
from terrain.cover import Cover
from terrain.ground import Ground
from terrain.land import Land

_WALLS = {
    "house": ((.74, .66, .56), (.62, .40, .30), (.82, .79, .72)), "barn": ((.52, .50, .46), (.42, .46, .42), (.60, .54, .46)),
    "hangar": ((.60, .64, .66), (.66, .68, .66)), "tower": ((.82, .82, .79),), "board": ((.80, .62, .12),),
    "post": ((.86, .84, .80),), "lorry": ((.80, .80, .78), (.30, .38, .52), (.55, .16, .14)),
    "car": ((.72, .73, .75), (.12, .13, .15), (.55, .13, .12), (.20, .28, .46), (.86, .86, .85)),
}
_ROOFS = {
    "house": ((.45, .25, .19), (.34, .33, .34), (.52, .34, .26)), "barn": ((.44, .45, .46), (.56, .57, .57), (.40, .30, .26)),
    "hangar": ((.68, .71, .73),), "tower": ((.35, .37, .39),),
}


class _Faces:
    """Four-cornered faces, collected and lit."""

    def __init__(self, light: Light) -> None:
        self._light = light
        self.points: list[Array] = []
        self.colours: list[Array] = []

    def add(self, corners: Array, colour: Array) -> None:
        """Faces (N, 4, 3) counter-clockwise from outside, one colour (N, 3) each."""
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 3] - corners[:, 0])
        normal = normal / (np.linalg.norm(normal, axis=1)[:, None] + 1e-9)
        sun = np.maximum(normal @ self._light.sun_d, 0.0)[:, None]
        lit = colour * (self._light.sun * sun + self._light.sky * (0.72 + 0.28 * normal[:, 2:]))
        self.points.append(corners.reshape(-1, 3))
        self.colours.append(np.repeat(np.clip(lit, 0.0, 1.0), 4, axis=0))


def object_actor(cover: Cover, ground: Ground, land: Land, light: Light) -> vtk.vtkActor:
    """One opaque actor of all boxes and standing hedges."""
    faces = _Faces(light)
    _add_boxes(faces, cover, ground)
    _add_hedges(faces, cover, ground, land)
    points, colours = np.concatenate(faces.points), np.concatenate(faces.colours)
    first = 4 * np.arange(len(points) // 4)[:, None]
    triangles = np.concatenate([first + [0, 1, 2], first + [0, 2, 3]], axis=1).reshape(-1, 3)
    code = constants({}) + glsl("common") + "in vec3 paint;\n"
    vertex = glsl("rim") + "in vec3 paintIn;\nout vec3 paint;\n"
    return shaded_actor(
        mesh(points, triangles), code, "fragOutput0 = vec4(haze(paint, length(place - eye)), 1.0);\n",
        {"paintIn": colours}, vertex, "setRim(place);\npaint = paintIn;\n",
    )


def _add_boxes(faces: _Faces, cover: Cover, ground: Ground) -> None:
    boxes = cover.boxes
    foot = ground.height_at(boxes.north_m, boxes.east_m)
    forward = np.column_stack([np.sin(boxes.bearing_rad), np.cos(boxes.bearing_rad)])
    left = np.column_stack([-forward[:, 1], forward[:, 0]])
    middle = np.column_stack([boxes.east_m, boxes.north_m])
    wall = np.array([_pick(_WALLS[k], t) for k, t in zip(boxes.kind, boxes.tone, strict=True)])
    roof = np.array([_pick(_ROOFS.get(k, _WALLS[k]), t) for k, t in zip(boxes.kind, boxes.tone, strict=True)])

    def corner(along: float, across: float, up: Array) -> Array:
        flat = middle + (along * 0.5 * boxes.length_m)[:, None] * forward + (across * 0.5 * boxes.width_m)[:, None] * left
        return np.column_stack([flat, foot + up])

    low, eaves, ridge = np.full(len(foot), -1.0), boxes.height_m, boxes.height_m + boxes.ridge_m
    sides = [(1, -1), (1, 1), (-1, 1), (-1, -1)]
    for (a, b), (c, d) in zip(sides, sides[1:] + sides[:1], strict=True):
        faces.add(np.stack([corner(a, b, low), corner(c, d, low), corner(c, d, eaves), corner(a, b, eaves)], axis=1), wall)
    faces.add(np.stack([corner(1, 1, eaves), corner(-1, 1, eaves), corner(-1, 0, ridge), corner(1, 0, ridge)], axis=1), roof)
    faces.add(np.stack([corner(-1, -1, eaves), corner(1, -1, eaves), corner(1, 0, ridge), corner(-1, 0, ridge)], axis=1), roof)
    pitched = boxes.ridge_m > 0.0
    for end in (1, -1):
        top = corner(end, 0, ridge)
        gable = np.stack([corner(end, -end, eaves), corner(end, end, eaves), top, top], axis=1)
        faces.add(gable[pitched], wall[pitched])
    _add_windows(faces, cover, corner)


def _add_windows(faces: _Faces, cover: Cover, corner: object) -> None:
    """Nothing yet."""


def _pick(colours: tuple[tuple[float, float, float], ...], tone: float) -> Array:
    wide = tone * len(colours)
    shade = 0.9 + 0.2 * (wide % 1.0)
    return np.array(colours[min(int(wide), len(colours) - 1)]) * shade


def _add_hedges(faces: _Faces, cover: Cover, ground: Ground, land: Land) -> None:
    """Each piece of hedge as a tent: two faces."""
    h = cover.hedges
    if len(h.north_m) == 0 or land.plan.hedge_m <= 0.0:
        return
    start, end = np.column_stack([h.east_m, h.north_m]), np.column_stack([h.to_east_m, h.to_north_m])
    along = end - start
    side = np.column_stack([-along[:, 1], along[:, 0]])
    side = side / (np.linalg.norm(side, axis=1)[:, None] + 1e-9) * (0.5 * land.plan.hedge_m)

    def up(places: Array, height: float) -> Array:
        return np.column_stack([places, ground.height_at(places[:, 1], places[:, 0]) + height])

    top_a, top_b = up(start, cover.hedge_height_m), up(end, cover.hedge_height_m)
    colour = np.tile(np.array(land.hedge), (len(start), 1))
    faces.add(np.stack([up(end + side, -0.3), up(start + side, -0.3), top_a, top_b], axis=1), colour)
    faces.add(np.stack([up(start - side, -0.3), up(end - side, -0.3), top_b, top_a], axis=1), colour)
