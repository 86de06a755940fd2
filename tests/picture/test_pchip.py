"""The shapes' curve against scipy's own PCHIP."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from render.picture.pchip import Curve


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("width", [(), (5,)])
def test_the_curve_is_scipys_inside_and_beyond(seed: int, width: tuple[int, ...]) -> None:
    rng = np.random.default_rng(seed)
    x = np.cumsum(rng.uniform(0.05, 2.0, 3 + seed))
    y = np.round(rng.normal(size=(len(x), *width)), 1)  # rounded: flat pieces occur too
    at = rng.uniform(x[0] - 1.0, x[-1] + 1.0, (7, 9))
    assert np.abs(Curve(x, y)(at) - PchipInterpolator(x, y, axis=0)(at)).max() < 1e-10
    assert np.abs(Curve(x, y)(x) - y).max() < 1e-12
