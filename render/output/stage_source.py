"""Frames of a study from the stage: which seat, which look, which flight, and how the picture is laid out."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from render.errors import LatepullError
from render.frames import quat_rotate
from render.output.events import slot_index
from render.output.source import FrameSource
from render.output.stage_options import StageOptions
from render.picture.camera import FIELD_MAX_RAD, PANINI_FROM_RAD, Camera
from render.picture.instant import Instant, instant_at
from render.picture.stage import Stage
from render.picture.stand import spectator_stand
from render.picture.views import (
    LOOKS,
    VIEWS,
    Sightline,
    chase_camera,
    gazing,
    seat_camera,
    sightline,
    spectator_camera,
)
from render.types import Study
from terrain.ground import Ground, read_ground

if TYPE_CHECKING:
    from render.picture.panini import Panini
    from render.picture.peripheral import Peripheral

Frame = NDArray[np.uint8]

FLIGHTS = ("faulted", "healthy")
TWINS = ("side", "stack", "ghost")
SPECTATOR_FIELD_RAD = float(np.radians(40.0))  # he turns with the aircraft and attends to little beside it


class StageSource:
    """One flight of a study from one viewpoint."""

    def __init__(
        self, study: Study, slot: str, size_px: tuple[int, int], ground: Ground, options: StageOptions, field_rad: float
    ) -> None:
        """field_rad: horizontal field of this picture. Raises MachineError where nothing can be drawn."""
        self._study, self._options = study, options
        self._flight = study.healthy if options.flight == "healthy" else study.faulted
        self._k = slot_index(study, slot)
        self._size, self._field_rad = size_px, field_rad
        spectator = options.view == "spectator"
        self._stand = spectator_stand(study.healthy, ground, study.scene.seed) if spectator else None
        wide = options.panini if options.panini is not None else field_rad > PANINI_FROM_RAD
        # imported when asked for: their compiled code takes a while to load
        self._wide: Panini | None = None
        self._peripheral: Peripheral | None = None
        if wide:
            from render.picture.panini import Panini

            self._wide = Panini(field_rad, size_px)
        if options.peripheral:
            from render.picture.peripheral import Peripheral

            self._peripheral = Peripheral(size_px)
        whole = self._wide is not None or self._peripheral is not None  # pixels from elsewhere in it
        self.stage = Stage(
            self._flight.airframes, ground, study.scene.day, size_px if self._wide is None else self._wide.source_px,
            seed=study.scene.seed, own=self._k if options.view == "seat" else None, ghost=options.twin == "ghost",
            smoke=self._flight if study.scene.film.smoke else None,
            smooth=options.smooth, unseen_px=0 if whole else options.unseen_px,
        )  # fmt: skip

    def frame(self, time_s: float) -> Frame:
        """The picture at an instant, (h, w, 3); used again by the next call."""
        instant = instant_at(self._flight, time_s)
        camera = self.camera(instant)
        ghost = instant_at(self._study.healthy, time_s) if self._options.twin == "ghost" else None
        if self._wide is None:
            frame = self.stage.draw(instant, camera, ghost)
        else:
            frame = self._wide.remap(self.stage.draw(instant, self._wide.source_camera(camera), ghost))
        if self._peripheral is not None:
            from render.picture.peripheral import patch_px

            eyes_e = quat_rotate(instant.quat_eb[self._k], self.sightline(instant).eyes_b)
            frame = self._peripheral.blur(frame, patch_px(camera, eyes_e, self._wide))
        return frame

    def camera(self, instant: Instant) -> Camera:
        """The camera of an instant. In a wide picture its field is the picture's along the middle row."""
        field, size = self._field_rad, self._size
        if self._options.view == "chase":
            return chase_camera(self._flight, instant.time_s, field, size)
        if self._stand is not None:
            return spectator_camera(self._flight, self._stand, instant.time_s, field, size)
        return seat_camera(instant, self._flight.airframes, self._k, self.sightline(instant).axis_b, field, size)

    def sightline(self, instant: Instant) -> Sightline:
        """Where the pilot looks at an instant."""
        if self._options.look == "gaze":
            return gazing(instant, self._flight.airframes, self._k, self._study.scene.watch)
        return sightline(instant, self._flight.airframes, self._k, self._options.look)


