"""What a pilot has of his own cockpit from the seat: rails, bows, coaming, panel, stick side, glass.

Own nose, wings and tip come with the shape's parts that are drawn in the own view. Body axes, metres.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pyvista as pv

from render.frames import Array
from render.picture.loft import Colour, Surf, grid_tris, merge, surface
from render.picture.shapes_cockpit import BLACK, INSIDE, Canopy, CockpitDesign
from render.picture.shapes_crew import head
from render.picture.shapes_jet import jet_cockpit
from render.picture.shapes_panel import body_of_pilot, panel, stick_and_throttle, trim
from render.picture.shapes_parts import Part, fixed
from render.picture.shapes_piston import piston_cockpit
from render.picture.shapes_turboprop import turboprop_cockpit
from scenes.airframe import Airframe

LEDGE: Colour = (108, 112, 110)

#: Half the distance between the eyes, m: common size of an adult, no source.
HALF_EYES_M = 0.031


def build_cockpit(airframe: Airframe) -> tuple[Part, ...]:
    """(opaque cockpit, its see-through edges and reflections) around the airframe's eye, drawn in the own view only.

    The see-through part has RGBA colours and is not lit; it is drawn last.
    """
    design = DESIGNS[airframe.shape](airframe)
    place, lid = design.place, design.lid
    solid = [_rails(lid, -place.eye_design_m[1], design.frame), _end_walls(lid)]
    solid += [_bow(lid, bow, design.frame) for bow in lid.frames]
    solid += [lid.deck(design.deck_x_m), *(lid.coaming(*hood) for hood in design.coamings)]
    solid += panel(lid, design.deck_x_m)
    solid += trim(lid, design.deck_x_m, -place.eye_design_m[1])
    eye = place.point((place.eye_design_m[0], 0.0, -place.eye_design_m[1]))
    near = [body_of_pilot(eye, design.suit), stick_and_throttle(eye)]
    if design.rear_eye_m is not None:
        near.append(head(place.point(design.rear_eye_m), (70, 84, 86), (200, 200, 196)))

    def deep(points: Array, normals: Array) -> Array:
        """Less of the sky's light the further down."""
        below = np.clip(points[:, 2] - eye[2] - 0.18, 0.0, 0.6)
        return 1.0 - 0.45 * below

    return (
        fixed("cockpit", merge([*(place.surf(s) for s in solid), *near]), specular=0.04, shade=deep),
        Part("cockpit_glass", _glass(design), own_view=True, specular=0.0, lit=False),
    )


DESIGNS: dict[str, Callable[[Airframe], CockpitDesign]] = {
    "jet": jet_cockpit,
    "turboprop": turboprop_cockpit,
    "piston": piston_cockpit,
}


def _stations(lid: Canopy, count: int = 40) -> Array:
    front, back = lid.crown[0, 0], lid.crown[-1, 0]
    return np.linspace(front - 0.01, back + 0.01, count)


def _facing(points: Array, colour: Colour, inside: Array) -> Surf:
    """An open grid (R, C, 3) that faces a point."""
    tris = grid_tris(points.shape[0], points.shape[1], False)
    skin = surface(points.reshape(-1, 3), tris, colour)
    if np.einsum("ij,ij->", skin.normals, inside - skin.points) < 0:
        skin = surface(points.reshape(-1, 3), tris[:, ::-1], colour)
    return skin


def _rails(lid: Canopy, eye_z_m: float, colour: Colour) -> Surf:
    """Canopy rails, left and right, with the cockpit wall and side console below them."""
    x = _stations(lid)
    w = np.maximum(lid.width(x), 0.0)
    sill = lid.sill_z(x)
    rail = [
        (w + 0.026, lid.body.top_z(x, w + 0.026) - 0.004),
        (w + 0.012, lid.body.top_z(x, w + 0.012) - 0.012),
        (w - 0.006, sill - 0.012),
        (w - 0.020, sill - 0.008),
    ]
    seal = [(w - 0.020, sill - 0.008), (w - 0.026, sill - 0.012), (w - 0.033, sill - 0.004), (w - 0.035, sill + 0.006)]
    lip = [(w - 0.035, sill + 0.006), (w - 0.036, sill + 0.045), (w - 0.058, sill + 0.06)]
    wall = [(w - 0.058, sill + 0.06), (0.86 * w, np.full_like(x, eye_z_m + 0.50))]
    console = [
        (0.86 * w, np.full_like(x, eye_z_m + 0.50)),
        (0.52 * w, np.full_like(x, eye_z_m + 0.53)),
        (0.50 * w, np.full_like(x, eye_z_m + 0.95)),
        (0.0 * w, np.full_like(x, eye_z_m + 0.95)),
    ]
    middle = np.array([float(x.mean()), 0.0, eye_z_m - 0.4])
    pieces = []
    for rows, paint_with in ((rail, colour), (seal, BLACK), (lip, LEDGE), (wall, INSIDE), (console, BLACK)):
        for sign in (1.0, -1.0):
            grid = np.stack([np.stack([x, sign * np.maximum(y, 0.0), z], -1) for y, z in rows], axis=1)
            pieces.append(_facing(grid, paint_with, middle))
    return merge(pieces)


