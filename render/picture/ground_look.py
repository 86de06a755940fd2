"""The ground's actors: one for each kind of ground, each with the shader of that kind only."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from vtkmodules.vtkCommonDataModel import vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.ground_mesh import ground_mesh
from render.picture.light import Light
from render.picture.shading import cells, constants, glsl, mesh, shaded_actor
from terrain.ground import Ground
from terrain.land import Airfield, Land

HILLY_M = 30.0  # ground with less relief hides nothing of itself that would cost
SORT_AGAIN_M = 250.0
_START = """
  vec3 ray = place - eye;
  float longest, px = footprint(place.xy, longest);
"""
_NOISES = """
  // lattices turned against one another, so that none shows
  vec2 q7 = vec2(0.1143 * q.x + 0.0857 * q.y, 0.1143 * q.y - 0.0857 * q.x);
  vec2 q1 = vec2(0.455 * q.x - 0.621 * q.y, 0.455 * q.y + 0.621 * q.x);
  float n7 = (noise(q7 + 11.3) - 0.5) * shown(7.0, px);
  float n1 = (0.62 * noise(q1) - 0.31) * shown(1.3, px);
  n1 += (0.55 * noise(q7 * 21.0 + q1 + 9.7) - 0.275) * shown(0.40, px);
"""
_LIGHT = """
  colour *= GROUND_LIGHT;
  fragOutput0 = vec4(haze(colour, length(ray)), 1.0);
"""
_RELIEF_LIGHT = "(sunLight * slopeLight + skyLight)"
_COUNTRY = (
    """
  vec2 q = grain(place.xy);
"""
    + _NOISES
    + """
  float n45 = (noise(q * (1.0 / 45.0)) - 0.5) * shown(45.0, px);
  vec3 colour = country(q, px, longest, n1, n7, n45);
"""
)
_SHORE = """
  float out_m = seaward(place.xy);
  float n7w = n7 + 0.6 * n45;
  float wet = fwidth(out_m);
  float beach = clamp((out_m + 34.0 + 16.0 * n7w) / max(wet, 3.0), 0.0, 1.0);
  vec3 sand = SAND * (1.0 + 0.25 * n7 + 0.35 * n1) * (1.0 - 0.28 * clamp((out_m + 9.0) * 0.2, 0.0, 1.0));
  colour = mix(colour, sand, beach) * GROUND_LIGHT;
  float sea = clamp(out_m / max(wet, 0.5) + 0.5, 0.0, 1.0);
  colour = mix(colour, seaColour(place.xy, ray, max(out_m, 0.0), px), sea);
  colour = mix(colour, vec3(0.90) * flatLight, 0.8 * foamAt(out_m, place.xy, px, n7w));
  fragOutput0 = vec4(haze(colour, length(ray)), 1.0);
"""
_SEA = """
  vec3 colour = seaColour(place.xy, ray, 1000.0, px);
  fragOutput0 = vec4(haze(colour, length(ray)), 1.0);
"""
_AIRFIELD = (
    """
  vec2 r = place.xy - AIRFIELD_AT;
  vec2 q = vec2(r.x * AIRFIELD_S + r.y * AIRFIELD_C, r.y * AIRFIELD_S - r.x * AIRFIELD_C);
