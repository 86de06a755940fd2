"""Gates: the least height against speed from which a loop closes, or from which any freeze still shows in time."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.decide.brief import AHEAD_S, GATE_ANGLES, Brief, closing_heights
from render.decide.solve import least_values
from render.decide.worst import Count, Worst, freeze_angles, worst_freezes
from render.flight.inside import begin_at
from render.frames import Array
from render.types import freeze_arrays
from terrain.ground import Ground

STEP_RAD = np.radians(10.0)  # between freeze points, at first
FINE_RAD = np.radians(2.5)  # near the worst of them
RUNGS_M = np.array([0.0, 60.0, 160.0, 320.0, 560.0, 900.0, 1500.0, 2400.0])
TOLERANCE_M, NEAR_S = 0.5, 0.02
KEEP_S = 1.0  # freeze points that leave this much more than the worst are not flown again in the search


@dataclass(frozen=True, slots=True, eq=False)
class Gate:
    """One gate: least heights, m above the field, for calibrated speeds (V,); NaN where there is none."""

    name: str  # top | vertical_down
    speed_mps: Array  # (V,)
    flown: int  # which of the speeds the loop as briefed has
    flown_height_m: float
    briefed_m: Array  # (V,) (a) the loop closes at the base by the briefed pull
    limit_m: Array  # (V,) (b) by the airframe's limits
    noticed_m: Array  # (V, O) (c) any freeze from there on leaves the wanted seconds; early, likely, late
    there_s: Array  # (V, O) seconds left in the worst freeze at (c)
    worst_rad: Array  # (V, O) where that freeze is
    none: str  # why (c) has no height for the likely observer where it has none; empty if it has

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, slots=True, eq=False)
class Solver:
    """What the solves share."""

    briefed: Brief
    ground: Ground
    want_s: float
    from_hand: bool
    who: tuple[int, ...] = (0, 1, 2)  # observers solved for, of OBSERVERS
    count: Count | None = None

    def worst(self, gate: str, cas_mps: Array, height_m: Array, angle_rad: Array) -> Worst:
        """The worst freezes of passes through a gate at these speeds and heights (N,)."""
        b = self.briefed
        twins = [begin_at(b.plan, b.gates[gate], float(v), float(h)) for v, h in zip(cas_mps, height_m, strict=True)]
        return worst_freezes(twins, np.full(len(twins), b.scale), angle_rad, self.ground, AHEAD_S[gate] + 4.0,
                             offset_s=b.gates[gate].time_s, from_hand=self.from_hand, count=self.count)

    def floor_heights(self, gate: str, cas_mps: Array) -> Array:
        """Heights from which the healthy loop by the briefed pull just clears the floor, (V,)."""
        low = dataclasses.replace(self.briefed, base_m=self.briefed.scene.floor_m)
        return closing_heights(low, gate, cas_mps, limit=False)


def solve_gate(solver: Solver, gate: str, cas_mps: Array) -> Gate:
    """Solve one gate for calibrated speeds (V,) that rise."""
    briefed = closing_heights(solver.briefed, gate, cas_mps, limit=False)
    limit = closing_heights(solver.briefed, gate, cas_mps, limit=True)
    state = solver.briefed.gates[gate]
    flown = int(np.argmin(np.abs(cas_mps - state.cas_mps)))
    noticed, there, at, why = _noticed(solver, gate, cas_mps, solver.floor_heights(gate, cas_mps), flown)
    return Gate(gate, cas_mps.copy(), flown, state.height_m, briefed, limit, noticed, there, at, why)


def held(solver: Solver, gate: str) -> Worst:
    """The worst freeze from a gate on of the loop as briefed, which goes through it where it does."""
    state = solver.briefed.gates[gate]
    angles = freeze_angles(GATE_ANGLES[gate], FINE_RAD)
    return solver.worst(gate, np.array([state.cas_mps]), np.array([state.height_m]), angles)


def _noticed(solver: Solver, gate: str, cas_mps: Array, low_m: Array, mid: int) -> tuple[Array, Array, Array, str]:
    """(c): heights (V, O), what is left there, where the worst freeze is, and why there is none.

    The speed the loop has is solved first, with all freeze points; the others from there, with those that matter.
    What is found is flown again with all of them, four times as fine near the worst, and solved again until
    nothing worse turns up.
    """
    coarse = freeze_angles(GATE_ANGLES[gate], STEP_RAD)
    start = np.where(np.isfinite(low_m), low_m, np.nanmax(low_m))
    who = list(solver.who)
    gaps, _, worst, _ = _solve(solver, gate, cas_mps[[mid]], start[[mid]], RUNGS_M, coarse)
    angles = coarse[np.any(worst.each_s[:, :, who] <= worst.least_s[:, None, who] + KEEP_S, axis=(0, 2))]
    gaps = np.broadcast_to(gaps, (len(cas_mps), gaps.shape[1]))
    for _ in range(4):
        gaps, there, worst, rows = _solve(solver, gate, cas_mps, start, _rungs(gaps), angles)
        if rows[0].size == 0:  # nobody has a height at any speed
            break
        v, o = rows
        at = np.arange(v.size)
        mine = np.array(who)[o]
        near = np.concatenate([_around(float(a), coarse) for a in worst.at_rad[at, mine]])
        every = np.unique(np.round(np.concatenate([coarse, near]), 9))
        worst = solver.worst(gate, cas_mps[v], (start[:, None] + gaps)[v, o], every)
        beyond = worst.least_s[at, mine] - solver.want_s
        worse = beyond < -NEAR_S
        if not np.any(worse):
            there = there.copy()
            there[v, o] = beyond
            break
        angles = np.unique(np.round(np.concatenate([angles, worst.at_rad[at, mine][worse]]), 9))
    at_rad = np.full(gaps.shape, np.nan)
    if rows[0].size:
        at_rad[rows] = worst.at_rad[np.arange(rows[0].size), np.array(who)[rows[1]]]
    why = ""
    if np.any(np.isnan(gaps[:, who.index(1)])):
        why = _why_none(gaps[:, [who.index(1)]], solver.worst(gate, cas_mps, start + RUNGS_M[-1], coarse))
    return start[:, None] + gaps, there + solver.want_s, at_rad, why


def _solve(
    solver: Solver, gate: str, cas_mps: Array, start_m: Array, rungs: Array, angles: Array
) -> tuple[Array, Array, Worst, tuple[NDArray[np.int_], NDArray[np.int_]]]:
    """Gaps above the start (V, O), what is left beyond the wanted, the worst there, and its rows (speed, observer)."""

    def left(item: NDArray[np.int_], height: Array) -> Array:
        return solver.worst(gate, cas_mps[item], height, angles).least_s[:, list(solver.who)] - solver.want_s

    found, there = least_values(left, start_m, rungs, TOLERANCE_M, NEAR_S)
    v, o = np.nonzero(np.isfinite(found))
    at = (cas_mps[v], found[v, o]) if v.size else (cas_mps, start_m + rungs[..., -1])
    worst = solver.worst(gate, *at, angles)
    return found - start_m[:, None], there, worst, (v, o)


def _rungs(gaps: Array) -> Array:
    """Rungs close about the gaps expected, (V, 2 O + 2); those of the long ladder where none is known."""
    sides = np.concatenate([0.85 * gaps, 1.1 * gaps + 1.0], axis=1)
    sides = np.where(np.isfinite(sides), sides, RUNGS_M[1 : sides.shape[1] + 1])
    ends = np.zeros((len(gaps), 1)), np.full((len(gaps), 1), RUNGS_M[-1])
    return np.maximum.accumulate(np.sort(np.concatenate([ends[0], sides, ends[1]], axis=1), axis=1), axis=1)


def _around(angle_rad: float, angles: Array) -> Array:
    """Freeze points close together about one of them, as far as its neighbours."""
    k = int(np.ceil(STEP_RAD / FINE_RAD)) - 1
    out: Array = angle_rad + np.arange(-k, k + 1) * FINE_RAD
    return out[(out >= angles[0] - 1e-9) & (out <= angles[-1] + 1e-9)]


def _why_none(found: Array, top: Worst) -> str:
    """Why the likely observer has no height at some speed, from what the highest rung leaves him there."""
    i = int(np.flatnonzero(np.any(np.isnan(found), axis=1))[0])
    deg = float(np.degrees(top.at_rad[i, 1]))
    if top.cut[i, 1]:
        return f"a freeze at {deg:.0f} deg leaves the range the model is valid in"
    if not np.isfinite(top.least_s[i, 1]):
        return f"a freeze at {deg:.0f} deg does not clear by itself, and nothing shows it to the likely observer"
    return f"a freeze at {deg:.0f} deg leaves {top.least_s[i, 1]:.1f} s even from the greatest height tried"
