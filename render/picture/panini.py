"""Wide fields without stretched edges: the Pannini projection, from one larger rectilinear picture.

A direction at azimuth ``phi`` and, over the cylinder about the picture's upright, elevation tangent ``tan(theta)``
(camera frame: sin(phi) = x/r, cos(phi) = z/r, tan(theta) = y/r, r = sqrt(x^2 + z^2)) stands at::

        S = (d + 1) / (d + cos(phi))        px = w/2 + f S sin(phi)        py = h/2 + f S tan(theta)

Source: T. K. Sharpless, B. Postle, D. M. German, Pannini: A New Projection for Rendering Wide Angle Perspective
Images, Computational Aesthetics 2010, equations 1-2 with d = 1. Upright lines and lines through the middle stay
straight, and at the middle the scale is f pixels a radian, as in the rectilinear picture.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from render.frames import Array, quat_rotate
from render.picture.camera import FIELD_MAX_RAD, Camera

Frame = NDArray[np.uint8]

DISTANCE = 1.0  # d: 0 rectilinear, infinity a cylinder seen from afar; 1 is the authors' usual one
# Pixels of the larger picture per pixel of this one at the middle, a little under 1: its edges are drawn several
# times finer than needed anyway, and its cost goes with the square.
FINENESS = 0.9


class Panini:
    """The remapping of one field and picture size; holds its tables.

    Raises ValueError for a field above 160 deg.
    """

    def __init__(self, field_rad: float, size_px: tuple[int, int]) -> None:
        """field_rad: horizontal field along the middle row; size_px: width and height of the result."""
        if not 0.0 < field_rad <= FIELD_MAX_RAD:
            raise ValueError(f"field {np.degrees(field_rad):g} deg: 0 to 160 deg are wanted")
        self.size_px = width, height = size_px
        self.focal_px = 0.5 * width / float(_stretch(np.array(0.5 * field_rad)) * np.sin(0.5 * field_rad))
        across = np.asarray((np.arange(width) + 0.5 - 0.5 * width) / self.focal_px, float)
        up_down = (np.arange(height) + 0.5 - 0.5 * height) / self.focal_px
        phi = _azimuth(across)
        x = np.broadcast_to(np.tan(phi), (height, width))  # on the plane z = 1
        y = up_down[:, None] / (_stretch(phi) * np.cos(phi))
        focal = FINENESS * self.focal_px
        # even, and a pixel to spare at each side for the mixing of neighbours
        self.source_px = (2 * int(focal * float(np.max(x)) + 2.0), 2 * int(focal * float(np.max(y)) + 2.0))
        self.source_field_rad = float(2.0 * np.arctan(0.5 * self.source_px[0] / focal))
        self._x = np.ascontiguousarray(0.5 * self.source_px[0] - 0.5 + focal * x, np.float32)
        self._y = np.ascontiguousarray(0.5 * self.source_px[1] - 0.5 + focal * y, np.float32)
        self._frame: Frame = np.empty((height, width, 3), np.uint8)

    def source_camera(self, camera: Camera) -> Camera:
        """The larger rectilinear camera at the same place and attitude."""
        return Camera(camera.pos_e_m, camera.quat_ec, self.source_field_rad, *self.source_px)

    def remap(self, source: Frame) -> Frame:
        """The picture from the larger one, (h, w, 3); the array is used again by the next call."""
        _mix(source, self._x, self._y, self._frame)
        return self._frame

    def project(self, camera: Camera, points_e_m: Array) -> Array:
        """Where earth points (..., 3) stand in the picture, (..., 2) px. The camera gives place and attitude."""
        return self.project_c(camera.to_camera(points_e_m))

    def project_c(self, points_c: Array) -> Array:
        """Where directions in the camera frame (..., 3) stand in the picture, (..., 2) px."""
        phi = np.arctan2(points_c[..., 0], points_c[..., 2])
        flat = np.hypot(points_c[..., 0], points_c[..., 2])
        stretch = _stretch(phi)
        across = stretch * np.sin(phi)
        down = stretch * points_c[..., 1] / flat
        middle = np.array([0.5 * self.size_px[0], 0.5 * self.size_px[1]])
        return np.asarray(middle + self.focal_px * np.stack([across, down], axis=-1))

    def directions_e(self, camera: Camera, px: Array) -> Array:
        """Unit vectors (..., 3) in earth axes through picture places (..., 2) px."""
        at = (np.asarray(px, float) - np.array([0.5 * self.size_px[0], 0.5 * self.size_px[1]])) / self.focal_px
        phi = _azimuth(at[..., 0])
        ray = np.stack([np.sin(phi), at[..., 1] / _stretch(phi), np.cos(phi)], axis=-1)
        return quat_rotate(camera.quat_ec, ray / np.linalg.norm(ray, axis=-1, keepdims=True))


def _stretch(phi: Array) -> Array:
    return np.asarray((DISTANCE + 1.0) / (DISTANCE + np.cos(phi)))


def _azimuth(across: Array) -> Array:
    """The azimuth that stands at a distance from the middle: the inverse of S sin(phi).

    From (d + 1) sin(phi) = u (d + cos(phi)), a quadratic in cos(phi).
    """
    d = DISTANCE
    k = (across / (d + 1.0)) ** 2
    cosine = (-k * d + np.sqrt((k * d) ** 2 - (k + 1.0) * (k * d * d - 1.0))) / (k + 1.0)
    return np.asarray(np.sign(across) * np.arccos(np.clip(cosine, -1.0, 1.0)))


@njit(cache=True, nogil=True)
def _mix(source, x, y, out):  # type: ignore[no-untyped-def]
    """Each pixel from the four around its place in the source, by area."""
    height, width = x.shape
    for i in range(height):
        for j in range(width):
            u, v = x[i, j], y[i, j]
            a, b = int(u), int(v)
            p, q = int((u - a) * 256.0), int((v - b) * 256.0)
            for c in range(3):
                top = int(source[b, a, c]) * (256 - p) + int(source[b, a + 1, c]) * p
                low = int(source[b + 1, a, c]) * (256 - p) + int(source[b + 1, a + 1, c]) * p
                out[i, j, c] = (top * (256 - q) + low * q + 32768) >> 16
