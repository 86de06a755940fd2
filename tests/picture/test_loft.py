"""Lofts and cuts against closed forms of geometry."""

from __future__ import annotations

import numpy as np
import pytest

from render.picture.loft import Surf, merge, mirrored
from render.picture.paint import cut, divided, faces, line, paint, patch, station
from render.picture.shapes_sections import Panel, airfoil, body, box, ellipsoid

RED, BLUE = (200, 10, 10), (10, 10, 200)


def areas(surf: Surf) -> np.ndarray:
    a, b, c = (surf.points[surf.tris[:, i]] for i in range(3))
    return np.linalg.norm(np.cross(b - a, c - a), axis=1) / 2


def coloured(surf: Surf, colour: tuple[int, int, int]) -> float:
    return float(areas(surf)[(surf.colour == np.array(colour)).all(axis=1)].sum())


@pytest.fixture(scope="module")
def ball() -> Surf:
    return ellipsoid((0.0, 0.0, 0.0), (1.0, 1.0, 1.0), RED, 60, 120)


def test_ellipsoid_volume() -> None:
    # 4/3 pi a b c.
    assert ellipsoid((3, 1, -2), (1.0, 0.5, 0.3), RED, 50, 90).volume_m3() == pytest.approx(
        4 / 3 * np.pi * 0.15, rel=5e-3
    )


def test_box_volume() -> None:
    assert box((0, 0, 0), (2, 3, 4), RED, lean=0.3).volume_m3() == pytest.approx(24.0)


def test_superellipse_of_exponent_two_is_an_ellipse() -> None:
    # A tube of constant half axes 0.5 and 0.4, 2 long: pi a b L.
    tube = body([(2.0, 0.5, -0.4, 0.4, 0.0, 2.0), (1.0, 0.5, -0.4, 0.4, 0.0, 2.0), (0.0, 0.5, -0.4, 0.4, 0.0, 2.0)])
    assert tube.loft(np.linspace(2, 0, 5), 90, RED).volume_m3() == pytest.approx(np.pi * 0.2 * 2, rel=3e-3)
    assert tube.top_z(np.array(1.0), np.array(0.3)) == pytest.approx(-0.4 * 0.8)


@pytest.mark.parametrize(("chord_part", "half"), [(0.1, 0.04683), (0.3, 0.06002), (0.5, 0.05294)])
def test_airfoil_has_the_published_ordinates(chord_part: float, half: float) -> None:
    # NACA 0012 ordinates, Abbott and von Doenhoff, appendix III (from memory); ours closes the trailing edge.
    contour = airfoil(0.12, 200)
    upper = contour[:200][::-1]
    assert np.interp(chord_part, upper[:, 0], upper[:, 1]) == pytest.approx(half, abs=1.5e-4)


def test_wing_volume() -> None:
    # Area of a four-digit section: 0.6851 t c^2 for the open tail (integral of Eq. y_t); closed tail 0.6809 (by parts).
    part = np.array([0.2969 / 1.5, -0.1260 / 2, -0.3516 / 3, 0.2843 / 4, -0.1036 / 5])
    wing = Panel(np.array([(0.0, 0.0, 0.0, 2.0, 0.12), (3.0, 0.0, 0.0, 2.0, 0.12)])).loft([0.0, 3.0], RED, points=80)
    assert wing.volume_m3() == pytest.approx(2 * 5 * part.sum() * 0.12 * 2.0**2 * 3.0, rel=3e-3)


def test_cut_keeps_surface_and_volume(ball: Surf) -> None:
    parted = cut(ball, lambda p: p[:, 0] * p[:, 1] + 0.2 - p[:, 2])
    assert len(parted.tris) > len(ball.tris)
    assert areas(parted).sum() == pytest.approx(areas(ball).sum(), rel=1e-9)
    assert parted.volume_m3() == pytest.approx(ball.volume_m3(), rel=1e-9)


def test_painted_cap_has_the_area_of_a_cap(ball: Surf) -> None:
    # Archimedes: 2 pi R h.
    assert coloured(paint(ball, station(-0.4, (1.0, 0.0, 0.0)), BLUE), BLUE) == pytest.approx(2 * np.pi * 0.6, rel=2e-3)


def test_line_has_the_area_of_a_zone(ball: Surf) -> None:
    # A zone of height w: 2 pi R w, wherever it lies; far narrower than the triangles.
    assert coloured(line(ball, station(0.33), 0.004, BLUE), BLUE) == pytest.approx(2 * np.pi * 0.004, rel=5e-3)


def test_patch_is_bounded_by_all_its_edges(ball: Surf) -> None:
    # One eighth of the sphere.
    eighth = patch(ball, [station(0.0, n) for n in ((1.0, 0, 0), (0, 1.0, 0), (0, 0, 1.0))], BLUE)
    assert coloured(eighth, BLUE) == pytest.approx(np.pi / 2, rel=3e-3)


def test_only_one_colour_is_painted_over(ball: Surf) -> None:
    half = paint(ball, station(0.0), BLUE)
    both = paint(half, station(0.5), (1, 2, 3), only=BLUE)
    assert coloured(both, RED) == pytest.approx(coloured(half, RED), rel=1e-9)
    assert coloured(both, BLUE) == 0.0


def test_divided_pieces_make_the_whole(ball: Surf) -> None:
    near, far = divided(ball, station(0.2))
    assert near.centroids()[:, 0].max() < 0.2 < far.centroids()[:, 0].min() + 1e-6
    assert merge([near, far]).volume_m3() == pytest.approx(ball.volume_m3(), rel=1e-9)


def test_mirror_keeps_the_outside_out() -> None:
    left = mirrored(box((0, 1, 0), (1, 2, 1), RED))
    assert left.volume_m3() == pytest.approx(1.0)
    assert left.points[:, 1].max() == pytest.approx(-1.0)
    side = faces(left, np.abs(left.centroids()[:, 1] + 2.0) < 1e-9)
    assert side.normals[:, 1] == pytest.approx(-1.0)
