"""A bare camera on a land's actors, for tests: any of them alone, depth read back."""

from __future__ import annotations

from types import TracebackType

import numpy as np
import vtk
from numpy.typing import NDArray
from vtkmodules.util.numpy_support import vtk_to_numpy

from render.picture.land import Land
from render.picture.probe import new_window

MAGENTA = np.array([255, 0, 255])


class Lens:
    """Looks at a land from earth-axes places; a context manager."""

    def __init__(self, land: Land, width: int = 400, height: int = 300, field_deg: float = 60.0, near_m: float = 0.15):
        self.land, self.width, self.height, self.near_m = land, width, height, near_m
        self.focal_px = 0.5 * height / np.tan(np.radians(field_deg) / 2.0)  # field is the vertical one
        self.window = new_window()
        self.window.SetSize(width, height)
        self.renderer = vtk.vtkRenderer()
        self.renderer.SetBackground(1.0, 0.0, 1.0)
        self.renderer.SetUseOIT(False)
        self.renderer.AutomaticLightCreationOff()
        self.camera = self.renderer.GetActiveCamera()
        self.camera.SetViewAngle(field_deg)
        self.window.AddRenderer(self.renderer)
        self._hidden: list[vtk.vtkActor] = []
        for actor in land.actors:
            self.renderer.AddActor(actor)

    def __enter__(self) -> Lens:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, exc: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.renderer.RemoveAllViewProps()
        self.window.Finalize()

    def show(self, *actors: vtk.vtkActor) -> None:
        """Only these; all without any."""
        self._hidden = [actor for actor in self.land.actors if actors and actor not in actors]
        for actor in self.land.actors:
            actor.SetVisibility(actor not in self._hidden)

    def look(self, pos_e_m: tuple[float, float, float], bearing_deg: float, up_deg: float) -> NDArray[np.uint8]:
        """The picture (h, w, 3) from north, east, down; straight down has its top toward the bearing."""
        n, e, d = pos_e_m
        b, u = np.radians(bearing_deg), np.radians(up_deg)
        axis = np.array([np.cos(u) * np.sin(b), np.cos(u) * np.cos(b), np.sin(u)])
        top = np.array([-np.sin(u) * np.sin(b), -np.sin(u) * np.cos(b), np.cos(u)])
        eye = np.array([e, n, -d])
        self.camera.SetPosition(*eye)
        self.camera.SetFocalPoint(*(eye + axis))
        self.camera.SetViewUp(*top)
        self.camera.SetClippingRange(self.near_m, 70_000.0)
        self._axes = np.stack([np.cross(axis, top), top, axis])
        self._eye = eye
        self.land.set_eye(np.array(pos_e_m))
        for actor in self._hidden:
            actor.SetVisibility(False)
        return self.again()

    def again(self) -> NDArray[np.uint8]:
        """The picture drawn once more."""
        self.window.Render()
        data = vtk.vtkUnsignedCharArray()
        self.window.GetPixelData(0, 0, self.width - 1, self.height - 1, 0, data, 0)
        return vtk_to_numpy(data).reshape(self.height, self.width, 3)[::-1].copy()

    def rays(self) -> NDArray[np.float64]:
        """Directions (h, w, 3), display axes, of unit depth, through the middles of the pixels."""
        x = (np.arange(self.width) + 0.5 - 0.5 * self.width) / self.focal_px
        y = (0.5 * self.height - np.arange(self.height) - 0.5) / self.focal_px
        grid = np.stack([*np.meshgrid(x, y), np.ones((self.height, self.width))], axis=-1)
        return grid @ self._axes

    def places(self) -> NDArray[np.float64]:
        """Where each pixel's nearest surface is, (h, w, 3) m, display axes; 1e7 where nothing was drawn."""
        data = vtk.vtkFloatArray()
        self.window.GetZbufferData(0, 0, self.width - 1, self.height - 1, data)
        z = vtk_to_numpy(data).reshape(self.height, self.width)[::-1].astype(float)
        near, far = self.near_m, 70_000.0
        depth = near * far / (far - z * (far - near))
        return self._eye + np.where((z < 1.0)[..., None], depth[..., None] * self.rays(), 1e7)

    def pixel(self, point_d_m: NDArray[np.float64]) -> NDArray[np.float64]:
        """Column and row (..., 2) of display-axes points, pixel edges counted from the top left."""
        x, y, depth = np.moveaxis((np.asarray(point_d_m, float) - self._eye) @ self._axes.T, -1, 0)
        return np.stack(
            [0.5 * self.width + self.focal_px * x / depth, 0.5 * self.height - self.focal_px * y / depth], -1
        )


def drawn(picture: NDArray[np.uint8]) -> NDArray[np.bool_]:
    """Pixels that are not the background."""
    return np.any(picture != MAGENTA, axis=-1)
