"""Shape-preserving cubic through given points.

scipy has the same as ``PchipInterpolator``; its import is a sixth of a draft still's time, so here are the few lines
that the shapes need. Source: F. N. Fritsch and J. Butland, A method for constructing local monotone piecewise cubic
interpolants, SIAM J. Sci. Stat. Comput. 5 (1984); ends by the three-point rule of C. Moler, Numerical Computing with
MATLAB (2004), chapter 3. Tested against scipy's.
"""

from __future__ import annotations

import numpy as np

from render.frames import Array


class Curve:
    """The curve through rising x (N,) and y (N, ...), N at least 3; beyond the ends the outer cubics go on."""

    def __init__(self, x: Array, y: Array) -> None:
        rows = y.reshape(len(y), -1)
        step = np.diff(x)[:, None]
        slope = np.diff(rows, axis=0) / step
        inner = _inner(step, slope)
        tangent = np.concatenate([_end(step[:2], slope[:2]), inner, _end(step[:-3:-1], slope[:-3:-1])])
        bend = (tangent[:-1] + tangent[1:] - 2.0 * slope) / step
        self._x, self._shape = np.asarray(x, float), y.shape[1:]
        self._powers = rows[:-1], tangent[:-1], (slope - tangent[:-1]) / step - bend, bend / step

    def __call__(self, at: Array) -> Array:
        """Values (*at.shape, ...) at places."""
        places = np.asarray(at, float).reshape(-1)
        i = np.searchsorted(self._x[1:-1], places, side="right")
        t = places[:, None] - self._x[i, None]
        one, two, three, four = (power[i] for power in self._powers)
        values = one + t * (two + t * (three + t * four))
        result: Array = values.reshape((*np.shape(at), *self._shape))
        return result


def _inner(step: Array, slope: Array) -> Array:
    """Weighted harmonic mean of the slopes on both sides; 0 at a turning point."""
    before, after = 2.0 * step[1:] + step[:-1], step[1:] + 2.0 * step[:-1]
    same = slope[:-1] * slope[1:] > 0.0
    left, right = np.where(same, slope[:-1], 1.0), np.where(same, slope[1:], 1.0)
    return np.where(same, (before + after) / (before / left + after / right), 0.0)


def _end(step: Array, slope: Array) -> Array:
    """Tangent at an end from the two steps and slopes next to it, (1, C)."""
    tangent = ((2.0 * step[0] + step[1]) * slope[0] - step[0] * slope[1]) / (step[0] + step[1])
    tangent = np.where(np.sign(tangent) != np.sign(slope[0]), 0.0, tangent)
    over = (np.sign(slope[0]) != np.sign(slope[1])) & (np.abs(tangent) > 3.0 * np.abs(slope[0]))
    return np.where(over, 3.0 * slope[0], tangent)[None]
