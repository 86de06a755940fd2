"""The land under the formation, ready for a renderer: objects, trees, ground, sky, clouds.

Display axes: x east, y north, z up, metres, from the display centre at field elevation.
"""

from __future__ import annotations

import numpy as np
import vtk

from render.frames import Array
from render.picture.axes import to_display
from render.picture.ground_mesh import ground_mesh
from render.picture.light import Light, light_of
from render.picture.shading import constants, glsl, mesh, shaded_actor
from scenes.model import Day
from terrain.ground import Ground
from terrain.land import Airfield, land_of
from terrain.land import Land as LandPlan

SKY_RADIUS_M = 65_000.0
_FONT = {  # 3 x 5 cells, rows from the top
    "0": "###", "1": ".#.", "2": "###",
}


class Land:
    """All actors of a land under one eye; give each renderer its own (the eye is a property of the actors).

    ground: heights and recipe; day: sun and visibility; seed: the same seed the ground was read with.
    """

    def __init__(self, ground: Ground, day: Day, seed: int) -> None:
        self.light: Light = light_of(day)
        plan = land_of(ground.recipe, seed)
        self.actors: list[vtk.vtkActor] = []
        self._add_ground(ground, plan)
        self._add_sky()
        for actor in self.actors:
            _set_light(actor, self.light)

    def set_eye(self, pos_e_m: Array) -> None:
        """Tell the shaders where the picture is seen from: (3,) m, earth axes. Call before each render."""
        eye = to_display(np.asarray(pos_e_m, float))
        for actor in self.actors:
            actor.GetShaderProperty().GetFragmentCustomUniforms().SetUniform3f("eye", tuple(eye))
        self._sky.SetPosition(0.0, 0.0, 0.0)

    def _add_ground(self, ground: Ground, plan: LandPlan) -> None:
        points, triangles, normals = ground_mesh(ground)
        near = _touches_airfield(plan.airfield, points, triangles)
        for chosen, with_airfield in ((near, True), (~near, False)):
            head = constants(_ground_constants(plan)) + _field_colour(plan)
            code = head + glsl("common") + "in vec3 upward;\n" + glsl("plan") + head_functions(plan) + glsl("ground")
            if with_airfield:
                code += glsl("airfield")
            main = GROUND_MAIN.replace("AIRFIELD_PART", AIRFIELD_PART if with_airfield else "")
            used, renumbered = np.unique(triangles[chosen], return_inverse=True)
            actor = shaded_actor(
                mesh(points[used], renumbered.reshape(-1, 3)), code, main, {"normalUp": normals[used]},
                "in vec3 normalUp;\nout vec3 upward;\n", "upward = normalUp;\n",
            )
            self.actors.append(actor)

    def _add_sky(self) -> None:
        source = vtk.vtkSphereSource()
        source.SetRadius(SKY_RADIUS_M)
        source.SetThetaResolution(32)
        source.SetPhiResolution(24)
        source.Update()
        data = source.GetOutput()
        data.GetPointData().Initialize()
        code = constants({"CIRRUS": 0.55}) + glsl("common") + glsl("sky")
        self._sky = shaded_actor(data, code, "skyColour(fragOutput0);\n")
        self.actors.append(self._sky)


GROUND_MAIN = """
  vec2 p = place.xy; vec3 ray = place - eye;
  float px = footprint(p), rough;
  vec3 colour = country(p, px, rough);
  AIRFIELD_PART
  vec3 up = normalize(upward);
  colour *= sunLight * max(dot(up, sunDir), 0.0) + skyLight * (0.6 + 0.4 * up.z);
  fragOutput0 = vec4(haze(colour, ray), 1.0);
"""
AIRFIELD_PART = """vec4 field = airfield(p, px, noise(p / 7.0), noise(p / 1.3));
  colour = mix(colour, field.rgb, field.a);
"""


def head_functions(plan: LandPlan) -> str:
    """Nothing yet."""
    return ""


