"""The sky as a dome round the eye; its clear colours stand at the dome's corners, thin cloud is added by the shader."""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkActor

from render.frames import Array
from render.picture.light import Light
from render.picture.shading import constants, glsl, mesh, shaded_actor
from terrain.pattern import value_noise

RADIUS_M = 65_000.0
_RINGS_DEG = np.array(
    [-89.0, -30.0, -8.0, -1.0, 0.0, 0.7, 1.5, 2.5, 4.0, 6.0, 9.0, 13.0, 18.0, 25.0, 34.0, 45.0, 58.0, 72.0, 85.0, 90.0]
)
_SIDES = 72
NO_VEIL_UP = 0.157  # sine of the height below which the veil is nowhere thick enough to show


def rim_colour(look_d: Array, light: Light) -> Array:
    """The sky at the horizon under looks (N, 3); the same as shaders/rim.glsl."""
    flat = look_d[:, :2] / (np.linalg.norm(look_d[:, :2], axis=1)[:, None] + 1e-9)
    sun = light.sun_d[:2] / (np.linalg.norm(light.sun_d[:2]) + 1e-9)
    toward = np.maximum(flat @ sun, 0.0)[:, None] ** 4
    result: Array = light.rim + light.glow * toward
    return result


def clear_sky(look_d: Array, light: Light) -> Array:
    """Colour (N, 3) of the clear sky in directions (N, 3). By eye, no source."""
    up = np.maximum(look_d[:, 2:], 0.0)
    rise = 1.0 - np.exp2(-4.2 * up / (0.35 + 0.65 * light.clear))
    colour = rim_colour(look_d, light) * (1.0 - rise) + light.zenith * rise
    colour = colour * (1.0 - 0.22 * up)
    toward = np.maximum(look_d @ light.sun_d, 0.0)[:, None]
    halo = (light.glow + np.array([0.22, 0.20, 0.16])) * (0.30 * toward**10 + 0.8 * toward**60)
    result: Array = np.clip(colour + halo, 0.0, 1.0)
    return result


def sky_actors(light: Light) -> list[vtkActor]:
    """The dome in two parts, without and with cloud; move both to the eye before each render."""
    height = np.radians(_RINGS_DEG)[:, None]
    turn = np.linspace(0.0, 2.0 * np.pi, _SIDES, endpoint=False)[None, :]
    look = np.stack(
        np.broadcast_arrays(np.cos(height) * np.cos(turn), np.cos(height) * np.sin(turn), np.sin(height)), -1
    )
    rings = len(_RINGS_DEG)
    i, j = (grid.ravel() for grid in np.meshgrid(np.arange(rings - 1), np.arange(_SIDES), indexing="ij"))
    k = (j + 1) % _SIDES
    a, b, c, d = i * _SIDES + j, i * _SIDES + k, (i + 1) * _SIDES + k, (i + 1) * _SIDES + j
    triangles = np.concatenate([np.column_stack([a, b, c]), np.column_stack([a, c, d])])
    look = look.reshape(-1, 3)
    lifted = np.maximum(look[:, 2] + 0.13, 0.02)
    q = look[:, :2] / lifted[:, None]
    thick = 0.75 * value_noise(0.6 * q[:, 0] + 3.7, 1.7 * q[:, 1] + 3.7, 41.0 / 512.0) - 0.58
    thick -= 1.2 * np.clip(1.0 - 4.0 * (look[:, 2] - 0.03), 0.0, 1.0)  # none near the horizon
    veil = np.column_stack([look[:, :2], lifted, thick])
    inputs = {"clearIn": clear_sky(look, light), "veilIn": veil, "sunIn": look - light.sun_d}
    outs = {"clearIn": "clearSky", "veilIn": "veilAt", "sunIn": "fromSun"}
    kinds = {name: f"vec{values.shape[1]}" for name, values in inputs.items()}
    head = "".join(f"in {kinds[name]} {name};\nout {kinds[name]} {outs[name]};\n" for name in inputs)
    copies = "".join(f"{outs[name]} = {name};\n" for name in inputs)
    white = np.clip(0.30 * light.rim + 0.70 * (0.75 * light.sun + 0.6 * light.sky), 0.0, 1.0)
    code = constants({"VEIL": 0.6, "VEIL_COLOUR": white})
    code += glsl("common").replace(
        "in vec3 rimAt;\nin float fade;\n", "const vec3 rimAt = vec3(0.0);\nconst float fade = 1.0;\n"
    )
    code += glsl("sky")
    low = (look[triangles, 2] < NO_VEIL_UP).all(axis=1)
    points, parts = RADIUS_M * look, ((low, "clearSky + sunDisc()"), (~low, "skyColour()"))
    return [
        shaded_actor(mesh(points, triangles[chosen]), code, f"fragOutput0 = vec4({rgb}, 1.0);\n", inputs, head, copies)
        for chosen, rgb in parts
    ]
