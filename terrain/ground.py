"""Ground heights on a regular grid about the display centre, and the recipes they come from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import yaml
from numpy.typing import ArrayLike, NDArray

RECIPES = Path(__file__).parent / "recipes"


class GroundError(Exception):
    """A ground that can't be had; says what was read and what is wanted."""

    exit_code = 2


@dataclass(frozen=True, slots=True, eq=False)
class Ground:
    """Heights above the field on a regular grid; beyond the grid the edge goes on."""

    name: str
    heights_m: NDArray[np.float64]  # (I, J) rows northward, columns eastward
    origin_n_m: float  # north of row 0
    origin_e_m: float  # east of column 0
    spacing_m: float
    recipe: Mapping[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.heights_m.setflags(write=False)

    def height_at(self, north_m: ArrayLike, east_m: ArrayLike) -> NDArray[np.float64]:
        """Height, m, at places of any (broadcast) shape: bilinear, edge values beyond the grid."""
        n, e = np.broadcast_arrays(np.asarray(north_m, float), np.asarray(east_m, float))
        rows, cols = self.heights_m.shape
        if rows == 1 or cols == 1:
            return np.full(n.shape, self.heights_m[0, 0])
        x = np.clip((n - self.origin_n_m) / self.spacing_m, 0.0, rows - 1.0)
        y = np.clip((e - self.origin_e_m) / self.spacing_m, 0.0, cols - 1.0)
        i = np.minimum(x.astype(int), rows - 2)
        j = np.minimum(y.astype(int), cols - 2)
        fx, fy = x - i, y - j
        low = self.heights_m[i, j] * (1.0 - fy) + self.heights_m[i, j + 1] * fy
        high = self.heights_m[i + 1, j] * (1.0 - fy) + self.heights_m[i + 1, j + 1] * fy
        result: NDArray[np.float64] = low * (1.0 - fx) + high * fx
        return result


def ground_names() -> tuple[str, ...]:
    """Names of the shipped recipes."""
    return tuple(sorted(path.stem for path in RECIPES.glob("*.yaml")))


def read_ground(name: str, seed: int = 1) -> Ground:
    """A ground from a shipped recipe and a seed. Raises GroundError for a name that is not shipped."""
    path = RECIPES / f"{name}.yaml"
    if name not in ground_names():
        raise GroundError(f"ground: read {name}, wanted one of {', '.join(ground_names())}")
    recipe = yaml.safe_load(path.read_text(encoding="utf-8"))
    return Ground(name, *_heights(recipe, seed), recipe=recipe)


def _heights(recipe: Mapping[str, Any], seed: int) -> tuple[NDArray[np.float64], float, float, float]:
    """Rolling relief: a sum of seeded waves, flat inside ``flat_within_m`` of the display centre."""
    relief = float(recipe["relief"]["height"])
    if relief == 0.0:
        return np.zeros((1, 1)), 0.0, 0.0, 1.0
    spacing, half = 100.0, 15_000.0
    axis = np.arange(-half, half + spacing, spacing)
    n, e = np.meshgrid(axis, axis, indexing="ij")
    rng = np.random.default_rng(seed)
    waves = np.zeros_like(n)
    for length in (4200.0, 2700.0, 1500.0):
        turn, phase = rng.uniform(0.0, 2.0 * np.pi, 2)
        waves += length / 4200.0 * np.sin(2.0 * np.pi * (n * np.cos(turn) + e * np.sin(turn)) / length + phase)
    waves = (waves - waves.min()) / np.ptp(waves)
    flat = float(recipe["relief"]["flat_within"])
    rise = np.clip((np.hypot(n, e) - flat) / 2000.0, 0.0, 1.0)
    return relief * waves * rise * rise * (3.0 - 2.0 * rise), -half, -half, spacing
