"""A smoke trail: a ribbon where the smoke was let out, turned to the eye, wider and thinner with age.

Display axes (east, north, up), metres. RGBA colours, to be drawn unlit and see-through.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyvista as pv

from render.frames import Array, quat_rotate
from render.picture.axes import to_display
from render.picture.loft import grid_tris

#: Share of the ribbon's half width and of its density, from side to side: thick in the middle, nothing at the edge.
_ACROSS = np.array([-1.0, -0.55, 0.0, 0.55, 1.0])
_DENSITY = np.array([0.0, 0.62, 1.0, 0.62, 0.0])


@dataclass(frozen=True, slots=True)
class SmokeLook:
    """How a trail looks. All figures are invented, of the size seen at displays; they make no claim."""

    start_m: float = 0.45  # half width where it leaves the aircraft
    grow_m: float = 0.7  # half width gained in the first second; grows as the square root of age after that
    last_s: float = 16.0  # age at which nothing is left
    alpha: float = 0.85  # density in the middle at the start
    colour: tuple[int, int, int] = (236, 238, 240)
    step_s: float = 0.15  # age between two rows of the ribbon


class Smoke:
    """The trail of one aircraft; ``mesh`` keeps its size, so that only points and colours change between frames."""

    def __init__(self, nozzle_b_m: Array, look: SmokeLook | None = None) -> None:
        """nozzle_b_m: where the smoke is let out, body axes (3,)."""
        self.look = look or SmokeLook()
        self._nozzle = np.asarray(nozzle_b_m, float)
        self._rows = int(np.ceil(self.look.last_s / self.look.step_s)) + 2
        tris = grid_tris(self._rows, len(_ACROSS), False)
        count = self._rows * len(_ACROSS)
        faces = np.column_stack([np.full(len(tris), 3), tris]).reshape(-1)
        self.mesh = pv.PolyData(np.zeros((count, 3), np.float32), faces)
        self.mesh.point_data["colour"] = np.zeros((count, 4), np.uint8)
        self.mesh.point_data.active_scalars_name = "colour"

    def update(
        self,
        now_s: float,
        time_s: Array,
        pos_e_m: Array,
        quat_eb: Array,
        eye_e_m: Array,
        wind_e_mps: Array | None = None,
        begin_s: float = -np.inf,
    ) -> bool:
        """Lay the trail for one instant; False where there is none yet.

        time_s (T,), pos_e_m (T, 3), quat_eb (T, 4): the aircraft's track. eye_e_m (3,): where the camera is.
        wind_e_mps (3,): the air's velocity, which carries the smoke. begin_s: when it was switched on.
        """
        look = self.look
        oldest = max(now_s - look.last_s, begin_s, float(time_s[0]))
        if now_s <= oldest:
            return False
        # Rows at whole steps of time, so that the ribbon does not swim along itself; the newest at the nozzle.
        last = np.floor(now_s / look.step_s)
        whole = (last - np.arange(self._rows - 1)) * look.step_s
        born = np.clip(np.concatenate([[now_s], whole]), oldest, now_s)[: self._rows]
        age = now_s - born
        middle = self._let_out(born, time_s, pos_e_m, quat_eb)
        if wind_e_mps is not None:
            middle = middle + age[:, None] * np.asarray(wind_e_mps, float)
        along = np.gradient(middle, axis=0)
        # Rows that share the oldest instant have no length of their own: they take the direction before them.
        along = _filled(along, np.concatenate([[True], np.diff(born) < -1e-9]))
        side = np.cross(along, np.asarray(eye_e_m, float) - middle)
        length = np.linalg.norm(side, axis=1, keepdims=True)
        side = np.where(length > 1e-9, side / np.maximum(length, 1e-9), [0.0, 0.0, 1.0])
        half = look.start_m + look.grow_m * np.sqrt(np.maximum(age, 0.0)) * np.minimum(age, 1.0) ** 0.5
        points = middle[:, None, :] + (half[:, None] * _ACROSS)[..., None] * side[:, None, :]
        # Thinner as it spreads: the same smoke over a wider ribbon, and it clears towards the end.
        fade = np.sqrt(look.start_m / half) * (1.0 - age / look.last_s)
        if np.isfinite(begin_s):
            fade = np.where(born <= begin_s + 1e-9, 0.0, fade)
        alpha = 255.0 * look.alpha * np.clip(fade, 0.0, 1.0)[:, None] * _DENSITY
        self.mesh.points = to_display(points.reshape(-1, 3)).astype(np.float32)
        colour = np.empty((len(points) * len(_ACROSS), 4), np.uint8)
        colour[:, :3] = look.colour
        colour[:, 3] = np.round(alpha).reshape(-1)
        self.mesh.point_data["colour"] = colour
        return True

    def _let_out(self, born_s: Array, time_s: Array, pos_e_m: Array, quat_eb: Array) -> Array:
        """Places of the nozzle at the instants of birth, (N, 3) earth axes; linear between the track's instants."""
        nozzle = pos_e_m + quat_rotate(quat_eb, np.broadcast_to(self._nozzle, pos_e_m.shape))
        return np.stack([np.interp(born_s, time_s, nozzle[:, i]) for i in range(3)], -1)


def _filled(along: Array, valid: Array) -> Array:
    """Rows without a direction of their own take the last one that had it."""
    last = np.maximum.accumulate(np.where(valid & (np.linalg.norm(along, axis=1) > 1e-9), np.arange(len(along)), 0))
    result: Array = along[last]
    return result
