"""The integrator: its order, batches against single flights, energy, mirrors, the same figures every time."""

from __future__ import annotations

import dataclasses
import itertools
import math

import numba
import numpy as np
import pytest

from render.flight import records as r
from render.flight import script as s
from render.flight.batch import Raw, fly_batch
from render.flight.fly import fly_scene, ground_arrays
from render.flight.plan import Plan, compile_scene
from render.frames import Array, quat_conj, quat_multiply
from render.types import Flight
from scenes.model import Day, Fault, Level, Point, Roll, Scene, Slot, Step, Wind
from tests.flight.made import DEG, FT, KT, flat_ground, freeze, invented_jet, lead_alone, loop_scene
from tests.reference.plane_cases import CASES, fly_ours

PATH = [r.N, r.D, r.V, r.ALPHA, r.PITCH]
SCALE = np.array([1e3, 1e3, 1e2, 0.1, 0.1])


def miss_of(y: Array, best: Array) -> float:
    """Largest part by which a final state misses the best one known."""
    return float(np.max(np.abs(y[PATH] - best[PATH]) / SCALE))


@pytest.mark.parametrize("name", CASES)
def test_a_smooth_flight_gains_sixteenfold_by_each_halving(name: str) -> None:
    """Classical Runge-Kutta: order 4 (any numerical analysis text)."""
    case = dataclasses.replace(CASES[name], time_s=(0.0,), stab_rad=(CASES[name].stab_rad[0],), end_s=8.0)
    best = fly_ours(case, 0.0025)[1][-1]
    errors = [miss_of(fly_ours(case, dt)[1][-1], best) for dt in (0.08, 0.04, 0.02)]
    orders = [math.log2(a / b) for a, b in itertools.pairwise(errors)]
    assert orders == pytest.approx([4.0, 4.0], abs=0.25)


def lead_at(plan: Plan, dt_s: float, end_s: float, *, healthy: bool) -> tuple[Array, Array]:
    """Final state and memory of a lead flown at another step."""
    case = plan.case.copy()
    if healthy:
        case["fault_kind"] = 0.0
    y, _, mem, _ = lead_alone(plan.entry[0], plan.af[0], case[0], plan.script, plan.knots, plan.coeffs, dt_s,
                              round(end_s / dt_s))
    return y[-1], mem


def test_a_scripted_loop_is_far_finer_than_its_step_needs() -> None:
    """The demand has kinks (knots, rate limits), so no clean order: the step flown misses less than 0.1 mm."""
    plan = compile_scene(loop_scene(slots=()), (invented_jet(),))
    best, _ = lead_at(plan, 0.00125, 36.0, healthy=True)
    for dt, allowed_m in ((0.04, 1e-3), (0.02, 1e-4), (0.01, 1e-5)):
        y, _ = lead_at(plan, dt, 36.0, healthy=True)
        assert np.hypot(y[r.N] - best[r.N], y[r.D] - best[r.D]) < allowed_m


def test_the_step_of_the_fault_is_split_at_its_point() -> None:
    """The point is found by a straight line inside its step: order 2 in the fault's time, a split elsewhere.

    An unsplit step would miss the fault by up to 20 ms; this one misses by microseconds, whatever the step.
    """
    plan = compile_scene(loop_scene(freeze(245.0), slots=()), (invented_jet(),))
    best, known = lead_at(plan, 0.000625, 36.0, healthy=False)
    late, path = [], []
    for dt in (0.08, 0.04, 0.02):
        y, mem = lead_at(plan, dt, 36.0, healthy=False)
        late.append(abs(mem[s.M_FAULT_S] - known[s.M_FAULT_S]))
        path.append(np.hypot(y[r.N] - best[r.N], y[r.D] - best[r.D]))
    assert late[2] < 5e-6
    assert late[2] < late[0] / 4.0
    assert path[2] < 1e-4


def test_a_fault_between_two_steps_comes_on_in_between() -> None:
    """A fault asked at a time off the grid holds the surface of just that time, not of a step's end."""
    for when in (10.003, 10.01, 10.0199):
        fault = Fault("freeze", Point("time", when))
        plan = compile_scene(loop_scene(fault, slots=()), (invented_jet(),))
        _, mem = lead_at(plan, 0.02, 12.0, healthy=False)
        _, fine = lead_at(plan, 0.001, 12.0, healthy=False)
        assert mem[s.M_FAULT_S] == pytest.approx(when, abs=1e-9)
        assert mem[s.M_STAB] == pytest.approx(fine[s.M_STAB], abs=1e-6)


