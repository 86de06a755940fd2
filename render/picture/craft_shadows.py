"""The shadows of a formation as actors of the stage, laid anew for each instant."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper

from render.frames import Array
from render.picture.axes import DISPLAY_FROM_EARTH
from render.picture.camera import Camera
from render.picture.instant import Instant
from render.picture.shadow import Shadow, cast_samples
from render.picture.shapes_parts import Shape
from render.sight.geometry import HeightAt

#: Along the sun's ray, m; beyond it the half-shadow (9.3 m wide there) has eaten the shadow of a small aircraft.
REACH_M = 1_000.0
SPACING_M = 0.16  # of the points that throw it: just finer than the cells of the net it is drawn on
WIDE_M = 60.0  # no shadow reaches farther from where the middle of its aircraft casts it


class Shadows:
    """One shadow for each aircraft; drawn after the ground, before anything else that is see-through."""

    def __init__(self, shapes: Sequence[Shape], sun_d: Array, height_at: HeightAt) -> None:
        """shapes: (K,); sun_d: toward the sun, display axes; height_at: the ground's height, m."""
        self._sun_e = np.asarray(sun_d, float) @ DISPLAY_FROM_EARTH
        self._height_at = height_at
        self._shapes = tuple(shapes)
        self._shadows: list[Shadow | None] = [None] * len(shapes)  # made when first needed: many films never do
        self._samples: dict[int, Array] = {}
        self._mappers = [unlit_mapper() for _ in shapes]
        self.actors = [unlit_actor(mapper) for mapper in self._mappers]

    def lay(self, instant: Instant, camera: Camera) -> None:
        """Lay the shadows of an instant that a camera may have in its picture."""
        for k, actor in enumerate(self.actors):
            actor.SetVisibility(k < len(instant.alive) and self._laid(instant, k, camera))

    def _laid(self, instant: Instant, k: int, camera: Camera) -> bool:
        pos = instant.pos_e_m[k]
        rise = -float(self._sun_e[2])
        height = -float(pos[2]) - float(self._height_at(pos[0], pos[1]))
        if rise < 0.05 or height / rise > REACH_M:
            return False
        middle_c = camera.to_camera(pos - height / rise * self._sun_e)
        away = float(np.linalg.norm(middle_c))
        corner = float(np.arctan(np.hypot(camera.width_px, camera.height_px) / 2.0 / camera.focal_px))
        if away > WIDE_M and np.arccos(middle_c[2] / away) > corner + np.arcsin(WIDE_M / away):
            return False  # laying one costs 2 ms; most of the time none is in the picture
        # a depth buffer of 24 bits tells depths apart to d^2 / (near 2^24): 0.4 m at 1 km
        lift_m = 0.05 + (away / 1000.0) ** 2
        return self._shadow(k).update(pos, instant.quat_eb[k], self._sun_e, self._height_at, lift_m)

    def _shadow(self, k: int) -> Shadow:
        shadow = self._shadows[k]
        if shadow is None:
            shape = self._shapes[k]
            if id(shape) not in self._samples:
                self._samples[id(shape)] = cast_samples(shape.parts, SPACING_M)
            shadow = self._shadows[k] = Shadow(self._samples[id(shape)])
            self._mappers[k].SetInputData(shadow.mesh)
        return shadow


def unlit_mapper() -> vtkPolyDataMapper:
    """A mapper of point colours as they are."""
    mapper = vtkPolyDataMapper()
    mapper.SetVBOShiftScaleMethod(0)
    mapper.SetScalarModeToUsePointFieldData()
    mapper.SelectColorArray("colour")
    mapper.SetColorModeToDirectScalars()
    return mapper


def unlit_actor(mapper: vtkPolyDataMapper) -> vtkActor:
    """A see-through actor without light."""
    actor = vtkActor()
    actor.SetMapper(mapper)
    actor.GetProperty().SetLighting(False)
    actor.ForceTranslucentOn()
    return actor
