"""The smoke trail lies where the aircraft was, faces the eye, widens and thins with age."""

from __future__ import annotations

import numpy as np
import pytest

from render.frames import quat_from_euler
from render.picture.smoke import Smoke, SmokeLook

TIME = np.linspace(0.0, 20.0, 401)
SPEED = 120.0
TRACK = np.stack([SPEED * TIME, np.zeros_like(TIME), np.full_like(TIME, -200.0)], -1)
NORTH = np.tile(quat_from_euler(0.0, 0.0, 0.0), (len(TIME), 1))
EYE = np.array([900.0, 60.0, -200.0])


def laid(smoke: Smoke, now_s: float, **more: object) -> tuple[np.ndarray, np.ndarray]:
    assert smoke.update(now_s, TIME, TRACK, NORTH, EYE, **more)  # type: ignore[arg-type]
    points = np.asarray(smoke.mesh.points, float).reshape(-1, 5, 3)
    return points, smoke.mesh.point_data["colour"][:, 3].reshape(-1, 5).astype(float)


def test_starts_at_the_nozzle_and_follows_the_track() -> None:
    points, _ = laid(Smoke(np.array([-5.0, 0.0, 0.2])), 18.0)
    # Display axes: east, north, up.
    assert points[0, 2] == pytest.approx([0.0, SPEED * 18.0 - 5.0, 199.8], abs=1e-3)
    assert points[:, 2, 0] == pytest.approx(0.0, abs=1e-3)
    assert points[:, 2, 1].min() == pytest.approx(SPEED * (18.0 - SmokeLook().last_s) - 5.0, abs=1e-2)


def test_wind_carries_it() -> None:
    wind = np.array([0.0, 6.0, 0.0])
    points, _ = laid(Smoke(np.zeros(3)), 12.0, wind_e_mps=wind)
    age = 12.0 - points[:, 2, 1] / SPEED
    assert points[:, 2, 0] == pytest.approx(6.0 * age, abs=1e-2)


def test_ribbon_is_square_to_the_line_of_sight() -> None:
    points, _ = laid(Smoke(np.zeros(3)), 12.0)
    across = points[:, 4] - points[:, 0]
    eye_d = np.array([EYE[1], EYE[0], -EYE[2]])
    sight = points[:, 2] - eye_d
    cosine = np.einsum("ij,ij->i", across, sight) / np.linalg.norm(across, axis=1) / np.linalg.norm(sight, axis=1)
    assert np.abs(cosine).max() < 1e-3


def test_widens_and_thins_with_age() -> None:
    points, alpha = laid(Smoke(np.zeros(3)), 18.0)
    width = np.linalg.norm(points[:, 4] - points[:, 0], axis=1)
    assert width[0] == pytest.approx(2 * SmokeLook().start_m, rel=1e-3)
    assert np.all(np.diff(width) > -1e-3)
    assert np.all(np.diff(alpha[:, 2]) <= 0) and alpha[-1, 2] == 0
    assert np.all(alpha[:, [0, 4]] == 0)


def test_rows_stand_still_in_the_air() -> None:
    smoke = Smoke(np.zeros(3))
    first, _ = laid(smoke, 12.0)
    second, _ = laid(smoke, 12.03)
    # The whole-step rows of both frames are the same places.
    shared = set(np.round(first[2:-2, 2, 1], 2)) & set(np.round(second[2:-2, 2, 1], 2))
    assert len(shared) > 70


def test_none_before_it_is_switched_on_and_only_since() -> None:
    smoke = Smoke(np.zeros(3))
    assert not smoke.update(3.0, TIME, TRACK, NORTH, EYE, begin_s=3.0)
    points, alpha = laid(smoke, 5.0, begin_s=3.0)
    assert points[:, 2, 1].min() == pytest.approx(SPEED * 3.0, abs=1e-2)
    assert alpha[points[:, 2, 1] <= SPEED * 3.0 + 1e-2].max() == 0
    assert np.all(np.isfinite(points))


def test_mesh_keeps_its_size() -> None:
    smoke = Smoke(np.zeros(3))
    laid(smoke, 0.5)
    size = (smoke.mesh.n_points, smoke.mesh.n_cells)
    laid(smoke, 19.0)
    assert (smoke.mesh.n_points, smoke.mesh.n_cells) == size
    assert size[1] < 1000
