"""Frames of a study from the stage: which seat, which look, which flight, and how the picture is laid out."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

import numpy as np
from numpy.typing import NDArray

from render.errors import LatepullError
from render.output.events import slot_index
from render.picture.camera import Camera
from render.picture.instant import Instant, instant_at
from render.picture.stage import Stage
from render.picture.views import (
    LOOKS,
    VIEWS,
    Sightline,
    chase_camera,
    gazing,
    seat_camera,
    sightline,
    spectator_camera,
    spectator_stand,
)
from render.types import Flight, Study
from terrain.ground import Ground, read_ground

Frame = NDArray[np.uint8]


class StageSource:
    """One flight of a study from one viewpoint."""

    def __init__(
        self, study: Study, flight: Flight, slot: str, size_px: tuple[int, int], ground: Ground, *, view: str, look: str
    ) -> None:
        self._study, self._flight, self._size = study, flight, size_px
        self._view, self._look = view, look
        self._k = slot_index(study, slot)
        self._field_rad = study.scene.film.field_rad
        self._stand = spectator_stand(study.healthy, ground.height_at) if view == "spectator" else None
        own = self._k if view == "seat" else None
        self.stage = Stage(flight.airframes, ground, study.scene.day, size_px, seed=study.scene.seed, own=own)

    def frame(self, time_s: float) -> Frame:
        """The picture at an instant, (h, w, 3); used again by the next call."""
        instant = instant_at(self._flight, time_s)
        return self.stage.draw(instant, self.camera(instant))

    def camera(self, instant: Instant) -> Camera:
        """The camera of an instant."""
        if self._view == "chase":
            return chase_camera(self._flight, instant.time_s, self._field_rad, self._size)
        if self._stand is not None:
            return spectator_camera(self._flight, self._stand, instant.time_s, self._field_rad, self._size)
        axis_b = self.sightline(instant).axis_b
        return seat_camera(instant, self._flight.airframes, self._k, axis_b, self._field_rad, self._size)

    def sightline(self, instant: Instant) -> Sightline:
        """Where the pilot looks at an instant."""
        if self._look == "gaze":
            return gazing(instant, self._flight.airframes, self._k, self._study.scene.watch)
        return sightline(instant, self._flight.airframes, self._k, self._look)


@contextmanager
def open_stage(
    study: Study, slot: str, size_px: tuple[int, int], *, view: str = "seat", look: str = "gaze"
) -> Iterator[StageSource]:
    """Open the frames of a slot; the window is closed on leaving.

    view: seat, chase or spectator; look (from the seat): lead, ahead, ground, or gaze, which is the scene's own:
    where its ``watch`` rests the eyes, with its looks at the gauges. Raises LatepullError (unknown option),
    MachineError (no OpenGL).
    """
    for name, value, known in (("view", view, VIEWS), ("look", look, LOOKS)):
        if value not in known:
            raise LatepullError(f"--{name}: read {value}, wanted one of {', '.join(known)}")
    ground = read_ground(study.scene.ground, study.scene.seed)
    source = StageSource(study, study.faulted, slot, size_px, ground, view=view, look=look)
    try:
        yield source
    finally:
        source.stage.close()
