"""The one turn between our axes and VTK's: earth north-east-down to east, north, up.

    e (north, east, down) -> d (x east, y north, z up), metres, same origin (the display centre at field elevation)
"""

from __future__ import annotations

import numpy as np

from render.frames import Array, quat_to_matrix

#: Rows: display axes; columns: earth axes.
DISPLAY_FROM_EARTH = np.array([[0.0, 1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, -1.0]])
DISPLAY_FROM_EARTH.setflags(write=False)


def to_display(vec_e: Array) -> Array:
    """Earth vectors or positions (..., 3), m, in display axes (..., 3)."""
    result: Array = np.asarray(vec_e, float) @ DISPLAY_FROM_EARTH.T
    return result


def body_to_display(pos_e_m: Array, quat_eb: Array) -> Array:
    """The 4 x 4 matrix that places body-axes points (3,) m at an aircraft's position and attitude."""
    matrix = np.eye(4)
    matrix[:3, :3] = DISPLAY_FROM_EARTH @ quat_to_matrix(np.asarray(quat_eb, float))
    matrix[:3, 3] = to_display(pos_e_m)
    return matrix