def _arch(lid: Canopy, at: float, lean: float, lift_m: float, shift_m: float, across: int = 33) -> Array:
    """Points (N, 3) along a bow, ``lift_m`` inside the glass and shifted along its plane's normal by ``shift_m``."""
    level = float(lid.sill_z(np.array(at)))
    turn = np.linspace(0.02, np.pi - 0.02, across)
    x = np.full_like(turn, at)
    for _ in range(6):  # the bow leans: its x depends on the height reached there
        width, sill, crown = np.maximum(lid.width(x), 1e-3), lid.sill_z(x), lid.crown_z(x)
        y = (width - lift_m) * np.sign(np.cos(turn)) * np.abs(np.cos(turn)) ** (2 / lid.fullness)
        z = sill - (sill - crown - lift_m) * np.sin(turn) ** (2 / lid.fullness)
        x = at + lean * (level - z) + shift_m
    return np.stack([x, y, z], -1)


def _bow(lid: Canopy, bow: tuple[float, float, float], colour: Colour) -> Surf:
    """A bow's solid core: the middle that neither eye sees past, with its depth towards the pilot."""
    at, lean, width = bow
    half = core_half_m(width)
    rows = [(0.0, -half), (0.012, -half), (0.026, -0.6 * half), (0.026, 0.6 * half), (0.012, half), (0.0, half)]
    grid = np.stack([_arch(lid, at, lean, lift, shift) for lift, shift in rows], axis=1)
    return _facing(grid, colour, np.array([at, 0.0, float(lid.sill_z(np.array(at)))]))


def core_half_m(width_m: float) -> float:
    """Half width of the part of a bow that hides things far behind it from both eyes; at least 8 mm.

    Geometry: a bow of width w close to two eyes 2 a apart hides a strip of w - 2 a from both, w + 2 a from one.
    """
    return max(width_m / 2 - HALF_EYES_M, 0.008)


def _end_walls(lid: Canopy) -> Surf:
    """The bulkhead behind the seats."""
    back = float(lid.crown[-1, 0]) + 0.25
    width, sill = float(lid.width(np.array(back))), float(lid.sill_z(np.array(back)))
    points = np.array([[[back, y, sill], [back, y, sill + 0.8]] for y in (-width, width)])
    return _facing(points, BLACK, np.array([back + 2.0, 0.0, sill]))


def _glass(design: CockpitDesign) -> pv.PolyData:
    """Feathered sides of the bows and rails, and faint reflections low on the glass: RGBA, unlit."""
    lid, place = design.lid, design.place
    frame, sky = np.array(design.frame, float), np.array([205.0, 215.0, 222.0])
    bands = []
    for at, lean, width in lid.frames:
        core, out = core_half_m(width), width / 2 + HALF_EYES_M
        for sign in (-1.0, 1.0):
            edge = ((-0.03, 240.0), (0.2, 130.0), (0.65, 70.0), (1.0, 0.0))
            shifts = [(sign * (core + part * (out - core)), alpha) for part, alpha in edge]
            bands.append([(_arch(lid, at, lean, 0.012, shift), frame * 0.8, alpha) for shift, alpha in shifts])
    x = _stations(lid, 48)
    w, sill, crown = np.maximum(lid.width(x), 1e-3), lid.sill_z(x), lid.crown_z(x)
    for sign in (-1.0, 1.0):
        rail = []
        for up, colour, alpha in (
            (-0.004, frame, 220.0), (0.006, frame * 1.3, 90.0), (0.014, sky, 26.0), (0.05, sky, 20.0), (0.11, sky, 7.0),
            (0.17, sky, 0.0),
        ):  # fmt: skip
            z = np.maximum(sill - 0.012 - up, crown)
            ratio = np.clip((sill - z) / np.maximum(sill - crown, 1e-6), 0.0, 1.0)
            y = w * (1.0 - ratio**lid.fullness) ** (1 / lid.fullness)
            rail.append((np.stack([x, sign * y, z], -1), colour, alpha))
        bands.append(rail)
    return _ribbons(bands, place.point)


def _ribbons(bands: list[list[tuple[Array, Array, float]]], place: Callable[[Array], Array]) -> pv.PolyData:
    """Strips between neighbouring lines, each line of one colour and alpha."""
    points, tris, colour, shift = [], [], [], 0
    for band in bands:
        grid = np.stack([points_of for points_of, _, _ in band])
        points.append(grid.reshape(-1, 3))
        tris.append(grid_tris(grid.shape[0], grid.shape[1], False) + shift)
        rgba = np.array([[*np.clip(c, 0, 255), a] for _, c, a in band])
        colour.append(np.repeat(rgba, grid.shape[1], axis=0))
        shift += grid.shape[0] * grid.shape[1]
    faces = np.concatenate(tris)
    mesh = pv.PolyData(
        place(np.concatenate(points)).astype(np.float32), np.column_stack([np.full(len(faces), 3), faces]).reshape(-1)
    )
    mesh.point_data["colour"] = np.round(np.concatenate(colour)).astype(np.uint8)
    mesh.point_data["Normals"] = np.tile(np.array([0.0, 0.0, -1.0], np.float32), (mesh.n_points, 1))
    mesh.point_data.active_normals_name = "Normals"
    mesh.point_data.active_scalars_name = "colour"
    return mesh
