"""Shape: never worse than its start, within its limits, closed; the freezes monotone; bad inputs refused."""

from __future__ import annotations

import dataclasses
import json
import math
from functools import lru_cache
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from render.command import main
from render.decide.shape import CLEAR_S, LIKELY, Frozen, Job, freeze_all, make_job, unlike_slots, with_demand
from render.decide.shape_limits import least_load_factor, measure_pulls, own_limits
from render.decide.shape_scene import found_scene
from render.decide.shape_search import Search, find_shape, fine_points
from render.errors import LatepullError
from render.flight.fly import fly_scene
from render.output.shape_chart import write_shape_chart
from render.output.shape_words import plain_shape, shape_text
from render.study import work_through
from scenes.model import DEG, Loop
from scenes.reader import read_airframe, read_scene, scene_text
from tests.decide.shaped import POINTS, hero, whole
from tests.flight.made import FT, flat_ground, invented_jet, loop_scene


@lru_cache
def jet_job() -> Job:
    return make_job(loop_scene(), lambda _: invented_jet(), flat_ground(), POINTS)


def test_a_demand_is_put_into_the_back_half_alone() -> None:
    job = jet_job()
    old, load = job.scene.script[job.loop], np.linspace(1.0, 4.0, len(job.knots_rad))
    new = with_demand(job, load, 2.0).script[job.loop]
    assert isinstance(old, Loop) and isinstance(new, Loop)
    front = sum(a <= math.pi for a in old.angle_rad)
    assert new.angle_rad[:front] == old.angle_rad[:front] and new.load_factor[:front] == old.load_factor[:front]
    assert new.angle_rad[front:] == (*job.knots_rad, old.angle_rad[-1])
    assert new.load_factor[front:] == (*load, 2.0) and new.close_at_m == old.close_at_m


def test_measures_are_those_of_the_flown_loop() -> None:
    job = jet_job()
    pull = measure_pulls(job, [job.scene])[0]
    healthy, _, _ = fly_scene(job.scene, job.airframe_of, job.ground)
    back = healthy.time_s >= healthy.events["top"]
    load, time_s = healthy.load_factor[back, 0], healthy.time_s[back]
    assert pull.load_factor == pytest.approx(load.max(), abs=1e-3)
    assert pull.speed_max_mps == pytest.approx(healthy.cas_mps[back, 0].max(), abs=0.5)
    down = healthy.events["vertical_down"]
    assert pull.down_height_m == pytest.approx(np.interp(down, healthy.time_s, -healthy.pos_e_m[:, 0, 2]), abs=0.5)
    inside = time_s < healthy.events["bottom"] - 0.5
    assert pull.onset_gps >= 0.95 * np.abs(np.gradient(load, time_s))[inside].max() * 0.9
    assert pull.excess(own_limits(pull)) == 0.0
    assert pull.excess(own_limits(pull, load_factor=0.9 * pull.load_factor)) == pytest.approx(1.0 / 0.9 - 1.0, abs=1e-4)


def test_the_freezes_of_a_loop_are_those_of_single_flights() -> None:
    job = hero()
    frozen = freeze_all(job, [job.scene], np.array([250.0]) * DEG)[0]
    scene = read_scene("late_freeze")
    fault = dataclasses.replace(scene.fault, at=dataclasses.replace(scene.fault.at, value=250.0 * DEG))
    study = work_through(dataclasses.replace(scene, fault=fault), read_airframe, job.ground, "")
    for o, name in enumerate(("early", "likely", "late")):
        assert frozen.lateness_s[0, o] == pytest.approx(
            max(slot["lateness_s"][name] for slot in study.verdict["slots"].values()), abs=1e-9)


