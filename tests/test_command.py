"""The commands as a user gives them: exit codes, messages without a traceback, outputs whole and kept."""

from __future__ import annotations

import contextlib
import io
import json
import shutil
from pathlib import Path

import pytest

from render.command import CAUTION, main
from tests.conftest import Run


@pytest.fixture(scope="module")
def flown(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, str]:
    """Where ``fly late_freeze`` was given, with what it made in ``out``, and what it printed."""
    where, said = tmp_path_factory.mktemp("flown"), io.StringIO()
    with contextlib.chdir(where), contextlib.redirect_stdout(said):
        assert main(["fly", "late_freeze"]) == 0
    return where, said.getvalue()


def test_fly_prints_the_table_and_writes_the_verdict_it_is_made_from(flown: tuple[Path, str]) -> None:
    where, out = flown
    assert "Slot right: last pull" in out and CAUTION.split(".")[0] in out
    folder = where / "out" / "late_freeze"
    assert {p.name for p in folder.iterdir()} == {
        "verdict.json", "table.txt", "tracks.csv", "margin.csv", "study.json", "study.npz"
    }
    verdict = json.loads((folder / "verdict.json").read_text(encoding="utf-8"))
    right = verdict["slots"]["right"]
    # the table's figure is the verdict's
    late_s = right["lateness_s"]["likely"]
    assert f"too late by {late_s:.1f} s" in out
    assert right["notice"]["likely"]["time_s"] > verdict["fault"]["time_s"]


def test_fly_json_is_the_verdict(run: Run, tmp_path: Path) -> None:
    code, out, _ = run("fly", "trailing_surface", "--json", "--out", "mine")
    assert code == 0
    assert json.loads(out) == json.loads((tmp_path / "mine" / "verdict.json").read_text(encoding="utf-8"))


def test_a_named_output_is_kept_unless_forced(run: Run, tmp_path: Path) -> None:
    assert run("fly", "healthy_loop", "--out", "mine")[0] == 0
    before = (tmp_path / "mine" / "verdict.json").read_bytes()
    code, _, err = run("fly", "trailing_surface", "--out", "mine")
    assert code == 2 and "is already there and is kept; give --force" in err
    assert (tmp_path / "mine" / "verdict.json").read_bytes() == before
    assert run("fly", "trailing_surface", "--out", "mine", "--force")[0] == 0
    assert (tmp_path / "mine" / "verdict.json").read_bytes() != before


@pytest.mark.parametrize(("words", "code", "complaint"), [
    (("fly", "late_freze"), 2, "read late_freze, wanted a shipped scene"),
    (("fly", "there/is/none.yaml"), 2, "none.yaml"),
    (("still", "late_freeze", "--at", "500"), 2, "a still at 500 s: the flight runs from 0 s to"),
    (("still", "late_freeze", "--at", "nan"), 2, "a still at nan s: the flight runs from 0 s to"),
    (("film", "late_freeze", "--from", "40", "--to", "30"), 2, "film from 40 s to 30 s: the flight runs from 0 s to"),
    (("film", "late_freeze", "--slot", "middle"), 2, "--slot: read middle, wanted one of lead, right, left"),
])  # fmt: skip
def test_wrong_input_is_named(
    run: Run, tmp_path: Path, flown: tuple[Path, str], words: tuple[str, ...], code: int, complaint: str
) -> None:
    shutil.copytree(flown[0] / "out", tmp_path / "out")  # as for a user who has flown the scene
    got, out, err = run(*words)
    assert got == code and complaint in err and out == ""


def test_json_carries_an_error_too(run: Run, tmp_path: Path, flown: tuple[Path, str]) -> None:
    shutil.copytree(flown[0] / "out", tmp_path / "out")
    code, out, err = run("film", "late_freeze", "--json", "--slot", "middle")
    assert code == 2 and "--slot" in err
    assert json.loads(out) == {"error": err.strip(), "exit_code": 2}


def test_a_place_that_cannot_be_is_named_and_nothing_is_left(run: Run, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("a file, not a folder", encoding="utf-8")
    code, _, err = run("fly", "healthy_loop", "--out", "file/in")
    assert code == 2 and "can't write file/in/verdict.json: a file stands where a folder is wanted" in err
    assert sorted(p.name for p in tmp_path.iterdir()) == ["file"]


def test_a_loop_that_cannot_close_says_what_is_reachable(run: Run, tmp_path: Path) -> None:
    scene = (
        "like: healthy_loop\nscript:\n  - level: {speed: 385 kt, height: 300 ft, heading: 80 deg, for: 3 s}\n"
        "  - loop:\n      load_factor: {0: 1.2, 12: 4.3, 40: 4.2, 90: 2.8, 180: 1, 270: 3.6, 350: 4.1, 358: 2.6}\n"
        "      power: 85 %\n      close_at: 5000 ft\n"
    )
    (tmp_path / "high.yaml").write_text(scene, encoding="utf-8")
    code, _, err = run("fly", "high.yaml")
    assert code == 2 and "can't close at 5000 ft" in err and "are reachable; limited by" in err
    assert not (tmp_path / "out").exists()


def test_interrupt_is_130(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(*_: object) -> object:
        raise KeyboardInterrupt

    monkeypatch.setattr("render.study.work_through", interrupted)
    code, _, err = run("fly", "healthy_loop")
    assert code == 130 and "nothing half-made is left" in err


@pytest.mark.parametrize("text", ["33", "35:33:4", "33:35:0.5", "a:b:c", "33:35:nan", "33:35:4:5"])
def test_slow_motion_that_is_none_is_named(run: Run, text: str) -> None:
    code, _, err = run("film", "late_freeze", "--slow", text)
    assert code == 2 and f"--slow: read {text}, wanted FROM:TO:TIMES" in err