def _set_light(actor: vtk.vtkActor, light: Light) -> None:
    uniforms = actor.GetShaderProperty().GetFragmentCustomUniforms()
    for name, value in (
        ("eye", np.zeros(3)), ("sunDir", light.sun_d), ("sunLight", light.sun), ("skyLight", light.sky),
        ("rimColour", light.rim), ("rimGlow", light.glow), ("zenithColour", light.zenith), ("sunGlow", light.glow + 0.3),
    ):
        uniforms.SetUniform3f(name, tuple(value))
    uniforms.SetUniformf("extinction", light.extinction)


def _touches_airfield(field: Airfield, points: Array, triangles: Array) -> Array:
    along, across = field.along_across(points[:, 1], points[:, 0])
    a, b = along[triangles], across[triangles]
    half = 0.5 * field.length_m + 260.0
    result: Array = (
        (a.min(axis=1) < half) & (a.max(axis=1) > -half) & (b.min(axis=1) < 360.0) & (b.max(axis=1) > -180.0)
    )
    return result


def _field_colour(plan: LandPlan) -> str:
    """A function of a field's kind and tone, from the recipe's list."""
    lines = ["vec3 fieldColour(float kind, float tone) {", "  vec3 low = vec3(0.0), high = vec3(0.0);"]
    for kind in reversed(plan.fields):
        low, high = (", ".join(f"{x:.5f}" for x in c) for c in (kind.low, kind.high))
        lines.append(f"  if (kind < {kind.up_to:.5f}) {{ low = vec3({low}); high = vec3({high}); }}")
    return "\n".join([*lines, "  return mix(low, high, tone);", "}\n"])


def _ground_constants(plan: LandPlan) -> dict[str, object]:
    p, field = plan.plan, plan.airfield
    number = round(np.degrees(field.heading_rad) / 10.0) % 36 or 36
    other = (number + 17) % 36 + 1
    long = field.length_m >= 2400.0
    return {
        "SALT": p.salt, "GRAIN_C": float(np.cos(p.grain_rad)), "GRAIN_S": float(np.sin(p.grain_rad)),
        "BEND": float(p.bend_m), "BLOCK": (p.block_u_m, p.block_v_m), "ENCLOSED": float(p.enclosed),
        "HEDGE": float(p.hedge_m), "ROAD": float(p.road_m), "ROAD_ROWS": float(p.road_rows),
        "ROADS_ACROSS": int(p.road_every_m > 0), "ROAD_EVERY": float(p.road_every_m), "WOOD_PART": float(p.wood_part),
        "WILD_WOOD": float(p.wild_wood), "CROP_FROM": float(plan.crop_from), "BARE_OPEN": 1.0,
        "WILD_A": plan.wild[0], "WILD_B": plan.wild[1], "WILD_C": plan.wild[2], "WOOD": plan.wood,
        "HEDGE_COLOUR": plan.hedge, "ROAD_COLOUR": plan.road, "VERGE": plan.verge, "ROAD_LINE": plan.road_line,
        "HEDGE_SHOWN": plan.hedge_shown,
        "AIRFIELD_AT": (field.east_m, field.north_m), "AIRFIELD_C": float(np.cos(field.heading_rad)),
        "AIRFIELD_S": float(np.sin(field.heading_rad)), "RUNWAY_L": float(field.length_m),
        "RUNWAY_W": float(field.width_m), "MOWN_A": field.grass[0], "MOWN_B": field.grass[1],
        "SURFACE": field.surface, "APRON": field.apron, "BARS": float(6 if field.width_m >= 45 else 4),
        "AIM_AT": 400.0 if long else 300.0, "AIM_W": 9.0 if long else 6.0, "AIM_FAR": 1.0 if long else 0.0,
        "FIGURE_A": _figure(number // 10), "FIGURE_B": _figure(number % 10),
        "FIGURE_C": _figure(other // 10), "FIGURE_D": _figure(other % 10),
    }


def _figure(digit: int) -> int:
    """A digit as 15 bits: 3 x 5 cells, bit 0 top left."""
    rows = (
        "111101101101111", "010010010010010", "111001111100111", "111001111001111", "101101111001001",
        "111100111001111", "111100111101111", "111001001001001", "111101111101111", "111101111001111",
    )[digit]
    return sum(1 << k for k, bit in enumerate(rows) if bit == "1")