def test_found_is_never_worse_closes_and_keeps_every_limit(tmp_path: Path) -> None:
    shape = whole()[0]
    assert shape.best is not None  # the hero loop's growing pull is far from the best within 4.8 g
    item = shape.trade[shape.best]
    assert item.frozen is not None and item.pull is not None and item.scene is not None
    assert item.frozen.score_s < shape.start.score_s
    assert len(item.frozen.freeze_rad) == 5 * (len(POINTS) - 1) + 1
    file = tmp_path / "shaped.yaml"
    file.write_text(found_scene("late_freeze", shape, tmp_path), encoding="utf-8")
    scene = read_scene(file)
    study = work_through(scene, read_airframe, hero().ground, scene_text(file))
    healthy = study.healthy
    top, bottom = healthy.events["top"], healthy.events["bottom"]
    down = (healthy.time_s >= top) & (healthy.time_s <= bottom)
    low = float(np.min(-healthy.pos_e_m[healthy.time_s >= top, 0, 2][: int(np.sum(down)) + 50]))
    assert low == pytest.approx(300 * FT, abs=1.0 * FT)
    limits = item.limits
    load, time_s = healthy.load_factor[down, 0], healthy.time_s[down]
    assert load.max() <= limits.load_factor
    over = round(0.2 / (time_s[1] - time_s[0]))
    assert np.abs(load[over:] - load[:-over]).max() / (time_s[over] - time_s[0]) <= limits.onset_gps + 1e-3
    jet = read_airframe("jet_trainer")
    lift = jet.lift_slope * (healthy.alpha_rad[down, 0] - jet.alpha_zero_rad)
    assert lift.max() <= limits.buffet * jet.cl_buffet + 1e-6
    # the scene of the file itself, measured again
    again = measure_pulls(hero(), [dataclasses.replace(scene, fault=None)])[0]
    assert again.excess(limits) == 0.0 and again.scale == pytest.approx(1.0, abs=0.03)


def test_with_nothing_to_gain_it_says_so_and_keeps_the_loop() -> None:
    job = jet_job()
    own = measure_pulls(job, [job.scene])[0]
    # no slope left to anything: only gentler pulls than are needed to close would keep it
    shape = find_shape(job, slope_gprad=0.2 * own.slope_gprad, budget=60, steps=1, people=6)
    assert shape.best is None and shape.trade[0].scene is None and not shape.within
    assert "Nothing better" in shape_text(shape)
    plain = plain_shape(shape)
    assert plain["best"] is None and plain["trade"][0]["pull"] is None and plain["start"]["within_limits"] is False


def test_the_same_seed_gives_the_same() -> None:
    job = jet_job()
    own = measure_pulls(job, [job.scene])[0]
    seeds = [np.interp(job.knots_rad, own.angle_rad, own.flown_load)]
    one, two, other = (Search(job, own_limits(own), own, seed, 0, "", None, 4) for seed in (5, 5, 6))
    first = one.first(seeds)
    assert np.array_equal(first, two.first(seeds)) and not np.array_equal(first, other.first(seeds))
    assert np.array_equal(one.scores(first), two.scores(first))


def test_chart_and_figures_are_written_whole(tmp_path: Path) -> None:
    shape = whole()[0]
    png, svg = write_shape_chart(shape, tmp_path / "shape")
    assert png.stat().st_size > 20_000 and "<svg" in svg.read_text(encoding="utf-8")[:2000]
    plain = json.loads(json.dumps(plain_shape(shape), allow_nan=False))
    assert plain["trade"][plain["best"]]["demand_g_by_deg"] and "not a clearance" in plain["caution"]
    assert plain["sentence"] in shape_text(shape)


@pytest.mark.slow
@pytest.mark.parametrize(("load", "slope", "clears"), [(4.4, None, True), (4.2, None, True), (None, 0.0285, False)])
def test_two_seeds_agree_and_finer_points_hold(load: float | None, slope: float | None, clears: bool) -> None:
    """With limits so wide that every freeze clears by itself, and so tight that lateness stays."""
    points = np.radians(np.arange(180.0, 346.0, 15.0))
    job = dataclasses.replace(hero(), freeze_rad=points)
    found = [find_shape(job, load_factor=load, slope_gprad=None if slope is None else slope / DEG, budget=3000,
                        seed=seed, steps=1).trade[0] for seed in (1, 22)]
    one, two = (f.frozen.worst_s[LIKELY] for f in found)
    assert np.isneginf(one) == clears
    assert (one == two) if clears else one == pytest.approx(two, rel=0.05)
    for item in found:
        # five times as fine again as the points it was checked at
        finer = freeze_all(job, [item.scene], fine_points(item.frozen.freeze_rad))[0]
        assert np.all(finer.clears) if clears else finer.worst_s[LIKELY] == pytest.approx(one, rel=0.05)


