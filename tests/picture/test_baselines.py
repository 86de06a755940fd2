"""Small pictures of each land, seat, look and aircraft, kept; a change that nobody meant shows here.

Renew after looking at them: ``pytest tests/picture/test_baselines.py --update-baselines``. Another OpenGL rounds
otherwise, so elsewhere than on the renderer recorded beside them they are skipped. Failed pictures lie in
out/failed/ as drawn, as wanted, and their difference eight times enlarged.
"""

from __future__ import annotations

import warnings
from collections.abc import Callable
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from render.frames import quat_from_euler, quat_multiply
from render.output.stage_source import open_stage
from render.picture.camera import Camera
from render.picture.instant import Instant
from render.picture.probe import probe_drawing
from render.picture.stage import Stage
from render.types import Flight, Study
from scenes.model import Day
from terrain.cover import cover_of
from terrain.ground import ground_names, read_ground
from tests.output.made_up import made_up_study
from tests.picture.airframes_made import airframe
from tests.picture.test_stage import LEVEL, NOBODY

pytestmark = pytest.mark.draws

SIZE = (400, 225)
KEPT = Path(__file__).parent / "baseline"
FAILED = Path(__file__).parents[2] / "out" / "failed"
#: A pixel is off when a channel differs by more than OFF of 255. Of all pixels: a warning, a failure.
OFF, WARN_PART, FAIL_PART = 12, 0.0005, 0.01
#: Mean difference of a picture, levels of 255: a change of light or haze moves each pixel by little.
WARN_MEAN, FAIL_MEAN = 0.05, 1.0

Frame = np.ndarray


def land(name: str) -> Frame:
    """From 300 m over the border of the airfield, 15 deg down."""
    attitude = quat_multiply(quat_from_euler(0.35, np.radians(-15.0), 0.0), LEVEL)
    with Stage((), read_ground(name, 1), Day(), SIZE) as stage:
        return stage.draw(NOBODY, Camera(np.array([-900.0, -200.0, -300.0]), attitude, np.radians(75.0), *SIZE)).copy()


def wood() -> Frame:
    """From 70 m beside a wood of the hills."""
    ground = read_ground("hills", 1)
    canopy = cover_of(ground, 1).canopy
    middle = np.argmax(canopy.height_m * (np.hypot(canopy.north_m, canopy.east_m) < 1200.0))
    north, east = canopy.north_m[middle] - 260.0, canopy.east_m[middle] - 60.0
    at = np.array([north, east, -float(ground.height_at(north, east)) - 70.0])
    attitude = quat_multiply(quat_from_euler(0.25, np.radians(-14.0), 0.0), LEVEL)
    with Stage((), ground, Day(), SIZE) as stage:
        return stage.draw(NOBODY, Camera(at, attitude, np.radians(75.0), *SIZE)).copy()


def aircraft(shape: str) -> Frame:
    """From the left, ahead and a little below, before the sky."""
    pos = np.array([0.0, 0.0, -600.0])
    one = Instant(0.0, pos[None], quat_from_euler(0.4, 0.1, 0.2)[None], np.full(1, -0.2), np.full(1, 0.2), (True,))
    attitude = quat_multiply(quat_from_euler(2.4, 0.12, 0.0), LEVEL)
    eye = pos + 20.0 * np.array([-np.cos(2.4), -np.sin(2.4), 0.1])
    with Stage((airframe(shape),), read_ground("heath", 1), Day(), SIZE) as stage:
        return stage.draw(one, Camera(eye, attitude, np.radians(38.0), *SIZE)).copy()


@cache
def looping() -> Study:
    """The invented study, its aircraft standing along their path, with a pull on the stabilator and a little roll."""
    study = made_up_study()

    def standing(flight: Flight) -> Flight:
        pitch = np.nan_to_num(flight.loop_angle_rad[:, 0])
        quat = np.array([quat_from_euler(np.radians(80.0), one, 0.0) for one in pitch])
        pull = np.full_like(flight.stabilator_rad, -0.12)
        return replace(flight, quat_eb=np.repeat(quat[:, None], len(flight.names), axis=1), stabilator_rad=pull)

    return replace(study, healthy=standing(study.healthy), faulted=standing(study.faulted))


def seat(slot: str, time_s: float, study: Study | None = None, **options: object) -> Frame:
    """From a slot of the looping formation."""
    with open_stage(study or looping(), slot, SIZE, **options) as source:
        return np.array(source.frame(time_s))


def wide() -> Frame:
    """A field of 130 deg."""
    study = looping()
    scene = replace(study.scene, film=replace(study.scene.film, field_rad=np.radians(130.0)))
    return seat("right", 22.0, replace(study, scene=scene))


PICTURES: dict[str, Callable[[], Frame]] = {
    **{f"land_{name}": lambda name=name: land(name) for name in ground_names()},
    "wood": wood,
    **{f"aircraft_{shape}": lambda shape=shape: aircraft(shape) for shape in ("jet", "turboprop", "piston")},
    "seat_lead": lambda: seat("right", 8.0, look="lead"),
    "seat_left": lambda: seat("left", 25.0),
    "seat_ahead": lambda: seat("right", 14.0, look="ahead"),
    "seat_ground": lambda: seat("right", 21.0, look="ground"),
    "seat_of_the_lead": lambda: seat("lead", 6.0, look="ahead"),
    "view_chase": lambda: seat("right", 24.0, view="chase"),
    "view_spectator": lambda: seat("right", 6.0, view="spectator"),
    "peripheral": lambda: seat("right", 22.0, peripheral=True),
    "wide": wide,
    "twin_side": lambda: seat("right", 24.0, twin="side"),
    "twin_ghost": lambda: seat("right", 24.0, twin="ghost"),
}


@pytest.fixture(scope="session")
def renderer() -> str:
    """What draws here, in its own words."""
    return probe_drawing().renderer


@pytest.mark.parametrize("name", PICTURES)
def test_picture_is_as_kept(name: str, renderer: str, request: pytest.FixtureRequest) -> None:
    target, note = KEPT / f"{name}.png", KEPT / "renderer.txt"
    if request.config.getoption("--update-baselines"):
        KEPT.mkdir(exist_ok=True)
        Image.fromarray(PICTURES[name]()).save(target, optimize=True)
        note.write_text(f"{renderer}\n", encoding="utf-8")
        return
    made_by = note.read_text(encoding="utf-8").strip()
    if renderer != made_by:
        pytest.skip(f"kept pictures are of {made_by}; here draws {renderer or 'nothing'}")
    drawn, wanted = PICTURES[name](), np.asarray(Image.open(target))
    assert drawn.shape == wanted.shape
    apart = np.abs(drawn.astype(int) - wanted)
    part, mean = float(np.mean(apart.max(axis=2) > OFF)), float(apart.mean())
    words = f"{name}: {100.0 * part:.2f} % of its pixels are off, {mean:.2f} levels in the mean"
    if part > FAIL_PART or mean > FAIL_MEAN:
        FAILED.mkdir(parents=True, exist_ok=True)
        shown = {"drawn": drawn, "wanted": wanted, "apart": np.minimum(8 * apart, 255).astype(np.uint8)}
        for kind, picture in shown.items():
            Image.fromarray(picture).save(FAILED / f"{name}_{kind}.png")
        pytest.fail(f"{words}; see {FAILED}, and renew with --update-baselines if it was meant")
    if part > WARN_PART or mean > WARN_MEAN:
        warnings.warn(words, stacklevel=1)
