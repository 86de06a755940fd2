"""The stage: land, light and aircraft in one off-screen window, drawn for an instant and a camera.

What is opaque is drawn nearest first (own cockpit, aircraft, objects, ground, sky: a software renderer then
shades each pixel about once), what is see-through after it.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import TracebackType
from typing import Any

import numpy as np
import vtkmodules.vtkRenderingOpenGL2  # noqa: F401 - without it actors have no shaders
from numpy.typing import NDArray
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkCommonCore import vtkUnsignedCharArray
from vtkmodules.vtkRenderingCore import vtkRenderer

from render.frames import Array, quat_rotate
from render.picture.axes import DISPLAY_FROM_EARTH, body_to_display, to_display
from render.picture.camera import Camera
from render.picture.canopy import build_cockpit
from render.picture.craft import Craft, craft_light
from render.picture.craft_shadows import Shadows
from render.picture.instant import Instant
from render.picture.land import Land
from render.picture.light import Light
from render.picture.probe import new_window, require_drawing
from render.picture.shapes import build_shape
from render.picture.trails import Trails
from render.picture.views import angles
from render.sight.geometry import direction_b
from render.types import Flight
from scenes.airframe import Airframe
from scenes.model import Day
from terrain.ground import Ground

Frame = NDArray[np.uint8]
NEAR_M, FAR_M = 0.15, 70_000.0  # nearest and farthest drawn
GHOST_OPACITY = 0.35
HEAD_TURN_RAD = float(np.radians(80.0))
PROPELLER_RPS = 33.0  # about 2,000 a minute; common practice, no source
GHOST_APART_M = 1.0  # nearer than this the two leads would only flicker in each other


class Stage:
    """Draws instants of one formation over one land; a context manager, closed on leaving.

    The graphics driver is not touched before the first picture, so a stage may be built before a process forks.
    """

    def __init__(
        self,
        airframes: Sequence[Airframe],
        ground: Ground,
        day: Day,
        size_px: tuple[int, int],
        *,
        seed: int = 1,
        own: int | None = None,
        ghost: bool = False,
        smoke: Flight | None = None,
        smooth: bool = True,
        unseen_px: int = 0,
    ) -> None:
        """airframes: (K,) of the formation; size_px: width and height; seed: the one the ground was read with;
        own: whose cockpit the camera sits in (None: outside all of them); ghost: whether a second lead may be
        drawn faintly; smoke: the flight whose aircraft trail it; smooth: whether silhouettes are antialiased;
        unseen_px: rows at the bottom that something else will cover: left black.
        """
        self._own, self._smooth = own, smooth
        width, height = self._size = size_px
        drawn = height - unseen_px
        self._land = Land(ground, day, seed)
        light = self._land.light
        on_craft = craft_light(light)
        shapes = {frame: build_shape(frame) for frame in dict.fromkeys(airframes)}
        self._craft = [Craft(shapes[frame].parts, on_craft) for frame in airframes]
        self._cockpit = None if own is None else Craft(build_cockpit(airframes[own]), on_craft)
        self._ghost = Craft(shapes[airframes[0]].parts, on_craft, opacity=GHOST_OPACITY, lit=False) if ghost else None
        self._shadows = Shadows([shapes[frame] for frame in airframes], light.sun_d, ground.height_at)
        self._trails = None if smoke is None else Trails(smoke, [shapes[frame] for frame in airframes], day.wind)
        self.renderer = _renderer(light)
        nearest_first = [self._cockpit, *self._craft, self._ghost]
        for craft in nearest_first:
            self._add(() if craft is None else craft.actors(clear=False))
        self._add(self._land.actors)
        self._add(self._shadows.actors)
        self._add(() if self._trails is None else self._trails.actors)
        for craft in reversed(nearest_first):
            self._add(() if craft is None else craft.actors(clear=True))
        self._window: Any = None  # opened by the first picture: a driver doesn't outlive a fork
        self._closed = False
        self._pixels = vtkUnsignedCharArray()
        self._pixels.SetNumberOfComponents(3)
        self._pixels.SetNumberOfTuples(width * drawn)
        self._frame: Frame = np.zeros((height, width, 3), np.uint8)
        self._drawn: Frame = self._frame[:drawn]

    def __enter__(self) -> Stage:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, exc: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Give the window back; drawing is over."""
        self._closed = True
        if self._window is not None:
            self.renderer.RemoveAllViewProps()
            self._window.RemoveRenderer(self.renderer)
            self._window.Finalize()
            self._window = None

    def draw(self, instant: Instant, camera: Camera, ghost: Instant | None = None) -> Frame:
        """The picture, (h, w, 3); the array is used again by the next call. The camera has the stage's size.

        ghost: where the faint second lead is, if the stage has one; he is left out while he is on the lead.
        Raises MachineError where this machine can't draw, ValueError once closed or for another size.
        """
        if self._closed:
            raise ValueError("the stage is closed")
        if (camera.width_px, camera.height_px) != self._size:
            raise ValueError(f"camera of {camera.width_px}x{camera.height_px}, stage of {self._size}")
        height, width, _ = self._drawn.shape
        if self._window is None:
            require_drawing()
            self._window = new_window()
            self._window.SetSize(width, height)
            self._window.SetSwapBuffers(False)  # nobody looks at the window itself: 2 ms of copies less
            self._window.SetFrameBlitModeToNoBlit()
            self._window.AddRenderer(self.renderer)
        self._place(instant, camera, ghost)
        self._aim(camera)
        self._window.Render()
        self._window.GetPixelData(0, 0, width - 1, height - 1, 0, self._pixels, 0)
        np.copyto(self._drawn, vtk_to_numpy(self._pixels).reshape(height, width, 3)[::-1])
        if self._smooth:
            from render.picture.edges import smooth_edges  # its compiler takes half a second to load: not for drafts

            smooth_edges(self._drawn)
        return self._frame

    @property
    def land_actors(self) -> Sequence[Any]:
        """The actors of land and sky."""
        return tuple(self._land.actors)

    def craft_points_e_m(self, k: int) -> Array:
        """All corners of aircraft k's visible parts as last drawn, (N, 3) m, earth axes."""
        return self._craft[k].points_d_m() @ DISPLAY_FROM_EARTH

    def _add(self, actors: Sequence[Any]) -> None:
        for actor in actors:
            self.renderer.AddActor(actor)

    def _place(self, instant: Instant, camera: Camera, ghost: Instant | None) -> None:
        eye_d = to_display(camera.pos_e_m)
        for k, craft in enumerate(self._craft):
            if k >= len(instant.alive):
                craft.hide()
                continue
            matrix = body_to_display(instant.pos_e_m[k], instant.quat_eb[k])
            craft.place(matrix, moved_parts(instant, k), eye_d, own=k == self._own)
            if k == self._own and self._cockpit is not None:
                self._cockpit.place(matrix, moved_parts(instant, k), eye_d, own=True)
        self._shadows.lay(instant, camera)
        if self._trails is not None:
            self._trails.lay(instant.time_s, camera)
        if self._ghost is not None:
            apart = 0.0 if ghost is None else float(np.linalg.norm(ghost.pos_e_m[0] - instant.pos_e_m[0]))
            if ghost is None or apart < GHOST_APART_M:
                self._ghost.hide()
            else:
                matrix = body_to_display(ghost.pos_e_m[0], ghost.quat_eb[0])
                self._ghost.place(matrix, moved_parts(ghost, 0), eye_d, own=False)

    def _aim(self, camera: Camera) -> None:
        vtk_camera = self.renderer.GetActiveCamera()
        pos = to_display(camera.pos_e_m)
        axis, up = (to_display(quat_rotate(camera.quat_ec, np.array(v))) for v in ((0.0, 0.0, 1.0), (0.0, -1.0, 0.0)))
        vtk_camera.SetPosition(*pos)
        vtk_camera.SetFocalPoint(*(pos + 100.0 * axis))
        vtk_camera.SetViewUp(*up)
        part = self._drawn.shape[0] / camera.height_px  # the camera's picture, less the rows at its bottom
        half = np.arctan(part * np.tan(0.5 * camera.field_vertical_rad))
        vtk_camera.SetViewAngle(float(np.degrees(2.0 * half)))
        vtk_camera.SetWindowCenter(0.0, (1.0 - part) / part)
        vtk_camera.SetClippingRange(NEAR_M, FAR_M)
        corner = np.hypot(np.tan(0.5 * camera.field_rad), np.tan(0.5 * camera.field_vertical_rad))
        self._land.set_eye(camera.pos_e_m, axis @ DISPLAY_FROM_EARTH, float(np.arctan(corner)))


def moved_parts(instant: Instant, k: int) -> Mapping[str, float]:
    """Angles of the moving parts of aircraft k, rad, by who moves them.

    The lead's head looks ahead, a wing pilot's at the lead as far as a neck turns (80 deg, NOTICING 1.37).
    """
    aileron = float(instant.aileron_rad[k])
    head = 0.0
    if k > 0:
        azimuth, _ = angles(direction_b(instant.pos_e_m[0] - instant.pos_e_m[k], instant.quat_eb[k]))
        head = float(np.clip(azimuth, -HEAD_TURN_RAD, HEAD_TURN_RAD))
    return {
        "stabilator": float(instant.stabilator_rad[k]),
        "aileron_left": aileron,  # rolls right: left trailing edge down, right up
        "aileron_right": -aileron,
        "head": head,
        "propeller": float((2.0 * np.pi * PROPELLER_RPS * instant.time_s) % (2.0 * np.pi)),
    }


def _renderer(light: Light) -> vtkRenderer:
    renderer = vtkRenderer()
    renderer.SetUseOIT(False)
    renderer.AutomaticLightCreationOff()  # every actor brings its own light
    renderer.SetBackground(*light.rim)
    return renderer