def test_the_least_load_factor_closes_and_less_does_not() -> None:
    job = jet_job()
    least = least_load_factor(job, 6.0)
    assert least_load_factor(job, least + 0.02) == pytest.approx(least, abs=0.03)
    with pytest.raises(LatepullError, match=r"--max-g: read .* can't close at 300 ft"):
        least_load_factor(job, least - 0.05)


def test_fine_points_hold_the_coarse_ones() -> None:
    fine = fine_points(POINTS)
    assert np.allclose(fine[::5], POINTS) and np.all(np.diff(fine) > 0.0)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.floats(-8.0, 8.0), min_size=3, max_size=6), st.floats(0.0, 5.0), st.data())
def test_later_noticing_is_never_a_better_score(late: list[float], more: float, data: st.DataObject) -> None:
    def frozen(values: list[float]) -> Frozen:
        each = np.array(values)
        return Frozen(np.arange(len(each), dtype=float), np.column_stack([each - 1.0, each, each + 1.0]),
                      np.zeros(len(each)), (None,) * len(each))

    i = data.draw(st.integers(0, len(late) - 1))
    later = [v + (more if j == i else 0.0) for j, v in enumerate(late)]
    assert frozen(later).score_s >= frozen(late).score_s
    # one that clears by itself never makes it worse
    cleared = [-math.inf if j == i else v for j, v in enumerate(late)]
    assert frozen(cleared).score_s <= frozen(late).score_s


def test_loops_that_all_clear_are_below_any_lateness_and_never_above_any() -> None:
    all_clear = Frozen(np.zeros(2), np.full((2, 3), -np.inf), np.array([10.0, 40.0]), (None, None))
    assert all_clear.score_s < CLEAR_S and np.all(np.isneginf(all_clear.worst_s))
    never = Frozen(np.zeros(2), np.array([[-1.0, np.inf, np.inf], [-2.0, -2.0, -2.0]]), np.zeros(2), (None, None))
    unknown = Frozen(np.zeros(1), np.full((1, 3), np.nan), np.zeros(1), ("left the range",))
    assert np.isposinf(never.worst_s[LIKELY]) and np.isposinf(unknown.worst_s[LIKELY])
    assert never.score_s == unknown.score_s > 20.0


def test_mirrored_slots_are_searched_once() -> None:
    assert [s.name for s in unlike_slots(hero().scene).formation] == ["right"]


@pytest.mark.parametrize(("change", "words"), [
    ("script:\n  - level: {speed: 385 kt, height: 300 ft, heading: 80 deg, for: 3 s}\n", "without a loop"),
    ("script:\n  - level: {speed: 385 kt, height: 300 ft, heading: 80 deg, for: 3 s}\n"
     "  - loop: {load_factor: {0: 1.2, 12: 4.3, 90: 2.8, 165: 1.0, 270: 3.6, 358: 2.6}}\n", "no close_at"),
])
def test_scenes_that_have_nothing_to_shape(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], change: str, words: str
) -> None:
    file = tmp_path / "mine.yaml"
    file.write_text(f"like: healthy_loop\n{change}", encoding="utf-8")
    assert main(["shape", str(file), "--out", str(tmp_path / "o")]) == 2
    err = capsys.readouterr().err
    assert words in err and "mine.yaml" in err and not (tmp_path / "o").exists()


def test_bad_options_are_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out = tmp_path / "o"
    for options, words in (
        (["--max-g", "2.5 g"], "can't close at 300 ft"), (["--max-g", "fast"], "--max-g: read fast"),
        (["--budget", "10"], "--budget: read 10"), (["--trade", "0"], "--trade: read 0"),
        (["--slope", "-1"], "--slope: read -1"), (["--onset", "2 kt"], "--onset: read 2 kt"),
    ):
        assert main(["shape", "late_freeze", "--out", str(out), *options]) == 2
        assert words in capsys.readouterr().err
    out.mkdir(exist_ok=True)
    (out / "shape.json").write_text("{}", encoding="utf-8")
    assert main(["shape", "late_freeze", "--out", str(out)]) == 2
    assert "shape.json" in capsys.readouterr().err
