"""The map: its cells against flights of the same scene, its boundary on finer grids, its words and outcomes."""

from __future__ import annotations

import csv
import dataclasses
import io

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from render.decide.cases import Cases, join, per_case
from render.decide.map import Map, Outcome, grid_values, make_map, map_axes, outcomes, own_twins, same_slots
from render.decide.map_words import map_sentences
from render.decide.values import Axis, common_of, spoilt, work_values
from render.errors import LatepullError
from render.output.map_tables import map_csv
from render.study import work_through
from scenes.model import DEG, Fault, Point, Scene
from scenes.reader import read_airframe, read_scene
from scenes.variants import with_values
from terrain.ground import read_ground
from tests.decide.studied import columns_of_study

HERO = read_scene("late_freeze")


def flown(scene: Scene, x: str | None, y: str | None) -> Map:
    mapped, x_axis, y_axis = map_axes(scene, x, y)
    common = common_of(mapped, read_airframe, read_ground(mapped.ground, mapped.seed))
    return make_map(scene, mapped, x_axis, y_axis, work_values(common, grid_values(x_axis, y_axis)))


@pytest.fixture(scope="module")
def coarse() -> Map:
    return flown(HERO, "loop_angle=190:310:20deg", "fraction=0:80:40%")


def test_a_cell_is_the_flight_of_its_scene(coarse: Map) -> None:
    """Late, in between and clear, to a billionth."""
    for i, j in ((0, 0), (2, 1), (6, 2)):
        scene = with_values(coarse.scene, {coarse.x.path: coarse.x.values[i], coarse.y.path: coarse.y.values[j]})
        study = work_through(scene, read_airframe, read_ground(scene.ground, scene.seed), "")
        for name, wanted in columns_of_study(study).items():
            np.testing.assert_allclose(coarse.grid(name)[i, j], wanted, rtol=0.0, atol=1e-9, equal_nan=True,
                                       err_msg=f"{name} at {i}, {j}")


def test_the_size_of_a_chunk_changes_no_bit(coarse: Map) -> None:
    mapped, x, y = map_axes(HERO, "loop_angle=190:310:20deg", "fraction=0:80:40%")
    common = common_of(mapped, read_airframe, read_ground(mapped.ground, mapped.seed))
    values = grid_values(x, y)
    made = make_map(HERO, mapped, x, y, join([work_values(common, values[at : at + 5]) for at in range(0, 21, 5)]))
    for name in per_case():
        np.testing.assert_array_equal(made.grid(name), coarse.grid(name), name)


def test_a_freeze_is_an_authority_of_nothing(coarse: Map) -> None:
    """The row of nothing left is the frozen scene itself, whose fault is of the other kind."""
    frozen = dataclasses.replace(HERO, fault=Fault("freeze", Point("loop_angle", 230.0 * DEG)))
    study = work_through(frozen, read_airframe, read_ground(HERO.ground, HERO.seed), "")
    assert coarse.grid("lateness_s")[2, 0] == pytest.approx(np.array(columns_of_study(study)["lateness_s"]), abs=1e-9)


def boundary(found: Map) -> float:
    """Between the last angle that is too late and the next, deg, in the first row, right wing."""
    late = np.flatnonzero(found.outcome[:, 0, 0] == Outcome.TOO_LATE)
    return 0.5 * (found.x.shown()[late[-1]] + found.x.shown()[late[-1] + 1])


def test_a_finer_grid_moves_the_boundary_of_too_late_by_less_than_a_cell(coarse: Map) -> None:
    fine = flown(HERO, "loop_angle=230:310:5deg", "fraction=0,40%")
    assert abs(boundary(fine) - boundary(coarse)) < 20.0
    finest = flown(HERO, f"loop_angle={boundary(fine) - 4:g}:{boundary(fine) + 4:g}:1deg", "fraction=0,40%")
    assert abs(boundary(finest) - boundary(fine)) < 5.0


def test_defaults_fit_the_fault() -> None:
    for name, x, y in (
        ("late_freeze", "fault.at.loop_angle", "fault.fraction"), ("part_authority", "fault.at.loop_angle",
                                                                   "fault.fraction"),
        ("slow_surface", "fault.at.loop_angle", "fault.rate"), ("trailing_surface", "fault.at.loop_angle",
                                                                "fault.over"),
        ("lead_to_idle", "fault.at.loop_angle", "script.0.level.speed"),
        ("engines_after_takeoff", "fault.at.height", "script.0.level.speed"),
    ):
        scene = read_scene(name)
        _, x_axis, y_axis = map_axes(scene, None, None)
        assert (x_axis.path, y_axis.path) == (x, y), name
        own = scene.fault
        assert own is not None
        if own.kind == "slow":
            assert own.rate_radps in y_axis.values
    assert own_twins(x_axis, y_axis) and not own_twins(*map_axes(HERO, None, None)[1:])


def test_maps_that_cannot_be() -> None:
    with pytest.raises(LatepullError, match="has no fault to map"):
        map_axes(read_scene("healthy_loop"), None, None)
    with pytest.raises(LatepullError, match="two different values"):
        map_axes(HERO, "loop_angle=180:300:20deg", "fault.at.loop_angle=180:300:20deg")
    # without a fault, two values of the flight
    mapped, _, _ = map_axes(read_scene("healthy_loop"), "script.0.level.speed=370,385kt", "temperature=10,20degC")
    assert mapped.fault is None


