"""What acuity leaves of a picture away from the gaze: detail finer than the eye resolves there is taken out.

The minimum resolvable angle grows by a straight line, MAR(E) = MAR0 + m E, MAR0 = 1 arcmin, m = 1.5 arcmin a degree
of eccentricity E (B. Guenter et al., Foveated 3D graphics, ACM TOG 31(6) 2012: m = 1.32 to 1.65; NOTICING 1.32);
the same line that noticing works with. Bars one MAR wide, the finest that are resolved, keep a third of their contrast,
bars twice as wide two thirds, bars of half the width nothing.

Acuity only: motion is seen well off the gaze (NOTICING 1.33), crowding, colour and contrast are not in it, and at the
true viewing distance the eye does the same once more.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from render.frames import Array
from render.picture.camera import Camera
from render.picture.panini import Panini
from render.sight.geometry import mar_rad

Frame = NDArray[np.uint8]

LEVELS = 7  # patches up to 128 px wide


class Peripheral:
    """Blurs frames of one size by eccentricity from a gaze; holds its working arrays."""

    def __init__(self, size_px: tuple[int, int]) -> None:
        """size_px: width and height of the frames."""
        width, height = size_px
        self._levels = []
        for _ in range(LEVELS):
            self._levels.append(np.empty((height, width, 3), np.uint8))
            width, height = max(width // 2, 1), max(height // 2, 1)

    def blur(self, frame: Frame, patch_px: Array) -> Frame:
        """The frame with each pixel the mean of a patch (h, w) px wide; used again by the next call."""
        np.copyto(self._levels[0], frame)
        for one, half in zip(self._levels[:-1], self._levels[1:], strict=True):
            _halve(one, half)
        level = np.log2(np.maximum(patch_px, 1.0, dtype=np.float32))
        for k in range(LEVELS - 2, -1, -1):
            _blend(self._levels[k], self._levels[k + 1], level, k)
        return self._levels[0]


def patch_px(camera: Camera, eyes_e: Array, wide: Panini | None = None) -> Array:
    """Width of the patch that one MAR covers at each pixel, (h, w) px, for eyes on a direction (3,) in earth axes.

    wide: the remapping, where the picture is not the camera's own.
    """
    width, height = (camera.width_px, camera.height_px) if wide is None else wide.size_px
    # the angle changes slowly over the picture: worked out on every eighth pixel
    x, y = np.arange(4.0, width + 8.0, 8.0), np.arange(4.0, height + 8.0, 8.0)
    px = np.stack(np.meshgrid(x, y), axis=-1)
    ray = camera.directions_e(px) if wide is None else wide.directions_e(camera, px)
    off = np.arccos(np.clip(ray @ (eyes_e / np.linalg.norm(eyes_e)), -1.0, 1.0))
    # pixels a radian, by the solid angle of a pixel: its side is the root
    east, down = np.gradient(ray, axis=1) / 8.0, np.gradient(ray, axis=0) / 8.0
    angle = np.sqrt(np.linalg.norm(np.cross(east, down), axis=-1))
    coarse = mar_rad(off) / angle
    return _stretched(coarse.astype(np.float32), height, width)


@njit(cache=True, nogil=True)
def _stretched(coarse, height, width):  # type: ignore[no-untyped-def]
    """Every eighth pixel's value, from the middle of each block of eight, brought to every pixel."""
    fine = np.empty((height, width), np.float32)
    for i in range(height):
        v = max((i - 3.5) / 8.0, 0.0)
        a = int(v)
        q = v - a
        for j in range(width):
            u = max((j - 3.5) / 8.0, 0.0)
            b = int(u)
            p = u - b
            top = coarse[a, b] * (1.0 - p) + coarse[a, b + 1] * p
            fine[i, j] = top * (1.0 - q) + (coarse[a + 1, b] * (1.0 - p) + coarse[a + 1, b + 1] * p) * q
    return fine


@njit(cache=True, nogil=True)
def _halve(one, half):  # type: ignore[no-untyped-def]
    for i in range(half.shape[0]):
        k = min(2 * i + 1, one.shape[0] - 1)
        for j in range(half.shape[1]):
            m = min(2 * j + 1, one.shape[1] - 1)
            for c in range(3):
                total = int(one[2 * i, 2 * j, c]) + int(one[2 * i, m, c]) + int(one[k, 2 * j, c]) + int(one[k, m, c])
                half[i, j, c] = (total + 2) >> 2


@njit(cache=True, nogil=True)
def _blend(fine, rough, level, k):  # type: ignore[no-untyped-def]
    """Level k's picture in place: more of the next rougher one, doubled in size, the more the map asks for.

    Doubling mixes the four nearest by 9 : 3 : 3 : 1, the middles of a pixel's quarters.
    """
    height, width, _ = fine.shape
    last_i, last_j = rough.shape[0] - 1, rough.shape[1] - 1
    half = (1 << k) >> 1
    top_y, top_x = level.shape[0] - 1, level.shape[1] - 1
    for i in range(height):
        near_i = min(i >> 1, last_i)
        far_i = min(max(near_i + (1 if i & 1 else -1), 0), last_i)
        y = min((i << k) + half, top_y)
        for j in range(width):
            part = int((level[y, min((j << k) + half, top_x)] - k) * 256.0)
            if part <= 0:
                continue
            part = min(part, 256)
            near_j = min(j >> 1, last_j)
            far_j = min(max(near_j + (1 if j & 1 else -1), 0), last_j)
            for c in range(3):
                near = 3 * int(rough[near_i, near_j, c]) + int(rough[near_i, far_j, c])
                far = 3 * int(rough[far_i, near_j, c]) + int(rough[far_i, far_j, c])
                fine[i, j, c] = (16 * (256 - part) * int(fine[i, j, c]) + part * (3 * near + far) + 2048) >> 12
