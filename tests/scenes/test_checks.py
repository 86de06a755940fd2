"""Values that are right one by one and wrong together, with an airframe of the tests' own."""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from scenes.airframe import Airframe
from scenes.checks import degrees_key
from scenes.complaint import SceneError
from scenes.overlap import Placed, clear_right
from scenes.reader import read_airframe, read_scene_text
from tests.scenes.made import WHOLE, with_line

FRAME = """\
like: jet_trainer
mass: 5000 kg
wing_area: 16 m2
wing_span: 9 m
chord: 2 m
length: 12 m
engines: 2
n_max: 7 g
n_min: -3 g
speed_max: 500 kt
stab_rate: 50 deg/s
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "frame.yaml").write_text(FRAME)
    return tmp_path


def faults_in(folder: Path, text: str) -> list[str]:
    """The complaints of a scene that flies the tests' own airframe, without the file's path."""
    text = text.replace("airframe: jet_trainer", "airframe: frame.yaml")
    with pytest.raises(SceneError) as caught:
        read_scene_text(text, folder / "s.yaml")
    return [line.removeprefix(f"{folder / 's.yaml'}:") for line in str(caught.value).split("\n")]


CASES = [
    ("370 kt", "600 kt", "7:20: script.0.level.speed: read 600 kt, wanted at most 500 kt, to which frame (lead) is "
     "valid"),
    ("90: 3.1", "90: 7.1", "9:41: script.1.loop.load_factor.90: read 7.1 g, wanted -3 g to 7 g, the limits of frame"),
    ("  - level: {for: 3 s}", "  - pull_out: {load_factor: 8 g}",
     "12:29: script.2.pull_out.load_factor: read 8 g, wanted -3 g to 7 g, the limits of frame"),
    ("load_factor: 6.0", "load_factor: 8 g",
     "17:26: break_out.load_factor: read 8 g, wanted at most 7 g, the limit of frame (right)"),
    ("kind: freeze", "kind: engines, lost: 3",
     "13:30: fault.lost: read 3, wanted at most 2: frame has no more engines"),
    ("kind: freeze", "kind: slow, rate: 55 deg/s",
     "13:27: fault.rate: read 55 deg/s, wanted less than 50 deg/s, the rate of frame with nothing failed"),
    ("right: 14 m", "right: 4 m", "15:10: formation.right: read a place inside the lead, 4.0 m from centre to centre, "
     "wanted aircraft clear of each other (spans 9 and 9 m, lengths 12 and 12 m) (did you mean right: 9 m?)"),
    ("left: {aft: 0 m, right: -14 m", "left: {aft: 3 m, right: 12 m",
     "16:9: formation.left: read a place inside right, 3.6 m from centre to centre, wanted aircraft clear of each "
     "other (spans 9 and 9 m, lengths 12 and 12 m) (did you mean right: 8.5 m?)"),
    ("floor: 100 ft", "floor: 100 ft\nbriefed: [{level: {speed: 300 kt, height: 300 ft, heading: 80 deg}}]",
     "6:10: briefed: read a briefed script beside the fault freeze, wanted one or the other: a fault is compared with "
     "the same script flown without it"),
]


@pytest.mark.parametrize(("old", "new", "line"), CASES, ids=[new for _, new, _ in CASES])
def test_together_wrong(folder: Path, old: str, new: str, line: str) -> None:
    """The exact words, at the value that is to be changed."""
    assert faults_in(folder, with_line(old, new))[0] == line


def test_all_at_once(folder: Path) -> None:
    """Faults of single values and of several together come in one error, in the file's order."""
    text = with_line("floor: 100 ft", "floor: 100").replace("8 kt", "8").replace("from: right", "from: rihgt")
    text = text.replace("load_factor: 6.0", "load_factor: 8 g").replace("gauges_every: never", "gauges_every: 2 s")
    lines = faults_in(folder, text)
    assert [line.split(": read")[0] for line in lines] == [
        "3:83: day.wind.speed", "5:8: floor", "17:26: break_out.load_factor", "18:38: watch.gauges_every",
        "19:14: film.from"]


@pytest.mark.parametrize(
    ("new", "line"),
    [
        ("{time: 99 s}", "9:34: fault.at.time: read 99 s, wanted a time within the script, which ends after 6 s"),
        ("{after_top: 1 s}", "9:39: fault.at.after_top: read after_top with a script of no loop, wanted a script of "
         "one loop, or a point by time or height"),
    ],
)
def test_points_of_a_script_without_a_loop(folder: Path, new: str, line: str) -> None:
    """Where the script's end is known, a later point is refused; where it isn't, the flight says so."""
    loop = WHOLE[WHOLE.index("  - loop:") : WHOLE.index("  - level: {for")]
    assert faults_in(folder, with_line("{loop_angle: 245 deg}", new).replace(loop, "")) == [line]


