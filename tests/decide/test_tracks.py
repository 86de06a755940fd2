"""A scatter measured from tracks is the one they were flown with."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
import pytest

from render.decide.passes import draw, pass_scenes
from render.decide.tracks import LEAD, measured_scatter, read_pass
from render.errors import LatepullError
from render.output.tables import tracks_csv
from render.study import work_through
from scenes.model import Scatter, Slot
from tests.flight.made import flat_ground, invented_jet, loop_scene

SPREAD = Scatter(entry_speed_mps=2.0, entry_height_m=6.0, load_factor=0.04, base_m=6.0, station_m=0.7)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Eight recordings of passes without a fault."""
    where = tmp_path_factory.mktemp("tracks")
    base = loop_scene(slots=(Slot("right", 4.0, 14.0, 1.0),))
    for i, scene in enumerate(pass_scenes(base, SPREAD, draw(8, 1, 5))):
        study = work_through(scene, lambda _: invented_jet(), flat_ground(), "")
        (where / f"pass{i}").mkdir()
        (where / f"pass{i}" / "tracks.csv").write_text(tracks_csv(study), encoding="utf-8")
    return where


def test_what_was_flown_is_found_again(folder: Path) -> None:
    base = loop_scene(slots=(Slot("right", 4.0, 14.0, 1.0),))
    found, count = measured_scatter(folder, dataclasses.replace(base, scatter=Scatter(reaction=0.4)))
    assert count == 8
    z = draw(8, 1, 5)
    # the sample's own standard deviations, not those asked for
    speed, height, early, low = (np.std(z.common[:, i], ddof=1) for i in (0, 1, 3, 4))
    assert found.entry_speed_mps == pytest.approx(2.0 * speed, rel=0.1)
    assert found.entry_height_m == pytest.approx(6.0 * height, rel=0.05)
    assert found.base_m == pytest.approx(6.0 * low, rel=0.05)
    up = np.std(z.common[:, 2], ddof=1)
    assert found.load_factor == pytest.approx(0.04 * np.sqrt(0.5 * (up**2 + early**2)), rel=0.25)
    assert found.station_m == pytest.approx(0.7 * np.sqrt(np.mean(np.var(z.own[:, 0, :3], axis=0, ddof=1))), rel=0.35)
    assert found.reaction == 0.4 and found.power == 0.0


def test_bad_recordings_are_all_named(folder: Path, tmp_path: Path) -> None:
    scene = loop_scene(slots=(Slot("right", 4.0, 14.0, 1.0),))
    with pytest.raises(LatepullError, match="0 tracks found, wanted at least 5"):
        measured_scatter(tmp_path / "nothing", scene)
    good = (folder / "pass0" / "tracks.csv").read_text(encoding="utf-8")
    head, first, *rest = good.splitlines()
    for i in range(4):
        (tmp_path / f"{i}.csv").write_text(good, encoding="utf-8")
    (tmp_path / "a.csv").write_text("\n".join([head.replace("lead_height_m", "height"), first, *rest]))
    cells = first.split(",")
    cells[head.split(",").index("lead_load_factor")] = "four"
    (tmp_path / "b.csv").write_text("\n".join([head, ",".join(cells), *rest]))
    (tmp_path / "c.csv").write_text("\n".join([head, first, *rest[:300]]))
    with pytest.raises(LatepullError) as caught:
        measured_scatter(tmp_path, scene)
    lines = str(caught.value).splitlines()
    assert [Path(line.split(":")[0]).name for line in lines] == ["a.csv", "b.csv", "c.csv"]
    assert "a.csv:1: no column lead_height_m" in lines[0] and "b.csv:2: not a number" in lines[1]
    assert "no whole loop" in lines[2]
    assert len(LEAD) == 10
    with pytest.raises(LatepullError, match="no column far_north_m"):
        read_pass(tmp_path / "0.csv", ["far"])
