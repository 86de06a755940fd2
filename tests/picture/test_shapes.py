"""The drawn aircraft: size, sense of the moving parts, closed and outward surfaces, silhouettes that differ."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from render.picture.shadow import cast_samples
from render.picture.shapes import Part, Shape, build_shape, part_matrix
from tests.picture.airframes_made import airframe

NAMES = ("jet", "turboprop", "piston")


@pytest.fixture(scope="module")
def shapes() -> dict[str, Shape]:
    return {name: build_shape(airframe(name)) for name in NAMES}


def triangles(part: Part) -> np.ndarray:
    """Corners (M, 3, 3)."""
    return np.asarray(part.mesh.points, float)[part.mesh.faces.reshape(-1, 4)[:, 1:]]


def turned(part: Part, angle_rad: float) -> np.ndarray:
    matrix = part_matrix(part, angle_rad)
    return np.asarray(part.mesh.points, float) @ matrix[:3, :3].T + matrix[:3, 3]


def solid(shape: Shape) -> list[Part]:
    return [p for p in shape.parts if p.opacity == 1.0 and p.name != "propeller"]


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("changed", [{}, {"length_m": 14.3, "wing_span_m": 8.8, "eye_forward_m": 0.3, "eye_up_m": 1.1}])
def test_length_and_span_are_the_airframes(name: str, changed: dict[str, float]) -> None:
    frame = airframe(name, **changed)
    points = np.concatenate([np.asarray(p.mesh.points, float) for p in solid(build_shape(frame))])
    assert np.ptp(points[:, 0]) == pytest.approx(frame.length_m, rel=0.01)
    assert np.ptp(points[:, 1]) == pytest.approx(frame.wing_span_m, rel=0.01)


@pytest.mark.parametrize("name", NAMES)
def test_front_pilots_eyes_are_the_airframes_eye(name: str, shapes: dict[str, Shape]) -> None:
    # The visor stands a few centimetres ahead of the eye, the helmet all round it.
    frame = airframe(name)
    points = np.asarray(shapes[name].part("head").mesh.points, float)
    eye = np.array([frame.eye_forward_m, 0.0, -frame.eye_up_m])
    assert np.all(points.min(axis=0) < eye) and np.all(points.max(axis=0) > eye)
    assert np.linalg.norm(points - eye, axis=1).max() < 0.40
    assert np.hypot(*(points[:, 1:].mean(axis=0) - eye[1:])) < 0.12


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("moved_by", ["stabilator", "aileron_left", "aileron_right"])
def test_positive_angle_puts_the_trailing_edge_down(name: str, moved_by: str, shapes: dict[str, Shape]) -> None:
    part = next(p for p in shapes[name].parts if p.moved_by == moved_by)
    assert part.hinge_b_m is not None and part.axis_b is not None
    before, after = np.asarray(part.mesh.points, float), turned(part, np.radians(10.0))
    # Distance behind the hinge line, level with the ground: x falls aft.
    along = (before - part.hinge_b_m) @ part.axis_b
    behind = -(before - part.hinge_b_m - along[:, None] * part.axis_b)[:, 0]
    aft = behind > 0.5 * behind.max()
    assert np.all((after - before)[aft, 2] > 0.0)
    # Closed form: the aftmost point sinks by its distance times the sine, its own height apart.
    k = int(np.argmax(behind))
    across = np.cross(part.axis_b, before[k] - part.hinge_b_m)
    expected = np.sin(np.radians(10.0)) * across + (1 - np.cos(np.radians(10.0))) * np.cross(part.axis_b, across)
    assert after[k] - before[k] == pytest.approx(expected, abs=1e-6)
    assert after[k, 2] - before[k, 2] == pytest.approx(behind[k] * np.sin(np.radians(10.0)), rel=0.15)


@pytest.mark.parametrize("name", NAMES)
def test_stabilator_turns_both_halves_about_one_cross_axis(name: str, shapes: dict[str, Shape]) -> None:
    part = shapes[name].part("stabilator")
    assert part.axis_b == pytest.approx([0.0, 1.0, 0.0])
    points = np.asarray(part.mesh.points, float)
    assert points[:, 1].max() == pytest.approx(-points[:, 1].min(), rel=1e-6)
    assert points[:, 0].min() < part.hinge_b_m[0] < points[:, 0].max()  # type: ignore[index]


@pytest.mark.parametrize("name", NAMES)
def test_stabilator_root_has_a_stripe_that_stands_out(name: str, shapes: dict[str, Shape]) -> None:
    # Luminance of ITU-R BT.709 (0.2126 R + 0.7152 G + 0.0722 B): the stripe against its neighbourhood.
    part = shapes[name].part("stabilator")
    y = np.abs(np.asarray(part.mesh.points, float)[:, 1])
    light = part.mesh.point_data["colour"].astype(float) @ [0.2126, 0.7152, 0.0722]
    root = y < y.min() + 0.25 * np.ptp(y)
    assert light[root].min() < 40 and light[root].max() > 100


@pytest.mark.parametrize("name", NAMES)
def test_head_turns_right_for_a_positive_angle(name: str, shapes: dict[str, Shape]) -> None:
    part = shapes[name].part("head")
    front = int(np.argmax(np.asarray(part.mesh.points)[:, 0]))
    assert turned(part, np.radians(30.0))[front, 1] > 0.05
    assert not part.own_view


@pytest.mark.parametrize("name", NAMES)
def test_moving_parts_are_closed_and_face_outward(name: str, shapes: dict[str, Shape]) -> None:
    # A closed surface's area vectors add up to nothing, and its volume (divergence theorem) is positive.
    for part in solid(shapes[name]):
        if part.moved_by is None:
            continue
        corners = triangles(part)
        area = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) / 2
        assert np.linalg.norm(area.sum(axis=0)) < 1e-3 * np.linalg.norm(area, axis=1).sum(), part.name
        volume = np.einsum("ij,ij->", corners[:, 0] - corners.mean(axis=(0, 1)), area) / 3
        assert volume > 0.0, part.name


@pytest.mark.parametrize("name", NAMES)
def test_hull_faces_outward(name: str, shapes: dict[str, Shape]) -> None:
    corners = triangles(shapes[name].part("hull"))
    area = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) / 2
    assert np.einsum("ij,ij->", corners[:, 0], area) / 3 > 1.0
    # Outline after outline: the faces seen from a side lie on that side of the middle.
    for axis, sign in ((1, 1), (1, -1), (2, 1)):
        facing = area[:, axis] * sign > 0.7 * np.linalg.norm(area, axis=1)
        weight = np.linalg.norm(area, axis=1)
        middle = np.average(corners.mean(axis=1)[:, axis], weights=weight)
        assert sign * (np.average(corners.mean(axis=1)[facing, axis], weights=weight[facing]) - middle) > 0.0


@pytest.mark.parametrize("name", NAMES)
def test_winding_agrees_with_the_normals(name: str, shapes: dict[str, Shape]) -> None:
    for part in solid(shapes[name]):
        corners = triangles(part)
        area = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) / 2
        normal = np.asarray(part.mesh.point_data["Normals"], float)[part.mesh.faces.reshape(-1, 4)[:, 1:]].mean(axis=1)
        against = np.einsum("ij,ij->i", area, normal) < 0.0
        size = np.linalg.norm(area, axis=1)
        assert size[against].sum() < 1e-3 * size.sum(), part.name
        assert np.linalg.norm(part.mesh.point_data["Normals"], axis=1) == pytest.approx(1.0, abs=1e-3)


@pytest.mark.parametrize("name", NAMES)
def test_budget_of_parts_and_triangles(name: str, shapes: dict[str, Shape]) -> None:
    parts = shapes[name].parts
    assert len(parts) <= 8
    assert sum(p.mesh.n_cells for p in parts) <= 25_000
    assert {p.moved_by for p in parts} >= {None, "stabilator", "aileron_left", "aileron_right", "head"}
    assert ("propeller" in {p.moved_by for p in parts}) == (name != "jet")


@pytest.mark.parametrize("axes", [(0, 2), (0, 1)], ids=["side", "plan"])
def test_silhouettes_differ(axes: tuple[int, int], shapes: dict[str, Shape]) -> None:
    # Overlap over union of the outlines, brought to the same length and the same middle.
    masks = {}
    for name, shape in shapes.items():
        points = cast_samples(shape.parts, 0.06)[:, list(axes)]
        points = (points - (points.max(axis=0) + points.min(axis=0)) / 2) / np.ptp(points[:, 0])
        cells = np.floor((points + 0.75) / 1.5 * 120).astype(int)
        mask = np.zeros((120, 120), bool)
        mask[cells[:, 0], cells[:, 1]] = True
        masks[name] = mask
    for one, two in combinations(NAMES, 2):
        overlap = (masks[one] & masks[two]).sum() / (masks[one] | masks[two]).sum()
        assert overlap < 0.75, (one, two, overlap)


def test_fixed_part_does_not_move(shapes: dict[str, Shape]) -> None:
    assert np.array_equal(part_matrix(shapes["jet"].part("hull"), 0.3), np.eye(4))
