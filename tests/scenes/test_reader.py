"""Shipped scenes, scenes that build on others, and the text a scene is made of."""

from __future__ import annotations

import math
import pickle
from pathlib import Path

import pytest

from scenes.complaint import SceneError
from scenes.model import FULL, Fault, Level, Loop, Point, Power, Slot
from scenes.reader import airframe_names, read_airframe, read_scene, read_scene_text, scene_names, scene_text
from tests.scenes.made import WHOLE, faults, with_line

DEG = math.pi / 180.0


@pytest.mark.parametrize("name", scene_names())
def test_shipped_scenes_read(name: str) -> None:
    """Each has its own title, a floor above nothing, and names the invented team or says nothing of one."""
    scene = read_scene(name)
    assert scene.name == name and scene.title and scene.floor_m > 0.0


def test_the_shipped_set() -> None:
    """At least nine scenes, all kinds of fault and none, three airframes that say they are invented."""
    scenes = [read_scene(name) for name in scene_names()]
    assert len(scenes) >= 9
    assert len({scene.title for scene in scenes}) == len(scenes)
    kinds = {scene.fault.kind if scene.fault else None for scene in scenes}
    assert kinds == {None, "freeze", "authority", "slow", "trail", "engines", "idle"}
    frames = [read_airframe(name) for name in airframe_names()]
    assert {frame.shape for frame in frames} == {"jet", "turboprop", "piston"}
    assert all("invented" in frame.invented for frame in frames)


def test_values_arrive_in_si() -> None:
    """Each kind of value once, against figures worked by hand: 370 x 1852/3600, 300 x 0.3048, 24 + 273.15."""
    scene = read_scene_text(WHOLE, "made.yaml")
    first = scene.script[0]
    assert isinstance(first, Level)
    assert first.speed_mps == pytest.approx(190.344444444, rel=1e-11)
    assert first.height_m == pytest.approx(91.44, rel=1e-15)
    assert first.heading_rad == pytest.approx(80 * DEG, rel=1e-15)
    assert scene.day.temperature_k == pytest.approx(297.15, rel=1e-15)
    assert scene.day.wind is not None and scene.day.wind.speed_mps == pytest.approx(4.11555555555, rel=1e-11)
    assert scene.floor_m == pytest.approx(30.48, rel=1e-15)
    loop = scene.script[1]
    assert isinstance(loop, Loop)
    assert loop.angle_rad == tuple(a * DEG for a in (0, 8, 90, 180, 270, 330, 358))
    assert loop.load_factor == (1.2, 4.6, 3.1, 0.6, 2.8, 4.9, 1.2)
    assert loop.power == FULL and loop.close_at_m == pytest.approx(91.44)
    assert scene.fault == Fault("freeze", Point("loop_angle", 245 * DEG))
    assert scene.formation == (Slot("right", 0.0, 14.0, 0.0), Slot("left", 0.0, -14.0, 0.0))
    assert (scene.break_out.load_factor, scene.break_out.onset_gps) == (6.0, 3.0)
    assert scene.watch.gauges_every_s is None and scene.watch.call_after_s is None
    assert (scene.film.slot, scene.film.width_px, scene.film.height_px, scene.film.rate_fps) == ("right", 1280, 720, 30)
    assert (scene.name, scene.source) == ("made", "made.yaml")


@pytest.mark.parametrize(
    ("old", "new", "power"),
    [("power: full\n", "power: 88 %\n", Power("part", 0.88)), ("power: full\n", "power: 0.5\n", Power("part", 0.5)),
     ("power: full\n", "power: idle\n", Power("idle"))],
)
def test_power(old: str, new: str, power: Power) -> None:
    """Words, a percentage, a part of one."""
    loop = read_scene_text(with_line(old, new)).script[1]
    assert loop.power == power


