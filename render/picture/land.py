"""The land under the formation, ready for a renderer: objects, trees, ground, sky, clouds.

Display axes: x east, y north, z up, metres, from the display centre at field elevation.
"""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.axes import to_display
from render.picture.clouds import cloud_actor
from render.picture.ground_look import GroundLook
from render.picture.light import Light, light_of
from render.picture.objects import object_actors
from render.picture.shadows import shadow_actors
from render.picture.sky import sky_actors
from render.picture.trees import TreeField
from render.picture.woods import Woods
from scenes.model import Day
from terrain.cover import cover_of
from terrain.ground import Ground
from terrain.land import land_of


class Land:
    """All actors of a land under one eye; give each renderer its own (the eye is a property of the actors).

    ground: heights and recipe; day: sun and visibility; seed: the same seed the ground was read with.
    """

    def __init__(self, ground: Ground, day: Day, seed: int) -> None:
        self.light: Light = light_of(day)
        plan = land_of(ground.recipe, seed)
        self.sky_actors = sky_actors(self.light)
        cover = cover_of(ground, seed)
        self._trees = TreeField(cover.trees, ground, plan)
        self.tree_actors = self._trees.actors
        self.shadow_actors = shadow_actors(cover, ground, self.light)
        self._ground = GroundLook(ground, plan, self.light)
        self.ground_actors = self._ground.actors
        self._woods = Woods(cover.canopy, ground, plan)
        self.object_actors = [*object_actors(cover, ground, plan, self.light), *self._woods.actors]
        solid = [*self.object_actors, *self.ground_actors]
        self._eyed = [*solid, *self.shadow_actors, *self.tree_actors]
        #: In drawing order: what is opaque nearest first, then shadows and trees, which are see-through at their edges.
        self.actors: list[vtkActor] = [*solid, *self.sky_actors, *self.shadow_actors, *self.tree_actors]
        base_m = getattr(day, "cloud_base_m", None)
        self.cloud_actor = None if base_m is None else cloud_actor(base_m)
        if self.cloud_actor is not None:
            self.actors.append(self.cloud_actor)
            self._eyed.append(self.cloud_actor)
        for actor in self.actors:
            set_light(actor, self.light)
        shaders = [actor.GetShaderProperty() for actor in self._eyed]
        self._tell = [uniforms.SetUniform3f for shader in shaders
                      for uniforms in (shader.GetVertexCustomUniforms(), shader.GetFragmentCustomUniforms())]

    @property
    def trees_drawn(self) -> int:
        """How many trees the last eye may see."""
        return self._trees.drawn

    def set_eye(self, pos_e_m: Array, axis_e: Array | None = None, half_field_rad: float = np.pi) -> None:
        """Tell the land where the picture is seen from: (3,) m, earth axes. Call before each render.

        axis_e, half_field_rad: the axis of view and the angle from it to the corners of the picture,
        if known: trees outside are then left out, which is only faster.
        """
        eye = tuple(to_display(np.asarray(pos_e_m, float)))
        axis_d = None if axis_e is None else to_display(np.asarray(axis_e, float))
        self._ground.set_eye(np.array(eye))
        self._woods.set_eye(np.array(eye))
        self._trees.set_eye(np.array(eye), axis_d, half_field_rad)
        for tell in self._tell:
            tell("eye", eye)
        for actor in self.sky_actors:
            actor.SetPosition(*eye)
        if self.cloud_actor is not None:
            self.cloud_actor.SetPosition(eye[0], eye[1], 0.0)


def set_light(actor: vtkActor, light: Light) -> None:
    """Hand an actor's shaders the day's light, and an eye to begin with."""
    uniforms = actor.GetShaderProperty().GetFragmentCustomUniforms()
    values = {
        "eye": np.zeros(3),
        "sunDir": light.sun_d,
        "sunLight": light.sun,
        "skyLight": light.sky,
        "flatLight": light.flat,
        "zenithColour": light.zenith,
    }
    for name, value in values.items():
        uniforms.SetUniform3f(name, tuple(value))
    uniforms.SetUniformf("extinction", light.extinction_per_m)
    uniforms = actor.GetShaderProperty().GetVertexCustomUniforms()
    uniforms.SetUniformf("extinction", light.extinction_per_m)
    for name, value in {**values, "rimColour": light.rim, "rimGlow": light.glow}.items():
        uniforms.SetUniform3f(name, tuple(value))