def test_a_batch_of_64_equals_64_single_flights(all_threads: None) -> None:
    heights, grid = ground_arrays(flat_ground())
    angles = np.linspace(40.0, 330.0, 64)
    plans = [compile_scene(loop_scene(freeze(a), kt=380.0 + 0.3 * i), (invented_jet(),) * 3)
             for i, a in enumerate(angles)]
    scale = np.linspace(0.9, 1.3, 64)
    together = fly_batch(plans, scale, 2000, heights, grid, healthy=False)
    assert np.ptp(together.y[:, -1, 0, r.N]) > 100.0  # they are different flights
    for i, plan in enumerate(plans):
        alone = fly_batch([plan], scale[i : i + 1], 2000, heights, grid, healthy=False)
        np.testing.assert_allclose(together.y[i], alone.y[0], rtol=1e-9, atol=1e-9)
        np.testing.assert_allclose(together.a[i], alone.a[0], rtol=1e-9, atol=1e-9)


def energy_gap(raw: Raw, k: int) -> float:
    """Total energy less the works of thrust and drag, as a part of the larger work, the worst instant."""
    y = raw.y[0, : int(np.min(raw.status[0, :, 1])) + 1, k]
    energy = 5300.0 * (0.5 * y[:, r.V] ** 2 - 9.80665 * y[:, r.D])
    gap = energy - energy[0] - (y[:, r.WORK_T] - y[:, r.WORK_D])
    return float(np.max(np.abs(gap)) / np.max(np.abs(y[:, r.WORK_D])))


@pytest.mark.parametrize("kind", ["freeze", "trail", "idle", "engines", "slow", "authority"])
def test_energy_balances_the_work_of_thrust_and_drag(kind: str) -> None:
    """d(m V^2/2 + m g h) = (T cos a - D) V dt, lead and wings, within 0.01 %."""
    heights, grid = ground_arrays(flat_ground())
    fault = Fault(kind, Point("loop_angle", 200.0 * DEG), fraction=0.3, rate_radps=2.0 * DEG)
    plan = compile_scene(loop_scene(fault), (invented_jet(),) * 3)
    raw = fly_batch([plan], np.ones(1), 1800, heights, grid, healthy=False)
    assert raw.mem[0, s.M_FAULT_ON] == 1.0
    for k in range(3):
        assert energy_gap(raw, k) < 1e-4


def mirrored(scene: Scene) -> Scene:
    """The same scene seen in a mirror that stands on the north line."""

    def turned(angle: float | None) -> float:
        return (-(angle or 0.0)) % (2.0 * math.pi)

    steps: list[Step] = []
    for step in scene.script:
        if isinstance(step, Level) and step.heading_rad is not None:
            step = dataclasses.replace(step, heading_rad=turned(step.heading_rad))
        elif isinstance(step, Roll):
            step = dataclasses.replace(step, angle_rad=-step.angle_rad)
        steps.append(step)
    wind = scene.day.wind
    day = dataclasses.replace(scene.day, wind=wind and dataclasses.replace(wind, from_rad=turned(wind.from_rad)))
    slots = tuple(dataclasses.replace(slot, right_m=-slot.right_m) for slot in scene.formation)
    return dataclasses.replace(scene, script=tuple(steps), day=day, formation=slots)


def lopsided(fault: Fault | None) -> Scene:
    """A scene with a roll, wind across and slots of several kinds, none its own mirror image."""
    slots = (Slot("echelon", 9.0, 12.0, 1.0), Slot("wide", 3.0, -20.0, 0.5))
    base = loop_scene(fault, slots=slots, close_ft=1500.0)
    begin = Level(388.0 * KT, 1000.0 * FT, 80.0 * DEG, 2.0)
    script = (begin, Roll(70.0 * DEG, 40.0 * DEG, 1.4), Level(for_s=3.0), *base.script[1:])
    return dataclasses.replace(base, script=script, day=Day(wind=Wind(200.0 * DEG, 9.0)))


