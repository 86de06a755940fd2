"""Real elevation files as grounds: a window of the file about the display centre, in metres."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import yaml
from numpy.typing import ArrayLike

from terrain.formats import Raster, RasterError, read_raster
from terrain.ground import RECIPES, Ground, GroundError
from terrain.pattern import Array

ENDINGS = (".asc", ".hgt", ".npz", ".tif", ".tiff")
REACH_M = 15_000.0
LEAST_REACH_M = 1_000.0
LOOK = "hills"  # the recipe whose colours and plan clothe a real relief

_A_M, _E2 = 6378137.0, 6.69437999014e-3  # WGS 84 ellipsoid: NIMA TR8350.2


def metres_per_degree(latitude_deg: float) -> tuple[float, float]:
    """Metres for a degree northward and eastward on the WGS 84 ellipsoid, from its radii of curvature M, N cos(lat)."""
    sin2 = math.sin(math.radians(latitude_deg)) ** 2
    bend = 1.0 - _E2 * sin2
    north = _A_M * (1.0 - _E2) / bend**1.5
    east = _A_M / math.sqrt(bend) * math.cos(math.radians(latitude_deg))
    return math.radians(north), math.radians(east)


def height_in(raster: Raster, north: ArrayLike, east: ArrayLike) -> Array:
    """Bilinear heights, m, at places in the raster's own coordinates; nan outside it and beside voids."""
    row = (raster.north - np.asarray(north, float)) / raster.step_north
    column = (np.asarray(east, float) - raster.west) / raster.step_east
    rows, columns = raster.heights_m.shape
    # A place on a cell centre, but for rounding, is on it.
    row, column = (np.where(np.abs(x - np.round(x)) < 1e-6, np.round(x), x) for x in (row, column))
    inside = (row >= 0.0) & (row <= rows - 1.0) & (column >= 0.0) & (column <= columns - 1.0)
    i = np.clip(np.floor(row).astype(int), 0, rows - 2)
    j = np.clip(np.floor(column).astype(int), 0, columns - 2)
    f, g, h = row - i, column - j, raster.heights_m

    def part(value: Array, weight: Array) -> Array:
        """A corner of no weight may be a void."""
        result: Array = np.where(weight == 0.0, 0.0, value * weight)
        return result

    total = part(h[i, j], (1 - f) * (1 - g)) + part(h[i, j + 1], (1 - f) * g)
    total = total + part(h[i + 1, j], f * (1 - g)) + part(h[i + 1, j + 1], f * g)
    result: Array = np.where(inside, total, np.nan)
    return result


def read_elevation(path: Path, centre: tuple[float, float] | None = None) -> Ground:
    """The ground of an elevation file about a display centre.

    centre: north, east in the file's coordinates (degrees, or metres); the file's middle if None.
    The field's elevation is the file's height there, so heights are above it. The window reaches
    15 km, less where the file ends; it is resampled bilinearly to the smaller of the cell's sides.
    Raises GroundError naming the file and its fault.
    """
    try:
        raster = read_raster(path)
        return _window(path.stem, raster, centre)
    except RasterError as fault:
        raise GroundError(f"ground: {path}: {fault}") from fault
    except OSError as fault:
        raise GroundError(f"ground: {path}: can't be read ({fault.strerror or fault})") from fault


def _window(name: str, raster: Raster, centre: tuple[float, float] | None) -> Ground:
    rows, columns = raster.heights_m.shape
    south, east_end = raster.north - (rows - 1) * raster.step_north, raster.west + (columns - 1) * raster.step_east
    north0, east0 = centre if centre is not None else (0.5 * (raster.north + south), 0.5 * (raster.west + east_end))
    unit_n, unit_e = metres_per_degree(north0) if raster.degrees else (1.0, 1.0)
    reach = min(
        (raster.north - north0) * unit_n,
        (north0 - south) * unit_n,
        (east0 - raster.west) * unit_e,
        (east_end - east0) * unit_e,
        REACH_M,
    )
    if reach < LEAST_REACH_M:
        raise RasterError(
            f"the display centre {north0:g} N {east0:g} E has {max(reach, 0.0):.0f} m of heights on its narrowest "
            f"side, wanted {LEAST_REACH_M:.0f} m; the file covers {south:g} to {raster.north:g} N, "
            f"{raster.west:g} to {east_end:g} E"
        )
    spacing = max(min(raster.step_north * unit_n, raster.step_east * unit_e), 5.0)
    count = int(reach / spacing)
    axis = spacing * np.arange(-count, count + 1)
    heights = height_in(raster, (north0 + axis / unit_n)[:, None], (east0 + axis / unit_e)[None, :])
    voids = np.argwhere(np.isnan(heights))
    if len(voids):
        i, j = voids[0]
        raise RasterError(
            f"{len(voids)} heights within {reach:.0f} m of the display centre are void, the first about "
            f"{north0 + axis[i] / unit_n:g} N {east0 + axis[j] / unit_e:g} E; wanted a file without gaps there"
        )
    look = yaml.safe_load((RECIPES / f"{LOOK}.yaml").read_text(encoding="utf-8"))
    recipe = {key: value for key, value in look.items() if key not in ("relief", "airfield")}
    field = heights[count, count]
    return Ground(name, heights - field, float(axis[0]), float(axis[0]), spacing, recipe)
