"""Really rendered frames against the analytic projection: points, horizon, true sizes, sameness, clean closing."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator

import numpy as np
import pytest
from vtkmodules.vtkFiltersSources import vtkSphereSource
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper

from render.frames import quat_from_euler, quat_multiply, quat_rotate
from render.picture import views
from render.picture.axes import to_display
from render.picture.camera import Camera, quat_from_axes
from render.picture.instant import Instant
from render.picture.panini import Panini
from render.picture.stage import Stage
from scenes.model import Day
from terrain.ground import read_ground
from tests.flight.made import invented_jet

pytestmark = pytest.mark.draws

SIZE = (800, 450)
MAGENTA = np.array([255, 0, 255])
LEVEL = quat_from_axes(np.array([[0.0, 1.0, 0.0], [0.0, 0.0, 1.0], [1.0, 0.0, 0.0]]))  # looks north, upright
DOWNWARD = quat_from_axes(np.array([[0.0, 1.0, 0.0], [-1.0, 0.0, 0.0], [0.0, 0.0, 1.0]]))  # from above, north up
NOBODY = Instant(0.0, np.zeros((0, 3)), np.zeros((0, 4)), np.zeros(0), np.zeros(0), ())


def formation(quat: np.ndarray, *places_b_m: tuple[float, float, float], height_m: float = 900.0) -> Instant:
    """Aircraft at places in the axes of the first one."""
    lead = np.array([300.0, 200.0, -height_m])
    pos = np.stack([lead + quat_rotate(quat, np.array(p)) for p in places_b_m])
    zero = np.zeros(len(pos))
    return Instant(0.0, pos, np.stack([quat] * len(pos)), zero, zero, (True,) * len(pos))


@pytest.fixture(scope="module")
def land() -> Iterator[Stage]:
    with Stage((), read_ground("heath", 1), Day(), SIZE) as stage:
        yield stage


@pytest.fixture(scope="module")
def pair() -> Iterator[Stage]:
    """Lead and a wing pilot, from the wing's seat; no smoothing, so that masks are exact."""
    with Stage((invented_jet(),) * 2, read_ground("heath", 1), Day(), SIZE, own=1, smooth=False) as stage:
        yield stage


def sphere(pos_e_m: np.ndarray, radius_m: float) -> vtkActor:
    """A small magenta ball that no light changes."""
    source = vtkSphereSource()
    source.SetRadius(radius_m)
    source.SetThetaResolution(24)
    source.SetPhiResolution(24)
    mapper = vtkPolyDataMapper()
    mapper.SetInputConnection(source.GetOutputPort())
    actor = vtkActor()
    actor.SetMapper(mapper)
    actor.SetPosition(*to_display(pos_e_m))
    actor.GetProperty().SetLighting(False)
    actor.GetProperty().SetColor(1.0, 0.0, 1.0)
    return actor


def drawn_centre(stage: Stage, camera: Camera, actor: vtkActor, wide: Panini | None = None) -> np.ndarray:
    """Where a magenta ball's pixels have their middle."""
    stage.renderer.AddActor(actor)
    frame = stage.draw(NOBODY, camera)
    stage.renderer.RemoveActor(actor)
    if wide is not None:
        frame = wide.remap(frame)
    rows, columns = np.nonzero(np.all(np.abs(frame.astype(int) - MAGENTA) < 40, axis=2))
    assert len(rows) >= 9, "the ball is not in the picture"
    return np.array([columns.mean() + 0.5, rows.mean() + 0.5])


def keyed(stage: Stage, instant: Instant, camera: Camera, only: tuple[int, ...]) -> np.ndarray:
    """Which pixels some of the aircraft cover, bool (h, w): drawn alone before a magenta background."""
    hidden = [actor for actor in stage.land_actors if actor.GetVisibility()]
    for actor in hidden:
        actor.SetVisibility(False)
    see, stage._land.set_eye = stage._land.set_eye, lambda *_: None  # it would bring near woods back
    stage.renderer.SetBackground(1.0, 0.0, 1.0)
    shown = Instant(instant.time_s, instant.pos_e_m[list(only)], instant.quat_eb[list(only)],
                    instant.stabilator_rad[list(only)], instant.aileron_rad[list(only)], (True,) * len(only))
    frame = stage.draw(shown, camera).copy()
    stage._land.set_eye = see
    for actor in hidden:
        actor.SetVisibility(True)
    return np.any(frame != MAGENTA.astype(np.uint8), axis=2)