def test_the_two_sentences_of_the_hero(coarse: Map) -> None:
    """Both wings alike; the first along the frozen row, the second over the whole map."""
    ((names, own, whole),) = map_sentences(coarse)
    assert names == "Right and left"
    assert own.startswith("With nothing of the control left, a fault at 190 to 270 deg of the loop shows too late even "
                          "for the early observer, and one at 290 to 310 deg")
    worst = np.nanmax(np.where(coarse.outcome[..., 0] == Outcome.CLEARS, np.nan, coarse.grid("lateness_s")[:, :, 0, 1]))
    assert f"{worst:.1f} s too late" in whole
    assert whole.endswith("with 80 % of the control left the formation clears by itself wherever the fault comes.")
    assert same_slots(coarse) == [(0, 1)]


def test_the_table_is_tidy(coarse: Map) -> None:
    rows = list(csv.DictReader(io.StringIO(map_csv(coarse))))
    assert len(rows) == 7 * 3 * 2 * 3
    assert [k for k in rows[0] if k.startswith("fault.")] == ["fault.at.loop_angle_deg", "fault.fraction_percent"]
    one = next(r for r in rows if r["fault.at.loop_angle_deg"] == "230" and r["fault.fraction_percent"] == "0"
               and r["slot"] == "left" and r["observer"] == "likely")
    assert float(one["lateness_s"]) == pytest.approx(coarse.grid("lateness_s")[2, 0, 1, 1], abs=1e-9)
    assert one["outcome"] == "too_late" and one["cue"] == "tilt" and one["error"] == ""
    clear = next(r for r in rows if r["fault.at.loop_angle_deg"] == "310")
    assert clear["contact_s"] == "" and clear["last_pull_floor_s"] == ""


def made_up(late: list[float], lowest_m: float) -> Cases:
    """One flown case of one slot with these three latenesses."""
    blank = spoilt(work_made(), {})
    columns = {name: getattr(blank, name).copy() for name in per_case()}
    columns["lateness_s"][0, 0] = late
    columns["lowest_m"][0] = lowest_m
    return dataclasses.replace(blank, **columns)


def work_made() -> Cases:
    n = np.nan
    return Cases(
        names=("right",), error=(None,), fault_s=np.array([30.0]), contact_s=np.full((1, 2), n),
        lowest_m=np.full((1, 2), n), loop_scale=np.ones(1), gates=np.full((1, 5, 4), n), load_factor_max=np.ones(1),
        speed_max_mps=np.ones(1), last_pull_floor_s=np.full((1, 1), 33.0), last_pull_ground_s=np.full((1, 1), 34.0),
        lead_notice_s=np.full((1, 3), n), notice_s=np.full((1, 1, 3), n), cue=np.full((1, 1, 3), -1),
        reaction_s=np.array([0.8, 1.5, 3.0]), lateness_s=np.full((1, 1, 3), n), clearance_floor_m=np.full((1, 1, 3), n),
        clearance_ground_m=np.full((1, 1, 3), n),
    )


@pytest.mark.parametrize(
    ("late", "lowest_m", "outcome"),
    [
        ([-1.0, -0.5, 0.0], 0.0, Outcome.ALL_IN_TIME), ([-1.0, -0.5, 0.1], 0.0, Outcome.LIKELY_IN_TIME),
        ([-1.0, 0.1, 3.0], 0.0, Outcome.EARLY_IN_TIME), ([0.1, 0.2, 0.3], 0.0, Outcome.TOO_LATE),
        ([np.nan] * 3, 0.0, Outcome.TOO_LATE), ([-1.0, np.nan, np.nan], 10.0, Outcome.EARLY_IN_TIME),
        ([5.0, 5.0, 5.0], 31.0, Outcome.CLEARS), ([np.nan] * 3, 31.0, Outcome.CLEARS),
    ],
)
def test_outcomes(late: list[float], lowest_m: float, outcome: Outcome) -> None:
    assert outcomes(made_up(late, lowest_m), 30.0)[0, 0] == outcome


@given(st.lists(st.floats(-5.0, 5.0), min_size=3, max_size=3), st.lists(st.floats(0.0, 4.0), min_size=3, max_size=3),
       st.floats(0.0, 60.0), st.floats(0.0, 20.0))
def test_later_is_never_better_and_a_higher_floor_neither(
    late: list[float], more: list[float], lowest_m: float, up_m: float
) -> None:
    """Outcomes are ordered from best to worst, so that they may only rise."""
    case = made_up(late, lowest_m)
    later = made_up([a + b for a, b in zip(late, more, strict=True)], lowest_m)
    assert outcomes(later, 30.0)[0, 0] >= outcomes(case, 30.0)[0, 0]
    if outcomes(case, 30.0)[0, 0] != Outcome.CLEARS:
        assert outcomes(case, 30.0 + up_m)[0, 0] >= outcomes(case, 30.0)[0, 0]


def test_words_for_maps_of_every_sort() -> None:
    """No grid of outcomes leaves the sentences without an end."""
    x = Axis("fault.at.loop_angle", "angle", "deg", tuple(a * DEG for a in (200.0, 220.0, 240.0)))
    y = Axis("fault.fraction", "fraction", "%", (0.0, 0.5, 1.0))
    blank = work_made()
    columns = {name: np.repeat(getattr(blank, name), 9, axis=0) for name in per_case()}
    for low in (0.0, 100.0):
        columns["lowest_m"] = np.full((9, 2), low)
        columns["lateness_s"] = np.linspace(-3.0, 3.0, 27).reshape(9, 1, 3)
        cases = dataclasses.replace(blank, error=(None,) * 8 + ("can't",), **columns)
        found = make_map(HERO, HERO, x, y, cases)
        ((_, own, whole),) = map_sentences(found)
        assert own.endswith(".") and whole.endswith(".") and "nan" not in own + whole
