"""Looks inside at the gauges, and the lead's call."""

from __future__ import annotations

import numpy as np

from render.frames import Array
from render.sight.geometry import Mask
from scenes.model import Watch


def eyes_inside(time_s: Array, watch: Watch) -> Mask:
    """When the eyes are inside, bool (..., T). The first look begins one interval after the start of the script."""
    if watch.gauges_every_s is None:
        return np.zeros(time_s.shape, dtype=bool)
    since = np.mod(time_s + 1e-9, watch.gauges_every_s)
    return np.asarray((time_s >= watch.gauges_every_s - 1e-9) & (since < watch.gauge_look_s))


def last_read(time_s: Array, values: Array, watch: Watch) -> Array:
    """Values (..., T) as they were at the end of the last finished look, held until the next one; 0 before any.

    time_s: even, (T,) or the values' shape.
    """
    if watch.gauges_every_s is None:
        return np.zeros_like(values)
    turn = np.floor((time_s - watch.gauge_look_s + 1e-9) / watch.gauges_every_s)
    read_s = turn * watch.gauges_every_s + watch.gauge_look_s
    first_s, step_s = time_s[..., :1], (time_s[..., 1] - time_s[..., 0])[..., None]
    # the first sample at or after the look's end
    at = np.clip(np.ceil((read_s - 1e-9 - first_s) / step_s), 0, time_s.shape[-1] - 1).astype(int)
    read = np.take_along_axis(values, np.broadcast_to(at, values.shape), -1)
    return np.where((turn >= 1.0) & (read_s >= first_s), read, 0.0)
