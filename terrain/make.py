"""Heights from a recipe and a seed: rolling relief kept off the airfield, a sea below a shore."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from terrain.land import land_of
from terrain.pattern import Array, value_noise

SPACING_M = 100.0
HALF_M = 15_000.0
SHORE_SPACING_M = 50.0
SHORE_HALF_M = 9_000.0
#: Lengths of the relief's rises as parts of the longest, and how high each is.
_OCTAVES = ((1.0, 1.0), (0.5, 0.42), (0.23, 0.13))
_RISE_M = 2_200.0  # over this distance the relief grows from nothing to all of its height
_SLOPE_M = 130.0  # the land falls to the sea over this distance


def make_heights(recipe: Mapping[str, Any], seed: int) -> tuple[Array, float, float, float]:
    """Heights (I, J) m above the field, north of row 0, east of column 0, spacing, m.

    Level land is one value. Relief: smooth noise of three lengths between 0 and ``height``, nothing
    within ``flat_within`` of the airfield's bounds. The same recipe and seed give the same heights.
    """
    relief, shore = recipe["relief"], recipe.get("shore")
    if float(relief["height"]) == 0.0 and shore is None:
        return np.zeros((1, 1)), 0.0, 0.0, 1.0
    half, spacing = (HALF_M, SPACING_M) if shore is None else (SHORE_HALF_M, SHORE_SPACING_M)
    axis = np.arange(-half, half + 0.5 * spacing, spacing)
    north, east = np.meshgrid(axis, axis, indexing="ij")
    heights = np.zeros_like(north)
    if float(relief["height"]) > 0.0:
        heights = float(relief["height"]) * _rolling(north, east, float(relief["scale"]), seed)
        heights *= _away_from_airfield(recipe, seed, north, east, float(relief["flat_within"]))
    if shore is not None:
        line = land_of(recipe, seed).plan.shore
        assert line is not None
        landward = np.clip(-(line.seaward_m(north, east) + 20.0) / _SLOPE_M, 0.0, 1.0)
        on_land = landward * landward * (3.0 - 2.0 * landward)
        heights = (heights + line.below_m) * on_land - line.below_m
    return heights, -half, -half, spacing


def _rolling(north: Array, east: Array, scale_m: float, seed: int) -> Array:
    """Smooth noise 0..1; its lattice is turned against the land's own grain."""
    turn = 0.47 + 1.3 * (seed % 7)
    u, v = np.cos(turn) * east + np.sin(turn) * north, np.cos(turn) * north - np.sin(turn) * east
    total = np.zeros_like(north)
    for k, (part, weight) in enumerate(_OCTAVES):
        length = scale_m * part
        total += weight * value_noise(
            u / length + 0.37 * k, v / length + 0.61 * k, float((seed * 53 + 101 * k + 11) % 512) / 512.0
        )
    result: Array = np.clip(total / sum(w for _, w in _OCTAVES) * 1.25 - 0.12, 0.0, 1.0)
    return result


def _away_from_airfield(recipe: Mapping[str, Any], seed: int, north: Array, east: Array, flat_m: float) -> Array:
    """0 near the airfield's bounds, 1 far away, smooth between."""
    field = land_of(recipe, seed).airfield
    if field is None:
        return np.ones_like(north)
    along, across = field.along_across(north, east)
    low, high = field.across_m
    out = np.hypot(
        np.maximum(np.abs(along) - field.half_along_m, 0.0),
        np.maximum(np.maximum(low - across, across - high), 0.0),
    )
    rise = np.clip((out - flat_m) / _RISE_M, 0.0, 1.0)
    result: Array = rise * rise * (3.0 - 2.0 * rise)
    return result
