"""Trees as crowns that turn to the eye, with their shadows on the ground: two triangles each."""

from __future__ import annotations

import numpy as np
import vtk
from numpy.typing import NDArray

from render.frames import Array
from render.picture.light import Light
from render.picture.shading import cells, constants, glsl, mesh, shaded_actor
from terrain.cover import Trees
from terrain.ground import Ground
from terrain.land import Land

_CORNERS = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]])
_FACES = np.array([[0, 1, 2], [0, 2, 3]])
SORT_STEP_M = 8.0  # trees are put in order of distance anew when the eye enters another cube of this size


class TreeField:
    """The trees of a land: an actor that has to be told where the eye is, so that near crowns cover far ones."""

    def __init__(self, trees: Trees, ground: Ground, land: Land) -> None:
        foot = np.column_stack([trees.east_m, trees.north_m, ground.height_at(trees.north_m, trees.east_m)])
        self._foot = foot
        self._cell: tuple[int, ...] | None = None
        bush = trees.kind == "bush"
        half = trees.height_m * np.where(bush, 0.55, np.where(trees.kind == "conifer", 0.49, 0.46))
        middle = trees.height_m * np.where(bush, 0.42, np.where(trees.kind == "conifer", 0.51, 0.54))
        crown = np.column_stack([half, 0.5 * trees.width_m, middle, trees.kind == "conifer"])
        tint = np.column_stack([trees.tone, np.modf(trees.tone * 97.31)[0]])
        self._data = mesh(np.repeat(foot, 4, axis=0), quads(np.arange(len(foot))))
        code = constants({"LEAF_A": land.leaf[0], "LEAF_B": land.leaf[1], "NEEDLE": land.needle})
        code += glsl("common") + glsl("tree")
        self.actor = shaded_actor(
            self._data, code, "fragOutput0 = treeColour();\n",
            {"corner": np.tile(_CORNERS, (len(foot), 1)), "crown": np.repeat(crown, 4, axis=0),
             "tint": np.repeat(tint, 4, axis=0)},
            glsl("rim") + glsl("tree_place"), "gl_Position = MCDCMatrix * setTree(place);\n",
        )
        self.actor.ForceTranslucentOn()

    def set_eye(self, eye_d: Array) -> None:
        """Order by distance from the middle of the eye's cube: the same eye always gives the same order."""
        cell = tuple(int(x) for x in np.floor(eye_d / SORT_STEP_M))
        if cell == self._cell:
            return
        self._cell = cell
        middle = (np.array(cell) + 0.5) * SORT_STEP_M
        order = np.argsort(-np.sum((self._foot - middle) ** 2, axis=1), kind="stable")
        self._data.SetPolys(cells(quads(order)))


def quads(numbers: NDArray[np.int64]) -> NDArray[np.int64]:
    """Two triangles for each numbered group of four points, in that order."""
    return (4 * numbers[:, None, None] + _FACES[None]).reshape(-1, 3)


def tree_shadows(trees: Trees, ground: Ground, light: Light) -> vtk.vtkActor:
    """Shadows of ellipsoid crowns on level ground: ellipses drawn out away from the sun."""
    up = max(float(light.sun_d[2]), 0.12)
    toward = light.sun_d[:2] / (np.linalg.norm(light.sun_d[:2]) + 1e-9)
    slope = min(float(np.linalg.norm(light.sun_d[:2])) / up, 6.0)
    half, wide = 0.46 * trees.height_m, 0.5 * trees.width_m
    middle = np.column_stack([trees.east_m, trees.north_m]) - (0.54 * trees.height_m * slope)[:, None] * toward
    long = np.hypot(half * slope, wide)
    side = np.array([-toward[1], toward[0]])
    places = (middle[:, None, :] + _CORNERS[None, :, :1] * (long[:, None] * toward)[:, None, :]
              + _CORNERS[None, :, 1:] * (wide[:, None] * side)[:, None, :]).reshape(-1, 2)
    points = np.column_stack([places, ground.height_at(places[:, 1], places[:, 0])])
    strength = 0.62 * np.clip(light.sun_d[2] * 4.0, 0.25, 1.0)
    code = constants({"STRENGTH": float(strength), "SHADE": 0.25 * light.sky}) + glsl("common")
    code += "in vec2 disc;\nin float left;\n"
    main = """
      float r = length(disc), w = fwidth(r);
      float cover = clamp((1.0 - r) / max(w, 0.30), 0.0, 1.0);
      fragOutput0 = vec4(SHADE, STRENGTH * cover * left);
    """
    position = "setShadow(place);\ngl_Position = MCDCMatrix * vertexMC;\ngl_Position.z -= 2e-6 * gl_Position.w;\n"
    actor = shaded_actor(
        mesh(points, quads(np.arange(len(half)))), code, main, {"corner": np.tile(_CORNERS, (len(half), 1))},
        glsl("rim") + glsl("shadow_place"), position,
    )
    actor.ForceTranslucentOn()
    return actor
