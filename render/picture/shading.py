"""Actors whose look is our own GLSL: reading the pieces, handing them constants, uniforms and attributes."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkDataObject, vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper

from render.frames import Array

SHADERS = Path(__file__).parent / "shaders"


@cache
def glsl(name: str) -> str:
    """The text of ``shaders/<name>.glsl``."""
    return (SHADERS / f"{name}.glsl").read_text(encoding="utf-8")


def constants(values: Mapping[str, object]) -> str:
    """``#define`` lines: ints as ints, floats, pairs as vec2, triples as vec3."""
    lines = []
    for key, value in values.items():
        if isinstance(value, int):
            text = str(value)
        elif isinstance(value, float):
            text = f"{value:.9g}" if any(c in f"{value:.9g}" for c in ".e") else f"{value:.9g}."
        else:
            numbers = [float(x) for x in value]  # type: ignore[attr-defined]
            text = f"vec{len(numbers)}({', '.join(f'{x:.9g}' for x in numbers)})"
        lines.append(f"#define {key} {text}")
    return "\n".join(lines) + "\n"


def mesh(points: Array, triangles: NDArray[np.int64]) -> vtkPolyData:
    """Polygons from points (P, 3) and corner numbers (T, 3)."""
    data = vtkPolyData()
    places = vtkPoints()
    places.SetData(numpy_to_vtk(np.ascontiguousarray(points, np.float32), deep=True))
    data.SetPoints(places)
    data.SetPolys(cells(triangles))
    return data


def cells(triangles: NDArray[np.int64]) -> vtkCellArray:
    """Triangles (T, 3) as VTK's own."""
    array = vtkCellArray()
    offsets = np.arange(0, 3 * len(triangles) + 1, 3, dtype=np.int64)
    array.SetData(
        numpy_to_vtkIdTypeArray(offsets, deep=True),
        numpy_to_vtkIdTypeArray(np.ascontiguousarray(triangles, np.int64).ravel(), deep=True),
    )
    return array


def shaded_actor(
    data: vtkPolyData,
    fragment: str,
    main: str,
    attributes: Mapping[str, Array] | None = None,
    vertex: str = "",
    position: str = "",
) -> vtkActor:
    """An unlit actor: ``fragment`` are declarations and functions, ``main`` writes ``fragOutput0``.

    attributes: name to (P, C) values at the points, handed to the vertex shader under that name.
    vertex: declarations of the vertex shader; position: statements of its ``main`` that may set
    ``gl_Position``; without it the fragment gets ``place``, where it is.
    A shader that does not compile makes the actor vanish without an error: test by pixels.
    """
    mapper = vtkPolyDataMapper()
    mapper.SetInputData(data)
    mapper.ScalarVisibilityOff()
    mapper.SetVBOShiftScaleMethod(0)
    for name, values in (attributes or {}).items():
        array = numpy_to_vtk(np.ascontiguousarray(values, np.float32), deep=True)
        array.SetName(name)
        data.GetPointData().AddArray(array)
        mapper.MapDataArrayToVertexAttribute(name, name, vtkDataObject.FIELD_ASSOCIATION_POINTS, -1)
    actor = vtkActor()
    actor.SetMapper(mapper)
    actor.GetProperty().SetLighting(False)
    shader = actor.GetShaderProperty()
    before = "//VTK::ValuePass::Dec\nout vec3 place;\n" + vertex
    shader.AddVertexShaderReplacement("//VTK::ValuePass::Dec", True, before, False)
    inside = "//VTK::ValuePass::Impl\nplace = vertexMC.xyz;\n" + position
    shader.AddVertexShaderReplacement("//VTK::ValuePass::Impl", True, inside, False)
    shader.AddFragmentShaderReplacement("//VTK::ValuePass::Dec", True, "//VTK::ValuePass::Dec\n" + fragment, False)
    shader.AddFragmentShaderReplacement("//VTK::Light::Impl", True, main, False)
    return actor
