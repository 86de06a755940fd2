"""Elevation files as rasters: Esri ASCII, SRTM HGT, NumPy .npz, GeoTIFF. Faults are RasterErrors."""

from __future__ import annotations

import re
import zipfile
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

LIMIT = 60_000_000  # cells: a 3601 x 3601 tile is 13 million


class RasterError(Exception):
    """What is wrong with an elevation file; its name is added by who reads it."""


@dataclass(frozen=True, slots=True, eq=False)
class Raster:
    """Heights (I, J) m, row 0 in the north; nan where the file has none. Places are those of cell centres."""

    heights_m: NDArray[np.float64]
    north: float  # of row 0: degrees, or metres
    west: float  # of column 0
    step_north: float  # between rows, positive
    step_east: float
    degrees: bool


def read_raster(path: Path) -> Raster:
    """The raster of a file, by its ending. Raises RasterError, OSError."""
    readers = {".asc": read_asc, ".hgt": read_hgt, ".npz": read_npz, ".tif": read_geotiff, ".tiff": read_geotiff}
    raster = readers[path.suffix.lower()](path)
    rows, columns = raster.heights_m.shape
    if rows < 2 or columns < 2:
        raise RasterError(f"read {rows} rows of {columns} heights, wanted at least 2 of 2")
    if not (raster.step_north > 0.0 and raster.step_east > 0.0 and np.isfinite([raster.north, raster.west]).all()):
        raise RasterError(f"read cells of {raster.step_east:g} by {raster.step_north:g}, wanted positive sizes")
    if raster.degrees and not (abs(raster.north) <= 90.0 and abs(raster.west) <= 360.0):
        raise RasterError(f"read a corner at {raster.north:g} N {raster.west:g} E, wanted degrees on the Earth")
    if not np.isfinite(raster.heights_m).any():
        raise RasterError("read no height at all, only voids")
    return raster


def read_asc(path: Path) -> Raster:
    """Esri ASCII grid: six (five) header lines, then rows from the north.

    Cells smaller than 0.05 near the Earth's degrees are taken as degrees, else metres.
    Source: GDAL's AAIGrid driver page; corner or centre keys, ``NODATA_value`` optional.
    """
    text = path.read_text(encoding="ascii", errors="replace").split("\n")
    header: dict[str, float] = {}
    line = 0
    while line < len(text) and re.match(r"\s*[A-Za-z]", text[line]):
        parts = text[line].split()
        key = parts[0].lower()
        if len(parts) != 2 or key in header:
            raise RasterError(
                f"line {line + 1}: read {text[line].strip()[:60]!r}, wanted one key and one number, each once"
            )
        header[key] = _number(parts[1], line + 1)
        line += 1
    for key in ("ncols", "nrows", "cellsize"):
        if key not in header:
            raise RasterError(f"line 1 to {line}: no {key} in the header")
    columns, rows, cell = int(header["ncols"]), int(header["nrows"]), header["cellsize"]
    if columns < 1 or rows < 1 or columns * rows > LIMIT:
        raise RasterError(f"read {rows} rows of {columns}, wanted 1 to {LIMIT} cells")
    half = {"xllcorner": 0.5, "xllcenter": 0.0, "yllcorner": 0.5, "yllcenter": 0.0}
    west = [header[k] + half[k] * cell for k in ("xllcorner", "xllcenter") if k in header]
    south = [header[k] + half[k] * cell for k in ("yllcorner", "yllcenter") if k in header]
    if len(west) != 1 or len(south) != 1:
        raise RasterError("wanted one of xllcorner, xllcenter and one of yllcorner, yllcenter in the header")
    try:
        values = np.array(" ".join(text[line:]).split(), dtype=float)
    except ValueError:
        values = np.array([_number(word, k + 1) for k in range(line, len(text)) for word in text[k].split()])
    if values.size != rows * columns:
        raise RasterError(f"read {values.size} heights, wanted {rows} rows of {columns} = {rows * columns}")
    heights = _without(values.reshape(rows, columns), header.get("nodata_value", -9999.0))
    degrees = cell < 0.05 and abs(west[0]) <= 360.0 and abs(south[0]) <= 90.0
    return Raster(heights, south[0] + (rows - 1) * cell, west[0], cell, cell, degrees)


def read_hgt(path: Path) -> Raster:
    """SRTM tile: 1201 x 1201 or 3601 x 3601 big-endian int16, rows from the north, -32768 void.

    Cell centres lie on the tile's edges. The name gives the south-west corner: N45E007.hgt.
    Source: GDAL's SRTMHGT driver page.
    """
    found = re.match(r"([NS])(\d\d)([EW])(\d\d\d)", path.stem.upper())
    if found is None:
        raise RasterError("wanted a name like N45E007.hgt, which says where the tile lies")
    south = int(found[2]) * (1 if found[1] == "N" else -1)
    west = int(found[4]) * (1 if found[3] == "E" else -1)
    data = path.read_bytes()
    side = {2 * 1201**2: 1201, 2 * 3601**2: 3601}.get(len(data))
    if side is None:
        raise RasterError(f"read {len(data)} bytes, wanted {2 * 1201**2} (3 seconds) or {2 * 3601**2} (1 second)")
    heights = _without(np.frombuffer(data, ">i2").reshape(side, side).astype(float), -32768.0)
    step = 1.0 / (side - 1)
    return Raster(heights, south + 1.0, float(west), step, step, True)


