"""Ground heights against a plane and SciPy's interpolator."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import RegularGridInterpolator

from terrain.ground import Ground, GroundError, ground_names, read_ground


def test_a_plane_is_exact_and_the_edge_goes_on() -> None:
    n, e = np.meshgrid(np.arange(4) * 10.0, np.arange(5) * 10.0, indexing="ij")
    ground = Ground("plane", 2.0 + 0.3 * n - 0.1 * e, 0.0, 0.0, 10.0)
    assert ground.height_at(17.0, 23.0) == pytest.approx(2.0 + 5.1 - 2.3, rel=1e-14)
    assert ground.height_at(-50.0, 0.0) == pytest.approx(2.0)


def test_bilinear_equals_scipy_regular_grid_interpolator() -> None:
    ground = read_ground("hills", 3)
    axis = ground.origin_n_m + ground.spacing_m * np.arange(ground.heights_m.shape[0])
    rng = np.random.default_rng(1)
    at = rng.uniform(-9000.0, 9000.0, (200, 2))
    outside = RegularGridInterpolator((axis, axis), ground.heights_m)(at)
    assert np.allclose(ground.height_at(at[:, 0], at[:, 1]), outside, rtol=1e-10, atol=1e-9)
    assert np.max(ground.heights_m) > 100.0


@pytest.mark.parametrize("name", ground_names())
def test_a_land_is_its_seed_and_level_at_the_display_centre(name: str) -> None:
    one, two = read_ground(name, 5), read_ground(name, 5)
    assert np.array_equal(one.heights_m, two.heights_m)
    assert one.height_at(0.0, 0.0) == 0.0


def test_an_unknown_land_names_the_known_ones() -> None:
    with pytest.raises(GroundError, match="read moon, wanted one of coast, dry_plain, farmland, heath, hills"):
        read_ground("moon")
