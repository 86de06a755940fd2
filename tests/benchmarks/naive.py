"""The naive pyvista movie loop: the stage's actors in a plotter with its defaults, a caption each frame."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Any

import numpy as np
import pyvista as pv

from render.output.stage_source import StageSource
from render.picture.instant import instant_at
from render.types import Study


def film_naively(source: StageSource, study: Study, times_s: list[float], rate_fps: float, path: Path) -> float:
    """Film instants of a source's scene as one would without thinking of speed; returns the seconds of the loop."""
    stage = source.stage
    actors = list(stage.renderer.GetActors())
    stage.renderer.RemoveAllViewProps()
    plotter: Any = pv.Plotter(off_screen=True, window_size=list(stage._size))
    for actor in actors:
        plotter.add_actor(actor, reset_camera=False, render=False)
    plotter.set_background(stage.renderer.GetBackground())
    plotter.open_movie(str(path), framerate=rate_fps)
    begun = time.perf_counter()
    for time_s in times_s:
        instant = instant_at(study.faulted, time_s)
        camera = source.camera(instant)
        stage._place(instant, camera, None)
        stage._aim(camera)  # sets the land's eye, and a camera to copy
        ours = stage.renderer.GetActiveCamera()
        plotter.camera.position = ours.GetPosition()
        plotter.camera.focal_point = ours.GetFocalPoint()
        plotter.camera.up = ours.GetViewUp()
        plotter.camera.view_angle = ours.GetViewAngle()
        plotter.camera.clipping_range = ours.GetClippingRange()
        plotter.add_text(f"{time_s:.1f} s", name="time")
        plotter.write_frame()
    spent = time.perf_counter() - begun
    shown = np.asarray(plotter.image)
    assert shown.std() > 10.0, "the naive film shows nothing"
    plotter.close()
    return spent