def read_npz(path: Path) -> Raster:
    """NumPy archive: ``elevation`` with cell edges ``xmin, xmax, ymin, ymax`` in degrees, or ``topo`` (or
    ``elevation``) with ``longitude`` and ``latitude`` of the cell centres; rows from the north or from the south.

    The first is how matplotlib ships its sample jacksboro_fault_dem.npz (whose ymin is the north edge).
    """
    try:
        with np.load(path, allow_pickle=False) as archive:
            have = {key: np.asarray(archive[key]) for key in archive.files}
    except (ValueError, zipfile.BadZipFile, EOFError, KeyError) as fault:
        raise RasterError(f"not a plain NumPy archive ({fault})") from fault
    name = "elevation" if "elevation" in have else "topo"
    if name not in have or have[name].ndim != 2 or have[name].dtype.kind not in "iuf":
        raise RasterError(
            f"read {', '.join(sorted(have)) or 'nothing'}, wanted a table of numbers called elevation or topo"
        )
    heights = have[name].astype(float)
    rows, columns = heights.shape
    if {"longitude", "latitude"} <= have.keys():
        east, north = have["longitude"].astype(float), have["latitude"].astype(float)
        if east.shape != (columns,) or north.shape != (rows,):
            raise RasterError(f"read {east.shape} longitudes and {north.shape} latitudes, wanted {columns} and {rows}")
        heights = _evened(_evened(heights, north, "latitudes").T, east, "longitudes").T
        first, last, west = float(north[0]), float(north[-1]), float(east[0])
        step_north, step_east = abs(last - first) / (rows - 1), float(east[-1] - east[0]) / (columns - 1)
    elif {"xmin", "xmax", "ymin", "ymax"} <= have.keys():
        x0, x1, first, last = (float(have[key]) for key in ("xmin", "xmax", "ymin", "ymax"))
        step_east, step_north = (x1 - x0) / columns, abs(last - first) / rows
        west, turn = x0 + 0.5 * step_east, 0.5 * step_north * (-1.0 if first > last else 1.0)
        first, last = first + turn, last - turn
    else:
        raise RasterError(f"read {', '.join(sorted(have))}, wanted longitude and latitude, or xmin, xmax, ymin, ymax")
    if first < last:
        heights, first = heights[::-1], last
    return Raster(heights, first, west, step_north, step_east, True)


def _evened(heights: NDArray[np.float64], at: NDArray[np.float64], what: str) -> NDArray[np.float64]:
    """Rows at rising or falling places, by straight lines between them, at evenly spaced places from first to last."""
    steps = np.diff(at)
    if len(at) < 2 or not ((steps > 0.0).all() or (steps < 0.0).all()):
        raise RasterError(f"{what} neither rise nor fall all the way")
    if np.ptp(steps) < 1e-4 * abs(steps[0]):
        return heights
    wanted = np.linspace(at[0], at[-1], len(at))
    row = np.interp(wanted, at, np.arange(len(at))) if steps[0] > 0.0 else np.interp(-wanted, -at, np.arange(len(at)))
    low = np.minimum(row.astype(int), len(at) - 2)
    part = (row - low)[:, None]
    result: NDArray[np.float64] = heights[low] * (1.0 - part) + heights[low + 1] * part
    return result


def read_geotiff(path: Path) -> Raster:
    """GeoTIFF, north up, one band. Source: GeoTIFF 1.1 (OGC 19-008r4): tags 33550, 33922, 34735; GDAL's tag 42113."""
    try:
        import tifffile
    except ImportError as fault:
        raise RasterError("reading GeoTIFF needs tifffile: pip install 'latepull[terrain]'") from fault
    try:
        with tifffile.TiffFile(path) as file:
            page: Any = file.pages[0]
            tags = {code: page.tags[code].value for code in (33550, 33922, 34735, 42113) if code in page.tags}
            heights = np.asarray(page.asarray(), float)
    except (tifffile.TiffFileError, ValueError, IndexError, KeyError) as fault:
        raise RasterError(f"not a TIFF that can be read ({fault})") from fault
    if heights.ndim != 2:
        raise RasterError(f"read {heights.ndim} dimensions, wanted one band of rows and columns")
    if 33550 not in tags or 33922 not in tags or 34735 not in tags:
        raise RasterError("no GeoTIFF tags 33550, 33922 and 34735: the picture does not say where it lies")
    keys = np.reshape(tags[34735], (-1, 4))
    key = {int(row[0]): int(row[3]) for row in keys[1:] if row[1] == 0}
    kind = key.get(1024, 0)
    if kind not in (1, 2):
        raise RasterError(f"read model type {kind}, wanted 1 (projected) or 2 (degrees)")
    if kind == 1 and key.get(3076, 9001) != 9001:
        raise RasterError(f"read length unit {key[3076]}, wanted 9001 (metre)")
    step_e, step_n = float(tags[33550][0]), float(tags[33550][1])
    column, row, _, x, y = (float(v) for v in tags[33922][:5])
    half = 0.0 if key.get(1025, 1) == 2 else 0.5  # the tie point is a cell's corner, or its centre
    if 42113 in tags:
        heights = _without(heights, _number(str(tags[42113]).strip("\x00 "), 0))
    return Raster(heights, y + (row - half) * step_n, x + (half - column) * step_e, step_n, step_e, kind == 2)


def _without(heights: NDArray[np.float64], void: float) -> NDArray[np.float64]:
    """Heights with nan for voids."""
    heights = np.array(heights, float)
    heights[heights == void] = np.nan
    return heights


def _number(word: str, line: int) -> float:
    try:
        return float(word)
    except ValueError:
        raise RasterError(f"line {line}: read {word[:40]!r}, wanted a number") from None
