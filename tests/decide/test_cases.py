"""Cases worked through together against studies worked through one by one."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from render.decide.cases import Cases, join, per_case, take, work_cases
from render.errors import LatepullError
from render.study import work_through
from render.types import Study
from scenes.model import DEG, Scene
from scenes.reader import read_airframe, read_scene
from scenes.variants import with_value, with_values
from terrain.ground import Ground, read_ground
from tests.decide.studied import columns_of_study

SAME = 1e-9


def ground_of(scene: Scene) -> Ground:
    return read_ground(scene.ground, scene.seed)


def work(scenes: list[Scene], **options: int) -> Cases:
    return work_cases(scenes, read_airframe, ground_of(scenes[0]), **options)


def assert_same(cases: Cases, row: int, scene: Scene, leave: tuple[str, ...] = ()) -> Study:
    """A row is the study of its scene, to a billionth of a second and metre; returns the study."""
    assert cases.error[row] is None, cases.error[row]
    study = work_through(scene, read_airframe, ground_of(scene), "")
    for name, wanted in columns_of_study(study).items():
        if name not in leave:
            np.testing.assert_allclose(getattr(cases, name)[row], wanted, rtol=0.0, atol=SAME, equal_nan=True,
                                       err_msg=f"{scene.name} {name}")
    return study


def test_freezes_that_share_a_twin_are_their_studies(all_threads: None) -> None:
    """Contact, a dip under the floor alone, and a freeze that clears by itself, begun from one healthy flight."""
    base = read_scene("late_freeze")
    scenes = [with_value(base, "fault.at.loop_angle", f"{a} deg") for a in (195, 272, 320)]
    cases = work(scenes)
    assert np.isfinite(cases.contact_s[0, 1]) and np.isnan(cases.contact_s[1:, 1]).all()
    assert np.isfinite(cases.last_pull_floor_s[:2, 0]).all() and np.isnan(cases.last_pull_floor_s[2, 0])
    for i, scene in enumerate(scenes):
        assert_same(cases, i, scene)


def test_cases_of_different_twins_watches_and_faults_are_their_studies() -> None:
    """An entry speed, a temperature, gauges, a call, a break-out, no fault at all, in one table."""
    base = read_scene("part_authority")
    scenes = [
        with_value(base, "script.0.level.speed", "388 kt"),
        with_values(base, {"day.temperature": "30 degC", "watch.call": "1 s"}),
        with_value(base, "watch.gauges_every", "3 s"),
        with_values(base, {"break_out.delay": "0.5 s", "break_out.load_factor": 5.0}),
        dataclasses.replace(base, fault=None),
    ]
    cases = work(scenes)
    assert len(np.unique(cases.loop_scale)) == 3
    for i, scene in enumerate(scenes):
        assert_same(cases, i, scene)


@pytest.mark.parametrize("name", ["turboprop_vic", "trailing_surface", "engines_after_takeoff"])
def test_other_airframes_slots_and_grounds(name: str) -> None:
    """Hills, one wing, no loop: whatever a scene has."""
    scene = read_scene(name)
    assert_same(work([scene]), 0, scene)


def test_a_script_that_is_not_the_briefed_one() -> None:
    """The gates and the scale are those of the flown pass there; all else is the study's."""
    scene = read_scene("long_float")
    cases = work([scene, with_value(scene, "break_out.load_factor", 5.5)])
    study = assert_same(cases, 0, scene, leave=("gates", "loop_scale"))
    assert_same(cases, 1, with_value(scene, "break_out.load_factor", 5.5), leave=("gates", "loop_scale"))
    bottom = float(np.min(study.faulted.height_agl_m[study.faulted.time_s > 25.0, 0]))
    assert cases.gates[0, 4, 1] == pytest.approx(bottom, abs=0.05)


def test_a_case_that_cannot_be_flown_is_a_row_with_the_complaint_of_fly() -> None:
    base = read_scene("late_freeze")
    high = with_value(base, "script.1.loop.close_at", "5000 ft")
    after = with_value(base, "fault.at.loop_angle", "359.5 deg")
    cases = work([base, high, after])
    assert cases.error[0] is None and cases.flown.tolist() == [True, False, False]
    for i, scene in ((1, high), (2, after)):
        with pytest.raises(LatepullError) as caught:
            work_through(scene, read_airframe, ground_of(scene), "")
        assert cases.error[i] == str(caught.value)
        assert np.isnan(cases.lateness_s[i]).all() and (cases.cue[i] == -1).all()


def test_chunks_threads_and_order_change_nothing(all_threads: None) -> None:
    base = read_scene("late_freeze")
    scenes = [with_value(base, "fault.at.loop_angle", a * DEG) for a in (200.0, 230.0, 260.0, 290.0, 215.0)]
    whole = work(scenes)
    pieces = work(scenes, chunk=2, threads=1)
    back = take(work(scenes[::-1]), [4, 3, 2, 1, 0])
    for name in per_case():
        # numpy rounds the last bit by how many it does at a time
        for other in (pieces, back):
            np.testing.assert_allclose(getattr(whole, name), getattr(other, name), rtol=0.0, atol=1e-11, err_msg=name)


def test_tables_join_and_tell_their_rows() -> None:
    base = read_scene("late_freeze")
    one, two = (work([with_value(base, "fault.at.loop_angle", f"{a} deg")]) for a in (250, 300))
    both = join([one, two])
    assert len(both) == 2 and both.names == ("right", "left")
    np.testing.assert_array_equal(both.fault_s, [one.fault_s[0], two.fault_s[0]])
    with pytest.raises(ValueError, match="read-only"):
        both.fault_s[0] = 0.0


def test_cases_of_one_table_need_the_same_slots() -> None:
    with pytest.raises(LatepullError, match="same slots"):
        work_cases([read_scene("late_freeze"), read_scene("trailing_surface")], read_airframe,
                   ground_of(read_scene("late_freeze")))
    with pytest.raises(LatepullError, match="no cases"):
        work_cases([], read_airframe, ground_of(read_scene("late_freeze")))


def test_a_higher_floor_never_leaves_more() -> None:
    """The last pull comes no later, and no observer is less late, as the floor goes up."""
    base = read_scene("late_freeze")
    cases = work([with_value(base, "floor", f"{f} ft") for f in (0, 60, 120, 180, 240)])
    assert np.all(np.diff(cases.last_pull_floor_s[:, 0]) < 0.0)
    assert np.all(np.diff(cases.lateness_s[:, 0, 1]) > 0.0)
    # a floor on the ground is the ground
    assert cases.last_pull_floor_s[0, 0] == pytest.approx(cases.last_pull_ground_s[0, 0], abs=SAME)


def test_observers_come_in_their_order() -> None:
    base = read_scene("late_freeze")
    cases = work([with_value(base, "fault.at.loop_angle", f"{a} deg") for a in range(190, 330, 20)])
    when = np.where(np.isnan(cases.notice_s), np.inf, cases.notice_s)
    assert np.all(when[:, :, 0] <= when[:, :, 1]) and np.all(when[:, :, 1] <= when[:, :, 2])
    late = cases.lateness_s
    assert np.all((late[:, :, 0] < late[:, :, 1]) | np.isnan(late[:, :, 0]) | np.isnan(late[:, :, 1]))
