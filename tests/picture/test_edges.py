"""The edge search against true area coverage, from pictures drawn many times finer."""

from __future__ import annotations

import numpy as np
import pytest
from PIL import Image, ImageDraw

from render.picture.edges import SEARCH_PX, smooth_edges

FINE = 8
SKY, WHITE = (70, 100, 170), (240, 236, 222)


def drawn(corners: list[tuple[float, float]], size: tuple[int, int] = (160, 90)) -> tuple[np.ndarray, np.ndarray]:
    """A polygon as hard pixels (one sample in the middle of each) and by its true cover of each pixel."""
    fine = Image.new("RGB", (size[0] * FINE, size[1] * FINE), SKY)
    ImageDraw.Draw(fine).polygon([(x * FINE, y * FINE) for x, y in corners], fill=WHITE)
    hard = np.asarray(fine)[FINE // 2 :: FINE, FINE // 2 :: FINE].copy()
    return hard, np.asarray(fine.resize(size, Image.Resampling.BOX)).copy()


def error(frame: np.ndarray, true: np.ndarray) -> float:
    return float(np.sqrt(np.mean((frame.astype(float) - true) ** 2)))


@pytest.mark.parametrize(
    "corners",
    [
        [(10.3, 12.1), (150.2, 21.4), (148.0, 60.3), (12.0, 70.7)],  # a fuselage: long flat edges
        [(30.2, 80.1), (55.6, 10.3), (80.4, 12.2), (95.1, 78.5)],  # a fin: steep edges
        [(20.0, 45.0), (80.0, 11.0), (140.0, 46.0), (80.0, 79.0)],  # a wing: about 30 deg
    ],
)
def test_smoothing_comes_much_nearer_to_true_coverage(corners: list[tuple[float, float]]) -> None:
    hard, true = drawn(corners)
    smooth = hard.copy()
    assert smooth_edges(smooth) > 50
    assert error(smooth, true) < 0.55 * error(hard, true)


def test_a_flat_picture_stays_and_an_upright_box_changes_only_near_its_corners() -> None:
    frame = np.full((60, 120, 3), 90, np.uint8)
    assert smooth_edges(frame) == 0
    frame[20:40, 10:110] = 230
    before = frame.copy()
    smooth_edges(frame)
    # how an edge goes on beyond its end can't be told from a very flat slope within the search
    changed = np.argwhere(np.any(frame != before, axis=2))
    assert len(changed) < 4 * (SEARCH_PX + 10)
    assert all(y in (20, 39) or x in (10, 109) for y, x in changed)
    assert all(min(x - 10, 109 - x) <= SEARCH_PX and min(y - 20, 39 - y) <= SEARCH_PX for y, x in changed)


def test_a_picture_turned_about_is_smoothed_the_same() -> None:
    hard, _ = drawn([(30.2, 80.1), (55.6, 10.3), (80.4, 12.2), (95.1, 78.5)])
    turned = np.ascontiguousarray(hard.transpose(1, 0, 2))
    smooth_edges(hard)
    smooth_edges(turned)
    differ = np.any(hard != turned.transpose(1, 0, 2), axis=2)
    assert np.mean(differ) < 0.002  # ties between lying and standing edges fall one way
