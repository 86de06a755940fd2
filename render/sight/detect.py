"""Detector A: a cue stands out when it exceeds two sigma for 0.3 s (section 6.3 of NOTICING.md)."""

from __future__ import annotations

import numpy as np
from numba import guvectorize

from render.frames import Array
from render.sight.observers import DWELL_S, SIGMAS


@guvectorize(["void(float64[:], float64[:], float64, float64[:])"], "(t),(t),()->()", cache=True)
def _dwells(time_s: Array, ratio: Array, dwell_s: float, found: Array) -> None:
    crossed = np.inf
    found[0] = np.inf
    for i in range(time_s.size):
        if not ratio[i] > 1.0:
            crossed = np.inf
            continue
        if crossed == np.inf:
            crossed = time_s[i]
            # If the series begins above one there is no crossing to interpolate.
            if i > 0 and ratio[i] > ratio[i - 1]:
                part = min(max((1.0 - ratio[i - 1]) / (ratio[i] - ratio[i - 1]), 0.0), 1.0)
                crossed = time_s[i - 1] + part * (time_s[i] - time_s[i - 1])
        if time_s[i] - crossed >= dwell_s - 1e-9:
            found[0] = crossed + dwell_s
            return


def first_dwell(time_s: Array, ratio: Array, dwell_s: float = DWELL_S) -> Array:
    """When a ratio has exceeded one for a dwell without a break, (...); infinity if never.

    time_s: (T,) or with leading axes of the ratio's, ratio: (..., T). The crossing is interpolated between
    samples. A larger ratio at every sample never gives a later time: where the smaller one stays above one, so
    does the larger, and it crossed no later. That is what orders the observers.
    """
    own = time_s.reshape(time_s.shape[:-1] + (1,) * (ratio.ndim - time_s.ndim) + time_s.shape[-1:])
    return np.asarray(_dwells(own, ratio, dwell_s))


def notice(time_s: Array, difference: Array, sigma: Array) -> Array:
    """When |difference| exceeds two sigma for the dwell, (...); infinity if never. Both (..., T), time as there."""
    return first_dwell(time_s, np.abs(difference) / (SIGMAS * sigma))


def delayed(values: Array, step_s: float, delay_s: float) -> Array:
    """A series (..., T) seen later by a delay, zero before; linear between samples."""
    whole = int(np.floor(delay_s / step_s + 1e-9))
    part = delay_s / step_s - whole
    padded = np.concatenate([np.zeros((*values.shape[:-1], whole + 1)), values], axis=-1)
    size = values.shape[-1]
    return np.asarray((1.0 - part) * padded[..., 1 : size + 1] + part * padded[..., :size])
