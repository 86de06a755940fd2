"""Raw OpenGL as the limit: the stage's own meshes and final shader sources, drawn by moderngl without VTK.

``take_scene`` writes down meshes, attributes, uniforms, poses and the GLSL that VTK ended up with; ``raw_draw`` draws
them as a frame source, so that the same workers and the same encoder film it. No antialiasing, no overlay; poses and
the order of trees are read ready-made; what changes its mesh from frame to frame (shadows of aircraft, smoke) is left
out.
"""

from __future__ import annotations

import pickle
from pathlib import Path
from typing import Any

import numpy as np
import vtk
from vtkmodules.util.numpy_support import vtk_to_numpy

from render.output.stage_source import StageSource
from render.picture.instant import instant_at
from render.types import Study

MOVING = ("eye", "sunPart", "upPart", "eyePart")


def take_scene(source: StageSource, study: Study, times_s: list[float], path: Path) -> None:
    """Write what a stage draws of some instants, in drawing order."""
    stage = source.stage
    codes: dict[int, tuple[str, str]] = {}
    actors = list(stage.renderer.GetActors())
    watched = []
    for i, actor in enumerate(actors):

        def note(_: Any, __: str, program: Any, i: int = i) -> None:
            codes[i] = (program.GetVertexShader().GetSource(), program.GetFragmentShader().GetSource())

        note.CallDataType = vtk.VTK_OBJECT  # type: ignore[attr-defined]
        watched.append((actor.GetMapper(), actor.GetMapper().AddObserver("UpdateShaderEvent", note)))
    for time_s in times_s[:: max(1, len(times_s) // 12)]:
        source.frame(time_s)
    for mapper, number in watched:
        mapper.RemoveObserver(number)
    changing = {id(actor) for actor in stage._shadows.actors}
    changing |= set() if stage._trails is None else {id(actor) for actor in stage._trails.actors}
    kept = [i for i in codes if id(actors[i]) not in changing]
    kept.sort(key=lambda i: (bool(actors[i].GetForceTranslucent()), i))  # VTK draws what is see-through after the rest
    poses = {}
    for time_s in times_s:
        instant = instant_at(study.faulted, time_s)
        camera = source.camera(instant)
        stage._place(instant, camera, None)
        stage._aim(camera)
        view = stage.renderer.GetActiveCamera().GetCompositeProjectionTransformMatrix(
            camera.width_px / camera.height_px, -1.0, 1.0
        )
        poses[time_s] = (_matrix(view), [_pose(actors[i], actors[i] in stage._land.tree_actors) for i in kept])
    things = [_thing(stage, actors[i], codes[i]) for i in kept]
    path.write_bytes(pickle.dumps({"things": things, "poses": poses, "background": stage.renderer.GetBackground()}))


def _matrix(matrix: Any) -> np.ndarray[Any, Any]:
    return np.array([[matrix.GetElement(i, j) for j in range(4)] for i in range(4)])


def _pose(actor: Any, tree: bool) -> tuple[bool, Any, dict[str, Any], Any]:
    """Whether it is shown, its matrix, the uniforms that change, and of trees the numbers of those drawn, in order."""
    values = {k: v for k, v in _uniforms(actor).items() if k in MOVING}
    order = None
    if tree:
        corners = vtk_to_numpy(actor.GetMapper().GetInput().GetPolys().GetConnectivityArray())
        order = np.array(corners[::6] // 4, np.int32)
    return bool(actor.GetVisibility()), _matrix(actor.GetMatrix()), values, order


def _uniforms(actor: Any) -> dict[str, Any]:
    values: dict[str, Any] = {}
    for side in ("Vertex", "Fragment"):
        held = getattr(actor.GetShaderProperty(), f"Get{side}CustomUniforms")()
        for i in range(held.GetNumberOfUniforms()):
            name = held.GetNthUniformName(i)
            if held.GetUniformNumberOfComponents(name) == 3:
                three = [0.0, 0.0, 0.0]
                held.GetUniform3f(name, three)
                values[name] = tuple(three)
            else:
                one = vtk.reference(0.0)
                held.GetUniformf(name, one)
                values[name] = float(one)
    return values


def _thing(stage: Any, actor: Any, code: tuple[str, str]) -> dict[str, Any]:
    data = actor.GetMapper().GetInput()
    inputs = {"vertexMC": np.array(vtk_to_numpy(data.GetPoints().GetData()), np.float32)}
    held = data.GetPointData()
    for i in range(held.GetNumberOfArrays()):
        name = {"colour": "scalarColor", "Normals": "normalPart"}.get(held.GetArrayName(i), held.GetArrayName(i))
        values = np.array(vtk_to_numpy(held.GetArray(i)), np.uint8 if name == "scalarColor" else np.float32)
        inputs[name] = values.reshape(len(values), -1)
    look = actor.GetProperty()
    material = {"ambientIntensity": look.GetAmbient(), "diffuseIntensity": look.GetDiffuse(),
                "opacityUniform": look.GetOpacity()}  # fmt: skip
    polys = data.GetPolys()
    assert polys.GetNumberOfConnectivityIds() == 3 * polys.GetNumberOfCells(), "triangles only"
    return {
        "code": code, "inputs": inputs, "uniforms": {**_uniforms(actor), **material},
        "corners": np.array(vtk_to_numpy(polys.GetConnectivityArray()), np.int32),
        "cull": bool(look.GetBackfaceCulling()), "clear": bool(actor.GetForceTranslucent()),
        "box": np.array(data.GetBounds()).reshape(3, 2).T,
        "tree": actor in stage._land.tree_actors,
    }  # fmt: skip
