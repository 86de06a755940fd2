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
        return -330.0, 340.0

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
class Standing:
    """How much of what stands on a land within a few kilometres of the display centre."""

    hedge_height_m: float
    hedge_reach_m: float  # hedges stand up within this distance, beyond it they are only painted
    hedge_gaps: float  # part of the pieces (45 m) of hedge that are missing
    hedge_trees: float  # trees for each piece of hedge
    tree_height_m: tuple[float, float]
    wood_kind: str  # broadleaf or conifer
    wood_height_m: tuple[float, float]
    wood_tries: int  # places tried; those in woods get a tree
    lone_trees: int
    bushes: int
    bush_height_m: tuple[float, float]
    farms: int
    houses: int
    vehicles: int


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
    sand: Colour
    deep: Colour
    shallow: Colour
    leaf: tuple[Colour, Colour]
    needle: Colour
    standing: Standing
    airfield: Airfield | None  # none on a real relief


def colour(text: str) -> Colour:
    """``#rrggbb`` as three numbers 0..1."""
    red, green, blue = (int(text[k : k + 2], 16) / 255.0 for k in (1, 3, 5))
    return red, green, blue


def _shore(recipe: Mapping[str, Any]) -> Shore | None:
    shore = recipe.get("shore")
    if shore is None:
        return None
    return Shore(float(np.radians(shore["bearing_deg"])), float(shore["distance"]), float(shore["below"]))


def _airfield(recipe: Mapping[str, Any]) -> Airfield | None:
    a = recipe.get("airfield")
    if a is None:
        return None
    return Airfield(
        float(np.radians(a["heading_deg"])),
        a["length"],
        a["width"],
        a["north"],
        a["east"],
        (colour(a["grass"][0]), colour(a["grass"][1])),
        colour(a["surface"]),
        colour(a["apron"]),
    )


def _standing(s: Mapping[str, Any]) -> Standing:
    hedge, wood = s["hedges"], s["woods"]
    return Standing(
        hedge["height"],
        hedge["reach"],
        hedge["gaps"],
        hedge["trees"],
        tuple(s["trees"]),
        wood["kind"],
        tuple(wood["trees"]),
        wood["tries"],
        s["lone_trees"],
        s["bushes"],
        tuple(s["bush_height"]),
        s["farms"],
        s["houses"],
        s["vehicles"],
    )


def land_of(recipe: Mapping[str, Any], seed: int) -> Land:
    """The land of a recipe (see terrain/recipes/*.yaml) and a seed."""
    p, c = recipe["plan"], recipe["colours"]
    plan = Plan(
        salt=float((seed * 37 + 151) % 512) / 512.0,
        grain_rad=np.radians(p["grain_deg"]),
        block_m=float(np.sqrt(FIELDS_OF_BLOCK * p["field"][0] * p["field"][1])),
        bend_m=p["bend"],
        enclosed=p["enclosed"],
        hedge_m=p["hedge"],
        road_m=p["road"],
        road_rows=p["road_rows"],
        shore=_shore(recipe),
        road_every_m=p["road_every"],
        wood_part=p["wood_part"],
        wild_wood=p["wild_wood"],
    )
    one, two, three = (colour(x) for x in c["wild"])
    return Land(
        plan,
        (one, two, three),
        tuple(FieldKind(k[0], colour(k[1])) for k in c["fields"]),
        c["crop_from"],
        colour(c["wood"]),
        colour(c["hedge"]),
        colour(c["road"]),
        colour(c["verge"]),
        bool(recipe.get("road_line", False)),
        float(recipe.get("wild_level", 0.5)),
        colour(c.get("sand", "#000000")),
        colour(c.get("deep", "#000000")),
        colour(c.get("shallow", "#000000")),
        (colour(c["leaf"][0]), colour(c["leaf"][1])),
        colour(c["needle"]),
        _standing(recipe["standing"]),
        _airfield(recipe),
    )
