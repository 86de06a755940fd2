"""Detector A: a cue stands out when it exceeds two sigma for 0.3 s (section 6.3 of NOTICING.md)."""

from __future__ import annotations

import numpy as np

from render.frames import Array
from render.sight.observers import DWELL_S, SIGMAS


def first_dwell(time_s: Array, ratio: Array, dwell_s: float = DWELL_S) -> Array:
    """When a ratio has exceeded one for a dwell without a break, (...); infinity if never.

    time_s: (T,), ratio: (..., T). The crossing is interpolated between samples. A larger ratio at every
    sample never gives a later time: where the smaller one stays above one, so does the larger, and it
    crossed no later. That is what orders the observers.
    """
    above = ratio > 1.0
    index = np.arange(time_s.size)
    last_below = np.maximum.accumulate(np.where(above, -1, index), axis=-1)  # (..., T), -1: none yet
    start = np.minimum(last_below + 1, time_s.size - 1)
    before = np.maximum(start - 1, 0)
    r0 = np.take_along_axis(ratio, before, -1)
    r1 = np.take_along_axis(ratio, start, -1)
    part = np.where((start > before) & (r1 > r0), (1.0 - r0) / np.where(r1 > r0, r1 - r0, 1.0), 1.0)
    # If the series begins above one there is no crossing to interpolate.
    crossed = np.where(start > before, time_s[before] + np.clip(part, 0.0, 1.0) * (time_s[start] - time_s[before]),
                       time_s[start])
    done = above & (time_s - crossed >= dwell_s - 1e-9)
    first = np.argmax(done, axis=-1)[..., None]
    found = np.take_along_axis(crossed, first, -1)[..., 0] + dwell_s
    return np.where(np.any(done, axis=-1), found, np.inf)


def notice(time_s: Array, difference: Array, sigma: Array) -> Array:
    """When |difference| exceeds two sigma for the dwell, (...); infinity if never. Both (..., T)."""
    return first_dwell(time_s, np.abs(difference) / (SIGMAS * sigma))


def delayed(values: Array, step_s: float, delay_s: float) -> Array:
    """A series (..., T) seen later by a delay, zero before; linear between samples."""
    whole = int(np.floor(delay_s / step_s + 1e-9))
    part = delay_s / step_s - whole
    padded = np.concatenate([np.zeros((*values.shape[:-1], whole + 1)), values], axis=-1)
    size = values.shape[-1]
    return np.asarray((1.0 - part) * padded[..., 1 : size + 1] + part * padded[..., :size])
