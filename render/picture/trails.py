"""The smoke trails of a formation as actors of the stage, laid anew for each instant."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.camera import Camera
from render.picture.craft_shadows import unlit_actor, unlit_mapper
from render.picture.shapes_parts import Shape
from render.picture.smoke import Smoke
from render.types import Flight
from scenes.model import Wind


class Trails:
    """One trail for each aircraft of a flight; see-through, drawn after shadows and trees."""

    def __init__(self, flight: Flight, shapes: Sequence[Shape], wind: Wind | None) -> None:
        """shapes: (K,), where the smoke leaves each; wind: carries it."""
        self._flight = flight
        self._wind_e_mps = air_velocity(wind)
        self._trails = [Smoke(shape.smoke_b_m) for shape in shapes]
        self.actors: list[vtkActor] = []
        for trail in self._trails:
            mapper = unlit_mapper()
            mapper.SetInputData(trail.mesh)
            self.actors.append(unlit_actor(mapper))

    def lay(self, time_s: float, camera: Camera) -> None:
        """Lay the trails of an instant as a camera sees them; after contact they stay as they were then."""
        flight = self._flight
        for k, (trail, actor) in enumerate(zip(self._trails, self.actors, strict=True)):
            met = flight.contact_s[k]
            now = time_s if met is None else min(time_s, met)
            actor.SetVisibility(
                trail.update(
                    now, flight.time_s, flight.pos_e_m[:, k], flight.quat_eb[:, k], camera.pos_e_m, self._wind_e_mps
                )
            )


def air_velocity(wind: Wind | None) -> Array:
    """Velocity of the air over the ground, (3,) m/s in earth axes, of a wind that comes from a direction."""
    if wind is None:
        return np.zeros(3)
    return -wind.speed_mps * np.array([np.cos(wind.from_rad), np.sin(wind.from_rad), 0.0])
