"""The camera: a pinhole at an eye, with its projection in closed form.

The camera frame ``c`` is the eye frame of ``sight.geometry``: x right, y down, z along the axis. Pixels count
from the top left corner of the picture, x right, y down; the centre of pixel (0, 0) is at (0.5, 0.5)::

        px = w/2 + f x/z      py = h/2 + f y/z      f = (w/2) / tan(field/2)      square pixels
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from render.frames import Array, quat_conj, quat_rotate
from render.types import freeze_arrays

FIELD_MAX_RAD = float(np.radians(160.0))
#: Wider fields are drawn by the Pannini projection: a plane stretches the edges of this one 2.4 times.
PANINI_FROM_RAD = float(np.radians(100.0))


@dataclass(frozen=True, slots=True, eq=False)
class Camera:
    """A pinhole camera: place, attitude, horizontal field and picture size.

    Raises ValueError for a field that one plane can't hold.
    """

    pos_e_m: Array  # (3,)
    quat_ec: Array  # (4,) camera -> earth, w first
    field_rad: float  # horizontal, side to side
    width_px: int
    height_px: int

    def __post_init__(self) -> None:
        freeze_arrays(self)
        if not 0.0 < self.field_rad <= FIELD_MAX_RAD:
            raise ValueError(f"field {np.degrees(self.field_rad):g} deg: a plane holds 0 to 160 deg")

    @property
    def focal_px(self) -> float:
        """Pixels per unit of tangent; near the centre, pixels per radian."""
        return float(0.5 * self.width_px / np.tan(0.5 * self.field_rad))

    @property
    def field_vertical_rad(self) -> float:
        """Vertical field, top to bottom."""
        return float(2.0 * np.arctan(0.5 * self.height_px / self.focal_px))

    def to_camera(self, points_e_m: Array) -> Array:
        """Earth points (..., 3), m, in the camera frame (..., 3), m."""
        return quat_rotate(quat_conj(self.quat_ec), np.asarray(points_e_m, float) - self.pos_e_m)

    def project(self, points_e_m: Array) -> Array:
        """Where earth points (..., 3) stand in the picture, (..., 2) px; NaN behind the camera."""
        return self.project_c(self.to_camera(points_e_m))

    def project_c(self, points_c: Array) -> Array:
        """Where points or directions in the camera frame (..., 3) stand in the picture, (..., 2) px."""
        depth = np.where(points_c[..., 2:] > 1e-9, points_c[..., 2:], np.nan)
        middle = np.array([0.5 * self.width_px, 0.5 * self.height_px])
        return np.asarray(middle + self.focal_px * points_c[..., :2] / depth)

    def directions_e(self, px: Array) -> Array:
        """Unit vectors (..., 3) in earth axes through picture places (..., 2) px."""
        px = np.asarray(px, float)
        across = (px - np.array([0.5 * self.width_px, 0.5 * self.height_px])) / self.focal_px
        ray = np.concatenate([across, np.ones((*px.shape[:-1], 1))], axis=-1)
        return quat_rotate(self.quat_ec, ray / np.linalg.norm(ray, axis=-1, keepdims=True))


def quat_from_axes(axes: Array) -> Array:
    """Camera -> earth quaternion (4,) of eye axes (3, 3): rows x right, y down, z gaze in earth axes.

    Source: Shepperd, Quaternion from rotation matrix, J. Guidance and Control 1 (1978): the largest of the four
    squares is divided by, so that nothing is lost near half a turn.
    """
    m = np.asarray(axes, float).T  # columns are the camera's axes in earth
    trace = m[0, 0] + m[1, 1] + m[2, 2]
    squares = np.array([trace, m[0, 0], m[1, 1], m[2, 2]])
    k = int(np.argmax(squares))
    root = np.sqrt(1.0 - trace + 2.0 * squares[k])
    quat = np.empty(4)
    quat[k] = 0.5 * root
    if k == 0:
        rest = np.array([m[2, 1] - m[1, 2], m[0, 2] - m[2, 0], m[1, 0] - m[0, 1]])
        quat[1:] = 0.5 * rest / root
    else:
        i, j = 1 + k % 3, 1 + (k + 1) % 3
        quat[0] = 0.5 * (m[j - 1, i - 1] - m[i - 1, j - 1]) / root
        quat[i] = 0.5 * (m[i - 1, k - 1] + m[k - 1, i - 1]) / root
        quat[j] = 0.5 * (m[j - 1, k - 1] + m[k - 1, j - 1]) / root
    return quat if quat[0] >= 0.0 else -quat
