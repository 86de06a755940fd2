"""Trees as crowns that turn to the eye: two triangles each."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from vtkmodules.vtkCommonDataModel import vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.shading import cells, constants, glsl, mesh, shaded_actor
from terrain.cover import Trees
from terrain.ground import Ground
from terrain.land import Land

_CORNERS = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]])
_FACES = np.array([[0, 1, 2], [0, 2, 3]])
SPARE_M = 30.0  # a tree this far outside the field may still show a part of its crown
LEAVES_FROM_RAD = 0.017  # a crown that looks smaller (14 px of 1280 in a field of 75 deg) shows no leaves


class TreeField:
    """The trees of a land: two actors, far trees before near ones, that have to be told where the eye is."""

    def __init__(self, trees: Trees, ground: Ground, land: Land) -> None:
        foot = np.column_stack([trees.east_m, trees.north_m, ground.height_at(trees.north_m, trees.east_m)])
        self._foot = foot
        bush = trees.kind == "bush"
        half = trees.height_m * np.where(bush, 0.55, np.where(trees.kind == "conifer", 0.49, 0.46))
        middle = trees.height_m * np.where(bush, 0.42, np.where(trees.kind == "conifer", 0.51, 0.54))
        crown = np.column_stack([half, 0.5 * trees.width_m, middle, trees.kind == "conifer"])
        tint = np.column_stack([trees.tone, np.modf(trees.tone * 97.31)[0]])
        self._width = trees.width_m
        shape = {
            "corner": np.tile(_CORNERS, (len(foot), 1)),
            "crown": np.repeat(crown, 4, axis=0),
            "tint": np.repeat(tint, 4, axis=0),
        }
        self._far, far_actor = _trees(foot, shape, land, leaves=False)
        self._near, near_actor = _trees(foot, shape, land, leaves=True)
        self.actors = [far_actor, near_actor]

    def set_eye(self, eye_d: Array, axis_d: Array | None, half_field_rad: float) -> None:
        """Draw far trees before near ones, and none that lie outside a cone round the axis of view.

        The same eye and axis always give the same order.
        """
        ray = self._foot - eye_d
        away = np.sqrt(np.einsum("nk,nk->n", ray, ray))
        seen = np.arange(len(away))
        if axis_d is not None and half_field_rad < 0.5 * np.pi:
            seen = np.nonzero(ray @ axis_d + SPARE_M > away * np.cos(half_field_rad))[0]
        order = seen[np.argsort(-away[seen], kind="stable")]
        small = self._width[order] < LEAVES_FROM_RAD * away[order]
        # A tree drawn without leaves that stands before one drawn with them is drawn with them too: order counts more.
        first = int(np.argmin(small)) if not small.all() else len(order)
        self._far.SetPolys(cells(quads(order[:first])))
        self._near.SetPolys(cells(quads(order[first:])))

    @property
    def drawn(self) -> int:
        """How many trees the last eye may see."""
        return int(self._far.GetNumberOfCells() + self._near.GetNumberOfCells()) // 2


def _trees(foot: Array, shape: dict[str, Array], land: Land, *, leaves: bool) -> tuple[vtkPolyData, vtkActor]:
    data = mesh(np.repeat(foot, 4, axis=0), quads(np.arange(len(foot))))
    code = constants({"LEAVES": int(leaves), "LEAF_A": land.leaf[0], "LEAF_B": land.leaf[1], "NEEDLE": land.needle})
    code += glsl("common") + glsl("tree")
    position = "gl_Position = MCDCMatrix * setTree(place);\n"
    actor = shaded_actor(data, code, "fragOutput0 = treeColour();\n", shape, glsl("rim") + glsl("tree_place"), position)
    actor.ForceTranslucentOn()
    return data, actor


def quads(numbers: NDArray[np.int64]) -> NDArray[np.int64]:
    """Two triangles for each numbered group of four points, in that order."""
    return (4 * numbers[:, None, None] + _FACES[None]).reshape(-1, 3)
