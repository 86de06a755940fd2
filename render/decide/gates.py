"""Gates: the least height against speed from which a loop closes, or from which any freeze still shows in time."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.decide.brief import AHEAD_S, GATE_ANGLES, Brief, closing_heights
from render.decide.solve import least_values
from render.decide.worst import Count, Row, Worst, freeze_angles, freeze_rows, worst_rows
from render.flight.inside import begin_at
from render.frames import Array
from render.types import freeze_arrays
from terrain.ground import Ground

STEP_RAD = np.radians(10.0)  # between freeze points, at first
FINE_RAD = np.radians(2.5)  # near the worst of them
RUNGS_M = np.array([0.0, 60.0, 160.0, 320.0, 560.0, 900.0, 1500.0, 2400.0])
TOLERANCE_M, NEAR_S = 0.5, 0.02
RISE_MPS, ROUNDS = 60.0, 6  # about what height a second more takes; how often it is solved again at most
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
class Guess:
    """About where a gate is: heights above the least from which the loop clears the floor, its worst freezes."""

    gap_m: Array  # (V, O) of the observers solved for
    angle_rad: Array  # (A,)

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
    flown: dict[tuple[str, float, float, float], Row] = dataclasses.field(default_factory=dict, init=False)

    def worst(self, gate: str, cas_mps: Array, height_m: Array, angle_rad: Array) -> Worst:
        """The worst freezes of passes through a gate at these speeds and heights (N,), angles (A,) or (N, A).

        What has been flown already is not flown again.
        """
        b, angles = self.briefed, np.broadcast_to(angle_rad, (len(cas_mps), np.shape(angle_rad)[-1]))
        keys = [[(gate, float(v), float(h), float(a)) for a in row]
                for v, h, row in zip(cas_mps, height_m, angles, strict=True)]
        new = list(dict.fromkeys(key for row in keys for key in row if key not in self.flown))
        if new:
            passes = dict.fromkeys(key[1:3] for key in new)
            number = {place: i for i, place in enumerate(passes)}
            twins = [begin_at(b.plan, b.gates[gate], v, h) for v, h in passes]
            rows = freeze_rows(twins, np.full(len(twins), b.scale), [(number[key[1:3]], key[3]) for key in new],
                               self.ground, AHEAD_S[gate] + 4.0, offset_s=b.gates[gate].time_s,
                               from_hand=self.from_hand, count=self.count)
            self.flown.update(zip(new, rows, strict=True))
        return worst_rows([[self.flown[key] for key in row] for row in keys], angles)

    def floor_heights(self, gate: str, cas_mps: Array) -> Array:
        """Heights from which the healthy loop by the briefed pull just clears the floor, (V,)."""
        low = dataclasses.replace(self.briefed, base_m=self.briefed.scene.floor_m)
        return closing_heights(low, gate, cas_mps, limit=False)


def solve_gate(solver: Solver, gate: str, cas_mps: Array, guess: Guess | None = None) -> Gate:
    """Solve one gate for calibrated speeds (V,) that rise. guess: about where (c) is, from a like gate."""
    briefed = closing_heights(solver.briefed, gate, cas_mps, limit=False)
    limit = closing_heights(solver.briefed, gate, cas_mps, limit=True)
    state = solver.briefed.gates[gate]
    flown = int(np.argmin(np.abs(cas_mps - state.cas_mps)))
    noticed, there, at, why = _noticed(solver, gate, cas_mps, solver.floor_heights(gate, cas_mps), flown, guess)
    return Gate(gate, cas_mps.copy(), flown, state.height_m, briefed, limit, noticed, there, at, why)


def held(solver: Solver, gate: str) -> Worst:
    """The worst freeze from a gate on of the loop as briefed, which goes through it where it does."""
    state = solver.briefed.gates[gate]
    angles = freeze_angles(GATE_ANGLES[gate], FINE_RAD)
    return solver.worst(gate, np.array([state.cas_mps]), np.array([state.height_m]), angles)


def _noticed(
    solver: Solver, gate: str, cas_mps: Array, low_m: Array, mid: int, guess: Guess | None
) -> tuple[Array, Array, Array, str]:
    """(c): heights (V, O), what is left there, where the worst freeze is, and why there is none.

    The speed the loop has is solved first, with all freeze points; the others from there, with those that matter.
    """
    coarse = freeze_angles(GATE_ANGLES[gate], STEP_RAD)
    start = np.where(np.isfinite(low_m), low_m, np.nanmax(low_m))
    who, v = list(solver.who), len(cas_mps)
    gaps, there, at_rad = (np.full((v, len(who)), np.nan) for _ in range(3))
    one = np.array([mid])
    if guess is None:
        gaps[one], there[one], at_rad[one], angles = _sure(solver, gate, cas_mps[one], start[one], RUNGS_M, coarse)
        known = solver.worst(gate, cas_mps[one], start[one] + np.nanmax(gaps[mid], initial=0.0), coarse)
        keep = np.any(known.each_s[:, :, who] <= known.least_s[:, None, who] + KEEP_S, axis=(0, 2))
        angles = np.unique(np.concatenate([coarse[keep], np.setdiff1d(angles, coarse)]))
        others = np.delete(np.arange(v), mid)
        rungs = _rungs(np.broadcast_to(gaps[mid], (others.size, len(who))))
    else:
        others, angles, rungs = np.arange(v), guess.angle_rad, _rungs(guess.gap_m)
    if others.size:
        gaps[others], there[others], at_rad[others], _ = _sure(solver, gate, cas_mps[others], start[others], rungs,
                                                               angles)
    why = ""
    if np.any(np.isnan(gaps[:, who.index(1)])):
        why = _why_none(gaps[:, [who.index(1)]], solver.worst(gate, cas_mps, start + RUNGS_M[-1], coarse))
    return start[:, None] + gaps, there + solver.want_s, at_rad, why


def _sure(
    solver: Solver, gate: str, cas_mps: Array, start_m: Array, rungs: Array, angles: Array
) -> tuple[Array, Array, Array, Array]:
    """Gaps above the start (V, O), what is left beyond the wanted, where the worst freeze is; the freeze points used.

    What is found with some freeze points is flown with all of them, four times as fine near the worst; where
    something worse turns up it is solved again from there on, until nothing worse does.
    """
    coarse, who = freeze_angles(GATE_ANGLES[gate], STEP_RAD), np.array(solver.who)

    def left(item: NDArray[np.int_], height: Array) -> Array:
        return solver.worst(gate, cas_mps[item], height, angles).least_s[:, who] - solver.want_s

    found, there = least_values(left, start_m, rungs, TOLERANCE_M, NEAR_S)
    at_rad = np.full(found.shape, np.nan)
    v, o = np.nonzero(np.isfinite(found))
    for _ in range(ROUNDS):
        if v.size == 0:
            break
        row, mine = np.arange(v.size), who[o]
        worst = solver.worst(gate, cas_mps[v], found[v, o], angles)
        near = np.array([_around(float(a), coarse) for a in worst.at_rad[row, mine]])
        every = np.concatenate([np.broadcast_to(np.union1d(coarse, angles), (v.size, np.union1d(coarse, angles).size)),
                                near], axis=1)
        worst = solver.worst(gate, cas_mps[v], found[v, o], every)
        beyond, at_rad[v, o] = worst.least_s[row, mine] - solver.want_s, worst.at_rad[row, mine]
        worse = beyond < -NEAR_S
        there[v, o] = np.where(worse, there[v, o], beyond)
        if not np.any(worse):
            break
        angles = np.union1d(angles, worst.at_rad[row, mine][worse])
        v, o, short = v[worse], o[worse], np.minimum(-beyond[worse], 3.0)
        speed, seen = cas_mps[v], who[o]

        def again(item: NDArray[np.int_], height: Array, speed: Array = speed, seen: Array = seen,
                  angles: Array = angles) -> Array:
            least = solver.worst(gate, speed[item], height, angles).least_s
            return least[np.arange(item.size), seen[item]][:, None] - solver.want_s

        end = (start_m[v] + RUNGS_M[-1] - found[v, o])[:, None]
        up = short[:, None] * RISE_MPS * np.array([0.0, 1.0, 4.0]) + [0.0, 2.0, 8.0]
        up = np.concatenate([np.minimum(up, 0.9 * end), end], axis=1)
        higher, over = least_values(again, found[v, o], up, TOLERANCE_M, NEAR_S)
        found[v, o], there[v, o] = higher[:, 0], over[:, 0]
        v, o = v[np.isfinite(higher[:, 0])], o[np.isfinite(higher[:, 0])]
    at_rad[~np.isfinite(found)] = np.nan
    return found - start_m[:, None], there, at_rad, angles


def _rungs(gaps: Array) -> Array:
    """Rungs close about the gaps expected, (V, 2 O + 2); those of the long ladder where none is known."""
    sides = np.concatenate([0.85 * gaps, 1.1 * gaps + 1.0], axis=1)
    sides = np.where(np.isfinite(sides), sides, RUNGS_M[1 : sides.shape[1] + 1])
    ends = np.zeros((len(gaps), 1)), np.full((len(gaps), 1), RUNGS_M[-1])
    return np.maximum.accumulate(np.sort(np.concatenate([ends[0], sides, ends[1]], axis=1), axis=1), axis=1)


def _around(angle_rad: float, angles: Array) -> Array:
    """Freeze points close together about one of them, as far as its neighbours; within the first and the last."""
    k = int(np.ceil(STEP_RAD / FINE_RAD)) - 1
    near: Array = np.round(np.clip(angle_rad + np.arange(-k, k + 1) * FINE_RAD, angles[0], angles[-1]), 9)
    return near


def _why_none(found: Array, top: Worst) -> str:
    """Why the likely observer has no height at some speed, from what the highest rung leaves him there."""
    i = int(np.flatnonzero(np.any(np.isnan(found), axis=1))[0])
    deg = float(np.degrees(top.at_rad[i, 1]))
    if top.cut[i, 1]:
        return f"a freeze at {deg:.0f} deg leaves the range the model is valid in"
    if not np.isfinite(top.least_s[i, 1]):
        return f"a freeze at {deg:.0f} deg does not clear by itself, and nothing shows it to the likely observer"
    return f"a freeze at {deg:.0f} deg leaves {top.least_s[i, 1]:.1f} s even from the greatest height tried"
