"""Speed of flights and maps, as ratios within one run; by hand: ``pytest -n 0 -m benchmark -s tests/benchmarks``.

One flight: the lead of late_freeze from the entry of his loop until 36 s, frozen on the way. ``solve_ivp`` gets the
same equations (``lead_commands`` and ``derivative``), cut at the fault for its sake, and the loosest tolerance
that comes as near as our steps of 0.02 s to a flight in steps of 0.001 s. It is timed twice: with the equations
compiled, which flatters it, and as plain Python (a process of its own without compiler), as it is usually used.
Ours: one flight in a batch that begins at the fault, as a map flies it, and in one that begins at the entry.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from render.decide.cases import work_cases
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import fly_batch, fly_faulted, fly_kept
from render.flight.closing import close_loops
from render.flight.kinematics import derivative, renormalise
from render.flight.passes import fly_lead
from render.flight.plan import DT_S, Plan, compile_scene
from render.frames import Array
from render.study import work_through
from scenes.model import Scene
from scenes.reader import read_airframe, read_scene
from scenes.variants import with_value, with_values
from terrain.ground import read_ground

pytestmark = pytest.mark.benchmark

ROOT = Path(__file__).parents[2]
UNTIL_S, FINE_S = 36.0, 0.001
FAR, FAR_GRID = np.full((1, 1), -20_000.0), np.array([0.0, 0.0, 1.0])
WANTED = 200.0


def lone_plan(scene: Scene) -> Plan:
    """The lead alone, with the scene's fault, its loop closed."""
    plan = compile_scene(scene, (read_airframe(scene.airframe),) * (1 + len(scene.formation)))
    case = plan.case.copy()
    case["loop_scale"] = close_loops([plan], plan.longest_s)
    return Plan(plan.scene, plan.airframes, plan.af, case, plan.entry, plan.script, plan.knots, plan.coeffs, plan.slots,
                plan.escape, plan.longest_s)


def fly(plan: Plan, dt_s: float, until_s: float = UNTIL_S) -> tuple[Array, Array, Array]:
    """States at each step, the memory at each step and at the end."""
    n = round(until_s / dt_s) + 1
    y, a, kept, mem = np.empty((n, r.NY)), np.empty((n, r.NA)), np.empty((n, s.NM)), np.zeros(s.NM)
    fly_lead(plan.entry[0], plan.af[0], plan.case[0], plan.script, plan.knots, plan.coeffs, FAR, FAR_GRID, dt_s, y, a,
             mem, 0, -1, -1, kept)
    return y, kept, mem


@dataclass(frozen=True, slots=True)
class Legs:
    """What a solver flies: the loop from its entry y0 (NY,), the memory there and the one at the fault."""

    af: Any
    case: Any
    script: Array
    knots: Array
    coeffs: Array
    y0: Array
    begin: Array
    mem: Array


def solve(legs: Legs, method: str, rtol: float) -> Array:
    """The state at UNTIL_S by ``solve_ivp`` from the loop's entry, begun again at the fault."""
    dy, memory = np.zeros(r.NY), legs.begin.copy()

    def rate(t: float, y: Array) -> Array:
        memory[s.M_LOOP] = s.loop_angle(y, memory)
        n, onset, roll, throttle, _ = s.lead_commands(t, y, legs.af, legs.case, memory, legs.script, legs.knots,
                                                      legs.coeffs)
        on = memory[s.M_FAULT_ON] > 0.5
        derivative(y, legs.af, legs.case, n, onset, roll, throttle, on, memory[s.M_STAB], True, 0.0, dy)
        return dy.copy()

    def leg(t0: float, t1: float, y: Array) -> Array:
        found = solve_ivp(rate, (t0, t1), y, method=method, rtol=rtol, atol=rtol)
        assert found.success
        end: Array = found.y[:, -1].copy()
        renormalise(end)
        return end

    fault_s = float(legs.mem[s.M_FAULT_S])
    y = leg(float(legs.begin[s.M_START_S]), fault_s, legs.y0)
    memory[s.M_FAULT_ON], memory[s.M_STAB] = 1.0, y[r.STAB]
    return leg(fault_s, UNTIL_S, y)


def missed(y: Array, reference: Array) -> float:
    """How far a final place is from the reference, m."""
    return float(np.linalg.norm(y[r.N : r.D + 1] - reference[r.N : r.D + 1]))


def best_of(work: Callable[[], Any], times: int) -> float:
    """Least processor time of some runs, s."""
    found = []
    for _ in range(times):
        begun = time.process_time()
        work()
        found.append(time.process_time() - begun)
    return min(found)


def loop_entry(kept: Array) -> int:
    """The first step of the loop."""
    return int(np.argmax(kept[:, s.M_STEP] == 1.0))


def solver_times(times: int, keep: Path) -> dict[str, tuple[float, float, float]]:
    """Per method: seconds of one solve at equal accuracy, its tolerance and its miss; ours beside them.

    keep: where what is solved is written, for a process that does it in plain Python.
    """
    plan = lone_plan(read_scene("late_freeze"))
    fine, fine_kept, mem = fly(plan, FINE_S)
    ours, _, _ = fly(plan, DT_S)
    goal = missed(ours[-1], fine[-1])
    i = loop_entry(fine_kept)
    legs = Legs(plan.af[0], plan.case[0], plan.script, plan.knots, plan.coeffs, fine[i], fine_kept[i], mem)
    np.savez(keep, af=plan.af[0], case=plan.case[0], script=plan.script, knots=plan.knots, coeffs=plan.coeffs,
             y0=fine[i], begin=fine_kept[i], mem=mem)
    found: dict[str, tuple[float, float, float]] = {"ours": (0.0, DT_S, goal)}
    for method in ("RK45", "DOP853", "LSODA"):
        for rtol in 10.0 ** -np.arange(6.0, 12.01, 0.5):
            off = missed(solve(legs, method, rtol), fine[-1])
            if off <= goal:
                spent = best_of(partial(solve, legs, method, rtol), times)
                found[method] = spent, float(rtol), off
                break
    return found


