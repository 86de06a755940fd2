"""Least values for which something is left: a ladder, then false position, many at once.

What is left grows with the value, but not smoothly: it may jump from "never noticed" to plenty where a faulted
flight begins to clear the ground by itself. So each root is kept between a value that fails and one that holds.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from render.frames import Array

Left = Callable[[NDArray[np.int_], Array], Array]
"""Item of each (N,), value of each (N,) -> what is left beyond the wanted, one for each observer, (N, O)."""


def least_values(
    left: Left, low: Array, rungs: Array, tolerance: float, near: float, rounds: int = 14
) -> tuple[Array, Array]:
    """Least values from which on nothing is wanting, (I, O), and what is left there, (I, O); NaN where there is none.

    low (I,): where each item's ladder begins; rungs (R,) or (I, R): added to it, rising, the first 0. The least is that
    above the last rung that fails. tolerance: how near the value that fails lies below the one that holds;
    near: what is left there may be this much at most before the search stops early.
    """
    items, r = len(low), rungs.shape[-1]
    which = np.repeat(np.arange(items), r)
    ladder = low[:, None] + np.broadcast_to(rungs, (items, r))
    seen = left(which, ladder.ravel()).reshape(items, r, -1)
    observers = seen.shape[2]
    fails = seen < 0.0
    last = r - 1 - np.argmax(fails[:, ::-1], axis=1)  # (I, O)
    last = np.where(np.any(fails, axis=1), last, -1)
    found = np.full((items, observers), np.nan)
    there = np.full((items, observers), np.nan)
    found[last == -1] = np.broadcast_to(low[:, None], found.shape)[last == -1]
    there[last == -1] = seen[:, 0][last == -1]
    i, o = np.nonzero((last >= 0) & (last < r - 1))
    at = last[i, o]
    a, b = ladder[i, at], ladder[i, at + 1]
    w_a, f_b = seen[i, at, o], seen[i, at + 1, o]
    side = np.zeros(len(i))
    w_b = f_b.copy()  # w_a and w_b: the weights of false position (Illinois)
    for n in range(rounds):
        go = (b - a > tolerance) & ~((f_b <= near) & (f_b >= 0.0))
        if not np.any(go):
            break
        smooth = np.isfinite(w_a) & np.isfinite(w_b) & (n % 4 != 3)
        with np.errstate(invalid="ignore", divide="ignore"):
            # aimed a little above the root, so that the value that holds comes in
            aim = near / 2.0
            mid = np.where(smooth, a + (b - a) * (aim - w_a) / (w_b - w_a), 0.5 * (a + b))
        mid = np.clip(mid, a + 0.02 * (b - a), b - 0.02 * (b - a))
        todo = _apart(np.flatnonzero(go), i, a, b)
        seen = left(i[todo], mid[todo])
        for j, x, values in zip(todo, mid[todo], seen, strict=True):
            # what one observer's try shows, the others of the item learn from
            for m in np.flatnonzero(i == i[j]):
                value = values[o[m]]
                if not a[m] < x < b[m]:
                    continue
                if value < 0.0:
                    w_b[m] = 0.5 * w_b[m] if side[m] == 1 else w_b[m]
                    a[m], w_a[m], side[m] = x, value, 1
                else:
                    w_a[m] = 0.5 * w_a[m] if side[m] == -1 else w_a[m]
                    b[m], f_b[m], w_b[m], side[m] = x, value, value, -1
    found[i, o], there[i, o] = b, f_b
    return found, there


def _apart(rows: NDArray[np.int_], item: NDArray[np.int_], a: Array, b: Array) -> NDArray[np.int_]:
    """The rows less those that would try the same item in the same bracket again."""
    _, first = np.unique(np.column_stack([item[rows], a[rows], b[rows]]), axis=0, return_index=True)
    return rows[np.sort(first)]