@pytest.mark.parametrize("fault", [None, freeze(230.0)], ids=["healthy", "frozen"])
def test_a_mirrored_scene_mirrors(fault: Fault | None) -> None:
    scene = lopsided(fault)
    ours, theirs = (fly_scene(x, lambda _: invented_jet(), flat_ground())[1] for x in (scene, mirrored(scene)))
    assert len(ours.time_s) == len(theirs.time_s)
    assert np.max(np.abs(ours.pos_e_m[:, 0, 1])) > 100.0
    across, turns = np.array([1.0, -1.0, 1.0]), np.array([-1.0, 1.0, -1.0])
    for name, sign in (("pos_e_m", across), ("vel_e_mps", across), ("rate_b_radps", turns)):
        np.testing.assert_allclose(getattr(ours, name), getattr(theirs, name) * sign, atol=1e-6)
    quat = theirs.quat_eb * np.array([1.0, -1.0, 1.0, -1.0])
    quat *= np.sign(np.sum(quat * ours.quat_eb, axis=-1, keepdims=True))
    np.testing.assert_allclose(ours.quat_eb, quat, atol=1e-9)
    for name in ("speed_mps", "alpha_rad", "load_factor", "stick", "stabilator_rad", "thrust_n", "height_agl_m"):
        np.testing.assert_allclose(getattr(ours, name), getattr(theirs, name), rtol=1e-7, atol=1e-7)


def test_a_steady_wind_carries_the_whole_formation_along() -> None:
    """Galilei: the air moves as one. A wind from 240 deg blows toward 60 deg: north cos 60, east sin 60."""
    scene = loop_scene(freeze(245.0), slots=(Slot("right", 4.0, 14.0, 1.0), Slot("trail", 30.0, 0.0, 3.0)))
    windy = dataclasses.replace(scene, day=Day(wind=Wind(240.0 * DEG, 10.0)))
    still, carried = (fly_scene(x, lambda _: invented_jet(), flat_ground())[1] for x in (scene, windy))
    toward = 10.0 * np.array([math.cos(60.0 * DEG), math.sin(60.0 * DEG), 0.0])
    contacts = [float(at) for f in (still, carried) for at in f.contact_s if at is not None]
    count = int(np.searchsorted(still.time_s, min(contacts))) - 5  # contact is the same instant but for rounding
    moved = carried.pos_e_m[:count] - still.pos_e_m[:count]
    np.testing.assert_allclose(moved, carried.time_s[:count, None, None] * toward * np.ones((1, 3, 1)), atol=1e-5)
    np.testing.assert_allclose(carried.vel_e_mps[:count] - still.vel_e_mps[:count], np.ones((count, 3, 1)) * toward,
                               atol=1e-6)


def test_velocity_is_the_rate_of_position_and_body_rates_turn_the_body() -> None:
    """Kinematics, by central differences over 0.04 s: of the positions, and of the attitude (w = 2 q* q')."""
    flight = fly_scene(lopsided(None), lambda _: invented_jet(), flat_ground())[0]
    dt = flight.time_s[2] - flight.time_s[0]
    found = (flight.pos_e_m[2:] - flight.pos_e_m[:-2]) / dt
    np.testing.assert_allclose(found, flight.vel_e_mps[1:-1], atol=0.02)
    quat = flight.quat_eb
    turned = 2.0 * quat_multiply(quat_conj(quat[1:-1]), (quat[2:] - quat[:-2]) / dt)[..., 1:]
    missed = np.abs(turned - flight.rate_b_radps[1:-1])
    # a roll asked all at once bends the roll rate within a step or two
    assert np.quantile(missed, 0.999) < 0.005 and np.max(missed) < 0.1


def arrays_of(flight: Flight) -> dict[str, Array]:
    return {f.name: getattr(flight, f.name) for f in dataclasses.fields(flight)
            if isinstance(getattr(flight, f.name), np.ndarray)}


def test_the_same_scene_gives_the_same_bits_on_one_thread_or_all(all_threads: None) -> None:
    first = fly_scene(loop_scene(freeze(245.0)), lambda _: invented_jet(), flat_ground())[1]
    threads = numba.get_num_threads()
    try:
        numba.set_num_threads(1)
        second = fly_scene(loop_scene(freeze(245.0)), lambda _: invented_jet(), flat_ground())[1]
    finally:
        numba.set_num_threads(threads)
    for name, values in arrays_of(first).items():
        assert np.array_equal(values, arrays_of(second)[name], equal_nan=True), name
    assert first.contact_s == second.contact_s
    assert dict(first.events) == dict(second.events)
