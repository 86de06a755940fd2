"""Axes read from options, and what is said of those that can't be."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from render.decide.values import common_of, find_path, read_axis, work_values
from render.errors import LatepullError
from scenes.model import DEG
from scenes.reader import read_airframe, read_scene
from terrain.ground import read_ground

SCENE = read_scene("part_authority")


@pytest.mark.parametrize(
    ("text", "name", "shown"),
    [
        ("fault.at.loop_angle=180:330:50deg", "fault.at.loop_angle_deg", (180, 230, 280, 330)),
        ("loop_angle=180:325:50 deg", "fault.at.loop_angle_deg", (180, 230, 280)),
        ("loop_angle=3:4:0.5 rad", "fault.at.loop_angle_rad", (3, 3.5, 4)),
        ("fraction=0:100:25%", "fault.fraction_percent", (0, 25, 50, 75, 100)),
        ("fraction=0:1:0.5", "fault.fraction", (0, 0.5, 1)),
        ("loop_angle=180:330deg/4", "fault.at.loop_angle_deg", (180, 230, 280, 330)),
        ("loop_angle=300,200,250deg", "fault.at.loop_angle_deg", (300, 200, 250)),
        ("temperature=10:30:10degC", "day.temperature_degC", (10, 20, 30)),
        ("script.1.loop.load_factor.90=2:3:0.5", "script.1.loop.load_factor.90_g", (2, 2.5, 3)),
        ("break_out.onset=2,3,4 g/s", "break_out.onset_g_per_s", (2, 3, 4)),
    ],
)
def test_axes(text: str, name: str, shown: tuple[float, ...]) -> None:
    axis = read_axis(SCENE, text, "--x")
    assert axis.name == name
    assert axis.shown() == pytest.approx(shown, abs=1e-9)


def test_an_axis_is_kept_in_si() -> None:
    axis = read_axis(SCENE, "loop_angle=180:330:50deg", "--x")
    np.testing.assert_allclose(axis.values, np.array([180, 230, 280, 330]) * DEG, rtol=0.0, atol=1e-12)
    assert read_axis(SCENE, "temperature=10:30:10degC", "--y").values == pytest.approx((283.15, 293.15, 303.15))
    assert axis.text(1) == "230 deg"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("loop_angel=180:330:5deg", "nearest fault.at.loop_angle"),
        ("speed=370:400:10kt", "fits script.0.level.speed, script.2.level.speed, day.wind.speed"),
        ("loop_angle=330:180:5deg", "does not rise"),
        ("loop_angle=180:180:5deg", "does not rise"),
        ("loop_angle=180:330:0deg", "a step above zero"),
        ("loop_angle=180:330:-5deg", "a step above zero"),
        ("loop_angle=180:400:5deg", "out of range; wanted 0 deg to 360 deg"),
        ("loop_angle=180:330:5kt", "is no value of fault.at.loop_angle"),
        ("loop_angle=180:330:5", "an angle with its unit"),
        ("loop_angle=", "PATH=FROM:TO:STEP"),
        ("=1:2:3", "PATH=FROM:TO:STEP"),
        ("loop_angle", "PATH=FROM:TO:STEP"),
        ("loop_angle=1:2:3:4deg", "PATH=FROM:TO:STEP"),
        ("loop_angle=,deg", "is no value"),
        ("loop_angle=180:181:5deg", "which is one value"),
        ("loop_angle=200,200deg", "a value comes twice"),
        ("loop_angle=0:360:0.0001deg", "3,600,001 values; at most 2,000"),
        ("loop_angle=0:360deg/999999999", "999,999,999 values"),
        ("loop_angle=nan,1deg", "is no value"),
        ("fault.rate=1:2:1deg/s", "no number of 'part_authority'"),
    ],
)
def test_bad_axes_say_what_is_wanted(text: str, said: str) -> None:
    with pytest.raises(LatepullError) as caught:
        read_axis(SCENE, text, "--x")
    assert said in str(caught.value) and str(caught.value).startswith("--x: ")


@given(st.text(alphabet="loop_ange=:,/0123456789.-deg%kt ", max_size=30))
def test_no_text_is_more_than_a_complaint(text: str) -> None:
    try:
        axis = read_axis(SCENE, text, "--x")
    except LatepullError:
        return
    assert 1 <= len(axis.values) <= 2000


def test_a_path_may_be_its_last_part() -> None:
    assert find_path(SCENE, "loop_angle", "--x").path == "fault.at.loop_angle"
    assert find_path(SCENE, "close_at", "--x").path == "script.1.loop.close_at"


def test_values_that_make_no_scene_are_rows_with_their_complaint() -> None:
    """A break-out that pulls more than the airframe stands is found by the scene's own checks."""
    common = common_of(SCENE, read_airframe, read_ground(SCENE.ground, SCENE.seed))
    good, bad = {"fault.fraction": 0.5}, {"break_out.load_factor": 8.9}
    cases = work_values(common, [good, bad])
    assert cases.error[0] is None and cases.error[1] is not None
    assert "break_out.load_factor" in cases.error[1]
    assert np.isfinite(cases.fault_s[0]) and np.isnan(cases.fault_s[1]) and (cases.cue[1] == -1).all()
