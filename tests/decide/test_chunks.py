"""Work in chunks: kept as they finish, gone on with, refused when it is another work or too much."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from render.decide.cases import Cases, per_case
from render.decide.chunks import (
    Folder,
    TooMuch,
    WorkChanged,
    WorkUnfinished,
    chunk_count,
    estimate,
    refuse_too_much,
    span,
    work_hash,
    work_in_chunks,
)
from render.decide.map import grid_values, map_axes
from render.decide.runner import Local
from render.decide.values import Common, common_of
from scenes.reader import read_airframe, read_scene
from terrain.ground import read_ground
from tests.decide.shaped import CutOff

CHUNK = 3


@pytest.fixture(scope="module")
def work() -> tuple[Common, list[Any]]:
    scene, x, y = map_axes(read_scene("late_freeze"), "loop_angle=200:300:25deg", "fraction=0,40%")
    return common_of(scene, read_airframe, read_ground(scene.ground, scene.seed)), grid_values(x, y)


@pytest.fixture(scope="module")
def whole(work: tuple[Common, list[Any]], tmp_path_factory: pytest.TempPathFactory) -> Cases:
    folder = Folder(tmp_path_factory.mktemp("whole") / "work", "key", chunk_count(len(work[1]), CHUNK))
    return work_in_chunks(*work, Local(), folder, chunk=CHUNK)


def same(one: Cases, other: Cases) -> None:
    assert one.error == other.error and one.names == other.names
    for name in per_case():
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name), err_msg=name)


def test_an_interrupted_work_keeps_its_chunks_and_goes_on(
    work: tuple[Common, list[Any]], whole: Cases, tmp_path: Path
) -> None:
    folder = Folder(tmp_path / "work", "key", 4)
    seen: list[tuple[int, int]] = []
    with pytest.raises(KeyboardInterrupt):
        work_in_chunks(*work, CutOff(2), folder, chunk=CHUNK, progress=lambda d, t: seen.append((d, t)))
    assert sorted(p.name for p in folder.path.glob("*.npz")) == ["000000.npz", "000001.npz"]
    assert seen == [(0, 10), (3, 10), (6, 10)]
    with pytest.raises(WorkUnfinished, match="2 of 4 chunks"):
        work_in_chunks(*work, Local(), folder, chunk=CHUNK)
    late = CutOff(2)
    same(work_in_chunks(*work, late, folder, chunk=CHUNK, resume=True), whole)
    assert late.left == 0 and not folder.path.exists()


def test_other_work_is_noticed_and_refused(work: tuple[Common, list[Any]], whole: Cases, tmp_path: Path) -> None:
    with pytest.raises(KeyboardInterrupt):
        work_in_chunks(*work, CutOff(1), Folder(tmp_path / "work", "key", 4), chunk=CHUNK)
    changed = Folder(tmp_path / "work", "another", 4)
    for resume in (True, False):
        with pytest.raises(WorkChanged, match="another scene text, grid or version"):
            work_in_chunks(*work, Local(), changed, chunk=CHUNK, resume=resume)
    same(work_in_chunks(*work, Local(), changed, chunk=CHUNK, force=True), whole)


def test_a_damaged_chunk_is_said(work: tuple[Common, list[Any]], tmp_path: Path) -> None:
    folder = Folder(tmp_path / "work", "key", 4)
    with pytest.raises(KeyboardInterrupt):
        work_in_chunks(*work, CutOff(1), folder, chunk=CHUNK)
    file = folder.path / "000000.npz"
    file.write_bytes(file.read_bytes()[:200])
    with pytest.raises(WorkChanged, match=r"000000\.npz is damaged"):
        work_in_chunks(*work, Local(), folder, chunk=CHUNK, resume=True)


def test_resuming_nothing_is_beginning(work: tuple[Common, list[Any]], whole: Cases, tmp_path: Path) -> None:
    same(work_in_chunks(*work, Local(), Folder(tmp_path / "work", "key", 4), chunk=CHUNK, resume=True), whole)


def test_the_hash_knows_text_grid_and_program(monkeypatch: pytest.MonkeyPatch) -> None:
    one = work_hash("text", ["map", 1.0])
    assert one == work_hash("text", ["map", 1.0])
    assert len({one, work_hash("text ", ["map", 1.0]), work_hash("text", ["map", 1.0000001])}) == 3
    monkeypatch.setattr("render.decide.chunks.marks", lambda: {"latepull": "other"})
    assert work_hash("text", ["map", 1.0]) != one


def test_a_million_cells_are_estimated_and_refused() -> None:
    expected = estimate(1_000_000, False, 2)
    assert expected.seconds > 3600.0
    with pytest.raises(TooMuch, match=r"1,000,000 cases, about .* h on \d+ cores, .* GB.*--force-size"):
        refuse_too_much(expected, force=False)
    refuse_too_much(expected, force=True)
    refuse_too_much(estimate(5000, False, 2), force=False)


def test_estimates_grow_with_work() -> None:
    assert estimate(200, False, 2).seconds == pytest.approx(2.0 * estimate(100, False, 2).seconds)
    assert estimate(100, True, 2).seconds > estimate(100, False, 2).seconds > estimate(100, False, 1).seconds
    assert [span(s) for s in (0.2, 40.0, 600.0, 12600.0)] == ["1 s", "40 s", "10 min", "3.5 h"]
