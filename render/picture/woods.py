"""Woods as a canopy: a surface over the ground, so that they stand up, hide what is behind, and cost little."""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.shading import constants, glsl, mesh, shaded_actor
from terrain.ground import Ground
from terrain.land import Land
from terrain.woods import Canopy

SQUARE_M = 800.0
CROWN_M = {"broadleaf": 8.5, "conifer": 6.0}  # between crowns; by eye
SUNK_M = 0.4  # a wood's edge begins below the ground: on a slope no light shows under it
RISES_M = (1_500.0, 900.0)  # from the eye: farther woods are painted on the ground, nearer ones stand at full height


class Woods:
    """The canopy of a land: opaque actors, one for each square, that have to be told where the eye is."""

    def __init__(self, canopy: Canopy, ground: Ground, land: Land) -> None:
        self.actors: list[vtkActor] = []
        self._boxes = np.empty((0, 3, 2))
        if len(canopy.triangles) == 0:
            return
        foot = ground.height_at(canopy.north_m, canopy.east_m)
        edge = canopy.height_m <= 0.0
        points = np.column_stack([canopy.east_m, canopy.north_m, foot + canopy.height_m - SUNK_M * edge])
        normals = _normals(points, canopy)
        code = constants({"WOOD": land.wood, "CROWN": CROWN_M[land.standing.wood_kind]}) + glsl("common") + glsl("wood")
        vertex = constants({"RISES_FROM": RISES_M[0], "RISES_TO": RISES_M[1], "SUNK": SUNK_M})
        vertex += glsl("rim") + glsl("wood_place")
        square = np.floor(points[canopy.triangles[:, 0], :2] / SQUARE_M).astype(int)
        for key in np.unique(square, axis=0):
            used, renumbered = np.unique(canopy.triangles[(square == key).all(axis=1)], return_inverse=True)
            actor = shaded_actor(
                mesh(points[used], renumbered.reshape(-1, 3)),
                code,
                "fragOutput0 = vec4(woodColour(), 1.0);\n",
                {"upward": normals[used], "above": canopy.height_m[used, None]},
                vertex,
                "setWood(place);\n",
            )
            actor.GetProperty().BackfaceCullingOn()
            self.actors.append(actor)
        self._boxes = np.array([actor.GetBounds() for actor in self.actors]).reshape(-1, 3, 2)

    def set_eye(self, eye_d: Array) -> None:
        """Leave out the squares that are too far to stand up."""
        off = np.maximum(np.maximum(self._boxes[:, :, 0] - eye_d, eye_d - self._boxes[:, :, 1]), 0.0)
        near = np.einsum("nk,nk->n", off, off) < RISES_M[0] ** 2
        for actor, shown in zip(self.actors, near.tolist(), strict=True):
            actor.SetVisibility(shown)


def _normals(points: Array, canopy: Canopy) -> Array:
    """Upward normals at the corners, from the triangles round each."""
    a, b, c = (points[canopy.triangles[:, k]] for k in range(3))
    face = np.cross(b - a, c - a)
    total = np.zeros_like(points)
    for k in range(3):
        np.add.at(total, canopy.triangles[:, k], face)
    result: Array = total / np.maximum(np.linalg.norm(total, axis=1, keepdims=True), 1e-9)
    return result
