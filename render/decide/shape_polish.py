"""A pull made better step by step: how each limit and each freeze answers to each knot, then a linear programme.

The worst of many freezes within many limits is the least of a maximum, with its answer where several meet; a step of
a linear programme over all of them goes there, where a simplex or an evolution stalls short of it. What was flown
decides, not the programme: a step that is no better is made shorter.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.optimize import linprog

from render.frames import Array

PROBE_G = 0.08  # by which each knot is moved to see what answers; lateness has a grain of some hundredths of a second
FIRST_G, LEAST_G, MOST_G = 0.4, 0.01, 0.8  # how far a step may move a knot: at first, at the least, at most
TRIALS = (1.0, 0.5, 0.2, 0.07)  # of it, tried side by side
INSIDE = 2e-3  # parts of the limits kept in hand, since the programme is straight and they are not
DEAR = 1e3  # of an excess beside lateness
GAIN_S, GAIN_PART = 2e-3, 0.05  # less is no gain: of lateness; of an excess, as a part of it


@dataclass(frozen=True, slots=True, eq=False)
class Judged:
    """Pulls judged: N of them, L limits, F freezes."""

    parts: Array  # (N, L) each limit's measure as a part of it; NaN: could not be flown
    excess: Array  # (N,) 0 within all limits
    late_s: Array  # (N, F) NaN where not frozen

    def merit(self, i: int) -> float:
        """What is made small, of one pull."""
        if self.excess[i] > 0.0 or np.isnan(self.late_s[i]).any():
            return DEAR * (1.0 + float(min(self.excess[i], 1e3)))
        return float(self.late_s[i].max())


Judge = Callable[[Array, bool], Judged]
"""Loads (N, D), whether to freeze those beyond the limits too -> judged."""


def polish(judge: Judge, load: Array, low: float, high: float, done: Callable[[], bool]) -> Array:
    """From a pull (D,) on: into the limits if it is beyond them, then to the least of its worst freeze.

    low, high: of each load. done: whether to stop (budget spent, or nothing left to gain).
    """
    here, reach = judge(load[None], False), FIRST_G
    while reach >= LEAST_G and not done():
        within = here.excess[0] == 0.0
        probes = np.where(load + PROBE_G > high, -PROBE_G, PROBE_G)
        around = judge(load + np.diag(probes), within)
        if not np.isfinite(here.parts).all() or not np.isfinite(around.parts).any():
            break
        parts = np.nan_to_num((around.parts - here.parts[0]) / probes[:, None])
        late = np.nan_to_num((around.late_s - here.late_s[0]) / probes[:, None])
        tried = np.array([
            np.clip(load + _step(here, parts, late, within, np.maximum(low - load, -reach * part),
                                 np.minimum(high - load, reach * part)), low, high) for part in TRIALS
        ])
        seen = judge(tried, False)
        merits = [seen.merit(i) for i in range(len(tried))]
        best, gain = int(np.argmin(merits)), GAIN_S if within else DEAR * GAIN_PART * float(here.excess[0])
        if merits[best] < here.merit(0) - gain:
            load = tried[best]
            here = Judged(seen.parts[[best]], seen.excess[[best]], seen.late_s[[best]])
            reach = min(max(2.0 * TRIALS[best], 0.5) * reach, MOST_G)
        else:
            reach *= 0.5 * TRIALS[-1]
    return load


def _step(here: Judged, parts: Array, late: Array, within: bool, low: Array, high: Array) -> Array:
    """The best step by the linear programme, (D,): parts (D, L), late (D, F) of each knot, between low and high."""
    knots, limits = parts.shape
    # unknowns: the step, the worst lateness, the excess
    rows = np.column_stack([parts.T, np.zeros(limits), -np.ones(limits)])
    right = 1.0 - INSIDE - here.parts[0]
    if within:
        freezes = late.shape[1]
        rows = np.concatenate([rows, np.column_stack([late.T, -np.ones(freezes), np.zeros(freezes)])])
        right = np.concatenate([right, -here.late_s[0]])
    cost = np.concatenate([np.zeros(knots), [1.0 if within else 0.0, DEAR]])
    bounds = [*zip(low, high, strict=True), (-1e4, 1e4), (0.0, None)]
    found = linprog(cost, A_ub=rows, b_ub=right, bounds=bounds, method="highs")
    step: Array = np.zeros(knots) if found.x is None else found.x[:knots]
    return step
