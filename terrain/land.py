"""What a recipe says of a land, checked: its plan, its colours, its airfield, its shore."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from terrain.pattern import FIELDS_OF_BLOCK, Plan, Shore

Colour = tuple[float, float, float]  # sRGB, 0..1


@dataclass(frozen=True, slots=True)
class FieldKind:
    """One use of fields: keys up to ``up_to`` (0..1, rising through the list)."""

    up_to: float
    colour: Colour


@dataclass(frozen=True, slots=True)
class Airfield:
    """A runway and what belongs to it; its middle's place, m; heading from north."""

    heading_rad: float
    length_m: float
    width_m: float
    north_m: float
    east_m: float
    grass: tuple[Colour, Colour]
    surface: Colour
    apron: Colour

    @property
    def half_along_m(self) -> float:
        """How far the airfield's bounds lie from its middle along the runway."""
        return 0.5 * self.length_m + 240.0

    @property
    def across_m(self) -> tuple[float, float]:
        """Where its bounds lie to the right (negative) and to the left of the runway's middle line."""
        return -150.0, 340.0

    def along_across(self, north_m: Any, east_m: Any) -> tuple[Any, Any]:
        """Distance along the runway from its middle, and to the left of its heading, m."""
        n, e = np.asarray(north_m, float) - self.north_m, np.asarray(east_m, float) - self.east_m
        c, s = np.cos(self.heading_rad), np.sin(self.heading_rad)
        return n * c + e * s, n * s - e * c

    def north_east(self, along_m: Any, across_m: Any) -> tuple[Any, Any]:
        """The inverse of ``along_across``."""
        a, b = np.asarray(along_m, float), np.asarray(across_m, float)
        c, s = np.cos(self.heading_rad), np.sin(self.heading_rad)
        return self.north_m + a * c + b * s, self.east_m + a * s - b * c


@dataclass(frozen=True, slots=True)
class Land:
    """Everything a recipe says but the relief."""

    plan: Plan
    wild: tuple[Colour, Colour, Colour]
    fields: tuple[FieldKind, ...]
    crop_from: float
    wood: Colour
    hedge: Colour
    road: Colour
    verge: Colour
    road_line: bool  # a white line along the middle
    wild_level: float  # where the first two colours of open land meet
    airfield: Airfield


def colour(text: str) -> Colour:
    """``#rrggbb`` as three numbers 0..1."""
    red, green, blue = (int(text[k : k + 2], 16) / 255.0 for k in (1, 3, 5))
    return red, green, blue


def _shore(recipe: Mapping[str, Any]) -> Shore | None:
    shore = recipe.get("shore")
    if shore is None:
        return None
    return Shore(float(np.radians(shore["bearing_deg"])), float(shore["distance"]), float(shore["below"]))


def land_of(recipe: Mapping[str, Any], seed: int) -> Land:
    """The land of a recipe (see terrain/recipes/*.yaml) and a seed."""
    p, c, a = recipe["plan"], recipe["colours"], recipe["airfield"]
    plan = Plan(
        salt=float((seed * 37 + 5) % 289), grain_rad=np.radians(p["grain_deg"]), 
        block_m=float(np.sqrt(FIELDS_OF_BLOCK * p["field"][0] * p["field"][1])), bend_m=p["bend"], enclosed=p["enclosed"], hedge_m=p["hedge"], road_m=p["road"],
        road_rows=p["road_rows"], shore=_shore(recipe), road_every_m=p["road_every"], wood_part=p["wood_part"], wild_wood=p["wild_wood"],
    )
    airfield = Airfield(
        np.radians(a["heading_deg"]), a["length"], a["width"], a["north"], a["east"],
        (colour(a["grass"][0]), colour(a["grass"][1])), colour(a["surface"]), colour(a["apron"]),
    )
    one, two, three = (colour(x) for x in c["wild"])
    return Land(
        plan, (one, two, three), tuple(FieldKind(k[0], colour(k[1])) for k in c["fields"]),
        c["crop_from"], colour(c["wood"]), colour(c["hedge"]), colour(c["road"]), colour(c["verge"]),
        bool(recipe.get("road_line", False)), float(recipe.get("wild_level", 0.5)), airfield,
    )
