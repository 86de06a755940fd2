"""``latepull map`` and ``latepull batch`` as a user gives them."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from render import command_batch
from render.command import CAUTION
from tests.conftest import Run

SMALL = ("--x", "loop_angle=200:300:50deg", "--y", "fraction=0,80%")


def test_map_writes_tables_arrays_words_and_chart(run: Run, tmp_path: Path) -> None:
    code, out, err = run("map", "late_freeze", *SMALL)
    assert code == 0 and CAUTION in out and "safe" not in out
    assert "3 x 2: 6 cases, about" in err
    assert "Right and left: With nothing of the control left" in out and "TOO LATE" not in out
    folder = tmp_path / "out" / "late_freeze" / "map"
    assert {p.name for p in folder.iterdir()} == {"map.csv", "map.npz", "map.txt", "map.png", "map.pdf", "map.svg"}
    with np.load(folder / "map.npz", allow_pickle=False) as data:
        assert data["lateness_s"].shape == (3, 2, 2, 3) and data["x"][0] == pytest.approx(np.radians(200.0))
        notes = json.loads(str(data["notes"]))
    assert notes["slots"] == ["right", "left"] and notes["outcomes"]["4"] == "too_late"
    with Image.open(folder / "map.png") as picture:
        # a field of black where it is too late, none but white where it clears
        pixels = np.asarray(picture.convert("L"))
    assert picture.size[0] == 1870
    # the lower row of the grid: two of three columns are too late
    low = pixels[pixels.shape[0] * 60 // 100 : pixels.shape[0] * 72 // 100] < 40
    assert low[:, 250:1150].mean() > 0.8 and low[:, 1300:1750].mean() < 0.05
    assert (folder / "map.pdf").read_bytes().startswith(b"%PDF")
    assert "<svg" in (folder / "map.svg").read_text(encoding="utf-8")[:2000]


def test_map_json_and_kept_outputs(run: Run) -> None:
    code, out, err = run("map", "late_freeze", *SMALL, "--json", "--out", "mine")
    assert code == 0 and err == ""
    said = json.loads(out)
    assert said["cells"] == 6 and sum(said["counts"]["right"].values()) == 6 and said["caution"] == CAUTION
    code, _, err = run("map", "late_freeze", *SMALL, "--out", "mine")
    assert code == 2 and "is already there and is kept; give --force" in err
    assert run("map", "late_freeze", *SMALL, "--out", "mine", "--force")[0] == 0


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("map", "late_freeze", "--x", "loop_angel=1:2:1deg"), "nearest fault.at.loop_angle"),
        (("map", "late_freeze", "--x", "loop_angle=300:200:5deg"), "does not rise"),
        (("map", "late_freeze", "--x", "loop_angle=0:360:0.2deg", "--y", "fraction=0:100:0.1%"), "--force-size"),
        (("map", "healthy_loop"), "no fault to map"),
        (("map", "no_such_scene"), "wanted a shipped scene"),
        (("batch", "no_such_list.yaml"), "no such file"),
    ],
)
def test_bad_input_is_exit_2_and_leaves_nothing(run: Run, tmp_path: Path, words: tuple[str, ...], said: str) -> None:
    code, _, err = run(*words)
    assert code == 2 and said in err
    assert not any((tmp_path / "out").rglob("*.*")) if (tmp_path / "out").exists() else True


def test_an_interrupted_map_goes_on_and_a_changed_scene_is_refused(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    scene = tmp_path / "mine.yaml"
    scene.write_text("like: late_freeze\ntitle: mine\n", encoding="utf-8")
    from render.decide import runner

    real, calls = runner.Local.run, []

    def cut_off(self: object, work: object, common: object, chunks: object) -> object:
        for pair in real(self, work, common, chunks):  # type: ignore[arg-type]
            if len(calls) == 1:
                raise KeyboardInterrupt
            calls.append(pair[0])
            yield pair

    monkeypatch.setattr(runner.Local, "run", cut_off)
    code, _, err = run("map", "./mine.yaml", *SMALL, "--chunk", "2")
    assert code == 130 and "give --resume to go on" in err
    unfinished = tmp_path / "out" / "mine" / "map" / "map.unfinished"
    assert [p.name for p in unfinished.glob("*.npz")] == ["000000.npz"]
    monkeypatch.setattr(runner.Local, "run", real)
    assert run("map", "./mine.yaml", *SMALL, "--chunk", "2")[0] == 2
    text = scene.read_text(encoding="utf-8")
    scene.write_text(text + "floor: 120 ft\n", encoding="utf-8")
    code, _, err = run("map", "./mine.yaml", *SMALL, "--chunk", "2", "--resume")
    assert code == 2 and "another scene text, grid or version" in err
    scene.write_text(text, encoding="utf-8")
    assert run("map", "./mine.yaml", *SMALL, "--chunk", "2", "--resume")[0] == 0
    assert not unfinished.exists()


def test_batch_makes_what_is_missing_and_nothing_twice(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("render.decide.runner.source_hash", lambda whole=False: "fixed")
    listed = tmp_path / "monday.yaml"
    listed.write_text("jobs:\n  - fly: late_freeze\n  - fly: early_freeze\n    name: early\n", encoding="utf-8")
    ran: list[str] = []

    def made(common: None, job: command_batch.Job) -> command_batch.Made:
        """What a process of its own makes (below) at once."""
        ran.append(job.name)
        return command_batch.Made(0, "", {"verdict.json": json.dumps(job.argv).encode(), "table.txt": b"table"})

    monkeypatch.setattr(command_batch, "run_job", made)
    assert run("batch", "monday.yaml")[0] == 0
    early = tmp_path / "out" / "monday" / "early"
    assert ran == ["fly_late_freeze", "early"]
    assert json.loads((early / "verdict.json").read_text(encoding="utf-8")) == ["fly", "early_freeze"]
    (early / "table.txt").unlink()
    code, out, _ = run("batch", "monday.yaml", "--json")
    assert code == 0 and ran[2:] == ["early"] and json.loads(out)["jobs"]["early"]["made"]
    assert run("batch", "monday.yaml")[1].strip().endswith("0 made, 2 finished before, 0 failed")
    # another list entry under the same name is another work
    listed.write_text("jobs:\n  - fly: late_freeze\n  - fly: part_authority\n    name: early\n", encoding="utf-8")
    code, _, err = run("batch", "monday.yaml")
    assert code == 2 and "another scene text, options or version: early" in err and len(ran) == 3


def test_batch_says_all_faults_of_a_list_with_their_lines(run: Run, tmp_path: Path) -> None:
    (tmp_path / "bad.yaml").write_text(
        "jobs:\n  - fly: late_frez\n  - film: late_freeze\n    slott: left\n  - [a]\n"
        "  - still: late_freeze\n    out: x\n  - slot: right\njob: 3\n", encoding="utf-8")
    code, _, err = run("batch", "bad.yaml")
    assert code == 2
    for line, words in ((2, "did you mean late_freeze?"), (3, "--slott=left"), (5, "a list"), (7, "the key out"),
                        (8, "0 commands"), (9, "did you mean jobs?")):
        assert any(row.startswith(f"bad.yaml:{line}:") and words in row for row in err.splitlines()), (line, words)


def test_a_job_that_fails_does_not_stop_the_others(run: Run, tmp_path: Path) -> None:
    scene = tmp_path / "high.yaml"
    scene.write_text("like: late_freeze\nfault: {kind: freeze, at: {loop_angle: 359.9 deg}}\n", encoding="utf-8")
    (tmp_path / "two.yaml").write_text("jobs:\n  - fly: ./high.yaml\n  - fly: healthy_loop\n", encoding="utf-8")
    code, out, err = run("batch", "two.yaml")
    assert code == 2 and "1 made, 0 finished before, 1 failed" in out
    assert "fly_high: the fault's point is never reached" in err
    made = tmp_path / "out" / "two" / "fly_healthy_loop"
    assert json.loads((made / "verdict.json").read_text(encoding="utf-8"))["scene"] == "healthy_loop"
    noted = json.loads((made / "job.json").read_text(encoding="utf-8"))["files"]
    assert noted and sorted(p.name for p in made.iterdir()) == sorted([*noted, "job.json"])
    assert not (made.parent / "fly_high").exists()