def box(mask: np.ndarray) -> tuple[float, float, float, float]:
    """Left, top, right, bottom of a mask, px."""
    rows, columns = np.nonzero(mask)
    return float(columns.min()), float(rows.min()), float(columns.max() + 1), float(rows.max() + 1)


@pytest.mark.parametrize("attitude", [(0.0, 0.0, 0.0), (2.1, 0.4, 0.6), (5.0, -0.9, 2.8)])
def test_known_points_land_within_a_pixel_of_the_pinhole_projection(
    land: Stage, attitude: tuple[float, float, float]
) -> None:
    quat = quat_multiply(quat_from_euler(*attitude), LEVEL)
    camera = Camera(np.array([5000.0, -3000.0, -1200.0]), quat, np.radians(75.0), *SIZE)
    for x, y in ((0.5, 0.5), (0.06, 0.08), (0.94, 0.1), (0.1, 0.9), (0.92, 0.9), (0.3, 0.62), (0.75, 0.2)):
        ray = camera.directions_e(np.array([x * SIZE[0], y * SIZE[1]]))
        point = camera.pos_e_m + 40.0 * ray
        found = drawn_centre(land, camera, sphere(point, 0.25))
        assert np.abs(found - camera.project(point)).max() < 1.0


def test_panini_puts_points_where_it_says_within_a_pixel() -> None:
    wide = Panini(np.radians(120.0), SIZE)
    small = Camera(np.array([0.0, 0.0, -1200.0]), quat_multiply(quat_from_euler(1.0, 0.2, 0.5), LEVEL), 1.0, *SIZE)
    camera = wide.source_camera(small)
    with Stage((), read_ground("heath", 1), Day(), wide.source_px) as stage:
        for deg, up in ((0.0, 0.0), (57.0, 0.0), (-57.0, 0.25), (40.0, -0.4), (-30.0, 0.3), (57.0, -0.35)):
            phi = np.radians(deg)
            ray_c = np.array([np.sin(phi), up, np.cos(phi)])
            point = camera.pos_e_m + 40.0 * quat_rotate(camera.quat_ec, ray_c)
            found = drawn_centre(stage, camera, sphere(point, 0.35), wide)
            assert np.abs(found - wide.project(camera, point)).max() < 1.0


@pytest.mark.parametrize("bank_deg", [0.0, 30.0, -70.0])
@pytest.mark.parametrize("height_m", [30.0, 1500.0])
def test_the_horizon_stands_at_the_dip_of_the_lands_edge(land: Stage, height_m: float, bank_deg: float) -> None:
    # Flat land whose edge lies north of the eye at a known distance R: its line stands below the true horizon by
    # atan(h / R) in the middle, and is straight. (Haze hides the edge itself: the sky is taken away here.)
    bank = np.radians(bank_deg)
    camera = Camera(
        np.array([0.0, 0.0, -height_m]), quat_multiply(quat_from_euler(0.0, 0.0, bank), LEVEL), np.radians(60.0), *SIZE
    )
    skies = [actor for actor in land.land_actors if actor.GetBounds()[5] > 5e3]  # domes: they reach far up
    for sky in skies:
        sky.SetVisibility(False)
    land.renderer.SetBackground(1.0, 0.0, 1.0)
    frame = land.draw(NOBODY, camera).astype(int)
    for sky in skies:
        sky.SetVisibility(True)
    is_sky = np.all(frame == MAGENTA, axis=2)
    reach_m = 60_000.0
    columns, rows = np.meshgrid(np.arange(SIZE[0]) + 0.5, np.arange(SIZE[1]) + 0.5)
    ray = camera.directions_e(np.stack([columns, rows], axis=-1))
    # px from the predicted line, positive on the ground's side: along the picture's normal to the horizon
    below = (ray[..., 2] / np.hypot(ray[..., 0], 1e-12) - height_m / reach_m) * camera.focal_px
    assert np.all(is_sky[below < -1.0]) and not np.any(is_sky[below > 1.0])
    assert 0.1 < np.mean(is_sky) < 0.9


