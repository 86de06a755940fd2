"""The view out of the seat: eye under the glass, nothing of the cockpit before a lead abeam."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from render.picture.canopy import DESIGNS, HALF_EYES_M, build_cockpit, core_half_m
from render.picture.shapes import Part, Shape, build_shape
from tests.picture.airframes_made import airframe

NAMES = ("jet", "turboprop", "piston")


@cache
def shape_of(name: str) -> Shape:
    """The whole aircraft, built once."""
    return build_shape(airframe(name))


@cache
def cockpit_of(name: str) -> tuple[Part, Part]:
    """Its cockpit, solid and clear, built once."""
    return build_cockpit(airframe(name))


def eye_of(name: str) -> np.ndarray:
    frame = airframe(name)
    return np.array([frame.eye_forward_m, 0.0, -frame.eye_up_m])


def ray_b(bearing_deg: float, elevation_deg: float) -> np.ndarray:
    a, e = np.radians([bearing_deg, elevation_deg])
    return np.array([np.cos(e) * np.cos(a), np.cos(e) * np.sin(a), -np.sin(e)])


def hits(part: Part, eye: np.ndarray, ray: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(distances, triangle indices) where a ray meets a mesh: Moeller and Trumbore (1997)."""
    tris = part.mesh.faces.reshape(-1, 4)[:, 1:]
    corners = np.asarray(part.mesh.points, float)[tris]
    e1, e2 = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    p = np.cross(ray, e2)
    det = np.einsum("ij,ij->i", e1, p)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        s = eye - corners[:, 0]
        u = np.einsum("ij,ij->i", s, p) / det
        q = np.cross(s, e1)
        v = q @ ray / det
        t = np.einsum("ij,ij->i", e2, q) / det
        met = (np.abs(det) > 1e-14) & (u >= 0) & (v >= 0) & (u + v <= 1) & (t > 0)
    return t[met], np.flatnonzero(met)


ABEAM = [(side * b, e) for side in (-1, 1) for b in range(60, 101, 5) for e in (-15, -10, -5, 0, 5, 10, 15)]


@pytest.mark.parametrize("name", NAMES)
def test_nothing_of_the_cockpit_hides_a_lead_abeam(name: str) -> None:
    solid, clear = cockpit_of(name)
    eye = eye_of(name)
    for bearing, elevation in ABEAM:
        ray = ray_b(bearing, elevation)
        assert len(hits(solid, eye, ray)[0]) == 0, (bearing, elevation)
        _, met = hits(clear, eye, ray)
        alpha = clear.mesh.point_data["colour"][clear.mesh.faces.reshape(-1, 4)[met, 1:], 3]
        assert np.all(alpha <= 60), (bearing, elevation)


@pytest.mark.parametrize("name", NAMES)
def test_nothing_of_the_own_aircraft_hides_a_lead_level_or_above(name: str) -> None:
    # The own wing may be seen below a lead, never before him down to 8 deg below the eye.
    parts = [p for p in shape_of(name).parts if p.own_view and p.name != "propeller"]
    eye = eye_of(name)
    for bearing, elevation in ABEAM:
        if elevation >= -8:
            ray = ray_b(bearing, elevation)
            assert all(len(hits(p, eye, ray)[0]) == 0 for p in parts), (bearing, elevation)


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("side", [-1, 1])
def test_looking_abeam_shows_rail_and_own_wing_tip(name: str, side: int) -> None:
    # In a 75 deg picture of 16:9 looking 85 deg: half 37.5 deg across, 23.3 deg down.
    parts = shape_of(name).parts
    solid, _ = cockpit_of(name)
    eye = eye_of(name)
    look, up = ray_b(85.0 * side, 0.0), np.array([0.0, 0.0, -1.0])
    right = np.cross(look, up)

    def inside(points: np.ndarray) -> np.ndarray:
        offset = points - eye
        ahead = offset @ look
        return (ahead > 0.1) & (np.abs(offset @ right) < np.tan(np.radians(37.5)) * ahead) & (
            np.abs(offset @ up) < np.tan(np.radians(37.5)) * 9 / 16 * ahead
        )

    assert inside(np.asarray(solid.mesh.points, float)).sum() > 20
    hull = np.asarray(next(p for p in parts if p.name == "hull").mesh.points, float)
    tip = hull[hull[:, 1] * side > 0.97 * airframe(name).wing_span_m / 2]
    seen = tip[inside(tip)]
    assert len(seen) > 10
    # And the rail leaves it free.
    free = [len(hits(solid, eye, (p - eye) / np.linalg.norm(p - eye))[0]) == 0 for p in seen[::3]]
    assert np.mean(free) > 0.8


@pytest.mark.parametrize("name", NAMES)
def test_eye_is_under_the_glass_with_room_for_a_helmet(name: str) -> None:
    eye = eye_of(name)
    shape = shape_of(name)
    above = hits(shape.part("glass"), eye, np.array([0.0, 0.0, -1.0]))[0]
    # From the eye to the crown of the helmet: about 0.16 m.
    assert len(above) == 1 and 0.18 < above[0] < 0.6
    for side in (-1, 1):
        assert len(hits(shape.part("glass"), eye, np.array([0.0, side * 1.0, 0.0]))[0]) == 1
    assert len(hits(shape.part("hull"), eye, np.array([0.0, 0.0, -1.0]))[0]) == 0


@pytest.mark.parametrize("name", NAMES)
def test_head_stays_under_the_glass_when_it_turns(name: str) -> None:
    lid, place = DESIGNS[name](airframe(name)).lid, DESIGNS[name](airframe(name)).place
    points = np.asarray(shape_of(name).part("head").mesh.points, float)
    neck = points.mean(axis=0)
    reach = np.hypot(*(points[:, :2] - neck[:2]).T)
    for turn in np.linspace(0, 2 * np.pi, 24, endpoint=False):
        at = np.stack([neck[0] + reach * np.cos(turn), neck[1] + reach * np.sin(turn), points[:, 2]], -1)
        design = (at - place.point((0.0, 0.0, 0.0))) / np.array([place.length, place.span, place.length])
        inside = design[:, 2] < lid.sill_z(design[:, 0])
        assert np.all(design[inside, 2] > lid.skin_z(design[inside, 0], design[inside, 1]))


def test_bow_core_is_what_neither_eye_sees_past() -> None:
    # Two eyes 62 mm apart behind a 100 mm bow: 38 mm hidden from both.
    assert 2 * core_half_m(0.100) == pytest.approx(0.100 - 2 * HALF_EYES_M)
    assert core_half_m(0.05) == pytest.approx(0.008)


@pytest.mark.parametrize("name", NAMES)
def test_cockpit_parts(name: str) -> None:
    solid, clear = cockpit_of(name)
    assert solid.own_view and clear.own_view and not clear.lit
    assert clear.mesh.point_data["colour"].shape[1] == 4
    assert solid.mesh.n_cells + clear.mesh.n_cells < 10_000
