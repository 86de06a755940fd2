"""A layer of broken cloud at its base, seen from below and from above."""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor

from render.picture.shading import glsl, mesh, shaded_actor

_RADII_M = np.concatenate([[0.0], np.geomspace(150.0, 45_000.0, 26)])
_SIDES = 48


def cloud_actor(base_m: float) -> vtkActor:
    """A level disc at ``base_m`` above the field, to be moved under or over the eye; see-through, drawn last."""
    turn = np.linspace(0.0, 2.0 * np.pi, _SIDES, endpoint=False)
    ring = np.stack([np.cos(turn), np.sin(turn)], axis=-1)
    places = (_RADII_M[:, None, None] * ring).reshape(-1, 2)
    points = np.column_stack([places, np.full(len(places), base_m)])
    i, j = (grid.ravel() for grid in np.meshgrid(np.arange(len(_RADII_M) - 1), np.arange(_SIDES), indexing="ij"))
    k = (j + 1) % _SIDES
    a, b, c, d = i * _SIDES + j, i * _SIDES + k, (i + 1) * _SIDES + k, (i + 1) * _SIDES + j
    triangles = np.concatenate([np.column_stack([a, c, b]), np.column_stack([a, d, c])])
    # The disc moves with the eye, its cloud does not: the shader works with where it is on the land.
    position = "place = vertexMC.xyz + vec3(eye.xy, 0.0);\nsetRim(place);\n"
    actor = shaded_actor(
        mesh(points, triangles),
        glsl("common") + glsl("cloud"),
        "fragOutput0 = cloudColour();\n",
        None,
        glsl("rim"),
        position,
    )
    actor.ForceTranslucentOn()
    return actor