JET = read_airframe("jet_trainer")


def frame(**changes: float) -> Airframe:
    """The shipped jet with its sizes replaced."""
    sizes: dict[str, float] = {"wing_span_m": 9.0, "chord_m": 2.0, "length_m": 12.0}
    return dataclasses.replace(JET, **(sizes | changes))  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("aft", "right", "down", "clear"),
    [
        (0.0, 9.0, 0.0, True),  # wing tips touch
        (0.0, 8.9, 0.0, False),
        (8.0, 6.0, 0.0, True),  # echelon with wings overlapped, nose behind the lead's wing
        (6.0, 5.0, 0.0, False),  # wing into the lead's tail
        (12.0, 0.0, 0.0, True),  # trail, nose to tail
        (11.9, 0.0, 0.0, False),
        (8.0, 0.0, 2.5, True),  # trail, stepped down by more than the fins' height
        (8.0, 0.0, 1.0, False),
    ],
)
def test_clear_of_each_other(aft: float, right: float, down: float, clear: bool) -> None:
    """Boxes worked by hand: span 9, chord 2, length 12, fuselage 1.44 wide and 2.4 high."""
    lead, wing = Placed("lead", frame()), Placed("wing", frame(), aft, right, down)
    assert (clear_right(lead, wing) is None) == clear


PLACES = st.floats(min_value=-30.0, max_value=30.0)


@given(PLACES, PLACES, st.floats(min_value=-4.0, max_value=4.0))
def test_overlap_is_the_same_either_way_and_mirrored(aft: float, right: float, down: float) -> None:
    """Symmetry, and moving to the distance asked for does clear it."""
    lead, wing = Placed("lead", frame()), Placed("wing", frame(wing_span_m=8.0, length_m=7.0), aft, right, down)
    mirrored = Placed("wing", wing.airframe, aft, -right, down)
    least = clear_right(lead, wing)
    assert least == clear_right(wing, lead) == clear_right(lead, mirrored)
    if least is not None:
        assert clear_right(lead, Placed("wing", wing.airframe, aft, least + 1e-9, down)) is None


@given(st.floats(min_value=0.0, max_value=360.0))
def test_degrees_key_reads_back(degrees: float) -> None:
    """The key of a loop table gives the same angle to the last bit."""
    angle = degrees * (math.pi / 180.0)
    assert float(degrees_key(angle)) * (math.pi / 180.0) == angle


@pytest.mark.parametrize(
    ("line", "complaint"),
    [
        ("cl_buffet: 2.9", "2:12: cl_buffet: read 2.9, wanted less than cl_max, 1.15"),
        ("thrust_stopped: -0.001\nthrust_idle: -0.01", "2:17: thrust_stopped: read -0.001, wanted at most thrust_idle, "
         "-0.01"),
        ("stab_no_load: 25 deg", "2:15: stab_no_load: read 25 deg, wanted an angle within the surface's travel, "
         "-20 deg to 10 deg"),
        ("chord: 5 m", "2:8: chord: read 5 m, wanted a mean aerodynamic chord that fits the wing: at or somewhat above "
         "its area over its span, 1.7 m"),
        ("thrust_mach_1: -2.5", "2:16: thrust_mach_1: read -2.5, wanted thrust that stays positive up to Mach 0.8 (it "
         "is lost at Mach 0.80)"),
        ("mass: 5300", "2:7: mass: read 5300, wanted a mass with its unit (kg, lb or t), such as 5300 kg"),
        ("wings: 2", "2:1: wings: read the key wings, wanted one of"),
    ],
)
def test_airframe_faults(tmp_path: Path, line: str, complaint: str) -> None:
    """Of an airframe's values, one by one and together."""
    file = tmp_path / "frame.yaml"
    file.write_text(f"like: jet_trainer\n{line}\n" + ("" if "cl_" not in line else "cl_max: 1.15\n")
                    + ("" if "chord" not in line else "wing_area: 16 m2\nwing_span: 9.4 m\n")
                    + ("" if "no_load" not in line else "stab_min: -20 deg\nstab_max: 10 deg\n")
                    + ("" if "mach_1" not in line else "thrust_mach_2: 0.25\nmach_max: 0.8\n"))
    with pytest.raises(SceneError) as caught:
        read_airframe(file)
    assert str(caught.value).startswith(f"{file}:{complaint}")
