"""Scatter: without spread it is the single case; seeded, whatever the chunk; its intervals cover."""

from __future__ import annotations

import dataclasses
import pickle
from functools import lru_cache
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from render.decide import known, scatter_work
from render.decide.chunks import Folder, chunk_count
from render.decide.passes import COMMON, OWN, draw, pass_scenes, reaction_s
from render.decide.scatter import ScatterStudy, share, study_scatter
from render.decide.scatter_work import fly_passes, prepare, work_passes
from render.errors import LatepullError
from render.study import work_through
from scenes.model import Loop, Scatter, Scene, Slot
from terrain.ground import Ground
from tests.flight.made import flat_ground, freeze, invented_jet, loop_scene

SPREAD = Scatter(entry_speed_mps=2.0, entry_height_m=6.0, load_factor=0.04, base_m=6.0, power=0.02, wind_mps=1.5,
                 station_m=0.7, attention=0.3, reaction=0.45)
ONE = (Slot("right", 0.0, 14.0, 0.0),)


@pytest.fixture(autouse=True)
def few_calibration_passes(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(known, "CALIBRATION_PASSES", 1000)
    monkeypatch.setattr(scatter_work, "TECHNIQUE_PASSES", 8)


def scene() -> Scene:
    # about three of four passes are known in time
    return loop_scene(freeze(182.0), slots=ONE)


def flown(
    passes: int, seed: int = 1, chunk: int = 64, spread: Scatter = SPREAD, technique: bool = True
) -> ScatterStudy:
    return study_scatter(scene(), spread, lambda _: invented_jet(), flat_ground(), passes=passes, seed=seed,
                         chunk=chunk, technique=technique)


def test_without_spread_it_is_the_single_case() -> None:
    alone = work_through(scene(), lambda _: invented_jet(), flat_ground(), "")
    study = flown(3, spread=Scatter())
    slot = study.slots[0]
    last = alone.margin.last_pull_floor_s[1]
    assert last is not None and slot.by_itself.count == 0
    for j, gate in enumerate(("entry", "vertical_up", "top", "vertical_down", "bottom")):
        point = alone.verdict["points"][gate]
        want = [point["time_s"], point["height_m"], point["speed_mps"], point["load_factor"]]
        assert study.gates[:, j] == pytest.approx(np.tile(want, (3, 1)), abs=1e-9)
    late = [note.lateness_s for note in alone.notices["right"]]
    assert [s.count for s in slot.observers_in_time] == [3 if x is not None and x <= 0.0 else 0 for x in late]
    assert slot.contact_idle.count == (3 if alone.faulted.contact_s[1] is not None else 0)
    # the table's technique stands, and what is left differs by the noise of his senses alone
    assert dict(slot.technique) == {} and slot.influences == ()
    with_more = flown(8, spread=Scatter())
    assert with_more.slots[0].in_hand_s[:3] == pytest.approx(slot.in_hand_s)


@lru_cache
def study_of_24() -> ScatterStudy:
    return flown(24)


def test_a_seed_gives_the_same_passes_whatever_the_chunk() -> None:
    """And a longer study begins with the passes of a shorter one."""
    one, more = flown(6, chunk=2), study_of_24()
    assert np.array_equal(one.gates, more.gates[:6])
    assert more.slots[0].in_hand_s[:6] == pytest.approx(one.slots[0].in_hand_s, abs=1e-9)
    assert dict(more.slots[0].technique) == dict(one.slots[0].technique)
    assert not np.array_equal(one.gates[:2], flown(2, seed=2, technique=False).gates)


def test_interrupted_work_goes_on_from_its_finished_chunks(tmp_path: Path) -> None:
    level = Ground("level", np.zeros((1, 1)), 0.0, 0.0, 1.0)
    work = prepare(scene(), SPREAD, lambda _: invented_jet(), level, 1, technique=False)
    folder = Folder(tmp_path / "scatter.unfinished", "key", chunk_count(6, 2))

    def interrupt(done: int, total: int) -> None:
        if done == 4:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        fly_passes(work, 6, folder=folder, chunk=2, progress=interrupt)
    assert len(list(folder.path.glob("*.npz"))) == 2
    told: list[int] = []
    cases, known_s = fly_passes(work, 6, folder=folder, chunk=2, resume=True, progress=lambda d, t: told.append(d))
    assert told == [4, 6] and not folder.path.exists()
    straight, known_straight = fly_passes(work, 6)
    # a chunk is a pure function of what can be sent to another machine
    _, there = work_passes(pickle.loads(pickle.dumps(work)), (2, 2))
    assert there == pytest.approx(known_straight[2:4])
    assert known_s == pytest.approx(known_straight)
    assert cases.gates == pytest.approx(straight.gates)


def test_counts_add_up_and_spread_shows_at_the_gates() -> None:
    study = study_of_24()
    slot = study.slots[0]
    assert slot.by_itself.count + slot.in_time.count + slot.too_late.count == len(study.gates) == 24
    top = study.gates[:, 2]
    assert 1.0 < np.std(study.gates[:, 0, 2], ddof=1) < 3.0  # 2 m/s were asked for
    assert 3.0 < np.std(study.gates[:, 4, 1], ddof=1) < 10.0  # and a base within 6 m
    assert np.std(top[:, 1]) > 10.0
    assert slot.contact_acting.count <= slot.contact_idle.count
    assert 0.0 <= slot.false_alarms <= 0.05
    assert all(abs(i.rank) <= 1.0 and i.low <= i.rank <= i.high for i in slot.influences)
    assert all(value > 0.0 for value in slot.technique.values())


@pytest.mark.slow
def test_intervals_of_twenty_studies_cover() -> None:
    # 20 studies of a seed each, of 15 passes; the truth is that of all 300 passes together
    counts = np.array([np.sum(flown(15, seed=s, technique=False).slots[0].in_hand_s >= 0.0) for s in range(20)])
    truth = counts.sum() / 300.0
    assert 0.4 < truth < 0.97
    covered = sum(share(int(k), 15).low <= truth <= share(int(k), 15).high for k in counts)
    # 95 % each at least: 16 or fewer of 20 has a chance of 1.6 %
    assert covered >= 17
    assert len(set(counts)) > 1


@settings(max_examples=60, deadline=None)
@given(st.integers(1, 400), st.data())
def test_shares_lie_in_their_intervals(of: int, data: st.DataObject) -> None:
    count = data.draw(st.integers(0, of))
    found = share(count, of)
    assert 0.0 <= found.low <= count / of <= found.high <= 1.0
    # Clopper-Pearson at the ends: (alpha/2)^(1/n), in closed form
    if count == 0:
        assert found.high == pytest.approx(1.0 - 0.025 ** (1.0 / of), abs=1e-9)


@settings(max_examples=30, deadline=None)
@given(st.floats(0.5, 2.5), st.floats(0.05, 0.9))
def test_reactions_are_a_truncated_gamma(mean: float, spread: float) -> None:
    drawn = reaction_s(mean, spread, np.random.default_rng(1).standard_normal(4000))
    assert np.all((drawn >= min(0.6, mean) - 1e-9) & (drawn <= 5.0 + 1e-9))
    assert np.all(np.diff(reaction_s(mean, spread, np.array([-2.0, 0.0, 2.0]))) > 0.0)
    if mean > 1.2 and spread < 0.3:
        assert np.mean(drawn) == pytest.approx(mean, rel=0.03)
        assert np.std(drawn) / mean == pytest.approx(spread, rel=0.1)
    assert reaction_s(mean, 0.0, np.array([1.0, -1.0])) == pytest.approx([mean, mean])


def test_each_draw_moves_what_it_says() -> None:
    draws = draw(1, 1, 1)
    base = scene()

    def with_only(name: str) -> Scene:
        common, own = np.zeros((1, len(COMMON))), np.zeros((1, 1, len(OWN)))
        if name in COMMON:
            common[0, COMMON.index(name)] = 1.0
        else:
            own[0, 0, OWN.index(name)] = 1.0
        return pass_scenes(base, SPREAD, dataclasses.replace(draws, common=common, own=own))[0]

    first, loop = with_only("entry speed").script[0], with_only("early pull down").script[1]
    assert first.speed_mps - base.script[0].speed_mps == pytest.approx(2.0)  # type: ignore[union-attr]
    before = base.script[1]
    assert isinstance(loop, Loop) and isinstance(before, Loop)
    changes = np.array(loop.load_factor) / np.array(before.load_factor) - 1.0
    at = np.degrees(before.angle_rad)
    assert np.all(changes[at < 150.0] == 0.0) and changes[list(at).index(225)] > 0.0 > changes[list(at).index(330)]
    wind = with_only("wind north").day.wind
    assert wind is not None and (wind.speed_mps, wind.from_rad) == pytest.approx((1.5, 0.0))
    assert with_only("place right").formation[0].right_m == pytest.approx(14.7)
    power = with_only("power").script[1]
    assert isinstance(power, Loop) and power.power.part == pytest.approx(0.88 * 1.02)


def test_what_cannot_be_asked_is_refused() -> None:
    with pytest.raises(LatepullError, match="has no fault"):
        study_scatter(loop_scene(), SPREAD, lambda _: invented_jet(), flat_ground(), passes=3, seed=1)
    with pytest.raises(LatepullError, match="has no wing pilots"):
        study_scatter(loop_scene(freeze(200.0), slots=()), SPREAD, lambda _: invented_jet(), flat_ground(), passes=3,
                      seed=1)
