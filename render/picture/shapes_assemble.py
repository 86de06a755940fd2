"""From the pieces of a design to the parts of a Shape; tip lights, propeller disc and crew that all shapes share."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import pyvista as pv

from render.frames import Array
from render.picture.loft import Colour, Surf, grid_tris, merge, mirrored
from render.picture.paint import patch, station
from render.picture.shapes_cockpit import CockpitDesign
from render.picture.shapes_crew import NECK_AFT_M, head, seat, torso
from render.picture.shapes_parts import Part, Shape, fixed, hinged
from render.picture.shapes_sections import Panel, ellipsoid

GREEN_LIGHT: Colour = (60, 210, 120)
RED_LIGHT: Colour = (230, 50, 40)


@dataclass(frozen=True, slots=True, eq=False)
class Pieces:
    """A design's pieces in its own metres: those on the centre line, the right-hand ones, the moving ones."""

    middle: Sequence[Surf]
    right: Sequence[Surf]  # mirrored to the left, its green light made red
    stabilator_right: Surf
    pivot_m: tuple[float, float, float]
    aileron_right: Surf
    wing: Panel
    aileron: tuple[float, float, float]  # inner and outer span station, part of the chord of its hinge
    helmets: tuple[tuple[Colour, Colour], ...]  # (shell, stripe) of the front pilot and, if there is one, the rear
    smoke_m: tuple[float, float, float]  # where a smoke trail is let out
    propeller: tuple[float, float, float] | None = None  # x, z of its hub, radius


def assemble(name: str, design: CockpitDesign, pieces: Pieces) -> Shape:
    """The parts at the airframe's size; heads and bodies of the crew stay at true size."""
    place, lid = design.place, design.lid
    left = [_red(mirrored(s)) for s in pieces.right]
    frame, glass = lid.shell(design.frame)
    inside = [frame, lid.tub(), lid.deck(design.deck_x_m), *(lid.coaming(*hood) for hood in design.coamings)]
    front = place.point((place.eye_design_m[0], 0.0, -place.eye_design_m[1]))
    crew = [torso(front, design.suit), seat(front, design.seat)]
    if design.rear_eye_m is not None:
        rear = place.point(design.rear_eye_m)
        crew.append(seat(rear, design.seat))
        if len(pieces.helmets) > 1:
            crew += [torso(rear, design.suit), head(rear, *pieces.helmets[1])]
    cabin = merge([*(place.surf(s) for s in inside), *crew])
    inner, outer, part = pieces.aileron
    ends = pieces.wing.point(inner, part), pieces.wing.point(outer, part)
    axis, hinge, flip = place.axis(ends[1] - ends[0]), place.point(ends[0]), np.array([1.0, -1.0, 1.0])
    tail = place.surf(merge([pieces.stabilator_right, mirrored(pieces.stabilator_right)]))
    aileron_right, aileron_left = place.surf(pieces.aileron_right), place.surf(mirrored(pieces.aileron_right))
    neck = front - np.array([NECK_AFT_M, 0.0, 0.0])
    hull = place.surf(merge([*pieces.middle, *pieces.right, *left]))
    parts = [
        fixed("hull", hull, specular=0.25),
        fixed("cabin", cabin, own_view=False, specular=0.05),
        hinged("head", head(front, *pieces.helmets[0]), "head", neck, np.array([0.0, 0.0, 1.0]), own_view=False),
        hinged("stabilator", tail, "stabilator", place.point(pieces.pivot_m), np.array([0.0, 1.0, 0.0])),
        hinged("aileron_right", aileron_right, "aileron_right", hinge, axis),
        hinged("aileron_left", aileron_left, "aileron_left", hinge * flip, -axis * flip),
        fixed("glass", place.surf(glass), own_view=False, opacity=0.28, specular=0.9),
    ]
    if pieces.propeller is not None:
        x, z, radius = pieces.propeller
        hub = place.point((x, 0.0, z))
        disc = propeller_disc(hub, radius * place.length)
        parts.append(Part("propeller", disc, hub, np.array([1.0, 0.0, 0.0]), "propeller", specular=0.0, lit=False))
    return Shape(name, tuple(parts), place.point(pieces.smoke_m))


def _red(surf: Surf) -> Surf:
    """A left tip's light is red."""
    green = (surf.colour == np.array(GREEN_LIGHT)).all(axis=1)
    return replace(surf, colour=np.where(green[:, None], np.array(RED_LIGHT, np.uint8), surf.colour))


def tip_light(at_m: Sequence[float]) -> Surf:
    """The right wing tip's green light."""
    return ellipsoid(at_m, (0.11, 0.045, 0.045), GREEN_LIGHT, 5, 10)


def hinge_mark(wing_skin: Surf, wing: Panel, aileron: tuple[float, float, float], colour: Colour) -> Surf:
    """A dark line on the fixed wing just ahead of its aileron."""
    inner, outer, part = aileron

    def ahead(p: Array) -> Array:
        x_le, _, chord, _ = np.moveaxis(wing.at(p[:, 1]), -1, 0)
        result: Array = p[:, 0] - (x_le - (part - 0.012) * chord)
        return result

    def aft(p: Array) -> Array:
        return ahead(p) - 0.022

    edges = [aft, station(outer, (0.0, 1.0, 0.0)), station(-inner, (0.0, -1.0, 0.0))]
    return patch(wing_skin, edges, colour)


def propeller_disc(hub_m: Array, radius_m: float, blades: int = 5, around: int = 60) -> pv.PolyData:
    """A turning propeller as a see-through disc: RGBA, denser near the hub, with faint blades and a light tip ring."""
    rings = np.array([0.14, 0.3, 0.6, 0.88, 0.90, 0.975, 1.0])
    density = np.array([105.0, 62.0, 40.0, 24.0, 46.0, 46.0, 0.0])
    tone = np.array([52.0, 56.0, 62.0, 66.0, 226.0, 226.0, 226.0])
    turn = np.linspace(0.0, 2 * np.pi, around, endpoint=False)
    y, z = rings[:, None] * radius_m * np.cos(turn), rings[:, None] * radius_m * np.sin(turn)
    points = np.stack([np.zeros_like(y), y, z], -1) + hub_m
    streak = 0.75 + 0.45 * np.cos(blades * turn) ** 4
    rgba = np.empty((len(rings), around, 4))
    rgba[..., :3] = tone[:, None, None]
    rgba[..., 3] = density[:, None] * streak
    tris = grid_tris(len(rings), around, True)
    faces = np.column_stack([np.full(len(tris), 3), tris]).reshape(-1)
    mesh = pv.PolyData(points.reshape(-1, 3).astype(np.float32), faces)
    mesh.point_data["colour"] = np.clip(np.round(rgba.reshape(-1, 4)), 0, 255).astype(np.uint8)
    mesh.point_data["Normals"] = np.tile(np.array([1.0, 0.0, 0.0], np.float32), (mesh.n_points, 1))
    mesh.point_data.active_normals_name = "Normals"
    mesh.point_data.active_scalars_name = "colour"
    return mesh
