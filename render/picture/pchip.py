"""Shape-preserving cubic through given points.

scipy has the same as ``PchipInterpolator``; its import is a sixth of a draft still's time, so here are the few lines
that the shapes need. Source: F. N. Fritsch and J. Butland, A method for constructing local monotone piecewise cubic
interpolants, SIAM J. Sci. Stat. Comput. 5 (1984); ends by the three-point rule of C. Moler, Numerical Computing with
MATLAB (2004), chapter 3. Tested against scipy's.
"""

from __future__ import annotations

import numpy as np

from render.frames import Array


def pchip(x: Array, y: Array, at: Array) -> Array:
    """Values (*at.shape, ...) at places of the curve through rising x (N,) and y (N, ...), N at least 3.

    Beyond the ends the outer cubics go on.
    """
    rows = y.reshape(len(y), -1)
    step = np.diff(x)[:, None]
    slope = np.diff(rows, axis=0) / step
    inner = _inner(step, slope)
    tangent = np.concatenate([_end(step[:2], slope[:2]), inner, _end(step[:-3:-1], slope[:-3:-1])])
    places = np.asarray(at, float).reshape(-1)
    i = np.clip(np.searchsorted(x, places, side="right") - 1, 0, len(x) - 2)
    h, t = step[i], places[:, None] - x[i, None]
    bend = (tangent[i] + tangent[i + 1] - 2.0 * slope[i]) / h
    values = rows[i] + t * (tangent[i] + t * ((slope[i] - tangent[i]) / h - bend + t * bend / h))
    result: Array = values.reshape((*np.shape(at), *y.shape[1:]))
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
