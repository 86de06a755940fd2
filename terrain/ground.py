"""Ground heights on a regular grid about the display centre, and the recipes they come from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import yaml
from numpy.typing import ArrayLike, NDArray

from terrain.make import make_heights

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


def is_elevation(name: str) -> bool:
    """Whether a ground's name is meant as an elevation file's path, with or without its display centre."""
    from terrain.elevation import ENDINGS

    return Path(name.rpartition("@")[0] or name).suffix.lower() in ENDINGS


def read_ground(name: str, seed: int = 1) -> Ground:
    """A ground from a shipped recipe and a seed, or from an elevation file (see terrain/elevation.py).

    name: a shipped land, or the path of a file that ends in .asc, .hgt, .npz, .tif or .tiff, with
    ``@north,east`` behind it to place the display centre (in the file's coordinates) elsewhere than in its middle.
    Raises GroundError for a name that is not shipped and for a file that can't be read.
    """
    from terrain.elevation import ENDINGS, read_elevation  # makes a Ground, so it can't come before it

    if name in ground_names():
        recipe = yaml.safe_load((RECIPES / f"{name}.yaml").read_text(encoding="utf-8"))
        return Ground(name, *make_heights(recipe, seed), recipe=recipe)
    file, at, place = name.rpartition("@") if "@" in name else (name, "", "")
    if Path(file).suffix.lower() not in ENDINGS:
        known = ", ".join(ground_names())
        raise GroundError(f"ground: read {name}, wanted one of {known} or an elevation file ({', '.join(ENDINGS)})")
    if not at:
        return read_elevation(Path(file))
    try:
        north, east = (float(x) for x in place.split(","))
    except ValueError:
        raise GroundError(f"ground: {file}: read @{place}, wanted @north,east as two numbers") from None
    return read_elevation(Path(file), (north, east))
