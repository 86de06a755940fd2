"""The drawn shapes of the three invented airframes: no real aircraft is meant."""

from __future__ import annotations

from render.picture.shapes_jet import build_jet
from render.picture.shapes_parts import Part, Shape, part_matrix
from render.picture.shapes_piston import build_piston
from render.picture.shapes_turboprop import build_turboprop
from scenes.airframe import Airframe

__all__ = ["Part", "Shape", "build_shape", "part_matrix"]


def build_shape(airframe: Airframe) -> Shape:
    """The parts of an airframe's shape, at its length and span, its front seat at the airframe's eye."""
    builders = {"jet": build_jet, "turboprop": build_turboprop, "piston": build_piston}
    return builders[airframe.shape](airframe)
