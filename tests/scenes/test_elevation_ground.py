"""A scene over a real relief: the elevation file is named like any other, its faults are complaints."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from scenes.complaint import SceneError
from scenes.reader import read_scene, scene_text
from terrain.ground import read_ground

ASC = "ncols 101\nnrows 101\nxllcorner 0\nyllcorner 0\ncellsize 50\nNODATA_value -9999\n"


def written(folder: Path, ground: str, heights: str) -> Path:
    (folder / "hill.asc").write_text(ASC + heights, encoding="utf-8")
    scene = folder / "scene.yaml"
    scene.write_text(f"like: healthy_loop\nground: {ground}\n", encoding="utf-8")
    return scene


def relief(top_m: float) -> str:
    """A cone 500 m wide in the north-east, level elsewhere at 100 m."""
    axis = np.arange(101) * 50.0
    north, east = np.meshgrid(axis[::-1], axis, indexing="ij")
    cone = np.clip(1.0 - np.hypot(north - 4000.0, east - 4000.0) / 500.0, 0.0, 1.0)
    return "\n".join(" ".join(f"{h:.2f}" for h in row) for row in 100.0 + top_m * cone)


def test_an_elevation_file_beside_the_scene_is_its_ground(tmp_path: Path) -> None:
    scene = read_scene(written(tmp_path, "hill.asc", relief(200.0)))
    ground = read_ground(scene.ground, scene.seed)
    assert float(ground.height_at(0.0, 0.0)) == pytest.approx(0.0, abs=1e-6)  # the field is the file's middle
    assert float(ground.height_at(1500.0, 1500.0)) == pytest.approx(200.0, abs=15.0)


def test_its_centre_may_be_placed(tmp_path: Path) -> None:
    scene = read_scene(written(tmp_path, "'hill.asc@4000,2000'", relief(200.0)))
    assert float(read_ground(scene.ground).height_at(0.0, 0.0)) == pytest.approx(0.0, abs=1e-6)


def test_a_change_of_the_file_changes_the_scenes_text(tmp_path: Path) -> None:
    path = written(tmp_path, "hill.asc", relief(200.0))
    before = scene_text(path)
    assert scene_text(path) == before
    (tmp_path / "hill.asc").write_text(ASC + relief(201.0), encoding="utf-8")
    assert scene_text(path) != before


@pytest.mark.parametrize(("ground", "heights", "wanted"), [
    ("none.asc", "", "can't be read"),
    ("hill.asc", "1 2 3", "hill.asc"),
    ("'hill.asc@x'", relief(1.0), "wanted @north,east as two numbers"),
])  # fmt: skip
def test_a_bad_file_is_a_complaint_with_its_line(tmp_path: Path, ground: str, heights: str, wanted: str) -> None:
    path = written(tmp_path, ground, heights)
    with pytest.raises(SceneError) as caught:
        read_scene(path)
    (complaint,) = caught.value.complaints
    assert complaint.line == 2 and complaint.path == "ground" and wanted in complaint.wanted