class TwinSource:
    """Healthy and faulted in one picture, in step: side by side (healthy left) or stacked (healthy above)."""

    def __init__(self, sources: list[StageSource], size_px: tuple[int, int], above_px: int | None) -> None:
        """above_px: the upper picture's height where one stands above the other."""
        self._sources, self._stacked = sources, above_px is not None
        self._frame: Frame = np.zeros((size_px[1], size_px[0], 3), np.uint8)
        #: At the top of a low picture the caption would hide the lead; at its foot lies the own wing.
        self.caption_bottom_px = above_px

    def frame(self, time_s: float) -> Frame:
        """The picture at an instant, (h, w, 3); used again by the next call."""
        x = y = 0
        for source in self._sources:
            part = source.frame(time_s)
            height, width = part.shape[:2]
            self._frame[y : y + height, x : x + width] = part
            x, y = (x, y + height + GAP_PX) if self._stacked else (x + width + GAP_PX, y)
        return self._frame


GAP_PX = 2  # black line between the two


@contextmanager
def open_stage(study: Study, slot: str, size_px: tuple[int, int], **options: object) -> Iterator[FrameSource]:
    """Open the frames of a slot; windows are closed on leaving. options: those of ``StageOptions``.

    Raises LatepullError (unknown option or one that can't be had here), MachineError (no OpenGL).
    """
    chosen = _checked(StageOptions(**options), study)  # type: ignore[arg-type]
    ground = read_ground(study.scene.ground, study.scene.seed)
    field = _field_rad(chosen, study)
    with ExitStack() as stack:

        def opened(one: StageOptions, size: tuple[int, int], field_rad: float) -> StageSource:
            source = StageSource(study, slot, size, ground, one, field_rad)
            stack.callback(source.stage.close)
            return source

        if chosen.twin not in ("side", "stack"):
            yield opened(chosen, size_px, field)
            return
        stacked = chosen.twin == "stack"
        part, part_field = twin_part(size_px, chosen.clear_px, stacked, field)
        halves = [opened(replace(chosen, flight=flight), part, part_field) for flight in ("healthy", "faulted")]
        yield TwinSource(halves, size_px, part[1] if stacked else None)


def twin_part(
    size_px: tuple[int, int], clear_px: int, stacked: bool, field_rad: float
) -> tuple[tuple[int, int], float]:
    """Size and field of each half of a twin: its scale is smaller by the root of the area it has."""
    width, height = size_px[0], size_px[1] - clear_px
    part = (width, (height - GAP_PX) // 2) if stacked else ((width - GAP_PX) // 2, height)
    scale = np.sqrt(part[0] * part[1] / (size_px[0] * size_px[1]))
    half = 0.5 * part[0] / (0.5 * size_px[0] / np.tan(0.5 * field_rad) * scale)
    return part, float(min(2.0 * np.arctan(half), FIELD_MAX_RAD))


def _checked(options: StageOptions, study: Study) -> StageOptions:
    known = (("view", VIEWS), ("look", LOOKS), ("flight", FLIGHTS), ("twin", (None, *TWINS)))
    faults = [
        f"--{name}: read {getattr(options, name)}, wanted one of {', '.join(str(c) for c in choices if c)}"
        for name, choices in known
        if getattr(options, name) not in choices
    ]
    if options.peripheral and options.view != "seat":
        faults.append(f"--peripheral: is what a pilot's eye has, and needs --view seat; read {options.view}")
    if options.twin is not None and study.faulted is study.healthy:
        faults.append(f"--twin {options.twin}: the scene has no fault, both flights are the same")
    if faults:
        raise LatepullError("\n".join(faults))
    return options


def _field_rad(options: StageOptions, study: Study) -> float:
    if options.field_rad is not None:
        return options.field_rad
    field = study.scene.film.field_rad
    return min(field, SPECTATOR_FIELD_RAD) if options.view == "spectator" else field
