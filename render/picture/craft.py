"""One drawn aircraft: its shape's parts as VTK actors, placed and moved together."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np
from vtkmodules.vtkCommonDataModel import vtkDataObject
from vtkmodules.vtkCommonMath import vtkMatrix4x4
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper

from render.frames import Array
from render.picture.light import Light
from render.picture.shading import glsl
from render.picture.shapes import Part, part_matrix

OPEN_SHEETS = ("cabin",)  # parts with surfaces that are seen from both sides


@dataclass(frozen=True, slots=True, eq=False)
class CraftLight:
    """Light on an aircraft: colours (3,), 0..1, of what falls on a face turned to each source.

    The shares add up to about 1 on a face turned to the sun, so that white paint isn't burnt out; by eye, no source.
    """

    toward_d: Array  # (3,) toward the sun, display axes
    sun: Array
    sky: Array
    ground: Array
    around: Array


def craft_light(light: Light) -> CraftLight:
    """The light on aircraft under the day's light."""
    ground = np.array([0.22, 0.23, 0.17]) * float(np.mean(light.sun)) * (0.3 + 0.7 * light.sun_d[2])
    return CraftLight(light.sun_d, 0.80 * light.sun, 0.40 * light.sky, ground, 0.5 * light.sky)


class Craft:
    """Parts that stand or fall together: an aircraft, or a cockpit seen from its seat."""

    def __init__(self, parts: Iterable[Part], light: CraftLight, *, opacity: float = 1.0, lit: bool = True) -> None:
        """opacity: of the whole, times each part's own; below 1 for a ghost. lit: False for its colours as they are."""
        self._parts, self._light = tuple(parts), light
        self._lit = tuple(lit and part.lit for part in self._parts)
        self._actors = tuple(
            part_actor(part, light if lights else None, opacity)
            for part, lights in zip(self._parts, self._lit, strict=True)
        )
        self._clear = tuple(opacity < 1.0 or blended(part) for part in self._parts)
        for actor, is_clear in zip(self._actors, self._clear, strict=True):
            actor.SetForceTranslucent(is_clear)
            actor.SetForceOpaque(not is_clear)
        self._matrices = [np.eye(4) for _ in self._parts]
        # asked for once: a formation has dozens of parts in each frame
        self._place = [actor.GetUserMatrix().DeepCopy for actor in self._actors]
        self._tell = [actor.GetShaderProperty().GetVertexCustomUniforms().SetUniform3f for actor in self._actors]

    def actors(self, *, clear: bool) -> list[vtkActor]:
        """The see-through actors, or the others: they are drawn in that order."""
        return [a for a, is_clear in zip(self._actors, self._clear, strict=True) if is_clear == clear]

    def place(self, body_to_display: Array, moved_rad: Mapping[str, float], eye_d_m: Array, *, own: bool) -> None:
        """Place all parts by the (4, 4) matrix of the body axes, each turned about its hinge, for an eye at (3,) m.

        moved_rad: angle by who moves it. own: seen from its own seat, only the parts for that are shown.
        """
        for i, (part, actor, lit) in enumerate(zip(self._parts, self._actors, self._lit, strict=True)):
            visible = part.own_view or not own
            actor.SetVisibility(visible)
            if not visible:
                continue
            matrix = body_to_display
            if part.moved_by is not None:
                matrix = matrix @ part_matrix(part, moved_rad.get(part.moved_by, 0.0))
            self._matrices[i] = matrix
            self._place[i](matrix.ravel())
            if lit:
                turn, tell = matrix[:3, :3], self._tell[i]
                tell("sunPart", (self._light.toward_d @ turn).tolist())
                tell("upPart", turn[2].tolist())
                tell("eyePart", ((eye_d_m - matrix[:3, 3]) @ turn).tolist())

    def hide(self) -> None:
        """Draw nothing of it."""
        for actor in self._actors:
            actor.SetVisibility(False)

    def points_d_m(self) -> Array:
        """All corners of the visible parts as placed, (N, 3) m, display axes."""
        found = [
            np.asarray(part.mesh.points, float) @ matrix[:3, :3].T + matrix[:3, 3]
            for part, actor, matrix in zip(self._parts, self._actors, self._matrices, strict=True)
            if actor.GetVisibility()
        ]
        return np.concatenate(found)


def part_actor(part: Part, light: CraftLight | None, opacity: float = 1.0) -> vtkActor:
    """A part as an actor with vertex colours and a user matrix of its own; light None: its colours as they are."""
    mapper = vtkPolyDataMapper()
    mapper.SetInputData(part.mesh)
    mapper.SetVBOShiftScaleMethod(0)
    mapper.SetScalarModeToUsePointFieldData()
    mapper.SelectColorArray("colour")
    mapper.SetColorModeToDirectScalars()
    actor = vtkActor()
    actor.SetMapper(mapper)
    actor.SetUserMatrix(vtkMatrix4x4())
    look = actor.GetProperty()
    look.SetLighting(False)  # VTK's own lighting costs three times as much, a pixel at a time
    look.SetOpacity(part.opacity * opacity)
    look.SetBackfaceCulling(not blended(part) and part.name not in OPEN_SHEETS)  # saves a fifth of the drawing
    if light is not None:
        mapper.MapDataArrayToVertexAttribute("normalPart", "Normals", vtkDataObject.FIELD_ASSOCIATION_POINTS, -1)
        shader = actor.GetShaderProperty()
        before = "//VTK::ValuePass::Dec\n" + glsl("craft")
        shader.AddVertexShaderReplacement("//VTK::ValuePass::Dec", True, before, False)
        inside = "//VTK::ValuePass::Impl\nvertexColorVSOutput.rgb = litPaint(scalarColor.rgb, vertexMC.xyz);\n"
        shader.AddVertexShaderReplacement("//VTK::ValuePass::Impl", True, inside, False)
        uniforms = shader.GetVertexCustomUniforms()
        for name in ("sun", "sky", "ground", "around"):
            uniforms.SetUniform3f(f"{name}Light", tuple(float(v) for v in getattr(light, name)))
        uniforms.SetUniformf("shine", part.specular)
    return actor


def blended(part: Part) -> bool:
    """Whether a part is see-through: its opacity, or an alpha among its colours."""
    colour = np.asarray(part.mesh.point_data["colour"])
    return part.opacity < 1.0 or (colour.shape[1] == 4 and bool(np.any(colour[:, 3] < 255)))