@pytest.mark.parametrize(
    ("new", "fault"),
    [
        ("{kind: authority, at: {after_top: 2 s}, fraction: 40 %}", Fault("authority", Point("after_top", 2.0), 0.4)),
        ("{kind: slow, at: {time: 9 s}, rate: 5 deg/s}", Fault("slow", Point("time", 9.0), rate_radps=5 * DEG)),
        ("{kind: trail, at: {height: 1 km, going: up}, over: 2 s}",
         Fault("trail", Point("height", 1000.0, "up"), over_s=2.0)),
        ("{kind: engines, at: {height: 1 km}, lost: all}", Fault("engines", Point("height", 1000.0))),
        ("{kind: engines, at: {height: 1 km}, lost: 1}", Fault("engines", Point("height", 1000.0), engines_lost=1)),
        ("{kind: idle, at: {time: 9 s}}", Fault("idle", Point("time", 9.0))), ("none", None),
    ],
)
def test_faults(new: str, fault: Fault | None) -> None:
    """Each kind with the keys of its own."""
    assert read_scene_text(with_line("{kind: freeze, at: {loop_angle: 245 deg}}", new)).fault == fault


def test_what_may_be_left_out() -> None:
    """Day, fault, watch, film: a standard day, nothing fails, eyes on the lead, filmed from the first slot."""
    kept = [line for line in WHOLE.splitlines() if not line.startswith(("day", "fault", "watch", "film"))]
    scene = read_scene_text("\n".join(kept))
    assert scene.fault is None and scene.day.temperature_k is None and scene.watch.look_at == "lead"
    assert scene.film.slot == "right"
    solo = "\n".join(line for line in kept if not line.startswith(("  right", "  left"))).replace(
        "formation:", "formation: {}")
    assert read_scene_text(solo).film.slot == "lead"


def write(folder: Path, **texts: str) -> Path:
    """Scene files by name; the last one's path."""
    for name, text in texts.items():
        (folder / f"{name}.yaml").write_text(text, encoding="utf-8")
    return folder / f"{name}.yaml"


def test_like_merges_and_removes(tmp_path: Path) -> None:
    """Mappings merge, lists and values replace, none removes, over more than one file."""
    file = write(
        tmp_path, base=WHOLE,
        middle="like: base.yaml\nday: {wind: {speed: 12 kt}}\nformation: {left: none}\nfloor: 200 ft\n",
        top="like: ./middle.yaml\ntitle: Top\nfault: none\nday: {temperature: none}\nscript:\n"
        "  - level: {speed: 300 kt, height: 500 ft, heading: 10 deg}\n",
    )
    scene = read_scene(file)
    base = read_scene(tmp_path / "base.yaml")
    assert scene.title == "Top" and scene.fault is None
    assert scene.floor_m == pytest.approx(60.96)
    assert scene.day.wind is not None and base.day.wind is not None
    assert scene.day.wind.from_rad == base.day.wind.from_rad
    assert scene.day.wind.speed_mps == pytest.approx(12 * 1852 / 3600)
    assert scene.day.temperature_k is None and scene.day.field_elevation_m == base.day.field_elevation_m
    assert [slot.name for slot in scene.formation] == ["right"]
    assert len(scene.script) == 1
    assert scene.name == "top"


def test_like_changes_the_fault(tmp_path: Path) -> None:
    """Another point replaces the point; another kind keeps the point and drops what only the old kind had."""
    write(tmp_path, base=with_line("kind: freeze", "kind: authority, fraction: 40 %"))
    later = read_scene(write(tmp_path, later="like: base.yaml\nfault: {at: {time: 12 s}}\n"))
    assert later.fault == Fault("authority", Point("time", 12.0), 0.4)
    frozen = read_scene(write(tmp_path, frozen="like: base.yaml\nfault: {kind: freeze}\n"))
    assert frozen.fault == Fault("freeze", Point("loop_angle", 245 * DEG))