def batch_times(flights: int) -> dict[str, float]:
    """Processor seconds of one of many flights of the lead alone, and of the lead with two wings."""
    scene = read_scene("late_freeze")
    plans = [compile_scene(with_value(scene, "fault.at.loop_angle", float(a)), (read_airframe(scene.airframe),) * 3)
             for a in np.radians(np.linspace(200.0, 290.0, flights))]
    alone = [Plan(p.scene, p.airframes[:1], p.af[:1], p.case, p.entry[:1], p.script, p.knots, p.coeffs, p.slots[:0],
                  p.escape, p.longest_s) for p in plans]
    scale = close_loops(plans[:1], plans[0].longest_s)
    steps, found = round(UNTIL_S / DT_S), {}
    for name, some in (("lead", alone), ("lead and two wings", plans)):
        twin = fly_kept(some[:1], scale, steps, FAR, FAR_GRID)
        of, end = np.zeros(flights, dtype=np.int64), np.full(flights, 10**6)
        begun = partial(fly_faulted, some, twin, of, end, steps, FAR, FAR_GRID)
        whole = partial(fly_batch, some, np.repeat(scale, flights), steps, FAR, FAR_GRID, healthy=False)
        found[f"{name}, from the fault"] = best_of(begun, 3) / flights
        found[f"{name}, from the entry"] = best_of(whole, 3) / flights
    return found


def test_one_of_many_flights_against_one_solve_ivp(tmp_path: Path) -> None:
    """Printed, with the ratios; the one that is claimed is plain Python against the lead from the fault."""
    batch_times(8)
    ours = batch_times(400)
    compiled = solver_times(3, tmp_path / "legs.npz")
    env = {**os.environ, "NUMBA_DISABLE_JIT": "1"}
    told = subprocess.run(
        [sys.executable, "-m", "tests.benchmarks.test_flight_speed", str(tmp_path / "legs.npz"),
         str(compiled["RK45"][1])], cwd=ROOT, env=env, capture_output=True, text=True, check=True)
    plain_s = float(told.stdout.strip().splitlines()[-1])
    print(f"\nin steps of {DT_S} s we miss a flight in steps of {FINE_S} s by "
          f"{compiled['ours'][2] * 1e6:.2g} micrometres after {UNTIL_S:g} s")
    for method, (spent, rtol, off) in compiled.items():
        if method != "ours":
            print(f"solve_ivp {method}, equations compiled: {spent * 1e3:.0f} ms at rtol {rtol:.1g}, misses by "
                  f"{off * 1e6:.2g} micrometres")
    print(f"solve_ivp RK45, equations in Python: {plain_s * 1e3:.0f} ms")
    for name, spent in ours.items():
        print(f"ours, {name}: {spent * 1e3:.2f} ms of one core a flight: {plain_s / spent:,.0f} times faster than in "
              f"Python, {compiled['RK45'][0] / spent:,.0f} times than compiled")
    assert plain_s / ours["lead, from the fault"] >= WANTED


def test_a_map_against_its_cases_one_by_one_and_growing() -> None:
    """Cases with margins and three observers for two slots: how time and memory grow, against ``work_through``."""
    base = read_scene("part_authority")
    ground = read_ground(base.ground, base.seed)
    frames = {base.airframe: read_airframe(base.airframe)}

    def scenes(count: int) -> list[Scene]:
        across = max(count // 20, 1)
        return [with_values(base, {"fault.at.loop_angle": float(a), "fault.fraction": float(f)}, frames)
                for a in np.radians(np.linspace(180.0, 330.0, across)) for f in np.linspace(0.0, 0.95, count // across)]

    work_cases(scenes(20), frames.__getitem__, ground)
    alone = best_of(lambda: work_through(base, frames.__getitem__, ground, ""), 3)
    print(f"\none work_through: {alone * 1e3:.0f} ms of one core")
    # with LATEPULL_BENCH_CASES=50000 up to there: some ten minutes
    most = int(os.environ.get("LATEPULL_BENCH_CASES", "5000"))
    for count in (c for c in (100, 500, 1000, 5000, 10_000, 50_000) if c <= most):
        begun, cpu = time.perf_counter(), time.process_time()
        for at in range(0, count, 5000):
            work_cases(scenes(count)[at : at + 5000], frames.__getitem__, ground)
        wall, cpu = time.perf_counter() - begun, time.process_time() - cpu
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
        print(f"{count:6,} cases: {wall:6.1f} s, {cpu / count * 1e3:5.1f} ms of one core each, "
              f"{alone * count / cpu:3.0f} times faster than one by one, peak {peak:.2f} GB, load of the machine "
              f"{os.getloadavg()[0]:.1f}")


if __name__ == "__main__":
    # the equations as plain Python: one solve of what the test has left in a file, timed
    with np.load(sys.argv[1]) as data:
        left = Legs(SimpleNamespace(**{n: float(data["af"][n]) for n in data["af"].dtype.names}),
                    SimpleNamespace(**{n: float(data["case"][n]) for n in data["case"].dtype.names}),
                    *(data[n] for n in ("script", "knots", "coeffs", "y0", "begin", "mem")))
    print(best_of(lambda: solve(left, "RK45", float(sys.argv[2])), 2))