def test_the_drawn_lead_has_its_true_span_and_length(pair: Stage) -> None:
    # from 90 m straight above, all of him but the fin is nearly at one depth
    jet = invented_jet()
    instant = formation(quat_from_euler(0.0, 0.0, 0.0), (0.0, 0.0, 0.0))
    camera = Camera(instant.pos_e_m[0] + np.array([0.0, 0.0, -90.0]), DOWNWARD, np.radians(18.0), *SIZE)
    left, top, right, bottom = box(keyed(pair, instant, camera, (0,)))
    assert right - left == pytest.approx(camera.focal_px * jet.wing_span_m / 90.0, rel=0.01)
    assert bottom - top == pytest.approx(camera.focal_px * jet.length_m / 90.0, rel=0.015)
    assert (left + right) / 2 == pytest.approx(SIZE[0] / 2, abs=1.0)


def test_the_lead_looked_at_is_where_the_camera_says(pair: Stage) -> None:
    quat = quat_from_euler(1.4, -0.8, 0.05)
    instant = formation(quat, (0.0, 0.0, 0.0), (-6.0, 14.0, 1.0))
    frames = (invented_jet(),) * 2
    seen = views.sightline(instant, frames, 1, "lead")
    camera = views.seat_camera(instant, frames, 1, seen.axis_b, np.radians(75.0), SIZE)
    mask = keyed(pair, instant, camera, (0,))
    x, y = camera.project(views.eye_of(instant, frames, 0))
    assert mask[int(y), int(x)]  # the lead's own eye is on the lead
    # his nose tip and tail end, from the shape itself, are the mask's ends
    points = pair.craft_points_e_m(0)
    px = np.clip(camera.project(points), 0.0, SIZE)
    left, top, right, bottom = box(mask)
    assert px[:, 0].min() == pytest.approx(left, abs=1.5) and px[:, 0].max() == pytest.approx(right, abs=1.5)
    assert px[:, 1].min() == pytest.approx(top, abs=1.5) and px[:, 1].max() == pytest.approx(bottom, abs=1.5)


def test_a_frame_is_the_same_twice_and_from_another_stage() -> None:
    instant = formation(quat_from_euler(1.4, -0.8, 0.0), (0.0, 0.0, 0.0), (0.0, 14.0, 0.0))
    frames = (invented_jet(),) * 2
    seen = views.sightline(instant, frames, 1, "lead")
    camera = views.seat_camera(instant, frames, 1, seen.axis_b, np.radians(75.0), SIZE)
    other = views.seat_camera(instant, frames, 1, views.direction(0.5, 0.1), np.radians(75.0), SIZE)
    drawn = []
    for _ in range(2):
        with Stage(frames, read_ground("heath", 1), Day(), SIZE, own=1) as stage:
            drawn.append(stage.draw(instant, camera).copy())
            stage.draw(instant, other)
            drawn.append(stage.draw(instant, camera).copy())
    assert all(np.array_equal(drawn[0], frame) for frame in drawn[1:])


def test_a_closed_stage_draws_no_more_and_leaves_no_handles() -> None:
    with Stage((), read_ground("heath", 1), Day(), (64, 36)) as stage:
        stage.draw(NOBODY, Camera(np.array([0.0, 0.0, -50.0]), LEVEL, 1.0, 64, 36))
    with pytest.raises(ValueError, match="closed"):
        stage.draw(NOBODY, Camera(np.array([0.0, 0.0, -50.0]), LEVEL, 1.0, 64, 36))
    stage.close()  # twice does no harm
    if not sys.platform.startswith("linux"):
        return
    before = len(os.listdir("/proc/self/fd"))
    for _ in range(3):
        with Stage((), read_ground("heath", 1), Day(), (64, 36)) as stage:
            stage.draw(NOBODY, Camera(np.array([0.0, 0.0, -50.0]), LEVEL, 1.0, 64, 36))
    assert len(os.listdir("/proc/self/fd")) <= before


def test_a_camera_of_another_size_is_refused(land: Stage) -> None:
    with pytest.raises(ValueError, match="stage of"):
        land.draw(NOBODY, Camera(np.zeros(3), LEVEL, 1.0, 64, 36))
