"""Elevation files: values verified outside (REFERENCES.md section 4), and every kind of bad file."""

from __future__ import annotations

from pathlib import Path

import matplotlib
import numpy as np
import pytest

from terrain.elevation import height_in, metres_per_degree, read_elevation
from terrain.formats import Raster, read_raster
from terrain.ground import GroundError, read_ground

SAMPLES = Path(matplotlib.get_data_path()) / "sample_data"


def asc(tmp_path: Path, text: str, name: str = "made.asc") -> Path:
    path = tmp_path / name
    path.write_text(text)
    return path


def made_asc(tmp_path: Path, heights: np.ndarray, cell: float = 30.0, more: str = "") -> Path:
    rows, columns = heights.shape
    head = f"ncols {columns}\nnrows {rows}\nxllcorner 500000\nyllcorner 5000000\ncellsize {cell}\n{more}"
    return asc(tmp_path, head + "\n".join(" ".join(f"{x:.3f}" for x in row) for row in heights) + "\n")


def test_matplotlibs_sample_has_the_verified_values() -> None:
    """Source: matplotlib's jacksboro_fault_dem.npz (USGS heights), values in REFERENCES.md section 4."""
    raster = read_raster(SAMPLES / "jacksboro_fault_dem.npz")
    heights = raster.heights_m
    assert heights.shape == (344, 403)
    assert heights.sum() == 73_617_913
    assert heights[288, 347] == heights.min() == 236
    assert heights[297, 219] == heights.max() == 1076
    assert [heights[0, 0], heights[0, -1], heights[-1, 0], heights[-1, -1]] == [483, 444, 545, 272]
    assert height_in(raster, 36.60, -84.25) == pytest.approx(513.0)
    north, west = raster.north - 159.25 * raster.step_north, raster.west + 196.75 * raster.step_east
    assert height_in(raster, north, west) == pytest.approx(496.938, abs=5e-4)


def test_the_ground_of_that_file_is_its_heights_above_the_middle() -> None:
    ground = read_ground(str(SAMPLES / "jacksboro_fault_dem.npz") + "@36.60,-84.25")
    raster = read_raster(SAMPLES / "jacksboro_fault_dem.npz")
    north_m, east_m = metres_per_degree(36.60)
    assert ground.height_at(0.0, 0.0) == 0.0
    for d_north, d_east in ((0.04, 0.03), (-0.06, -0.08)):
        # Resampling to square cells blurs by less than the bend of one cell: 3 m on slopes of this land.
        there = height_in(raster, 36.60 + d_north, -84.25 + d_east) - 513.0
        assert ground.height_at(d_north * north_m, d_east * east_m) == pytest.approx(float(there), abs=3.0)


def test_sea_file_with_longitudes_and_latitudes() -> None:
    """Source: matplotlib's topobathy.npz, shape and range in REFERENCES.md section 4."""
    raster = read_raster(SAMPLES / "topobathy.npz")
    assert raster.heights_m.shape == (91, 120)
    # Its latitudes are evenly spaced on a chart, not on the globe: rows are interpolated, peaks lose a little.
    assert raster.heights_m.min() == pytest.approx(-1437.0, abs=15.0)
    assert raster.heights_m.max() == pytest.approx(2205.0, abs=40.0)
    assert raster.north == pytest.approx(49.98418, abs=1e-4)
    assert raster.west == pytest.approx(234.0167, abs=1e-4)


def test_metres_per_degree_against_a_geodesy_package() -> None:
    """Source: pymap3d 3.2.0 (REFERENCES.md section 4): ENU of (45.01, 7.01, 1500) about (45, 7, 1000).

    Its east and north are 788.5163 and 1111.6292 m at 1500 m above the ellipsoid; scaled back to it
    by a / (a + 1500), within 0.02 % (the tangent plane's own bend and the parallels' convergence).
    """
    north, east = metres_per_degree(45.0)
    down = 6378137.0 / (6378137.0 + 1500.0)
    assert 0.01 * north == pytest.approx(1111.6292 * down, rel=2e-4)
    assert 0.01 * east == pytest.approx(788.5163 * down, rel=2.5e-4)


def test_esri_ascii_rows_start_in_the_north_and_corner_is_not_centre(tmp_path: Path) -> None:
    """Source: rasterio's AAIGrid values in REFERENCES.md section 4: first centre (500015, 5001485)."""
    heights = np.arange(50.0 * 60.0).reshape(50, 60)
    raster = read_raster(made_asc(tmp_path, heights))
    assert (raster.west, raster.north) == (500015.0, 5001485.0)
    assert np.array_equal(raster.heights_m, heights)
    assert not raster.degrees


@pytest.mark.parametrize("ending", ["asc", "tif", "hgt"])
def test_same_file_read_by_rasterio(tmp_path: Path, ending: str) -> None:
    rasterio = pytest.importorskip("rasterio")
    pytest.importorskip("tifffile")
    rng = np.random.default_rng(2)
    if ending == "hgt":
        heights = rng.integers(-20, 900, (1201, 1201)).astype(">i2")
        path = tmp_path / "N45E007.hgt"
        path.write_bytes(heights.tobytes())
    elif ending == "asc":
        path = made_asc(tmp_path, rng.uniform(0.0, 900.0, (50, 60)).round(3))
    else:
        path = tmp_path / "made.tif"
        transform = rasterio.transform.from_origin(500000.0, 5001500.0, 30.0, 30.0)
        with rasterio.open(
            path,
            "w",
            driver="GTiff",
            height=50,
            width=60,
            count=1,
            dtype="float32",
            crs="EPSG:32632",
            transform=transform,
            nodata=-9999.0,
        ) as out:
            out.write(rng.uniform(0.0, 900.0, (50, 60)).astype("float32"), 1)
    ours = read_raster(path)
    with rasterio.open(path) as other:
        theirs = other.read(1)
        x, y = other.xy(0, 0)
    assert np.array_equal(ours.heights_m.astype("float32"), theirs.astype("float32"))
    assert (ours.west, ours.north) == (pytest.approx(x, abs=1e-9), pytest.approx(y, abs=1e-9))
    if ending == "hgt":  # REFERENCES.md section 4: lat 45.25 lon 7.5 is row 900, column 600
        assert height_in(ours, 45.25, 7.5) == theirs[900, 600]


