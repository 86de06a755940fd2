"""Every file of shaders/ is in a program that compiled, and takes part in the picture.

A shader that does not compile raises nothing: its actor is missing and the exit status is 0.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import vtk

from render.frames import quat_from_euler, quat_multiply
from render.picture.camera import Camera
from render.picture.instant import Instant
from render.picture.shading import SHADERS
from render.picture.stage import Stage
from scenes.model import Day
from terrain.ground import read_ground
from tests.flight.made import invented_jet
from tests.picture.test_stage import LEVEL

pytestmark = pytest.mark.draws

SIZE = (400, 225)
FILES = sorted(path.stem for path in SHADERS.glob("*.glsl"))
DAY = Day(cloud_base_m=1500.0)
LEAD = np.array([-520.0, 40.0, -170.0])
ONE = Instant(0.0, LEAD[None], quat_from_euler(1.0, 0.0, 0.0)[None], np.zeros(1), np.zeros(1), (True,))
#: Over the airfield's border toward the coast's sea, low over a field, and up at the cloud: place, heading, pitch.
EYES = (((-560.0, 0.0, -180.0), 0.3, -0.25), ((-900.0, 1500.0, -60.0), 0.1, -0.12), ((0.0, 0.0, -40.0), 3.7, 0.55))


def cameras() -> list[Camera]:
    """The views that together show every kind of thing."""
    return [
        Camera(np.array(at), quat_multiply(quat_from_euler(heading, pitch, 0.0), LEVEL), np.radians(75.0), *SIZE)
        for at, heading, pitch in EYES
    ]


def programs(stage: Stage) -> dict[int, str]:
    """Final shader texts of the actors that are drawn from the cameras, by actor number."""
    texts: dict[int, str] = {}
    watched = []
    for i, actor in enumerate(stage.renderer.GetActors()):

        def note(_: Any, __: str, program: Any, i: int = i) -> None:
            texts[i] = program.GetVertexShader().GetSource() + program.GetFragmentShader().GetSource()

        note.CallDataType = vtk.VTK_OBJECT  # type: ignore[attr-defined]
        watched.append((actor.GetMapper(), actor.GetMapper().AddObserver("UpdateShaderEvent", note)))
    for camera in cameras():
        stage.draw(ONE, camera)
    for mapper, number in watched:
        mapper.RemoveObserver(number)
    return texts


def test_each_shader_is_used_compiled_and_seen() -> None:
    with Stage((invented_jet(),), read_ground("coast", 1), DAY, SIZE, smooth=False) as stage:
        texts = programs(stage)
        actors = list(stage.renderer.GetActors())
        whole = [stage.draw(ONE, camera).copy() for camera in cameras()]
        for name in FILES:
            # the file's last function, since its head may be put in by a variant
            mark = (SHADERS / f"{name}.glsl").read_text(encoding="utf-8").rstrip().splitlines()[-4:]
            users = [actors[i] for i, text in texts.items() if "\n".join(mark) in text]
            assert users, f"{name}.glsl is in no program that was drawn"
            changed = 0
            for camera, full in zip(cameras(), whole, strict=True):
                stage._place(ONE, camera, None)
                shown = [actor for actor in users if actor.GetVisibility()]
                for actor in shown:
                    stage.renderer.RemoveActor(actor)
                changed += int(np.any(stage.draw(ONE, camera) != full, axis=2).sum())
                for actor in shown:
                    stage.renderer.AddActor(actor)
            assert changed > 100, f"{name}.glsl: {changed} pixels change without it"