def test_complaints_point_at_the_file_where_the_value_stands(tmp_path: Path) -> None:
    """Base and top each have a fault: both are reported, each in its own file."""
    top = write(tmp_path, base=with_line("floor: 100 ft", "floor: 100"), top="like: base.yaml\nfilm: {rate: 3}\n")
    base = tmp_path / "base.yaml"
    with pytest.raises(SceneError) as caught:
        read_scene(top)
    assert str(caught.value).split("\n") == [
        f"{base}:5:8: floor: read 100, wanted a length with its unit (m, ft, km, NM or cm), such as 100 ft",
        f"{top}:2:14: film.rate: read 3, wanted 5 to 60",
    ]


def test_like_in_a_circle_or_unknown(tmp_path: Path) -> None:
    """Said with the files that make the circle; a shipped name that is nearly right is offered."""
    a = write(tmp_path, b="like: a.yaml\n", a="like: b.yaml\n")
    with pytest.raises(SceneError) as caught:
        read_scene(a)
    assert str(caught.value) == (
        f"{tmp_path / 'b.yaml'}:1:7: like: read a.yaml -> b.yaml -> a.yaml, wanted files that don't build on each "
        "other in a circle")
    own = write(tmp_path, own="like: own.yaml\n")
    with pytest.raises(SceneError, match=r"own.yaml -> own.yaml"):
        read_scene(own)
    assert faults("like: helthy_loop\n")[0].endswith("(did you mean healthy_loop?)")
    assert faults("like: [a]\n") == ["s.yaml:1:7: like: read a list, wanted the name of a shipped scene, or a path"]


def test_a_long_chain_is_refused(tmp_path: Path) -> None:
    """Seventeen files built on each other."""
    write(tmp_path, s0=WHOLE, **{f"s{i}": f"like: s{i - 1}.yaml\n" for i in range(1, 17)})
    assert read_scene(tmp_path / "s15.yaml").title == "A loop"
    with pytest.raises(SceneError, match="at most 16 files built on each other"):
        read_scene(tmp_path / "s16.yaml")


def test_an_airframe_of_ones_own(tmp_path: Path) -> None:
    """A path beside the scene; its faults are reported with the scene's."""
    write(tmp_path, frame="like: jet_trainer\ntitle: Heavier\nmass: 6 t\n")
    scene = read_scene(write(tmp_path, s=with_line("airframe: jet_trainer", "airframe: frame.yaml")))
    frame = read_airframe(scene.airframe)
    assert (frame.name, frame.title, frame.mass_kg) == ("frame", "Heavier", 6000.0)
    assert frame.wing_area_m2 == read_airframe("jet_trainer").wing_area_m2
    write(tmp_path, frame="like: jet_trainer\nmass: 6000\n")
    bad = write(tmp_path, s=with_line("airframe: jet_trainer", "airframe: frame.yaml").replace("100 ft", "100"))
    with pytest.raises(SceneError) as caught:
        read_scene(bad)
    assert [(Path(c.file).name, c.path) for c in caught.value.complaints] == [("frame.yaml", "mass"),
                                                                              ("s.yaml", "floor")]


def test_scene_text_changes_with_anything_the_scene_is_made_of(tmp_path: Path) -> None:
    """Base, airframe, the airframe's base: a comment is enough; the place is not."""
    parts = {"plane0": "like: jet_trainer\n", "plane": "like: plane0.yaml\n",
             "base": with_line("airframe: jet_trainer", "airframe: plane.yaml"), "top": "like: base.yaml\n"}
    file = write(tmp_path, **parts)
    text = scene_text(file)
    for name in parts:
        write(tmp_path, **{name: parts[name] + "# new\n"})
        assert scene_text(file) != text
        write(tmp_path, **{name: parts[name]})
        assert scene_text(file) == text
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    assert scene_text(write(elsewhere, **parts)) == text
    assert "# ---- heath.yaml" in text


def test_an_error_survives_a_worker_process() -> None:
    """Pickled and back, with its complaints."""
    with pytest.raises(SceneError) as caught:
        read_scene_text("title: a\n")
    again = pickle.loads(pickle.dumps(caught.value))
    assert again.complaints == caught.value.complaints and str(again) == str(caught.value)
    assert again.details()["complaints"][0]["file"] == "scene.yaml"