"""
    + _NOISES
)
_MAINS = {
    "country": _START + _COUNTRY + _LIGHT,
    "shore": _START + _COUNTRY + _SHORE,
    "sea": _START + _SEA,
    "mown": _START + _AIRFIELD + "vec3 colour = mown(q, px, n1, n7);" + _LIGHT,
    "runway": _START + _AIRFIELD + "vec3 colour = runway(q, px, n1, n7);" + _LIGHT,
}
_PIECES = {
    "country": ("plan", "ground"),
    "mown": ("airfield",),
    "runway": ("airfield",),
    "shore": ("plan", "ground", "water"),
    "sea": ("plan", "water"),
}


class GroundLook:
    """The surface of a ground with a land's look, to be given its light (see ``land.set_light``) and an eye.

    Hills hide one another: their triangles are drawn nearest first, so that hidden pixels are not shaded. The
    picture does not depend on that order.
    """

    def __init__(self, ground: Ground, land: Land, light: Light) -> None:
        shape = ground_mesh(ground, land)
        self._hilly = float(np.ptp(ground.heights_m)) > HILLY_M
        self._sorted_at: Array | None = None
        self._parts: list[tuple[vtkPolyData, NDArray[np.int64], Array]] = []
        self.actors: list[vtkActor] = []
        head = constants(_constants(land))
        head += f"#define GROUND_LIGHT {'flatLight' if shape.level else _RELIEF_LIGHT}\n"
        head += glsl("common") + ("" if shape.level else "in float slopeLight;\n") + _field_colour(land)
        vertex = glsl("rim") + ("" if shape.level else "in float sunOnSlope;\nout float slopeLight;\n")
        position = "setRim(place);\n" + ("" if shape.level else "slopeLight = sunOnSlope;\n")
        slope = np.maximum(shape.normals @ light.sun_d, 0.0)[:, None]
        for kind, every in shape.triangles.items():
            used, renumbered = np.unique(every, return_inverse=True)
            points, triangles = shape.points[used], renumbered.reshape(-1, 3)
            data = mesh(points, triangles)
            code = head + "".join(glsl(piece) for piece in _PIECES[kind])
            attributes = {} if shape.level else {"sunOnSlope": slope[used]}
            self.actors.append(shaded_actor(data, code, _MAINS[kind], attributes, vertex, position))
            self._parts.append((data, triangles, points[triangles].mean(axis=1)))

    def set_eye(self, eye_d: Array) -> None:
        """Put the triangles of hilly ground in order anew once the eye has moved on."""
        if not self._hilly:
            return
        if self._sorted_at is not None and np.linalg.norm(eye_d - self._sorted_at) < SORT_AGAIN_M:
            return
        self._sorted_at = np.array(eye_d)
        for data, triangles, middles in self._parts:
            data.SetPolys(cells(triangles[np.argsort(np.sum((middles - eye_d) ** 2, axis=1), kind="stable")]))


def _field_colour(land: Land) -> str:
    """A function from a field's kind to its colour, from the recipe's list."""
    text = ""
    for kind in land.fields:
        colour = ", ".join(f"{x:.5f}" for x in kind.colour)
        text += f"kind < {kind.up_to:.5f} ? vec3({colour}) : " if kind is not land.fields[-1] else f"vec3({colour})"
    return f"vec3 fieldColour(float kind) {{ return {text}; }}\n"


def _constants(land: Land) -> dict[str, object]:
    p = land.plan
    weights = np.diff([0.0, *(kind.up_to for kind in land.fields)])
    fields = np.sum([w * np.array(k.colour) for w, k in zip(weights, land.fields, strict=True)], axis=0)
    mean = p.enclosed * fields + (1.0 - p.enclosed) * np.mean(land.wild, axis=0)
    values: dict[str, object] = {
        "COUNTRY_MEAN": mean,
        "FIELD": float(p.block_m / np.sqrt(8.0)),
        "SALT": p.salt,
        "GRAIN_C": float(np.cos(p.grain_rad)),
        "GRAIN_S": float(np.sin(p.grain_rad)),
        "BEND": float(p.bend_m),
        "BLOCK": float(p.block_m),
        "ENCLOSED": float(p.enclosed),
        "HEDGE": float(p.hedge_m),
        "ROAD": float(p.road_m),
        "ROAD_ROWS": float(p.road_rows),
        "ROADS_ACROSS": int(p.road_every_m > 0),
        "ROAD_EVERY": float(p.road_every_m),
        "WOOD_PART": float(p.wood_part),
        "WILD_WOOD": float(p.wild_wood),
        "CROP_FROM": float(land.crop_from),
        "WILD_LEVEL": float(land.wild_level),
        "WILD_A": land.wild[0],
        "WILD_B": land.wild[1],
        "WILD_C": land.wild[2],
        "WOOD": land.wood,
        "HEDGE_COLOUR": land.hedge,
        "ROAD_COLOUR": land.road,
        "VERGE": land.verge,
        "ROAD_LINE": int(land.road_line),
    }
    if p.shore is not None:
        values |= {
            "SHORE_C": float(np.cos(p.shore.bearing_rad)),
            "SHORE_S": float(np.sin(p.shore.bearing_rad)),
            "SHORE_OUT": float(p.shore.distance_m),
            "SAND": land.sand,
            "DEEP": land.deep,
            "SHALLOW": land.shallow,
        }
    if land.airfield is not None:
        values |= _airfield_constants(land.airfield)
    return values


def _airfield_constants(field: Airfield) -> dict[str, object]:
    number = round(np.degrees(field.heading_rad) / 10.0) % 36 or 36
    other = (number + 17) % 36 + 1
    long = field.length_m >= 2400.0
    return {
        "AIRFIELD_AT": (field.east_m, field.north_m),
        "AIRFIELD_C": float(np.cos(field.heading_rad)),
        "AIRFIELD_S": float(np.sin(field.heading_rad)),
        "BOUNDS": (field.half_along_m, 0.5 * (field.across_m[1] - field.across_m[0])),
        "BOUNDS_MID": float(0.5 * sum(field.across_m)),
        "RUNWAY_L": float(field.length_m),
        "RUNWAY_W": float(field.width_m),
        "MOWN_A": field.grass[0],
        "MOWN_B": field.grass[1],
        "SURFACE": field.surface,
        "APRON": field.apron,
        "BARS": float(6 if field.width_m >= 45 else 4),
        "AIM_AT": 400.0 if long else 300.0,
        "AIM_W": 9.0 if long else 6.0,
        "AIM_FAR": 1.0 if long else 0.0,
        "FIGURE_A": _figure(number // 10),
        "FIGURE_B": _figure(number % 10),
        "FIGURE_C": _figure(other // 10),
        "FIGURE_D": _figure(other % 10),
    }


def _figure(digit: int) -> int:
    """A digit as 15 bits: 3 x 5 cells, bit 0 top left."""
    rows = (
        "111101101101111",
        "010010010010010",
        "111001111100111",
        "111001111001111",
        "101101111001001",
        "111100111001111",
        "111100111101111",
        "111001001001001",
        "111101111101111",
        "111101111001111",
    )[digit]
    return sum(1 << k for k, bit in enumerate(rows) if bit == "1")