def test_voids_count_only_near_the_display_centre(tmp_path: Path) -> None:
    heights = np.full((200, 200), 100.0)
    heights[3, 100] = -9999.0
    far = read_elevation(made_asc(tmp_path, heights), (5_000_000.0 + 1500.0, 500_000.0 + 3000.0))
    assert far.height_at(100.0, 0.0) == 0.0
    heights[100, 100] = -9999.0
    with pytest.raises(GroundError, match=r"made\.asc: \d+ heights within \d+ m of the display centre are void"):
        read_elevation(made_asc(tmp_path, heights))


HEAD = "ncols 3\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 1000\n"


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("", "no ncols in the header"),
        ("ncols 3\nncols 3\n", "line 2: read 'ncols 3', wanted one key and one number, each once"),
        ("ncols three\n", "line 1: read 'three', wanted a number"),
        (HEAD.replace("cellsize 1000\n", ""), "no cellsize in the header"),
        (HEAD.replace("xllcorner 0\n", ""), "wanted one of xllcorner, xllcenter"),
        (HEAD + "1 2 3\n4 5\n", "read 5 heights, wanted 2 rows of 3 = 6"),
        (HEAD + "1 2 3\n4 five 6\n", "line 7: read 'five', wanted a number"),
        (HEAD.replace("ncols 3", "ncols 99999999"), "wanted 1 to 60000000 cells"),
        (HEAD.replace("1000", "-5") + "1 2 3 4 5 6", "wanted positive sizes"),
        (HEAD + "-9999 -9999 -9999 -9999 -9999 -9999", "only voids"),
        (HEAD.replace("nrows 2", "nrows 1") + "1 2 3", "wanted at least 2 of 2"),
        (HEAD + "1 2 3 4 5 6", "wanted 1000 m"),
    ],
)
def test_a_bad_ascii_grid_is_named_with_its_fault(tmp_path: Path, text: str, fault: str) -> None:
    path = asc(tmp_path, text)
    with pytest.raises(GroundError) as caught:
        read_ground(str(path))
    assert str(path) in str(caught.value)
    assert fault in str(caught.value)


def test_other_bad_files_are_named_with_their_fault(tmp_path: Path) -> None:
    def fault(path: Path, words: str) -> None:
        with pytest.raises(GroundError) as caught:
            read_ground(str(path))
        assert str(path) in str(caught.value)
        assert words in str(caught.value)

    fault(tmp_path / "gone.asc", "can't be read (No such file or directory)")
    short = tmp_path / "N45E007.hgt"
    short.write_bytes(b"\0" * 100)
    fault(short, "read 100 bytes, wanted 2884802 (3 seconds) or 25934402 (1 second)")
    nameless = tmp_path / "tile.hgt"
    nameless.write_bytes(b"\0" * 2884802)
    fault(nameless, "wanted a name like N45E007.hgt")
    wrong = tmp_path / "wrong.npz"
    wrong.write_bytes(b"not an archive")
    fault(wrong, "not a plain NumPy archive")
    np.savez(tmp_path / "other.npz", heights=np.zeros((3, 3)))
    fault(tmp_path / "other.npz", "read heights, wanted a table of numbers called elevation or topo")
    np.savez(tmp_path / "bare.npz", elevation=np.zeros((3, 3)))
    fault(tmp_path / "bare.npz", "wanted longitude and latitude, or xmin, xmax, ymin, ymax")
    np.savez(tmp_path / "object.npz", elevation=np.array([[{}]], dtype=object))
    fault(tmp_path / "object.npz", "not a plain NumPy archive")
    pytest.importorskip("tifffile")
    text = tmp_path / "text.tif"
    text.write_text("no picture")
    fault(text, "not a TIFF that can be read")


def test_a_tiff_that_does_not_say_where_it_lies(tmp_path: Path) -> None:
    tifffile = pytest.importorskip("tifffile")
    path = tmp_path / "plain.tif"
    tifffile.imwrite(path, np.zeros((4, 4), "float32"))
    with pytest.raises(GroundError, match="does not say where it lies"):
        read_ground(str(path))


def test_a_place_that_is_no_place() -> None:
    path = SAMPLES / "jacksboro_fault_dem.npz"
    with pytest.raises(GroundError, match="wanted @north,east as two numbers"):
        read_ground(f"{path}@here")
    with pytest.raises(GroundError, match=r"the file covers 36\.4467 to 36\.7325 N, -84\.4133 to -84\.0783 E"):
        read_ground(f"{path}@12,13")


def test_bilinear_weight_of_a_corner_that_is_void() -> None:
    raster = Raster(np.array([[1.0, np.nan], [3.0, 4.0]]), 1.0, 0.0, 1.0, 1.0, False)
    assert height_in(raster, 0.5, 0.0) == 2.0
    assert np.isnan(height_in(raster, 0.5, 0.5))
    assert np.isnan(height_in(raster, 2.0, 0.0))
