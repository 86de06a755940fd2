"""What a drawn aircraft is made of: parts with a mesh, a hinge and who moves them."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import pyvista as pv

from render.frames import Array
from render.picture.loft import Surf
from render.picture.paint import to_mesh
from scenes.airframe import Airframe

Mover = Literal["stabilator", "aileron_left", "aileron_right", "head", "propeller"]


@dataclass(frozen=True, slots=True, eq=False)
class Part:
    """One mesh drawn in one go.

    mesh: point normals and point data ``colour`` (uint8 RGB; RGBA where its transparency varies). Body axes, m.
    hinge_b_m, axis_b: a point and the unit direction of the hinge; right-hand turn about the axis.
    moved_by: whose angle turns it (stabilator, ailerons: positive trailing edge down; head: positive to the right).
    own_view: drawn when the camera sits in this aircraft's cockpit.
    opacity: of the whole part. specular: strength of its highlight. lit: False where the colour is already shaded.
    """

    name: str
    mesh: pv.PolyData
    hinge_b_m: Array | None = None
    axis_b: Array | None = None
    moved_by: Mover | None = None
    own_view: bool = True
    opacity: float = 1.0
    specular: float = 0.15
    lit: bool = True


@dataclass(frozen=True, slots=True, eq=False)
class Shape:
    """The parts of one aircraft, opaque ones first, in body axes."""

    name: str
    parts: tuple[Part, ...]
    smoke_b_m: Array  # (3,) where a smoke trail is let out

    def part(self, name: str) -> Part:
        """The part of that name."""
        return next(p for p in self.parts if p.name == name)


@dataclass(frozen=True, slots=True)
class Fit:
    """How a design becomes the airframe's: lengths by ``length``, widths by ``span``, seat on seat."""

    length: float
    span: float
    eye_design_m: tuple[float, float]  # forward, up in the design
    eye_m: tuple[float, float]  # forward, up in the airframe

    def point(self, point_m: Sequence[float] | Array) -> Array:
        """A design point (3,) or points (..., 3) in body axes."""
        scale = np.array([self.length, self.span, self.length])
        design_eye = np.array([self.eye_design_m[0], 0.0, -self.eye_design_m[1]])
        eye = np.array([self.eye_m[0], 0.0, -self.eye_m[1]])
        result: Array = (np.asarray(point_m, float) - design_eye) * scale + eye
        return result

    def axis(self, axis: Sequence[float] | Array) -> Array:
        """A design direction as a unit vector in body axes."""
        turned = np.asarray(axis, float) * np.array([self.length, self.span, self.length])
        return turned / np.linalg.norm(turned)

    def surf(self, surf: Surf) -> Surf:
        """A design mesh in body axes."""
        normals = surf.normals / np.array([self.length, self.span, self.length])
        normals = normals / np.linalg.norm(normals, axis=1, keepdims=True)
        return Surf(self.point(surf.points), normals, surf.tris, surf.colour)


def fit(airframe: Airframe, length_m: float, span_m: float, eye_m: tuple[float, float]) -> Fit:
    """The fit of a design of given length, span and front eye to an airframe."""
    return Fit(
        airframe.length_m / length_m, airframe.wing_span_m / span_m, eye_m, (airframe.eye_forward_m, airframe.eye_up_m)
    )


def fixed(
    name: str,
    surf: Surf,
    *,
    own_view: bool = True,
    opacity: float = 1.0,
    specular: float = 0.15,
    shade: Callable[[Array, Array], Array] | None = None,
) -> Part:
    """A part that does not move."""
    return Part(name, to_mesh(surf, shade), own_view=own_view, opacity=opacity, specular=specular)


def hinged(
    name: str,
    surf: Surf,
    moved_by: Mover,
    hinge_b_m: Array,
    axis_b: Array,
    *,
    own_view: bool = True,
    opacity: float = 1.0,
) -> Part:
    """A part that turns about a hinge."""
    axis = np.asarray(axis_b, float) / np.linalg.norm(axis_b)
    hinge = np.asarray(hinge_b_m, float)
    hinge.setflags(write=False)
    axis.setflags(write=False)
    return Part(name, to_mesh(surf), hinge, axis, moved_by, own_view, opacity)


def part_matrix(part: Part, angle_rad: float) -> Array:
    """The (4, 4) matrix in body axes that turns a part about its hinge by an angle; unity for fixed parts.

    Source: Rodrigues' rotation formula, R = I + sin(a) K + (1 - cos(a)) K^2.
    """
    matrix = np.eye(4)
    if part.hinge_b_m is None or part.axis_b is None:
        return matrix
    x, y, z = part.axis_b
    k = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    turn = np.eye(3) + np.sin(angle_rad) * k + (1.0 - np.cos(angle_rad)) * (k @ k)
    matrix[:3, :3] = turn
    matrix[:3, 3] = part.hinge_b_m - turn @ part.hinge_b_m
    return matrix
